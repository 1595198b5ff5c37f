"""Temperatures and balances of many cases in one Newton method.

A few cases, the pilots, go first. At a few temperatures the best vertex of each says what its
energy is about; between them lies the first temperature, and the nearest vertex is the first
set of phases. A polynomial through the temperatures that the pilots reach then gives those of
all others to a few percent, so that these need no more than one vertex each.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import component_amounts
from solver.core.batch import Minima, gather, judge, settle_one, to_vertices
from solver.core.cases import Cases, Feed
from solver.core.joint import solve_joint
from solver.core.mixture import Mixture, R
from solver.core.phaseset import solve_set
from solver.core.searches import Found, Searches
from solver.core.surmise import surmise
from solver.core.totals import totals

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ROUNDS, _RETRIES = 5, 2
_LADDER = (500.0, 1100.0, 2400.0)  # K
_PILOTS = 32
_WORTH = 3  # times as many cases as pilots are worth the detour
_BEYOND = 0.15  # of ln T, how far a surmise may go beyond what the pilots reach


def find_together(
    mixture: Mixture,
    feed: Feed,
    search: Searches,
    features: Array,
    out: Found,
) -> tuple[Indices, Array]:
    """Settle what this method can.

    Cases that are lost start again from the nearest ones that were found; what is lost again
    or ends on a transition is left.

    Returns
    -------
    tuple
        The cases left, and first temperatures of all cases.
    """
    count = len(search.values)
    everyone = np.arange(count)
    run = _Run(mixture, feed, search, out, everyone, np.full(count, 1000.0))
    pilots = everyone
    if count >= _WORTH * _PILOTS:
        ordered = np.argsort(features[:, 0], kind="stable")
        pilots = np.sort(ordered[np.linspace(0, count - 1, _PILOTS).round().astype(int)])
    first = run.part(pilots)
    if not first.climb():
        return everyone, run.T
    first.settle()
    run.take(pilots, first)
    if len(pilots) < count and out.found.any():
        rest = np.setdiff1d(everyone, pilots)
        known = pilots[out.found[pilots]]
        log_T = np.log(out.T[known])
        T = np.exp(
            np.clip(
                surmise(features[known], log_T, features[rest]),
                log_T.min() - _BEYOND,
                log_T.max() + _BEYOND,
            )
        )
        run.T[rest] = np.clip(T, search.T_low, search.T_high)
        others = run.part(rest)
        others.begin(run, known, features)
        others.settle()
        run.take(rest, others)
    first_T = run.T.copy()
    for _ in range(_RETRIES):
        found, lost = np.flatnonzero(out.found), np.flatnonzero(~out.found)
        if not found.size or not lost.size:
            break
        again = run.part(lost)
        again.begin_near(run, found, features)
        again.settle()
        run.take(lost, again)
    return np.flatnonzero(~out.found), first_T


@dataclass
class _Run:
    """Cases whose temperature and balances are being solved together.

    Attributes
    ----------
    out : Found
        What is found, of all cases of the batch.
    which : ndarray of int
        The numbers in the batch of the cases of this run.
    T : ndarray
        Temperatures of the cases of this run.
    """

    mixture: Mixture
    feed: Feed
    search: Searches
    out: Found
    which: Indices
    T: Array
    minima: Minima = field(init=False)

    def __post_init__(self) -> None:
        self.minima = Minima.of_size(self.mixture, len(self.which))

    def part(self, rows: Indices) -> _Run:
        """Some of the cases, with what is known of them."""
        run = _Run(self.mixture, self.feed, self.search, self.out, self.which[rows], self.T[rows])
        run.minima = self.minima.part(rows)
        return run

    def take(self, rows: Indices, part: _Run) -> None:
        """What has become of some of the cases."""
        self.T[rows] = part.T
        self.minima.take(rows, part.minima)

    def cases(self) -> Cases:
        """The cases at their present temperatures."""
        return self.search.cases(self.mixture, self.feed, self.which, self.T)

    def settle(self, rounds: int = _MAX_ROUNDS) -> None:
        """Solve, judge the sets of phases, and solve those that change them again."""
        minima, closed = self.minima, np.zeros(len(self.which), dtype=bool)
        for number in np.unique(minima.of[minima.of >= 0]):
            active, members = minima.sets[number]
            rows = np.flatnonzero(minima.of == number)
            which = self.which[rows]
            joint = solve_joint(
                self.mixture,
                self.feed.of(which),
                self.search.of(which),
                active,
                self.mixture.basis(members),
                self.T[rows],
                minima.log_a[rows],
                minima.nu[rows],
            )
            good = joint.closed & (joint.T > self.search.T_low) & (joint.T < self.search.T_high)
            rows = rows[good]
            closed[rows] = True
            self.T[rows] = joint.T[good]
            minima.log_a[rows], minima.nu[rows] = joint.log_a[good], joint.nu[good]
        rows = np.flatnonzero(closed)
        if not rows.size:
            return
        part = self.part(rows)
        onward = part.judge()
        if onward.size and rounds > 1:
            again = part.part(onward)
            again.settle(rounds - 1)
            part.take(onward, again)
        self.take(rows, part)

    def judge(self) -> Indices:
        """Accept the cases whose set is right; returns the others, with their next set."""
        minima, cases = self.minima, self.cases()
        onward: list[Indices] = []
        for number in np.unique(minima.of):
            active, members = minima.sets[number]
            rows = np.flatnonzero(minima.of == number)
            start = minima.log_a[rows], minima.nu[rows]
            basis = self.mixture.basis(members)
            for part, solved in solve_set(cases, rows, active, basis, *start):
                onward += judge(cases, rows[part], active, solved, minima)
        self._accept(cases)
        return np.concatenate(onward) if onward else np.zeros(0, dtype=np.intp)

    def _accept(self, cases: Cases) -> None:
        """Take the cases whose energy closes."""
        mixture, out, variable = self.mixture, self.out, self.search.variable
        n, T = self.minima.n, self.T
        state = totals(
            n, mixture.is_gas, mixture.volume, cases.g, cases.h, T, self.minima.p, cases.V,
            mixture.twins,
        )  # fmt: skip
        excess = np.abs(getattr(state, variable) - self.search.values[self.which])
        size = R * n.sum(axis=1) * (1.0 if variable == "S" else T)
        good = self.minima.found & (excess <= 1e-11 * size)
        target = self.which[good]
        out.T[target], out.p[target], out.n[target] = T[good], self.minima.p[good], n[good]
        out.potentials[target], out.found[target] = self.minima.potentials[good], True
        for name, values in out.functions.items():
            values[target] = getattr(state, name)[good]

    def begin(self, run: _Run, known: Indices, features: Array) -> None:
        """Sets and activities at the present temperatures from vertices."""
        near = _nearest(features, known, self.which)
        minima, cases = self.minima, self.cases()
        minima.of[:] = run.minima.of[near]
        rows = to_vertices(cases, np.arange(len(cases)), minima, np.arange(len(cases)))
        lost = np.ones(len(cases), dtype=bool)
        lost[rows] = False
        minima.of[lost] = -1
        gather(cases, rows, minima)

    def begin_near(self, run: _Run, known: Indices, features: Array) -> None:
        """Sets, activities and temperatures of the nearest cases that are known."""
        near = _nearest(features, known, self.which)
        atoms = np.abs(self.feed.totals).sum(axis=1)
        self.T, self.minima.of = run.T[near], run.minima.of[near]
        self.minima.log_a = run.minima.log_a[near]
        self.minima.nu = run.minima.nu[near] + np.log(atoms[self.which] / atoms[near])

    def climb(self) -> bool:
        """First temperatures and sets from the vertices at a ladder of temperatures.

        False where even the first case cannot be settled.
        """
        count, steps = len(self.which), len(_LADDER)
        everyone, ladder = np.arange(count), np.array(_LADDER)
        rungs = _Run(
            self.mixture, self.feed, self.search, self.out,
            np.tile(self.which, steps), np.repeat(ladder, count),
        )  # fmt: skip
        cases, minima = rungs.cases(), rungs.minima
        minima.sets = self.minima.sets
        settle_one(cases, 0, minima)
        if not minima.found[0]:
            return False
        to_vertices(cases, np.arange(len(cases)), minima, np.zeros(len(cases), dtype=np.intp))
        values = rungs.vertex_values(cases).reshape(steps, count)
        wanted = self.search.values[self.which]
        rising = np.maximum.accumulate(np.nan_to_num(values, nan=-np.inf), axis=0)
        upper = np.clip((rising < wanted).sum(axis=0), 1, steps - 1)
        low, high = values[upper - 1, everyone], values[upper, everyone]
        with np.errstate(all="ignore"):
            share = np.clip(np.nan_to_num((wanted - low) / (high - low), nan=0.5), -0.4, 1.6)
        first = ladder[upper - 1] + share * (ladder[upper] - ladder[upper - 1])
        self.T = np.clip(first, max(self.search.T_low, 200.0), self.search.T_high)
        nearest = np.abs(np.log(self.T / ladder[:, None])).argmin(axis=0)
        self.minima = minima.part(nearest * count + everyone)
        self.minima.found[:] = False
        gather(self.cases(), np.flatnonzero(self.minima.of >= 0), self.minima)
        return True

    def vertex_values(self, cases: Cases) -> Array:
        """The variable searched, at the vertices (cases,)."""
        minima, mixture = self.minima, self.mixture
        n = np.zeros(cases.c.shape)
        for number in np.unique(minima.of[minima.of >= 0]):
            rows = np.flatnonzero(minima.of == number)
            basis = mixture.basis(minima.sets[number][1])
            b = component_amounts(cases.feed.amounts[rows], cases.feed.vectors, basis)
            n[np.ix_(rows, np.array(basis.members))] = np.maximum(b, 0.0)
        p = cases.pressures(np.arange(len(cases)), n)
        p = np.where((p > 0.0) & np.isfinite(p), p, 1.0e5)
        state = totals(
            n, mixture.is_gas, mixture.volume, cases.g, cases.h, cases.T, p, cases.V, mixture.twins
        )
        return np.asarray(getattr(state, self.search.variable))


def _nearest(features: Array, known: Indices, which: Indices) -> Indices:
    """For each case of `which` the nearest of the known ones."""
    from scipy.spatial import cKDTree  # slow to import

    return known[np.asarray(cKDTree(features[known]).query(features[which])[1], dtype=np.intp)]
