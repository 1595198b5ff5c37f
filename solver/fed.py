"""The mixture as it is fed, before anything reacts."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from solver.core.mixture import condensed_volume
from solver.core.thermo import ThermoTable
from solver.core.totals import totals
from solver.errors import InputError
from solver.fixed import checked_value
from solver.gas_model import GasModel, gas_model

if TYPE_CHECKING:
    from species_db import Species

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


def as_fed(feed: Mapping[Species, float], T: float, p: float, gas: str | GasModel = "ideal") -> Fed:
    """State of the mixture as fed: gases mixed, condensed species beside them, no reaction.

    Parameters
    ----------
    feed : mapping of Species to float
        mol.
    T, p : float
        K, Pa.
    gas : str or GasModel
        Gas model. With an equation of state the gases mix by it, and split into gas and liquid
        where they do at T and p.

    Raises
    ------
    InputError
        Empty or negative feed, T or p out of range, unknown gas model.
    """
    model = gas_model(gas)
    T, p = checked_value("T", T), checked_value("p", p)
    species = list(feed)
    for sp in species:
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
    thermo = ThermoTable(species)
    is_gas = np.array([sp.phase == "gas" for sp in species])
    at_T, at_p = np.array([T]), np.array([p])
    g, h, _ = thermo.over(at_T)
    volume = np.array([condensed_volume(sp) for sp in species])
    fluid = is_gas & (n > 0.0)
    ideal = n if model.is_ideal else np.where(is_gas, 0.0, n)
    state = totals(ideal[None, :], is_gas, volume, g, h, at_T, at_p, None)
    values = {name: float(getattr(state, name)[0]) for name in ("V", "H", "U", "S", "G")}
    if not model.is_ideal and fluid.any():
        from solver.real.feed import fluid_as_fed  # an ideal gas does without

        gases = [sp for sp, held in zip(species, fluid, strict=True) if held]
        real = fluid_as_fed(gases, n[fluid], T, p, model)
        values = {name: value + float(getattr(real, name)[0]) for name, value in values.items()}
    return Fed(T=T, p=p, **values)


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
