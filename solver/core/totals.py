"""State functions of mixtures of given amounts at given T and p."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.columns import run_of
from solver.core.mixture import P0, R

Array = NDArray[np.float64]

_LEAST = 1e-300  # mol; what is not there has a logarithm of no account


@dataclass(frozen=True, slots=True)
class Totals:
    """Extensive state functions (cases,), SI: V m3, H, U and G J, S J/K."""

    V: Array
    H: Array
    U: Array
    S: Array
    G: Array

    def blend(self, other: Totals, share: float) -> Totals:
        """The states with a share of `other` in them, at the same T and p."""
        return Totals(
            *(
                (1.0 - share) * getattr(self, name) + share * getattr(other, name)
                for name in ("V", "H", "U", "S", "G")
            )
        )


def totals(
    n: Array,
    is_gas: NDArray[np.bool_],
    volume: Array,
    g: Array,
    h: Array,
    T: Array,
    p: Array,
    V: Array | None,
    twins: Sequence[tuple[int, int]] = (),
) -> Totals:
    """Ideal gas with pure condensed phases beside it.

    Parameters
    ----------
    n, g, h : ndarray, shape (cases, species)
        Amounts (mol), g/RT and h/RT at 1 bar.
    volume : ndarray, shape (species,)
        Molar volumes of condensed species, m3/mol.
    T, p : ndarray, shape (cases,)
        K, Pa.
    V : ndarray, shape (cases,), or None
        The volume held, m3; None where the mixture takes what it needs.
    twins : sequence of (int, int)
        Species that stand twice (the second is the inert part of the first): they mix as one.
    """
    RT = R * T
    mixed = n
    if twins:
        mixed = n.copy()
        for first, second in twins:
            mixed[:, first] += mixed[:, second]
            mixed[:, second] = 0.0
    gas = mixed[:, run_of(np.flatnonzero(is_gas))]
    N = gas.sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        logs = np.maximum(gas, _LEAST)
        mixing = np.einsum("ij,ij->i", gas, np.log(logs, out=logs))
        mixing += np.where(N > 0.0, N * (np.log(p / P0) - np.log(N)), 0.0)
        gas_volume = np.where(N > 0.0, N * RT / p, 0.0)
    V_condensed = n @ volume
    heat = np.einsum("ij,ij->i", n, h)
    H = RT * heat + V_condensed * (p - P0)
    S = R * (heat - np.einsum("ij,ij->i", n, g) - mixing)
    if V is None:
        V = gas_volume + V_condensed
    return Totals(V=V, H=H, U=H - p * V, S=S, G=H - T * S)
