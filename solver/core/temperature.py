"""The temperature at which the minimum has the energy or entropy that is held.

Along the minimum H and S at fixed p, and U and S at fixed V, never fall with T. So the
temperature is unique and is bracketed throughout; Newton steps with the equilibrium heat
capacity are taken inside the bracket. Where phases melt, boil or decompose at one
temperature the curve jumps: the bracket closes upon the jump, and the end state is the
split of the two minima at its ends that has the energy held.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Feed
from solver.core.minimise import Minimum, Present, minimise
from solver.core.mixture import Held, Mixture, R
from solver.core.response import amounts_by_log_T
from solver.core.totals import Totals, totals

Array = NDArray[np.float64]

_MAX_EVALUATIONS = 200
_CLOSED = 2e-13
_FIRST_T = 1000.0


class OutOfReach(ArithmeticError):
    """No temperature in the allowed range has this energy; `side` is 'below' or 'above'."""

    def __init__(self, side: str, T: float, value: float) -> None:
        super().__init__(f"{side} what is reached at {T} K")
        self.side, self.T, self.value = side, T, value


@dataclass(frozen=True)
class Point:
    """A minimum at one temperature with its state functions."""

    T: float
    p: float
    n: Array
    potentials: Array
    present: Present
    totals: Totals
    slope: float | None
    """d(value searched)/dT at the set of phases kept."""


@dataclass(frozen=True)
class Search:
    """What is searched: the variable ("H", "U" or "S"), its value, and what is held beside."""

    variable: str
    value: float
    p: float | None
    V: float | None
    T_low: float
    T_high: float

    def held(self, T: float) -> Held:
        """What the minimiser holds at temperature T."""
        return Held(T, p=self.p, V=self.V)


def point_at(
    mixture: Mixture, feed: Feed, held: Held, start: Present | None, variable: str | None
) -> Point:
    """Minimise at one temperature and evaluate the state."""
    minimum = minimise(mixture, feed, held, start)
    g, h, cp = mixture.thermo.at(held.T)
    state = totals(minimum.n, mixture.is_gas, mixture.volume, g, h, held.T, minimum.p, held.V)
    slope = _slope(mixture, minimum, held, h, cp) if variable else None
    if slope is not None and variable == "S":
        slope /= held.T
    return Point(held.T, minimum.p, minimum.n, minimum.potentials, minimum.present, state, slope)


def _slope(mixture: Mixture, minimum: Minimum, held: Held, h: Array, cp: Array) -> float | None:
    """dH/dT at fixed p or dU/dT at fixed V, J/K, along the minimum."""
    dn = amounts_by_log_T(mixture, minimum, h, held.p is not None)
    if dn is None:
        return None
    slope = R * (float(minimum.n @ cp) + float(dn @ h))
    if held.p is None:
        slope -= R * float(minimum.n[mixture.is_gas].sum() + dn[mixture.is_gas].sum())
    return slope if slope > 0.0 and np.isfinite(slope) else None


def find_temperature(
    mixture: Mixture, feed: Feed, search: Search, start: Point | None = None
) -> Point:
    """The point that has the value searched.

    Raises
    ------
    OutOfReach
        The value lies beyond what the allowed temperatures reach.
    """
    low: Point | None = None
    high: Point | None = None
    T = start.T if start else min(max(_FIRST_T, search.T_low), search.T_high)
    present = start.present if start else None
    before_last = last = np.inf  # size of the two excesses before
    creeps = 0
    for _ in range(_MAX_EVALUATIONS):
        point = point_at(mixture, feed, search.held(T), present, search.variable)
        present = point.present
        excess = getattr(point.totals, search.variable) - search.value
        size = R * float(point.n.sum()) * (1.0 if search.variable == "S" else point.T)
        if abs(excess) <= _CLOSED * size:
            return point
        if excess < 0.0:
            low = point
            if T >= search.T_high:
                raise OutOfReach("above", T, getattr(point.totals, search.variable))
        else:
            high = point
            if T <= search.T_low:
                raise OutOfReach("below", T, getattr(point.totals, search.variable))
        step = -excess / point.slope if point.slope else (np.inf if excess < 0 else -np.inf)
        if abs(step) <= 2.0 * np.spacing(T) and abs(excess) <= 1e-11 * size:
            return point  # rounding decides
        if low is None or high is None:
            creeps = creeps + 1 if abs(excess) > 0.3 * last else 0
            step *= 4.0**creeps  # the slope leaves out what condensed phases add: get across
            limits = max(0.4 * T, search.T_low), min(2.5 * T, search.T_high)
            T = float(np.clip(T + step, *limits))
        else:
            if high.T - low.T <= 4.0 * np.spacing(high.T):
                return _split(search, low, high)
            proposal = T + step
            slow = abs(excess) > 0.5 * before_last
            if slow or not low.T < proposal < high.T:
                proposal = 0.5 * (low.T + high.T)
            T = float(proposal)
        before_last, last = last, abs(excess)
    assert low is not None
    assert high is not None
    return _split(search, low, high)


def _split(search: Search, low: Point, high: Point) -> Point:
    """The mixture of two minima at a transition that has the value searched."""
    bottom = getattr(low.totals, search.variable)
    top = getattr(high.totals, search.variable)
    share = (search.value - bottom) / (top - bottom)
    n = (1.0 - share) * low.n + share * high.n
    return Point(
        high.T, high.p, n, high.potentials, high.present, low.totals.blend(high.totals, share), None
    )
