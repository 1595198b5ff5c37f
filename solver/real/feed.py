"""A real mixture as it is fed: split into gas and liquid where it is not stable, unreacted."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

import species_db
from solver.core.cases import Feed
from solver.core.mixture import make_mixture
from solver.core.thermo import ThermoTable
from solver.core.totals import Totals, totals
from solver.errors import NotProven
from solver.gas.fluid import make_fluid
from solver.gas.properties import residual_properties
from solver.gas_model import GasModel
from solver.real.functions import state_functions
from solver.real.minimise import minimise_real
from solver.real.problem import RealCases, make_real, pure_liquids

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]


@cache
def _library_gases() -> dict[str, tuple[Species, ...]]:
    """Gases of the built-in library by CAS number."""
    out: dict[str, tuple[Species, ...]] = {}
    for sp in species_db.load().values():
        if sp.phase == "gas" and sp.cas:
            out[sp.cas] = (*out.get(sp.cas, ()), sp)
    return out


def held_by_equation(
    fed: Sequence[Species], candidates: Sequence[Species] | None, gas: GasModel
) -> dict[str, Species]:
    """Pure liquids that the equation of state holds as its own, by key, with their gas.

    Parameters
    ----------
    fed : sequence of Species
    candidates : sequence of Species or None
        Where the gas is looked for; None: in the built-in library.
    """
    liquids = [sp for sp in fed if sp.phase == "liquid" and sp.cas]
    if not liquids:
        return {}
    pool = candidates
    if pool is None:
        pool = [sp for liquid in liquids for sp in _library_gases().get(liquid.cas, ())]
    gases = [sp for sp in pool if sp.phase == "gas"]
    fluid = make_fluid(gases, gas.key)
    modelled = [sp for sp, held in zip(gases, fluid.modelled, strict=True) if held]
    by_key = {sp.key: sp for sp in modelled}
    return {key: by_key[own] for key, own in pure_liquids(liquids, modelled).items()}


def liquid_as_fed(species: Species, n: float, T: float, p: float, gas: GasModel) -> Totals:
    """State functions of a pure liquid by the equation of state, from its gas' record.

    Settling holds the same matter in the same way, so that heat balances close.
    """
    fluid = make_fluid([species], gas.key)
    at_T, at_p, amount = np.array([T]), np.array([p]), np.array([[n]])
    g, h, _ = ThermoTable([species]).over(at_T)
    is_gas, none = np.ones(1, dtype=bool), np.zeros(1)
    state = totals(amount, is_gas, none, g, h, at_T, at_p, None)
    extra = residual_properties(fluid, at_T, at_p, amount, "liquid")
    V, H, S = extra.V, state.H + extra.H, state.S + extra.S
    return Totals(V=V, H=H, U=H - p * V, S=S, G=H - T * S)


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
    pairs = gas.among({sp.key for sp in species})
    real = make_real(mixture, make_fluid(species, gas.key, pairs))
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
