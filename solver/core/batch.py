"""The minimum of many cases at fixed T and p or V, in few passes over arrays.

A few well-spread cases are settled one by one. Every other case starts from the potentials
of the nearest settled one, and all cases that share a set of phases and components are
solved in one pass. A case whose set turns out wrong takes a phase in or lets one go and
joins the cases of its new set. What a start from a neighbour cannot reach becomes one of the
spread cases of the next pass, so that every case is settled with the same means and held to
the same proof as a single one.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Cases
from solver.core.columns import rows_of
from solver.core.lines import coarseness, weights_between
from solver.core.minimise import Minimum, NotHeld, Unsettled, minimise
from solver.core.mixture import Held, Mixture
from solver.core.phaseset import Solved, solve_set
from solver.core.vertices import walk
from solver.core.vessel import TooSmall

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ROUNDS = 12
_SEEDS = 1
_AT_ONCE = 3
_LARGE, _SCARCE = 20, -14.0  # cases of a group; ln activity of a component
_NEAR = 0.3  # distance up to which a neighbour's activities are the better start
_MAX_PASSES = 400

_Set = tuple[tuple[int, ...], tuple[int, ...]]  # condensed phases, components


@dataclass
class Minima:
    """Minima of many cases, filled in as they are found.

    Attributes
    ----------
    n : ndarray, shape (cases, species)
    potentials : ndarray, shape (cases, rows)
    p : ndarray, shape (cases,)
    found : ndarray of bool, shape (cases,)
    why : dict of int to Exception
        What stood in the way of a case that was not found.
    sets, of : list and ndarray (cases,)
        The sets of phases and components, and which of them each case has.
    log_a : ndarray, shape (cases, components)
    nu : ndarray, shape (cases,)
    """

    n: Array
    potentials: Array
    p: Array
    found: NDArray[np.bool_]
    why: dict[int, Exception]
    sets: list[_Set]
    of: Indices
    log_a: Array
    nu: Array

    @classmethod
    def of_size(cls, mixture: Mixture, count: int) -> Minima:
        """Nothing found yet, for a number of cases."""
        return cls(
            n=np.full((count, len(mixture.species)), np.nan),
            potentials=np.full((count, mixture.A.shape[1]), np.nan),
            p=np.full(count, np.nan),
            found=np.zeros(count, dtype=bool),
            why={},
            sets=[],
            of=np.full(count, -1),
            log_a=np.zeros((count, mixture.rank)),
            nu=np.zeros(count),
        )

    def number(self, chosen: _Set) -> int:
        """Index of a set of phases and components."""
        if chosen not in self.sets:
            self.sets.append(chosen)
        return self.sets.index(chosen)

    def accept(self, which: Indices, solved: Solved, rows: Indices) -> None:
        """Take the solution of some rows of a group as found."""
        self.n[rows_of(which, len(self.n))] = solved.n[rows_of(rows, len(solved.n))]
        self.potentials[which] = solved.basis.potentials(solved.mu[rows])
        self.p[which] = solved.p[rows]
        self.log_a[which] = solved.log_a[rows]
        self.nu[which] = solved.nu[rows]
        self.found[which] = True

    def put(self, i: int, minimum: Minimum) -> None:
        """Take one case settled by itself."""
        present = minimum.present
        self.n[i], self.potentials[i], self.p[i] = minimum.n, minimum.potentials, minimum.p
        self.log_a[i], self.nu[i] = present.log_a, present.nu
        self.of[i] = self.number((present.active, present.members))
        self.found[i] = True

    def part(self, keep: NDArray[np.bool_] | Indices) -> Minima:
        """The minima of some of the cases; the sets are shared."""
        return Minima(
            n=self.n[keep],
            potentials=self.potentials[keep],
            p=self.p[keep],
            found=self.found[keep],
            why={},
            sets=self.sets,
            of=self.of[keep],
            log_a=self.log_a[keep],
            nu=self.nu[keep],
        )

    def take(self, rows: Indices, part: Minima) -> None:
        """What has become of some of the cases, as `part` gave them out."""
        for name in ("n", "potentials", "p", "found", "of", "log_a", "nu"):
            getattr(self, name)[rows] = getattr(part, name)


def minimise_many(cases: Cases, features: Array, start: Minima | None = None) -> Minima:
    """Settle all cases.

    Parameters
    ----------
    cases : Cases
    features : ndarray, shape (cases, any)
        Coordinates in which near cases have similar minima.
    start : Minima, optional
        Minima of the same cases at a slightly other temperature.
    """
    out = Minima.of_size(cases.mixture, len(cases))
    if start is not None:
        out.sets = list(start.sets)
        known = np.flatnonzero(start.found)
        out.of[known], out.log_a[known], out.nu[known] = (
            start.of[known],
            start.log_a[known],
            start.nu[known],
        )
        _exchange_all(cases, known, out)
    else:
        for i in spread(features, _SEEDS):
            settle_one(cases, int(i), out)
        step = coarseness(features)
        if step:  # a coarse pass gives the rest near neighbours
            coarse = np.arange(0, len(cases), step)
            _settle_together(cases, coarse, features, out)
            between = interpolate(cases, coarse, features, out)
            _exchange_all(cases, between, out)
    # what a neighbour's start does not reach may be reached from a nearer neighbour
    for _ in range(_MAX_PASSES):
        left = _waiting(out)
        if not left.size:
            break
        _settle_together(cases, left, features, out)
        still = _waiting(out)
        if still.size and (still.size > 0.5 * left.size or still.size < 4):
            for i in still[spread(features[still], _AT_ONCE)]:
                settle_one(cases, int(i), out)
    return out


def _waiting(out: Minima) -> Indices:
    """Cases neither found nor given up."""
    waiting = ~out.found
    waiting[list(out.why)] = False
    return np.flatnonzero(waiting)


def _settle_together(cases: Cases, which: Indices, features: Array, out: Minima) -> None:
    """Settle cases in passes, from a settled neighbour if one is near, else from a vertex."""
    settled = np.flatnonzero(out.found)
    if not settled.size or not which.size:
        return
    from scipy.spatial import cKDTree  # slow to import

    distance, nearest = cKDTree(features[settled]).query(features[which])
    near = np.asarray(nearest, dtype=np.intp)
    close = np.asarray(distance) < _NEAR
    source = settled[near[close]]
    target = which[close]
    out.of[target] = out.of[source]
    out.log_a[target] = out.log_a[source]
    out.nu[target] = out.nu[source] + np.log(cases.atoms[target] / cases.atoms[source])
    far = which[~close]
    if far.size:
        far = to_vertices(cases, far, out, settled[near[~close]])
        gather(cases, far, out)
    _exchange_all(cases, np.concatenate([target, far]), out)


def interpolate(cases: Cases, coarse: Indices, features: Array, out: Minima) -> Indices:
    """Give the cases between settled ones of one set the activities that lie between theirs.

    Returns the cases that have some.
    """
    which, nodes, weights = weights_between(features, coarse)
    near = nodes[np.arange(len(which)), np.abs(weights).argmax(axis=1)]
    good = out.found[nodes].all(axis=1) & (out.of[nodes] == out.of[near][:, None]).all(axis=1)
    good &= ~out.found[which]
    nodes, weights, near = nodes[good], weights[good], near[good]
    target: Indices = which[good]
    log_atoms = np.log(cases.atoms)
    out.of[target] = out.of[near]
    out.log_a[target] = np.einsum("ij,ijk->ik", weights, out.log_a[nodes])
    size = out.nu - log_atoms
    out.nu[target] = (weights * size[nodes]).sum(axis=1) + log_atoms[target]
    return target


def to_vertices(cases: Cases, which: Indices, out: Minima, near: Indices) -> Indices:
    """Give cases the set of their best vertex, walking there from that of another case.

    Returns the cases that arrived.
    """
    c = cases.c[which]
    log_p = np.zeros(len(which))
    if not cases.holds_pressure:
        # a vertex needs a pressure: that of half as many moles as there are atoms
        log_p = np.maximum(np.log(0.5 * cases.atoms[which]) - cases.nu_fixed[which], -60.0)
        c = c.copy()
        c[:, cases.gas] += log_p[:, None]
    placed: list[Indices] = []
    for number in np.unique(out.of[near]):
        rows = np.flatnonzero(out.of[near] == number)
        for part, vertex, amounts in walk(cases, which[rows], c[rows], out.sets[number][1]):
            placed += _place(cases, which, rows[part], vertex, amounts, c, log_p, out)
    return np.concatenate(placed) if placed else np.zeros(0, dtype=np.intp)


def gather(cases: Cases, which: Indices, out: Minima) -> None:
    """Let cases of rare components join a large group whose components are not scarce.

    A pass costs the same for one case as for many, and any abundant components will do.
    """
    numbers, counts = np.unique(out.of[which], return_counts=True)
    large = numbers[counts >= _LARGE][np.argsort(-counts[counts >= _LARGE])]
    for number in numbers[counts < _LARGE]:
        active, members = out.sets[number]
        rows = which[out.of[which] == number]
        basis = cases.mixture.basis(members)
        mu = cases.c[rows][:, members] + out.log_a[rows]
        for other in large:
            its_active, its_members = out.sets[other]
            if its_active != active or not rows.size:
                continue
            chosen = list(its_members)
            log_a = mu @ basis.reactions[chosen].T - cases.c[rows][:, chosen]
            fits = log_a.min(axis=1) > _SCARCE
            out.of[rows[fits]], out.log_a[rows[fits]] = other, log_a[fits]
            rows, mu = rows[~fits], mu[~fits]


def _place(
    cases: Cases,
    which: Indices,
    rows: Indices,
    vertex: tuple[int, ...],
    amounts: Array,
    c: Array,
    log_p: Array,
    out: Minima,
) -> list[Indices]:
    """Sets and activities of cases at one vertex, parted by which condensed phases it has."""
    members = np.array(vertex)
    condensed = ~cases.mixture.is_gas[members]
    present = (amounts > 0.0) & condensed
    gas = (amounts * ~condensed).sum(axis=1)
    with np.errstate(divide="ignore"):
        nu = np.where(gas > 0.0, np.log(gas), np.log(cases.atoms[which[rows]]) - 30.0)
        log_n = np.log(np.maximum(amounts, 0.0))
    # a component of zero amount starts at the activity that the vertex gives it: one
    base = nu if cases.holds_pressure else cases.nu_fixed[which[rows]]
    activity = np.where(np.isfinite(log_n), log_n - base[:, None], log_p[rows][:, None])
    placed: list[Indices] = []
    for pattern in np.unique(present, axis=0):
        some = np.flatnonzero((present == pattern).all(axis=1))
        active = tuple(int(m) for m in members[pattern])
        chosen, log_a = vertex, activity[some] * ~condensed
        if (condensed & ~pattern).any():  # a phase at zero is no component: gases stand in
            force = c[rows[some]][:, members] @ cases.mixture.basis(vertex).reactions.T
            force -= c[rows[some]]
            scarce = 1e-40 * np.exp(np.clip(force[0], -100.0, 0.0))
            scarce[members] += np.maximum(amounts[some[0]], 0.0)
            chosen = tuple(sorted(cases.members(active, scarce)))
            log_a = force[:, chosen] + log_p[rows[some]][:, None]
            for k, member in enumerate(chosen):
                if member in vertex:
                    log_a[:, k] = activity[some, vertex.index(member)]
                if not cases.mixture.is_gas[member]:
                    log_a[:, k] = 0.0
        target = which[rows[some]]
        out.of[target] = out.number((active, chosen))
        out.log_a[target], out.nu[target] = log_a, base[some]
        placed.append(target)
    return placed


def spread(features: Array, count: int) -> Indices:
    """Well-spread rows: each next one is farthest from those before."""
    count = min(count, len(features))
    chosen = [int(np.argmin(np.abs(features - features.mean(axis=0)).sum(axis=1)))]
    distance = ((features - features[chosen[0]]) ** 2).sum(axis=1)
    while len(chosen) < count:
        chosen.append(int(np.argmax(distance)))
        distance = np.minimum(distance, ((features - features[chosen[-1]]) ** 2).sum(axis=1))
    return np.unique(chosen)


def settle_one(cases: Cases, i: int, out: Minima) -> None:
    """Settle one case by itself, cold."""
    held = Held(
        float(cases.T[i]),
        p=None if cases.p is None else float(cases.p[i]),
        V=None if cases.V is None else float(cases.V[i]),
    )
    one = np.array([i])
    try:
        out.put(i, minimise(cases.mixture, cases.feed.of(one), held))
    except (NotHeld, Unsettled, TooSmall, np.linalg.LinAlgError) as error:
        out.why[i] = error


def _exchange_all(cases: Cases, which: Indices, out: Minima) -> None:
    """Follow the sets of the given cases to their minima; what is lost stays unfound."""
    going = which
    for _ in range(_MAX_ROUNDS):
        if not going.size:
            return
        onward: list[Indices] = []
        numbers = out.of[going]
        for number in np.unique(numbers):
            group = going[numbers == number]
            active, members = out.sets[number]
            basis = cases.mixture.basis(members)
            for rows, solved in solve_set(
                cases, group, active, basis, out.log_a[group], out.nu[group]
            ):
                onward += judge(cases, group[rows], active, solved, out)
        going = np.concatenate(onward) if onward else np.zeros(0, dtype=np.intp)


def judge(
    cases: Cases, which: Indices, active: tuple[int, ...], solved: Solved, out: Minima
) -> list[Indices]:
    """Accept the right ones; give the others their next set. Returns those that go on."""
    onward: list[Indices] = []
    rows = np.flatnonzero(solved.closed)
    act = list(active)
    if act:
        worst = solved.n[np.ix_(rows, np.array(act, dtype=np.intp))].argmin(axis=1)
        negative = solved.n[rows, np.array(act)[worst]] < 0.0
        for k in np.unique(worst[negative]):
            leaving = act[k]
            some = rows[negative & (worst == k)]
            rest = [i for i in act if i != leaving]
            onward += _change(cases, which, some, rest, act, solved, out)
        rows = rows[~negative]
    absent = np.array([i for i in cases.condensed.tolist() if i not in set(act)], dtype=np.intp)
    if absent.size and rows.size:
        force = solved.force[np.ix_(rows, absent)]
        best = force.argmax(axis=1)
        forms = force[np.arange(len(rows)), best] > cases.force_tolerance[which[rows]]
        for k in np.unique(best[forms]):
            entering = int(absent[k])
            row = solved.basis.reactions[entering]
            if any(row[j] != 0.0 and m not in act for j, m in enumerate(solved.basis.members)):
                some = rows[forms & (best == k)]
                onward += _change(cases, which, some, [*act, entering], act, solved, out)
        rows = rows[~forms]
    poor = ~solved.well_based[rows]
    if poor.any():
        some = rows[poor]
        changed = _change(cases, which, some, act, act, solved, out)
        if changed:
            onward += changed
        else:  # no better components exist
            poor[:] = False
    rows = rows[~poor]
    if rows.size:
        out.accept(which[rows], solved, rows)
    return onward


def _change(
    cases: Cases,
    which: Indices,
    rows: Indices,
    active: list[int],
    held: list[int],
    solved: Solved,
    out: Minima,
) -> list[Indices]:
    """Give some rows another set, its components chosen for the first of them.

    Empty where that is the set they have `held`.
    """
    first = rows[0]
    n, force = solved.n[first], solved.force[first]
    scarce = np.exp(np.clip(force, -650.0, 650.0)) * 1e-40 * cases.scale[which[first]]
    members = tuple(sorted(cases.members(active, np.where(n > 0.0, n, scarce))))
    if members == solved.basis.members and set(active) == set(held):
        return []
    target = which[rows]
    out.of[target] = out.number((tuple(sorted(active)), members))
    out.log_a[target] = np.maximum(solved.force[np.ix_(rows, np.array(members))], -650.0)
    if not cases.holds_pressure:
        out.nu[target] = solved.nu[rows]
        return [target]
    gas = solved.n[rows][:, cases.gas].sum(axis=1)
    with np.errstate(divide="ignore"):
        out.nu[target] = np.where(gas > 0.0, np.log(gas), np.log(cases.scale[target]) - 30.0)
    return [target]
