"""The temperatures of many cases at once, at the energy or entropy that each holds."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.batch import Minima, minimise_many, spread
from solver.core.cases import Cases, Feed
from solver.core.minimise import NotHeld, Unsettled
from solver.core.mixture import Mixture, R
from solver.core.response import by_log_T
from solver.core.temperature import OutOfReach, Point, Search, find_temperature, heat_capacity
from solver.core.totals import totals
from solver.core.vessel import TooSmall

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_SEEDS = 6
_MAX_EVALUATIONS = 30
_CLOSED = 2e-13
_SETTLED_NEAR = 40  # cases up to this many are not worth a pass of their own


@dataclass(frozen=True)
class Searches:
    """What is searched in many cases: the variable, its values, and what is held beside.

    Attributes
    ----------
    variable : str
        "H", "U" or "S".
    values : ndarray, shape (cases,)
    p, V : ndarray, shape (cases,), or None
    T_low, T_high : float
    """

    variable: str
    values: Array
    p: Array | None
    V: Array | None
    T_low: float
    T_high: float

    def one(self, i: int) -> Search:
        """The search of one case."""
        return Search(
            self.variable,
            float(self.values[i]),
            None if self.p is None else float(self.p[i]),
            None if self.V is None else float(self.V[i]),
            self.T_low,
            self.T_high,
        )

    def cases(self, mixture: Mixture, feed: Feed, which: Indices, T: Array) -> Cases:
        """Some cases at given temperatures."""
        p = None if self.p is None else self.p[which]
        V = None if self.V is None else self.V[which]
        return Cases(mixture, feed.of(which), T, p, V)


@dataclass
class Found:
    """Points of many cases, filled in as they are found."""

    T: Array
    p: Array
    n: Array
    potentials: Array
    functions: dict[str, Array]
    """V, H, U, S and G, each (cases,)."""
    found: NDArray[np.bool_]
    why: dict[int, Exception]

    @classmethod
    def none_of(cls, mixture: Mixture, count: int) -> Found:
        """Nothing found yet."""
        return cls(
            T=np.full(count, np.nan),
            p=np.full(count, np.nan),
            n=np.full((count, len(mixture.species)), np.nan),
            potentials=np.full((count, mixture.A.shape[1]), np.nan),
            functions={name: np.full(count, np.nan) for name in ("V", "H", "U", "S", "G")},
            found=np.zeros(count, dtype=bool),
            why={},
        )

    def put(self, i: int, point: Point) -> None:
        """Take one case settled by itself."""
        self.T[i], self.p[i], self.n[i] = point.T, point.p, point.n
        self.potentials[i] = point.potentials
        for name, values in self.functions.items():
            values[i] = point.value(name)
        self.found[i] = True


def find_temperatures(mixture: Mixture, feed: Feed, search: Searches, features: Array) -> Found:
    """Settle all cases; the ones that end on a transition are settled one by one.

    Parameters
    ----------
    features : ndarray, shape (cases, any)
        Coordinates in which near cases have similar end states.
    """
    count = len(search.values)
    out = Found.none_of(mixture, count)
    T = _first_temperatures(mixture, feed, search, features, out)
    going = np.flatnonzero(~out.found)
    going = going[[int(i) not in out.why for i in going]]
    if going.size > _SETTLED_NEAR:
        going = _newton(mixture, feed, search, features, T, going, out)
    for i in going:
        _settle_one(mixture, feed, search, int(i), float(T[i]), out)
    return out


def _settle_one(
    mixture: Mixture, feed: Feed, search: Searches, i: int, T: float, out: Found
) -> float | None:
    """Settle one case by itself; returns its heat capacity where it is no transition."""
    try:
        point = find_temperature(mixture, feed.of(np.array([i])), search.one(i), T)
    except (NotHeld, OutOfReach, TooSmall, Unsettled, np.linalg.LinAlgError) as error:
        out.why[i] = error
        return None
    out.put(i, point)
    return point.slope


def _first_temperatures(
    mixture: Mixture, feed: Feed, search: Searches, features: Array, out: Found
) -> Array:
    """Settle a few spread cases; the others start from the nearest one's temperature."""
    count = len(search.values)
    T = np.full(count, 1000.0)
    slopes = np.full(count, np.nan)
    size = np.abs(feed.totals).sum(axis=1)
    for i in spread(features, min(_SEEDS, count)):
        slope = _settle_one(mixture, feed, search, int(i), float(T.mean()), out)
        if slope is not None:
            slopes[i] = slope / size[i]
    seeds = np.flatnonzero(out.found & np.isfinite(slopes))
    if not seeds.size:
        return T
    distance = ((features[:, None, :] - features[seeds]) ** 2).sum(axis=2)
    near = seeds[distance.argmin(axis=1)]
    step = (search.values / size - search.values[near] / size[near]) / slopes[near]
    T = np.clip(out.T[near] + step, 0.7 * out.T[near], 1.4 * out.T[near])
    return np.asarray(np.clip(T, search.T_low, search.T_high))


def _newton(
    mixture: Mixture,
    feed: Feed,
    search: Searches,
    features: Array,
    T: Array,
    going: Indices,
    out: Found,
) -> Indices:
    """Bracketed Newton steps on all cases at once; returns those it does not finish."""
    low = np.full(len(T), -np.inf)
    high = np.full(len(T), np.inf)
    before = np.full(len(T), np.inf)
    minima: Minima | None = None
    left_over: list[Indices] = []
    at_p = search.p is not None
    for _ in range(_MAX_EVALUATIONS):
        if not going.size:
            break
        now = T[going]
        cases = search.cases(mixture, feed, going, now)
        minima = minimise_many(cases, features[going], minima)
        lost = ~minima.found
        V = None if search.V is None else search.V[going]
        state = totals(minima.n, mixture.is_gas, mixture.volume, cases.g, cases.h, now, minima.p, V)
        excess = getattr(state, search.variable) - search.values[going]
        size = R * minima.n.sum(axis=1) * (1.0 if search.variable == "S" else now)
        slope, dlog_a, dnu = _slopes(mixture, cases, minima, at_p)
        if search.variable == "S":
            slope = slope / now
        with np.errstate(divide="ignore", invalid="ignore"):
            step = -excess / slope
        rounding = (np.abs(step) <= 2.0 * np.spacing(now)) & (np.abs(excess) <= 1e-11 * size)
        done = ~lost & ((np.abs(excess) <= _CLOSED * size) | rounding)
        for name, values in out.functions.items():
            values[going[done]] = getattr(state, name)[done]
        rows = going[done]
        out.T[rows], out.p[rows], out.n[rows] = now[done], minima.p[done], minima.n[done]
        out.potentials[rows], out.found[rows] = minima.potentials[done], True
        below = excess < 0.0
        low[going[below]] = np.maximum(low[going[below]], now[below])
        high[going[~below]] = np.minimum(high[going[~below]], now[~below])
        proposal = np.clip(now + step, 0.4 * now, 2.5 * now)
        inside = (proposal > low[going]) & (proposal < high[going])
        creeping = np.abs(excess) > 0.7 * before[going]
        bracketed = np.isfinite(low[going]) & np.isfinite(high[going])
        with np.errstate(invalid="ignore"):
            middle = 0.5 * (low[going] + high[going])
        proposal = np.where((~inside | creeping) & bracketed, middle, proposal)
        before[going] = np.abs(excess)
        beyond = (proposal < search.T_low) | (proposal > search.T_high)
        stuck = bracketed & (high[going] - low[going] <= 1e-9 * now)
        aside = ~done & (lost | beyond | stuck | ~np.isfinite(proposal))
        left_over.append(going[aside])
        keep = ~done & ~aside
        shift = np.log(proposal[keep] / now[keep])
        minima = minima.part(keep)
        minima.log_a += dlog_a[keep] * shift[:, None]
        minima.nu += dnu[keep] * shift
        T[going[keep]] = proposal[keep]
        going = going[keep]
    return np.concatenate([going, *left_over])


def _slopes(
    mixture: Mixture, cases: Cases, minima: Minima, at_p: bool
) -> tuple[Array, Array, Array]:
    """Heat capacities (cases,) and d(log_a)/d(ln T), d(nu)/d(ln T) of all cases."""
    slope = np.full(len(cases), np.nan)
    dlog_a, dnu = np.zeros(minima.log_a.shape), np.zeros(len(cases))
    for number in np.unique(minima.of[minima.found]):
        rows = np.flatnonzero((minima.of == number) & minima.found)
        active, members = minima.sets[number]
        n, h = minima.n[rows], cases.h[rows]
        dn, dlog_a[rows], dnu[rows] = by_log_T(mixture, mixture.basis(members), active, n, h, at_p)
        slope[rows] = heat_capacity(mixture, n, dn, h, cases.cp[rows], at_p)
    slope[~(slope > 0.0)] = np.nan
    return slope, dlog_a, dnu
