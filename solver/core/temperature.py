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
from solver.core.coexistence import Sealed, coexist
from solver.core.minimise import Minimum, Present, minimise
from solver.core.mixture import Held, Mixture, R
from solver.core.response import by_log_T
from solver.core.totals import Totals, totals

Array = NDArray[np.float64]

_MAX_EVALUATIONS = 200
_CLOSED = 2e-13
_FIRST_T = 1000.0
_AT_END = 5e-11
_SLIVER = 1e-11
_FILLED = 1e-12


class OutOfReach(ArithmeticError):
    """No temperature in the allowed range has this energy; `side` is 'below' or 'above'."""

    def __init__(self, side: str, T: float, value: float) -> None:
        super().__init__(f"{side} what is reached at {T} K")
        self.side, self.T, self.value = side, T, value


@dataclass(frozen=True)
class Point:
    """A minimum at one temperature with its state functions (each of shape (1,))."""

    T: float
    p: float
    n: Array
    potentials: Array
    present: Present
    totals: Totals
    slope: float | None
    """d(value searched)/dT at the set of phases kept."""

    def value(self, variable: str) -> float:
        """One state function."""
        return float(getattr(self.totals, variable)[0])


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
    T = np.array([held.T])
    g, h, cp = mixture.thermo.over(T)
    V = None if held.V is None else np.array([held.V])
    n = minimum.n[None, :]
    state = totals(
        n, mixture.is_gas, mixture.volume, g, h, T, np.array([minimum.p]), V, mixture.twins
    )
    slope = _slope(mixture, minimum, held, h, cp) if variable else None
    if slope is not None and variable == "S":
        slope /= held.T
    return Point(held.T, minimum.p, minimum.n, minimum.potentials, minimum.present, state, slope)


def _slope(mixture: Mixture, minimum: Minimum, held: Held, h: Array, cp: Array) -> float | None:
    """dH/dT at fixed p or dU/dT at fixed V, J/K, along the minimum."""
    n = minimum.n[None, :]
    at_p = held.p is not None
    dn, _, _ = by_log_T(mixture, minimum.basis, minimum.present.active, n, h, at_p)
    slope = float(heat_capacity(mixture, n, dn, h, cp, at_p)[0])
    return slope if slope > 0.0 and np.isfinite(slope) else None


def heat_capacity(
    mixture: Mixture, n: Array, dn: Array, h: Array, cp: Array, holds_pressure: bool
) -> Array:
    """dH/dT at fixed p or dU/dT at fixed V, J/K (cases,), from dn/d(ln T)."""
    slope = R * ((n * cp).sum(axis=1) + (dn * h).sum(axis=1))
    if not holds_pressure:
        slope -= R * (n[:, mixture.is_gas] + dn[:, mixture.is_gas]).sum(axis=1)
    return np.asarray(slope)


def find_temperature(
    mixture: Mixture,
    feed: Feed,
    search: Search,
    T: float = _FIRST_T,
    present: Present | None = None,
) -> Point:
    """The point that has the value searched, sought from T.

    Raises
    ------
    OutOfReach
        The value lies beyond what the allowed temperatures reach.
    """
    low: Point | None = None
    high: Point | None = None
    T = min(max(T, search.T_low), search.T_high)
    before_last = last = np.inf  # size of the two excesses before
    creeps = crossings = 0
    tried = _Tried()
    for _ in range(_MAX_EVALUATIONS):
        point = point_at(mixture, feed, search.held(T), present, search.variable)
        present = point.present
        value = point.value(search.variable)
        excess = value - search.value
        size = R * float(point.n.sum()) * (1.0 if search.variable == "S" else point.T)
        if abs(excess) <= _CLOSED * size:
            return point
        at_end = T >= search.T_high or T <= search.T_low
        if at_end and abs(excess) <= _AT_END * size:
            return point  # the energy of the very end of the range, to rounding
        if excess < 0.0:
            low = point
            if T >= search.T_high:
                raise OutOfReach("above", T, value)
        else:
            high = point
            if T <= search.T_low:
                raise OutOfReach("below", T, value)
        step = -excess / point.slope if point.slope else (np.inf if excess < 0 else -np.inf)
        if abs(step) <= 2.0 * np.spacing(T) and abs(excess) <= 1e-11 * size:
            return point  # rounding decides
        if low is None or high is None:
            creeps = creeps + 1 if abs(excess) > 0.3 * last else 0
            step *= 4.0**creeps  # the slope leaves out what condensed phases add: get across
            limits = max(0.4 * T, search.T_low), min(2.5 * T, search.T_high)
            T = float(np.clip(T + step, *limits))
        else:
            shared = tried.coexisting(mixture, feed, search, low, high)
            if shared is not None:
                return shared
            if high.T - low.T <= _narrow(mixture, search, low, high):
                return _split(mixture, search, low, high)
            proposal = T + step
            slow = abs(excess) > 0.5 * before_last
            if slow or not low.T < proposal < high.T:
                join = _join(mixture, low, high)
                proposal = _crossing(low, high, crossings) if join is None else join
                crossings += join is None
            T = float(proposal)
        before_last, last = last, abs(excess)
    assert low is not None
    assert high is not None
    return _split(mixture, search, low, high)


def _join(mixture: Mixture, low: Point, high: Point) -> float | None:
    """A temperature between the ends, or just below the upper, at which a record changes form.

    The segments of a record meet there; the upper one holds at the join itself.
    """
    for i in sorted({*_condensed(mixture, low)} & {*_condensed(mixture, high)}):
        for segment in mixture.species[i].segments[1:]:
            join = float(segment.T_low)
            if low.T < join < high.T:
                return join
            if join == high.T and low.T < (below := float(np.nextafter(join, 0.0))):
                return below
    return None


def _crossing(low: Point, high: Point, tries: int) -> float:
    """Where the free energies of the two ends, carried on with their entropies, are equal.

    That is the temperature of a transition, found quadratically. Every third try halves the
    bracket instead, and near an end the other side of it is taken, so that the bracket closes.
    """
    middle = 0.5 * (low.T + high.T)
    if tries % 3 == 2:
        return middle
    S_low, S_high = low.value("S"), high.value("S")
    free = "A" if low.p != high.p else "G"
    F_low, F_high = (
        end.value("G") if free == "G" else end.value("U") - end.T * end.value("S")
        for end in (low, high)
    )
    if S_high <= S_low:
        return middle
    # measured from the middle, so that little is lost to rounding
    T = middle + ((F_high + S_high * (high.T - middle)) - (F_low + S_low * (low.T - middle))) / (
        S_high - S_low
    )
    reach = 2.0 ** (tries % 8) * np.spacing(middle)
    if T <= low.T + reach:
        T = low.T + reach
    elif T >= high.T - reach:
        T = high.T - reach
    return float(T) if low.T < T < high.T else middle


def _condensed(mixture: Mixture, point: Point) -> tuple[int, ...]:
    """Condensed species present: all in a split too, which keeps the set of one of its ends."""
    return tuple(mixture.condensed[point.n[mixture.condensed] > 0.0].tolist())


def _narrow(mixture: Mixture, search: Search, low: Point, high: Point) -> float:
    """Width of a bracket, K, that is a transition."""
    if _shares_vessel(mixture, search, low, high):
        return _SLIVER * high.T  # along the sliver the pressure changes: its width is of no account
    return float(4.0 * np.spacing(high.T))


def _shares_vessel(mixture: Mixture, search: Search, low: Point, high: Point) -> bool:
    """Whether unlike phases at the two ends bring about unlike pressures."""
    if search.V is None or low.p == high.p:
        return False
    return _condensed(mixture, low) != _condensed(mixture, high)


@dataclass
class _Tried:
    """The pairs of phase sets and the widths at which a shared vessel was sought."""

    sets: tuple[tuple[int, ...], tuple[int, ...]] | None = None
    width: float = np.inf

    def coexisting(
        self, mixture: Mixture, feed: Feed, search: Search, low: Point, high: Point
    ) -> Point | None:
        """The state in which the phases of both ends share the vessel, if there is one."""
        if not _shares_vessel(mixture, search, low, high):
            return None
        sets = _condensed(mixture, low), _condensed(mixture, high)
        width = high.T - low.T
        if sets == self.sets and width > 0.05 * self.width:
            return None
        self.sets, self.width = sets, width
        bottom, top = low.value(search.variable), high.value(search.variable)
        n = _blend(search.value - bottom, top - search.value, high.n, low.n)
        potentials = 0.5 * (low.potentials + high.potentials)
        start = Sealed(0.5 * (low.T + high.T), high.p, n, potentials)
        phases = tuple(sorted({*sets[0], *sets[1]}))
        assert search.V is not None
        found = coexist(mixture, feed, phases, search.variable, search.value, search.V, start)
        if found is None or not low.T <= found.T <= high.T:
            return None
        state = _state(mixture, found.n, found.T, found.p, search.V)
        return Point(found.T, found.p, found.n, found.potentials, high.present, state, None)


def _blend(share: float, other: float, one: Array, two: Array) -> Array:
    """Two arrays in the proportion of the shares; each by itself, as one may be tiny."""
    return (share * one + other * two) / (share + other)


def _state(mixture: Mixture, n: Array, T: float, p: float, V: float) -> Totals:
    at = np.array([T])
    g, h, _ = mixture.thermo.over(at)
    return totals(
        n[None, :], mixture.is_gas, mixture.volume, g, h, at, np.array([p]), np.array([V]),
        mixture.twins,
    )  # fmt: skip


def _split(mixture: Mixture, search: Search, low: Point, high: Point) -> Point:
    """The mixture of two minima at a transition that has the value searched."""
    bottom, top = low.value(search.variable), high.value(search.variable)
    over, under = search.value - bottom, top - search.value
    n = _blend(over, under, high.n, low.n)
    state, p = low.totals.blend(high.totals, over / (over + under)), high.p
    if search.V is not None and low.p != high.p:
        # the two ends have the volume held, each at its own pressure: so has the split at its own
        p = _pressure(mixture, n, high, search.V)
        if _shares_vessel(mixture, search, low, high):
            # over the width of a sliver the energy changes by more than rounding
            off = search.value - float(
                getattr(_state(mixture, n, high.T, p, search.V), search.variable)[0]
            )
            n = _blend(over + off, under - off, high.n, low.n)
            p = _pressure(mixture, n, high, search.V)
            state = _state(mixture, n, high.T, p, search.V)
        else:
            H = state.U + p * state.V
            state = Totals(V=state.V, H=H, U=state.U, S=state.S, G=H - high.T * state.S)
    return Point(high.T, p, n, high.potentials, high.present, state, None)


def _pressure(mixture: Mixture, n: Array, near: Point, V: float) -> float:
    """Pressure of the gas in what is left to it, Pa; without gas that which fills the vessel."""
    gas, left = float(n[mixture.gas].sum()), V - float(n @ mixture.volume)
    if gas:
        return gas * R * near.T / left
    return near.p if left <= _FILLED * V else 0.0
