"""Temperatures and balances of many cases in one Newton method, started from vertices.

At a few temperatures the best vertex of each case says what its energy is about; between them
lies the first temperature, and the nearest vertex is the first set of phases.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import component_amounts
from solver.core.batch import Minima, gather, judge, settle_one, to_vertices
from solver.core.cases import Cases, Feed
from solver.core.joint import solve_joint
from solver.core.mixture import Mixture, R
from solver.core.phaseset import solve_set
from solver.core.searches import Found, Searches
from solver.core.totals import totals

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ROUNDS, _RETRIES = 5, 2
_LADDER = (350.0, 700.0, 1200.0, 2000.0, 3300.0)  # K


def find_together(
    mixture: Mixture,
    feed: Feed,
    search: Searches,
    features: Array,
    going: Indices,
    out: Found,
) -> tuple[Indices, Array]:
    """Settle what this method can.

    Cases that are lost start again from the nearest ones that were found; what is lost again
    or ends on a transition is left.

    Returns
    -------
    tuple
        The cases left, and first temperatures of all cases asked.
    """
    from scipy.spatial import cKDTree  # slow to import

    everyone = np.arange(len(going))
    run = _Run(mixture, feed, search, going, np.full(len(going), _LADDER[0]))
    start = run.first_temperatures()
    if start is None:
        return going, np.full(len(going), 1000.0)
    first = run.T.copy()
    gather(run.cases_at(everyone, run.T), start, run.minima)
    run.rounds(start)
    atoms = np.abs(feed.totals[going]).sum(axis=1)
    for _ in range(_RETRIES):
        found, lost = np.flatnonzero(run.minima.found), np.flatnonzero(~run.minima.found)
        if not found.size or not lost.size:
            break
        near = found[cKDTree(features[going[found]]).query(features[going[lost]])[1]]
        run.T[lost], run.minima.of[lost] = run.T[near], run.minima.of[near]
        run.minima.log_a[lost] = run.minima.log_a[near]
        run.minima.nu[lost] = run.minima.nu[near] + np.log(atoms[lost] / atoms[near])
        run.rounds(lost)
    rows = np.flatnonzero(run.minima.found)
    if rows.size:
        _accept(mixture, search, run.cases_at(rows, run.T[rows]), run, going, rows, out)
    left = ~out.found[going]
    return going[left], first[left]


@dataclass
class _Run:
    """Cases whose temperature and balances are being solved together."""

    mixture: Mixture
    feed: Feed
    search: Searches
    going: Indices
    T: Array

    def __post_init__(self) -> None:
        self.minima = Minima.none_of(self.cases_at(np.arange(len(self.going)), self.T))

    def cases_at(self, which: Indices, T: Array) -> Cases:
        """Some of the cases at given temperatures."""
        return self.search.cases(self.mixture, self.feed, self.going[which], T)

    def rounds(self, pending: Indices) -> None:
        """Solve, judge the sets of phases, and solve those that change them again."""
        minima, search = self.minima, self.search
        for _ in range(_MAX_ROUNDS):
            if not pending.size:
                return
            closed: list[Indices] = []
            for number in np.unique(minima.of[pending]):
                active, members = minima.sets[number]
                rows = pending[minima.of[pending] == number]
                joint = solve_joint(
                    self.mixture,
                    self.feed.of(self.going[rows]),
                    search.of(self.going[rows]),
                    active,
                    self.mixture.basis(members),
                    self.T[rows],
                    minima.log_a[rows],
                    minima.nu[rows],
                )
                good = joint.closed & (joint.T > search.T_low) & (joint.T < search.T_high)
                closed.append(rows[good])
                self.T[rows[good]] = joint.T[good]
                minima.log_a[rows[good]] = joint.log_a[good]
                minima.nu[rows[good]] = joint.nu[good]
            pending = self._judged(np.concatenate(closed))

    def _judged(self, pending: Indices) -> Indices:
        """Accept the cases whose set is right; returns the others, with their next set."""
        minima = self.minima
        cases = self.cases_at(np.arange(len(self.going)), self.T)
        onward: list[Indices] = []
        for number in np.unique(minima.of[pending]):
            active, members = minima.sets[number]
            rows = pending[minima.of[pending] == number]
            start = minima.log_a[rows], minima.nu[rows]
            basis = self.mixture.basis(members)
            for part, solved in solve_set(cases, rows, active, basis, *start):
                onward += judge(cases, rows[part], active, solved, minima)
        return np.concatenate(onward) if onward else np.zeros(0, dtype=np.intp)

    def first_temperatures(self) -> Indices | None:
        """First temperatures and sets from the vertices at a ladder of temperatures.

        Returns the cases that have one; None where even the first case cannot be settled.
        """
        everyone = np.arange(len(self.going))
        minima, ladder = self.minima, np.array(_LADDER)
        values = np.full((len(ladder), len(everyone)), np.nan)
        kept: list[tuple[Indices, Array, Array]] = []
        near = np.zeros(len(everyone), dtype=np.intp)
        for step, T in enumerate(ladder):
            cases = self.cases_at(everyone, np.full(len(everyone), T))
            if step == 0:
                settle_one(cases, 0, minima)
                if not minima.found[0]:
                    return None
                minima.found[0] = False
            to_vertices(cases, everyone, minima, near)
            near = everyone
            values[step] = self._vertex_values(cases)
            kept.append((minima.of.copy(), minima.log_a.copy(), minima.nu.copy()))
        wanted = self.search.values[self.going]
        rising = np.maximum.accumulate(np.nan_to_num(values, nan=-np.inf), axis=0)
        upper = np.clip((rising < wanted).sum(axis=0), 1, len(ladder) - 1)
        low, high = values[upper - 1, everyone], values[upper, everyone]
        with np.errstate(all="ignore"):
            share = np.clip(np.nan_to_num((wanted - low) / (high - low), nan=0.5), -0.4, 1.6)
        T = ladder[upper - 1] + share * (ladder[upper] - ladder[upper - 1])
        self.T = np.clip(T, max(self.search.T_low, 200.0), self.search.T_high)
        nearest = np.abs(np.log(self.T / ladder[:, None])).argmin(axis=0)
        for step, (of, log_a, nu) in enumerate(kept):
            rows = nearest == step
            minima.of[rows], minima.log_a[rows], minima.nu[rows] = of[rows], log_a[rows], nu[rows]
        return np.flatnonzero(minima.of >= 0)

    def _vertex_values(self, cases: Cases) -> Array:
        """The variable searched, at the vertices (cases,)."""
        minima, mixture = self.minima, self.mixture
        n = np.zeros(cases.c.shape)
        for number in np.unique(minima.of[minima.of >= 0]):
            rows = np.flatnonzero(minima.of == number)
            basis = mixture.basis(minima.sets[number][1])
            b = component_amounts(cases.feed.amounts[rows], cases.feed.vectors, basis)
            n[np.ix_(rows, np.array(basis.members))] = np.maximum(b, 0.0)
        V = None if cases.V is None else cases.V
        p = cases.pressures(np.arange(len(cases)), n)
        p = np.where((p > 0.0) & np.isfinite(p), p, 1.0e5)
        state = totals(
            n, mixture.is_gas, mixture.volume, cases.g, cases.h, cases.T, p, V, mixture.twins
        )
        return np.asarray(getattr(state, self.search.variable))


def _accept(
    mixture: Mixture,
    search: Searches,
    cases: Cases,
    run: _Run,
    going: Indices,
    rows: Indices,
    out: Found,
) -> None:
    """Take the cases whose energy closes."""
    which, minima, T = going[rows], run.minima, cases.T
    V = None if search.V is None else search.V[which]
    n, p = minima.n[rows], minima.p[rows]
    state = totals(n, mixture.is_gas, mixture.volume, cases.g, cases.h, T, p, V, mixture.twins)
    excess = np.abs(getattr(state, search.variable) - search.values[which])
    size = R * n.sum(axis=1) * (1.0 if search.variable == "S" else T)
    good = excess <= 1e-11 * size
    target = which[good]
    out.T[target], out.p[target], out.n[target] = T[good], p[good], n[good]
    out.potentials[target], out.found[target] = minima.potentials[rows[good]], True
    for name, values in out.functions.items():
        values[target] = getattr(state, name)[good]
