"""A real mixture as it is fed: split into gas and liquid where it is not stable, unreacted."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Feed
from solver.core.mixture import make_mixture
from solver.core.totals import Totals
from solver.errors import NotProven
from solver.gas.fluid import make_fluid
from solver.gas_model import GasModel
from solver.real.functions import state_functions
from solver.real.minimise import minimise_real
from solver.real.problem import RealCases, make_real

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]


def fluid_as_fed(species: Sequence[Species], n: Array, T: float, p: float, gas: GasModel) -> Totals:
    """State functions of gas species mixed at T and p, each its own balance: nothing reacts.

    Parameters
    ----------
    species : sequence of Species
        Gas species.
    n : ndarray, shape (species,)
        mol, all above zero.

    Raises
    ------
    NotProven
        The split of the feed into phases was not found.
    """
    rows = {sp.key: k for k, sp in enumerate(species)}
    own = np.eye(len(species))
    mixture = make_mixture(species, rows, own, np.ones(len(species)))
    real = make_real(mixture, make_fluid(species, gas.key, gas.interactions))
    scale = 2.0 ** -round(float(np.log2(n.max())))
    cases = RealCases(real, Feed((n * scale)[None, :], own), np.array([T]), np.array([p]))
    minima = minimise_real(cases, np.zeros((1, 1)))
    if not minima.found[0]:
        raise NotProven(
            f"The phases of the feed at {T:g} K and {p:g} Pa were not found; "
            "choose gas = ideal, or change the feed's temperature or pressure.",
            "feed",
            (T, p),
        )
    state = state_functions(cases, minima.fluids, minima.n)
    return Totals(*(getattr(state, name) / scale for name in ("V", "H", "U", "S", "G")))
