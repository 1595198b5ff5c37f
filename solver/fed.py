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

if TYPE_CHECKING:
    from species_db import Species

GAS_MODELS = ("ideal",)
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


def as_fed(feed: Mapping[Species, float], T: float, p: float, gas: str = "ideal") -> Fed:
    """State of the mixture as fed: gases mixed, condensed species beside them, no reaction.

    Parameters
    ----------
    feed : mapping of Species to float
        mol.
    T, p : float
        K, Pa.
    gas : str
        Gas model.

    Raises
    ------
    InputError
        Empty or negative feed, T or p out of range, unknown gas model.
    """
    check_gas(gas)
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
    state = totals(n[None, :], is_gas, volume, g, h, at_T, at_p, None)
    return Fed(
        T=T,
        p=p,
        V=float(state.V[0]),
        H=float(state.H[0]),
        U=float(state.U[0]),
        S=float(state.S[0]),
        G=float(state.G[0]),
    )


def check_gas(gas: str) -> None:
    """Refuse a gas model that is not there."""
    if gas not in GAS_MODELS:
        raise InputError(
            f"The gas model {gas!r} is not available; choose {' or '.join(GAS_MODELS)}.",
            "gas",
            gas,
            ", ".join(GAS_MODELS),
        )


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
