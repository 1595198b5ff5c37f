"""The mixture as it is fed, before anything reacts."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import condensed_volume
from solver.core.thermo import ThermoTable
from solver.core.totals import Totals, totals
from solver.errors import InputError
from solver.fixed import checked_value
from solver.gas_model import GasModel, gas_model

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

MOST = 1e30  # mol
LEAST = 1e-250  # of the largest amount fed; less counts as nothing (one molecule is 2e-24 mol)


@dataclass(frozen=True, slots=True)
class Fed:
    """State of an unreacted feed; SI."""

    T: float
    p: float
    V: float
    H: float
    U: float
    S: float
    G: float


def as_fed(
    feed: Mapping[Species, float],
    T: float,
    p: float,
    gas: str | GasModel = "ideal",
    *,
    species: Sequence[Species] | None = None,
) -> Fed:
    """State of the mixture as fed: gases mixed, condensed species beside them, no reaction.

    Parameters
    ----------
    feed : mapping of Species to float
        mol.
    T, p : float
        K, Pa.
    gas : str or GasModel
        Gas model. With an equation of state the gases mix by it, and split into gas and liquid
        where they do at T and p; a pure liquid whose gas it holds is its liquid too.
    species : sequence of Species, optional
        The candidates that the feed will be settled among: a pure liquid is taken by its own
        record if its gas is none of them. Without them the library is asked for the gas.

    Raises
    ------
    InputError
        Empty or negative feed, T or p out of range, unknown gas model.
    """
    model = gas_model(gas)
    T, p = checked_value("T", T), checked_value("p", p)
    fed = list(feed)
    for sp in fed:
        if isinstance(sp, str):
            raise InputError(
                f"The feed as fed needs Species, not the key {sp!r}; look it up in the library.",
                f"feed[{sp}]",
                sp,
                "a Species",
            )
    n = np.array([checked_amount(sp.key, amount) for sp, amount in feed.items()])
    if not n.sum() > 0.0:
        raise InputError("The feed is empty; give at least one amount.", "feed", 0.0, "above 0 mol")
    parts = [_beside(fed, n, T, p)] if model.is_ideal else _real_parts(fed, n, T, p, model, species)
    names = ("V", "H", "U", "S", "G")
    return Fed(
        T=T, p=p, **{name: sum(float(getattr(part, name)[0]) for part in parts) for name in names}
    )


def _beside(species: Sequence[Species], n: Array, T: float, p: float) -> Totals:
    """An ideal gas and pure condensed species beside it."""
    at_T, at_p = np.array([T]), np.array([p])
    g, h, _ = ThermoTable(species).over(at_T)
    is_gas = np.array([sp.phase == "gas" for sp in species])
    volume = np.array([condensed_volume(sp) for sp in species])
    return totals(n[None, :], is_gas, volume, g, h, at_T, at_p, None)


def _real_parts(
    fed: Sequence[Species],
    n: Array,
    T: float,
    p: float,
    gas: GasModel,
    candidates: Sequence[Species] | None,
) -> list[Totals]:
    """The fluid, each liquid that the equation of state holds, and the rest."""
    from solver.real.feed import (  # an ideal gas does without
        fluid_as_fed,
        held_by_equation,
        liquid_as_fed,
    )

    own = held_by_equation(fed, candidates, gas)
    gases = [k for k, sp in enumerate(fed) if sp.phase == "gas" and n[k] > 0.0]
    rest = [k for k, sp in enumerate(fed) if sp.phase != "gas" and sp.key not in own]
    parts = [
        liquid_as_fed(own[sp.key], float(amount), T, p, gas)
        for sp, amount in zip(fed, n, strict=True)
        if sp.key in own and amount > 0.0
    ]
    if gases:
        parts.append(fluid_as_fed([fed[k] for k in gases], n[gases], T, p, gas))
    if rest:
        parts.append(_beside([fed[k] for k in rest], n[rest], T, p))
    return parts


def checked_amount(key: str, amount: object) -> float:
    """An amount as a float, or an InputError that names the species."""
    try:
        number = float(amount)  # type: ignore[arg-type]
    except (TypeError, ValueError):
        number = math.nan
    if not 0.0 <= number <= MOST:
        raise InputError(
            f"The amount of {key} is {amount}; give a number of moles from 0 to {MOST:.0e}.",
            f"feed[{key}]",
            amount,
            f"0 to {MOST:.0e} mol",
        )
    return number
