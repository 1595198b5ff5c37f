"""State functions of a mixture of given amounts at given T and p."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import P0, R

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Totals:
    """Extensive state functions, SI: V m3, H, U and G J, S J/K."""

    V: float
    H: float
    U: float
    S: float
    G: float

    def blend(self, other: Totals, share: float) -> Totals:
        """The state with a share of `other` in it, at the same T and p."""
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
    T: float,
    p: float,
    V: float | None,
) -> Totals:
    """Ideal gas with pure condensed phases beside it.

    Parameters
    ----------
    n, volume, g, h : ndarray, shape (species,)
        Amounts (mol), molar volumes of condensed species (m3/mol), g/RT and h/RT at 1 bar.
    T, p : float
        K, Pa.
    V : float or None
        The volume held, m3; None where the mixture takes what it needs.
    """
    RT = R * T
    gas = n[is_gas]
    N = float(gas.sum())
    some = gas[gas > 0.0]
    mixing = float(some @ np.log(some / N)) + N * np.log(p / P0) if N > 0.0 else 0.0
    V_condensed = float(n @ volume)
    H = RT * float(n @ h) + V_condensed * (p - P0)
    S = R * (float(n @ (h - g)) - mixing)
    if V is None:
        V = N * RT / p + V_condensed
    return Totals(V=V, H=H, U=H - p * V, S=S, G=H - T * S)
