"""The T and p at which real mixtures have the energy, entropy or volume held.

Many cases at once: Newton's method on ln T, on ln p, or on both, with the response of the
minima to them, from where the ideal mixtures end up. Where one unknown is sought its bracket
is kept. A case on a jump (a pure fluid that boils, a salt that decomposes) or lost by
Newton's method is sought alone in nested brackets (`alone`).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.batch import minimise_many
from solver.core.batch_temperature import find_temperatures
from solver.core.cases import Cases, Feed
from solver.core.minimise import Unsettled
from solver.core.mixture import R
from solver.core.searches import Searches
from solver.core.temperature import OutOfReach
from solver.core.totals import Totals
from solver.fixed import P_HIGHEST, P_LOWEST, T_HIGHEST, T_LOWEST, Pair
from solver.real.alone import Ends, Target, seek_alone
from solver.real.functions import Response, respond, state_functions
from solver.real.minimise import minimise_real
from solver.real.problem import RealCases, RealMixture
from solver.real.states import Minima

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

_MAX_STEPS = 30
_CLOSED = 2e-13
_ROUNDING = 2e-11
_STALE = 4  # steps that come no nearer, as on a jump
_T_STEP, _P_STEP = 0.4, 1.5  # largest change of ln T and ln p


@dataclass
class Found:
    """End points of many cases.

    Attributes
    ----------
    T, p : ndarray, shape (cases,)
    minima : Minima
        Amounts, potentials and tangent-plane distances there.
    totals : dict of str to ndarray
    why : dict of int to Exception
    """

    T: Array
    p: Array
    minima: Minima
    totals: dict[str, Array]
    why: dict[int, Exception]


def find_states(
    real: RealMixture, feed: Feed, pair: Pair, first: Array, second: Array, features: Array
) -> Found:
    """Settle all cases of one pair.

    Parameters
    ----------
    first, second : ndarray, shape (cases,)
        Values of the pair's variables, in the scale of the feed.
    features : ndarray, shape (cases, any)
    """
    target = Target(pair, first, second)
    T, p = _guess(real, feed, target, features)
    whole = RealCases(real, feed, T, p)
    out = Found(T, p, Minima.none_of(whole), {}, {})
    totals = {name: np.full(len(T), np.nan) for name in ("V", "H", "U", "S", "G")}
    out.totals = totals
    if pair.name == "T,p":
        minima = minimise_real(whole, features)
        _keep(out, np.arange(len(T)), minima, state_functions(whole, minima.fluids, minima.n))
        out.why.update(minima.why)
        return out
    T, p = T.copy(), p.copy()  # the search moves on from these
    left = _seek(real, feed, target, features, out)
    for i in left:
        one = feed.of(np.array([i]))
        try:
            ends = seek_alone(real, one, target.of(np.array([i])), float(T[i]), float(p[i]))
        except (OutOfReach, Unsettled) as error:
            out.why[int(i)] = error
            continue
        _put(out, int(i), ends)
    return out


def _guess(real: RealMixture, feed: Feed, target: Target, features: Array) -> tuple[Array, Array]:
    """T and p of the ideal mixtures, where they have any."""
    pair, count = target.pair, len(target.first)
    p = None if pair.holds_volume else target.second
    V = target.second if pair.holds_volume else None
    atoms = np.abs(feed.totals).sum(axis=1)
    if pair.searched is None:
        T = target.first.copy()
        if p is not None:
            return T, p.copy()
        ideal = minimise_many(Cases(real.mixture, feed, T, None, V), features)
        found, pressures = ideal.found, ideal.p
    else:
        search = Searches(pair.searched, target.first, p, V, T_LOWEST, T_HIGHEST)
        points = find_temperatures(real.mixture, feed, search, features)
        found, pressures = points.found, points.p
        T = np.where(found, points.T, 1000.0)
    if p is not None:
        return T, p.copy()
    assert V is not None
    thin = 0.5 * atoms * R * T / V
    pressures = np.where(found & (pressures > P_LOWEST) & (pressures < 1e9), pressures, thin)
    return T, np.clip(pressures, P_LOWEST, 1e9).reshape(count)


def _seek(real: RealMixture, feed: Feed, target: Target, features: Array, out: Found) -> Indices:
    """Newton's method on all cases; returns those that it does not end for."""
    pair, count = target.pair, len(target.first)
    move_T, move_p = pair.searched is not None, pair.holds_volume
    going = np.arange(count)
    lost: list[int] = []
    minima: Minima | None = None
    low, high = np.full(count, -np.inf), np.full(count, np.inf)  # of the one unknown
    best, stale = np.full(count, np.inf), np.zeros(count, dtype=np.intp)
    for _ in range(_MAX_STEPS):
        if not going.size:
            break
        cases = RealCases(real, feed.of(going), out.T[going], out.p[going])
        minima = minimise_real(cases, features[going], minima)
        state = state_functions(cases, minima.fluids, minima.n)
        wanted = target.of(going)
        F = wanted.excess(state, cases.T, minima.n)
        ended = minima.found & (np.abs(F).max(axis=1) <= _CLOSED)
        step, answer = np.zeros((len(going), 2)), None
        active = np.flatnonzero(minima.found & ~ended)
        answers: list[tuple[Indices, Response]] = []
        for number in np.unique(minima.of[active]):
            rows = active[minima.of[active] == number]
            chosen = minima.sets[number]
            slots = np.array(chosen.fluids, dtype=np.intp)
            part = cases.of(rows)
            answer = respond(part, chosen, minima.fluids[np.ix_(rows, slots)], minima.n[rows])
            answers.append((rows, answer))
            step[rows] = wanted.step(rows, state, part, answer, F[rows])
        step[:, 0] *= move_T
        step[:, 1] *= move_p
        size = np.abs(step).max(axis=1)
        # rounding decides: nothing nearer can be asked for
        ended |= minima.found & (size <= 1e-15) & (np.abs(F).max(axis=1) <= _ROUNDING)
        worst = np.abs(F).max(axis=1)
        nearer = worst < 0.5 * best[going]
        stale[going] = np.where(nearer, 0, stale[going] + 1)
        best[going] = np.where(nearer, worst, best[going])
        bad = ~minima.found | ~np.isfinite(size) | (stale[going] > _STALE)
        shrink = np.maximum(np.abs(step[:, 0]) / _T_STEP, np.abs(step[:, 1]) / _P_STEP)
        step /= np.maximum(shrink, 1.0)[:, None]
        if not (move_T and move_p):
            k = 0 if move_T else 1
            x = np.log(cases.T if move_T else cases.p)
            sign = F[:, 0] if move_T else -F[:, 0]
            low[going] = np.where(sign < 0.0, np.maximum(low[going], x), low[going])
            high[going] = np.where(sign > 0.0, np.minimum(high[going], x), high[going])
            new = x + step[:, k]
            astray = (new <= low[going]) | (new >= high[going])
            astray &= np.isfinite(low[going]) & np.isfinite(high[going])
            middle = 0.5 * (low[going] + high[going])
            step[:, k] = np.where(astray, middle - x, step[:, k])
        _keep(out, going, minima, state, ended)
        T = cases.T * np.exp(step[:, 0])
        p = cases.p * np.exp(step[:, 1])
        bad |= ~ended & ((T < T_LOWEST) | (T > T_HIGHEST) | (p < P_LOWEST) | (p > P_HIGHEST))
        bad &= ~ended
        lost += going[bad].tolist()
        onward = np.flatnonzero(~(ended | bad))
        _foresee(minima, answers, step)
        minima = minima.part(onward)
        going = going[onward]
        out.T[going], out.p[going] = T[onward], p[onward]
    return np.array(sorted([*lost, *going.tolist()]), dtype=np.intp)


def _foresee(minima: Minima, answers: list[tuple[Indices, Response]], step: Array) -> None:
    """Carry the unknowns on to the next T and p, to first order."""
    for rows, answer in answers:
        slots = np.array(minima.set_of(int(rows[0])).fluids, dtype=np.intp)
        for k in range(2):
            by = step[rows, k]
            minima.log_a[rows] += np.clip(answer.log_a[k] * by[:, None], -20.0, 20.0)
            nu = np.clip(answer.nu[k] * by[:, None], -2.0, 2.0)
            minima.nu[np.ix_(rows, slots)] += nu
            minima.theta[np.ix_(rows, slots)] += answer.theta[k] * by[:, None, None]


def _keep(
    out: Found, which: Indices, minima: Minima, state: Totals, rows: Flags | None = None
) -> None:
    """Take over cases that have ended."""
    some = np.flatnonzero(minima.found if rows is None else rows)
    if not some.size:
        return
    out.minima.take(which[some], minima.part(some))
    for name, values in out.totals.items():
        values[which[some]] = getattr(state, name)[some]


def _put(out: Found, i: int, ends: Ends) -> None:
    out.T[i], out.p[i] = ends.T, ends.p
    minima = out.minima
    minima.fluids[i], minima.n[i] = ends.fluids, ends.n
    minima.potentials[i], minima.distance[i] = ends.potentials, ends.distance
    minima.found[i] = True
    for name, values in out.totals.items():
        values[i] = float(getattr(ends.state, name)[0])
