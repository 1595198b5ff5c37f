"""One real case sought in nested brackets, jumps included.

At fixed T the volume of the minimum never rises with p; along the states of one volume, or
of one pressure, energy and entropy never fall with T. So p is bracketed inside, T outside.
Where a bracket closes on a jump, phases change at one temperature and pressure, and the end
state is the split of the two minima at its ends that has the value held.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Feed
from solver.core.minimise import Unsettled
from solver.core.mixture import R
from solver.core.temperature import OutOfReach
from solver.core.totals import Totals
from solver.fixed import P_HIGHEST, T_HIGHEST, T_LOWEST, Pair
from solver.real.functions import Response, state_functions
from solver.real.minimise import minimise_real
from solver.real.problem import RealCases, RealMixture
from solver.real.states import Minima

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_P_LEAST = 1e-30  # Pa
_MAX_EVALUATIONS = 160
_NARROW = 1e-15
_MET = 1e-13
_SLIVER = 1e-12  # of ln p: the Gibbs energies of two phases tell no more


@dataclass(frozen=True)
class Target:
    """The values that a pair holds, arrays (cases,), in the scale of the feed."""

    pair: Pair
    first: Array
    second: Array

    def of(self, which: Indices) -> Target:
        """Of some of the cases."""
        return Target(self.pair, self.first[which], self.second[which])

    def excess(self, state: Totals, T: Array, n: Array) -> Array:
        """How far states are off (cases, 2): energy over n R T or entropy over n R, ln volume."""
        out = np.zeros((len(T), 2))
        searched = self.pair.searched
        if searched is not None:
            unit = R * n.sum(axis=1) * (1.0 if searched == "S" else T)
            out[:, 0] = (getattr(state, searched) - self.first) / unit
        if self.pair.holds_volume:
            with np.errstate(invalid="ignore", divide="ignore"):
                out[:, 1] = np.log(state.V / self.second)
        if searched is None:
            out = out[:, ::-1].copy()
        return out

    def step(
        self, rows: Indices, state: Totals, cases: RealCases, answer: Response, F: Array
    ) -> Array:
        """Newton steps (rows, 2) of ln T and ln p; F as `excess` gives it."""
        T, p, searched = cases.T, cases.p, self.pair.searched
        V = state.V[rows]
        slope_T, slope_p = answer.H_T, answer.H_p
        if searched == "S":
            slope_T, slope_p = answer.H_T / T, (answer.H_p - V * p) / T
        elif searched == "U":
            slope_T, slope_p = answer.H_T - p * answer.V_T, answer.H_p - p * (answer.V_p + V)
        with np.errstate(all="ignore"):
            if searched is None:
                return np.column_stack([np.zeros(len(rows)), -F[:, 0] * V / answer.V_p])
            wanted = self.first[rows] - getattr(state, searched)[rows]
            if not self.pair.holds_volume:
                return np.column_stack([wanted / slope_T, np.zeros(len(rows))])
            b = -F[:, 1] * V
            det = slope_T * answer.V_p - slope_p * answer.V_T
            return np.column_stack(
                [
                    (wanted * answer.V_p - slope_p * b) / det,
                    (slope_T * b - wanted * answer.V_T) / det,
                ]
            )


@dataclass(frozen=True)
class Ends:
    """One end point: a minimum, or the split of two at one T and p."""

    T: float
    p: float
    fluids: Array  # (slots, gas species)
    n: Array
    potentials: Array
    distance: float
    state: Totals

    def value(self, name: str) -> float:
        """One state function, or ``p``."""
        return float(getattr(self.state, name)[0])


def seek_alone(real: RealMixture, feed: Feed, target: Target, T: float, p: float) -> Ends:
    """The end point of one case, sought from T and p.

    Raises
    ------
    OutOfReach
        The value lies beyond what the allowed temperatures reach.
    Unsettled
        No end of the search.
    """
    seeker = _Seeker(real, feed)
    pair, value = target.pair, float(target.first[0])
    if pair.searched is None:
        return seeker.at_volume(value, float(target.second[0]), p)
    if pair.holds_volume:
        V, last = float(target.second[0]), [p]

        def at(T: float) -> Ends:
            ends = seeker.at_volume(T, V, last[0])
            last[0] = max(ends.p, _P_LEAST)
            return ends

    else:

        def at(T: float) -> Ends:
            return seeker.at(T, p)

    return _seek(at, seeker.blend, pair.searched, value, T)


class _Seeker:
    """Evaluates one case at any T and p, each from the last."""

    def __init__(self, real: RealMixture, feed: Feed) -> None:
        self._real, self._feed = real, feed
        self._last: Minima | None = None

    def at(self, T: float, p: float) -> Ends:
        """The minimum at T and p."""
        cases = RealCases(self._real, self._feed, np.array([T]), np.array([p]))
        minima = minimise_real(cases, np.zeros((1, 1)), self._last)
        if not minima.found[0] and self._last is not None:
            minima = minimise_real(cases, np.zeros((1, 1)))
        if not minima.found[0]:
            raise minima.why.get(0, Unsettled("a real mixture was not settled"))
        self._last = minima
        state = state_functions(cases, minima.fluids, minima.n)
        return Ends(
            T,
            p,
            minima.fluids[0],
            minima.n[0],
            minima.potentials[0],
            float(minima.distance[0]),
            state,
        )

    def blend(self, low: Ends, high: Ends, share: float) -> Ends:
        """A split with a share of `high` in it."""
        fluids = (1.0 - share) * low.fluids + share * high.fluids
        n = (1.0 - share) * low.n + share * high.n
        cases = RealCases(self._real, self._feed, np.array([high.T]), np.array([high.p]))
        state = state_functions(cases, fluids[None], n[None])
        distance = min(low.distance, high.distance)
        return Ends(high.T, high.p, fluids, n, high.potentials, distance, state)

    def at_volume(self, T: float, V: float, p: float) -> Ends:
        """The minimum at T whose volume is V, sought from p."""
        large: Ends | None = None
        small: Ends | None = None
        x, width, tries = float(np.log(p)), np.inf, 0
        for count in range(_MAX_EVALUATIONS):
            at = self.at(T, float(np.exp(x)))
            off = float(np.log(at.value("V") / V))
            if abs(off) <= _MET:
                return at
            if at.fluids.sum() <= 0.0 and off < 0.0 and at.p <= _P_LEAST:
                return at  # nothing evaporates: condensed phases need not fill a vessel
            if off > 0.0:
                large = at
            else:
                small = at
            if large is None or small is None:
                x += float(np.sign(off)) * min(abs(off) + 1e-3, 0.02 * 4.0**count)
                if x > np.log(P_HIGHEST) or x < np.log(_P_LEAST):
                    raise Unsettled(f"no pressure up to {P_HIGHEST:g} Pa fits the volume")
                continue
            last, width = width, float(np.log(small.p / large.p))
            if width <= (_SLIVER if _jumps(large, small) else 16.0 * _NARROW):
                return self._filled(large, small, V)
            tries = (tries + 1) % 3 if width > 0.5 * last else 0
            x = _pressure(large, small, V, tries)
        raise Unsettled("no end of the search for the pressure")

    def _filled(self, large: Ends, small: Ends, V: float) -> Ends:
        top, bottom = large.value("V"), small.value("V")
        return self.blend(large, small, (top - V) / (top - bottom))


def _jumps(first: Ends, second: Ends) -> bool:
    """Whether two ends have different phases, so that something may jump between them."""
    there = (first.fluids.sum(axis=1) > 0.0) != (second.fluids.sum(axis=1) > 0.0)
    return bool(there.any() or ((first.n > 0.0) != (second.n > 0.0)).any())


def _pressure(large: Ends, small: Ends, V: float, tries: int) -> float:
    """ln of a pressure between two ends, for the volume V between theirs.

    Where the volume jumps between them, their Gibbs energies, carried on with the volumes,
    meet at the pressure of the jump; else the logarithms of the volumes lead there. What
    creeps is halved.
    """
    x_low, x_high = float(np.log(large.p)), float(np.log(small.p))
    if tries == 2:
        return 0.5 * (x_low + x_high)
    if _jumps(large, small) and tries == 0:
        V_l, V_s, middle = large.value("V"), small.value("V"), 0.5 * (large.p + small.p)
        p = middle + (
            (small.value("G") + V_s * (middle - small.p))
            - (large.value("G") + V_l * (middle - large.p))
        ) / (V_l - V_s)
        x = float(np.log(p)) if large.p < p < small.p else 0.5 * (x_low + x_high)
    else:
        share = np.log(large.value("V") / V) / np.log(large.value("V") / small.value("V"))
        x = x_low + float(share) * (x_high - x_low)
    # a little beyond it as seen from the nearer end, so that the farther end comes up
    reach = max(0.4 * _SLIVER, 0.25 * (x_high - x_low) ** 2)
    x += reach if x - x_low < x_high - x else -reach
    return min(max(x, x_low + 4.0 * _NARROW), x_high - 4.0 * _NARROW)


def _seek(
    at: Callable[[float], Ends],
    blend: Callable[[Ends, Ends, float], Ends],
    variable: str,
    value: float,
    T: float,
) -> Ends:
    """The T at which a state function has its value."""
    low: Ends | None = None
    high: Ends | None = None
    T = float(np.clip(T, T_LOWEST, T_HIGHEST))
    width, tries = np.inf, 0
    for count in range(_MAX_EVALUATIONS):
        ends = at(T)
        excess = ends.value(variable) - value
        unit = R * float(ends.n.sum()) * (1.0 if variable == "S" else T)
        if abs(excess) <= (2e-13 if width > 1e-9 * T else 5e-12) * unit:
            return ends
        if excess < 0.0:
            low = ends
            if T >= T_HIGHEST:
                raise OutOfReach("above", T, ends.value(variable))
        else:
            high = ends
            if T <= T_LOWEST:
                raise OutOfReach("below", T, ends.value(variable))
        if low is None or high is None:
            factor = 1.0 + 0.01 * 3.0 ** min(count, 4)
            T = float(np.clip(T * factor if high is None else T / factor, T_LOWEST, T_HIGHEST))
            continue
        last, width = width, high.T - low.T
        if width <= 4.0 * np.spacing(high.T):
            bottom, top = low.value(variable), high.value(variable)
            if abs(excess) <= 1e-11 * unit:
                return ends
            return blend(low, high, (value - bottom) / (top - bottom))
        tries = (tries + 1) % 3 if width > 0.5 * last else 0
        T = _temperature(low, high, variable, value, tries)
    raise Unsettled("no end of the search for the temperature")


def _temperature(low: Ends, high: Ends, variable: str, value: float, tries: int) -> float:
    """A temperature between two ends, as `_pressure`."""
    middle = 0.5 * (low.T + high.T)
    if tries == 2:
        return middle
    if low.p == high.p and _jumps(low, high) and tries == 0:
        # where the Gibbs energies of the ends meet, carried on with their entropies
        S_low, S_high = low.value("S"), high.value("S")
        T = middle + (
            (high.value("G") + S_high * (high.T - middle))
            - (low.value("G") + S_low * (low.T - middle))
        ) / max(S_high - S_low, 1e-300)
        T = T if low.T < T < high.T else middle
    else:
        bottom, top = low.value(variable), high.value(variable)
        T = low.T + (high.T - low.T) * (value - bottom) / (top - bottom)
    ulp = float(np.spacing(middle))
    reach = max(2e-14 * middle, (high.T - low.T) ** 2 / middle)
    T += reach if T - low.T < high.T - T else -reach
    T = min(max(T, low.T + ulp), high.T - ulp)
    return float(T) if low.T < T < high.T else middle
