"""The temperature at which a composition would be at equilibrium for one reaction."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from solver.core.mixture import R
from solver.fixed import T_HIGHEST, T_LOWEST
from solver.reactions.reaction import Reaction
from solver.reactions.root import bracketed_root

_STEPS = 400
_AT_EQUILIBRIUM, _NEAR = 1e-9, 1e-5  # of ln K, and in K


@dataclass(frozen=True, slots=True)
class Approach:
    """How far a composition is from equilibrium, said as a temperature.

    Attributes
    ----------
    T : float
        Temperature of the mixture, K.
    T_eq : float or None
        Temperature at which K equals Q, K; where there are several, the one nearest to T.
    reason : str
        Why there is none, or that there are others.
    """

    T: float
    T_eq: float | None
    reason: str = ""

    @property
    def approach(self) -> float | None:
        """Temperature approach to equilibrium T - T_eq, K, as common for reformers.

        Positive for an endothermic reaction (methane and steam) that has not gone as far as
        it could at T: the outlet is hotter than its composition tells. For an exothermic
        reaction that falls short it is negative. Common practice, no source.
        """
        return None if self.T_eq is None else self.T - self.T_eq

    @property
    def shift(self) -> float | None:
        """T_eq - T, K: what a restriction adds to T where it takes K (K at T + shift)."""
        return None if self.T_eq is None else self.T_eq - self.T


def equilibrium_temperature(
    reaction: Reaction, ln_q: float | None, T: float, *, reason: str = ""
) -> Approach:
    """Temperature at which K(T) = Q, by bracketing over the range of the data.

    Parameters
    ----------
    reaction : Reaction
    ln_q : float or None
        ln of the reaction quotient of the composition, kept while the temperature is varied.
    T : float
        Temperature of the mixture, K.
    reason : str
        Why ln_q is None.
    """
    if ln_q is None:
        return Approach(T, None, reason or "the reaction quotient is not known")
    if not math.isfinite(ln_q):
        side = "reactants" if ln_q > 0 else "products"
        return Approach(
            T, None, f"Q is {'infinite' if ln_q > 0 else 'zero'}: one of the {side} is missing"
        )
    slope = reaction.dh(T) / (R * T**2)
    gap = ln_q - reaction.ln_k(T)
    if abs(gap) < _AT_EQUILIBRIUM and abs(gap) <= _NEAR * abs(slope):
        return Approach(T, T + gap / slope if slope else T)  # van 't Hoff, exact for so small a gap
    low, high = reaction.data_range
    if not low < high:
        return Approach(T, None, "the records of its species have no temperatures in common")
    low, high = max(min(low, T), T_LOWEST), min(max(high, T), T_HIGHEST)

    def off(t: float) -> float:
        return reaction.ln_k(t) - ln_q

    grid = np.unique([*np.geomspace(low, high, _STEPS), T])
    values = np.asarray(reaction.ln_k(grid)) - ln_q
    found = []
    for i in np.flatnonzero((values[:-1] > 0.0) != (values[1:] > 0.0)):
        a, b = float(grid[i]), float(grid[i + 1])
        fa, fb = off(a), off(b)
        if (fa > 0.0) != (fb > 0.0):
            found.append(bracketed_root(off, a, b, fa, fb))
    if not found:
        lnk = values + ln_q
        return Approach(
            T,
            None,
            f"no temperature from {low:.0f} to {high:.0f} K gives K = Q: ln Q is {ln_q:.4g}, "
            f"ln K goes from {float(lnk.min()):.4g} to {float(lnk.max()):.4g}",
        )
    found.sort(key=lambda t: abs(t - T))
    others = ", ".join(f"{t:.1f} K" for t in found[1:])
    return Approach(T, found[0], f"K = Q also at {others}" if others else "")
