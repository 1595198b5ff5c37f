"""The temperatures of many cases at once, at the energy or entropy that each holds."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.batch import Minima, minimise_many
from solver.core.cases import Cases, Feed
from solver.core.minimise import NotHeld, Unsettled
from solver.core.mixture import Mixture, R
from solver.core.response import by_log_T
from solver.core.searches import Found, Searches
from solver.core.temperature import OutOfReach, find_temperature, heat_capacity
from solver.core.together import find_together
from solver.core.totals import totals
from solver.core.vessel import TooSmall

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_EVALUATIONS = 30
_CLOSED = 2e-13
_SETTLED_NEAR = 40  # cases up to this many are not worth a pass of their own


def find_temperatures(mixture: Mixture, feed: Feed, search: Searches, features: Array) -> Found:
    """Settle all cases; the ones that end on a transition are settled one by one.

    Parameters
    ----------
    features : ndarray, shape (cases, any)
        Coordinates in which near cases have similar end states.
    """
    count = len(search.values)
    out = Found.none_of(mixture, count)
    T = np.full(count, 1000.0)
    going = np.arange(count)
    if count > _SETTLED_NEAR:
        going, T = find_together(mixture, feed, search, features, out)
    if going.size > _SETTLED_NEAR:
        going = _newton(mixture, feed, search, features, T, going, out)
    for i in going:
        _settle_one(mixture, feed, search, int(i), float(T[i]), out)
    return out


def _settle_one(
    mixture: Mixture, feed: Feed, search: Searches, i: int, T: float, out: Found
) -> None:
    """Settle one case by itself."""
    try:
        out.put(i, find_temperature(mixture, feed.of(np.array([i])), search.one(i), T))
    except (NotHeld, OutOfReach, TooSmall, Unsettled, np.linalg.LinAlgError) as error:
        out.why[i] = error


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
