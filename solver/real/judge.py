"""What becomes of solved phases: accepted, or another set of phases for the next pass."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import choose_members
from solver.real.newton import Solved
from solver.real.problem import ROOTS, SLOTS, RealCases
from solver.real.stability import tangent_plane
from solver.real.states import Minima, PhaseSet

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

CALM_ENTERED = 5
"""Steps by substitution after a fluid phase has come in."""
LIQUID = 0.3
"""Volume fraction b/v from which a fluid is called a liquid; the critical one is 0.25 to 0.26."""
_ALIKE = 1e-6
_ENTERS = 0.3  # share of what a new fluid phase could take at most


class Judge:
    """Accepts the right ones of a solved group; gives the others their next set."""

    def __init__(
        self,
        cases: RealCases,
        which: Indices,
        chosen: PhaseSet,
        solved: Solved,
        out: Minima,
        calm: Indices,
    ) -> None:
        self.cases, self.which, self.chosen = cases, which, chosen
        self.solved, self.out, self.calm = solved, out, calm
        self.next: list[Indices] = []

    def onward(self) -> list[Indices]:
        """Judge; returns the cases that go on with another set."""
        solved, chosen = self.solved, self.chosen
        self._without_fluid(np.flatnonzero(~solved.closed), solved.vanishing)
        rows = self._collapsed(np.flatnonzero(solved.closed))
        rows = self._leaving(rows)
        rows = self._entering(rows)
        poor = ~solved.well_based[rows]
        if poor.any() and self._change(rows[poor], chosen.active, chosen.fluids):
            rows = rows[~poor]
        rows = self._unstable(rows)
        self._accept(rows)
        return self.next

    def _without_fluid(self, rows: Indices, gone: Indices) -> None:
        for f, slot in enumerate(self.chosen.fluids):
            some = rows[gone[rows] == f]
            rest = tuple(s for s in self.chosen.fluids if s != slot)
            if some.size and rest:
                self._change(some, self.chosen.active, rest)

    def _collapsed(self, rows: Indices) -> Indices:
        """Two fluid phases that have become one and the same."""
        fluids = self.chosen.fluids
        gone = np.full(len(self.which), -1)
        share = self.solved.fluids / np.maximum(
            self.solved.fluids.sum(axis=2, keepdims=True), 1e-300
        )
        for f in range(1, len(fluids)):
            for g in range(f):
                near = np.abs(share[rows, f] - share[rows, g]).max(axis=1) < _ALIKE
                theta = self.solved.theta
                near &= np.abs(theta[rows, f] - theta[rows, g]).max(axis=1) < 1e3 * _ALIKE
                gone[rows[near]] = f
        self._without_fluid(rows[gone[rows] >= 0], gone)
        return np.asarray(rows[gone[rows] < 0])

    def _leaving(self, rows: Indices) -> Indices:
        active = list(self.chosen.active)
        if not active or not rows.size:
            return rows
        amounts = self.solved.n[np.ix_(rows, np.array(active, dtype=np.intp))]
        worst = amounts.argmin(axis=1)
        negative = amounts[np.arange(len(rows)), worst] < 0.0
        for k in np.unique(worst[negative]):
            rest = tuple(i for i in active if i != active[k])
            self._change(rows[negative & (worst == k)], rest, self.chosen.fluids)
        return np.asarray(rows[~negative])

    def _entering(self, rows: Indices) -> Indices:
        taken = set(self.chosen.active)
        condensed = self.cases.real.condensed
        absent = np.array([i for i in condensed.tolist() if i not in taken], dtype=np.intp)
        if not absent.size or not rows.size:
            return rows
        force = self.solved.force[np.ix_(rows, absent)]
        best = force.argmax(axis=1)
        tolerance = self.cases.ideal.force_tolerance[self.which[rows]]
        forms = force[np.arange(len(rows)), best] > tolerance
        for k in np.unique(best[forms]):
            entering = (*self.chosen.active, int(absent[k]))
            self._change(rows[forms & (best == k)], entering, self.chosen.fluids)
        return np.asarray(rows[~forms])

    def _unstable(self, rows: Indices) -> Indices:
        """Bring in the fluid phase that lies below the tangent plane."""
        cases, solved = self.cases, self.solved
        if not rows.size or not cases.gas.size:
            return rows
        part = cases.of(self.which[rows])
        d = solved.force[np.ix_(rows, cases.gas)]
        live = ~solved.dead[None, :] & (d > -650.0)
        size = solved.fluids[rows].sum(axis=2, keepdims=True)
        present = solved.fluids[rows] / np.maximum(size, 1e-300)
        if not self.chosen.fluids:
            present = np.zeros((len(rows), 1, cases.gas.size))
        trials = tangent_plane(part, d, live, present)
        self.out.distance[self.which[rows]] = trials.distance
        low = trials.distance < -cases.ideal.force_tolerance[self.which[rows]]
        for row, w in zip(rows[low], trials.w[low], strict=True):
            self._take_in(int(row), w)
        return np.asarray(rows[~low])

    def _take_in(self, row: int, w: Array) -> None:
        """Start a fluid phase of composition w beside the others."""
        cases, solved, out = self.cases, self.solved, self.out
        case = np.array([self.which[row]])
        q = cases.q[case]
        fluids = list(self.chosen.fluids)
        amounts = {slot: solved.fluids[row, f] for f, slot in enumerate(fluids)}
        trial = packing(cases, case, w[None, :], "least")[0][0]
        dense = [packing(cases, case, amounts[s][None, :], ROOTS[s])[0][0] for s in fluids]
        if not fluids:
            slot = 1 if trial > LIQUID else 0
        elif fluids == [0] and trial < dense[0]:  # what was there is the liquid
            amounts[1], slot = amounts.pop(0), 0
        else:
            slot = next((s for s in range(len(SLOTS)) if s > max(fluids)), -1)
            if fluids == [1] and trial < dense[0]:
                slot = 0
        shares = [solved.fluids[row, f] for f in range(len(fluids))]
        self.out.apart[int(case[0])] = np.array([w, *(n / n.sum() for n in shares)])
        if slot < 0:
            return  # more fluid phases than there is room for
        total = solved.fluids[row].sum(axis=0)
        own = solved.basis.reactions[cases.gas]
        use, there = w @ own, total @ own
        uses = use > 1e-12
        most = float((there[uses] / use[uses]).min()) if uses.any() else float(total.sum())
        amounts[slot] = w * max(_ENTERS * most, 1e-12)
        slots = tuple(sorted(amounts))
        if len(slots) + len(self.chosen.active) > cases.mixture.rank:
            if len(slots) > 2 or self.chosen.active:
                return  # a phase must go for it: the linear program says which
            slots, amounts = (slot,), {slot: w * max(most, 1e-12)}
        self._change(np.array([row]), self.chosen.active, slots)
        for s, fluid in amounts.items():
            size = fluid.sum()
            root = "least" if s == slot else ROOTS[s]
            moments = (fluid / size)[None, None, :] @ q
            out.nu[case, s] = np.log(size)
            out.theta[case, s] = cases.fluid.residual(moments[:, 0], root).grad
        self.calm[case] = CALM_ENTERED

    def _change(self, rows: Indices, active: tuple[int, ...], fluids: tuple[int, ...]) -> bool:
        """Give some rows another set; False where it is the set that they have."""
        cases, solved, out = self.cases, self.solved, self.out
        if len(fluids) + len(active) > cases.mixture.rank and len(active) > len(self.chosen.active):
            return True  # lost: one must go for the other
        first = rows[0]
        preference = np.where(
            solved.n[first] > 0.0,
            np.log(np.maximum(solved.n[first], 1e-300)),
            np.clip(solved.force[first], -650.0, 0.0) - 700.0,
        )
        members = chosen_members(cases, active, preference)
        chosen = PhaseSet(tuple(sorted(active)), members, fluids)
        if chosen == PhaseSet(
            tuple(sorted(self.chosen.active)), self.chosen.members, self.chosen.fluids
        ):
            return False
        target = self.which[rows]
        out.of[target] = out.number(chosen)
        out.log_a[target] = np.maximum(solved.force[np.ix_(rows, np.array(members))], -650.0)
        for f, slot in enumerate(self.chosen.fluids):
            out.nu[target, slot] = solved.nu[rows, f]
            out.theta[target, slot] = solved.theta[rows, f]
        self.next.append(target)
        return True

    def _accept(self, rows: Indices) -> None:
        solved, out, target = self.solved, self.out, self.which[rows]
        slots = np.array(self.chosen.fluids, dtype=np.intp)
        out.n[target] = solved.n[rows]
        out.potentials[target] = solved.basis.potentials(solved.mu[rows])
        out.log_a[target] = solved.log_a[rows]
        out.nu[target] = -np.inf
        out.theta[target] = 0.0
        out.fluids[target] = 0.0
        out.nu[np.ix_(target, slots)] = solved.nu[rows]
        out.theta[np.ix_(target, slots)] = solved.theta[rows]
        out.fluids[np.ix_(target, slots)] = solved.fluids[rows]
        out.found[target] = True


def packing(
    cases: RealCases, which: Indices | slice, n: Array, root: str
) -> tuple[Array, NDArray[np.bool_]]:
    """Volume fraction b/v of fluids of amounts n (cases, gas species), and if no root is beside."""
    M = cases.moments(n, which)
    residual = cases.fluid.residual(M, root)
    with np.errstate(divide="ignore", invalid="ignore"):
        dense = np.where(M[:, 0] > 0.0, M[:, 1] / (M[:, 0] * residual.Z), 0.0)
    return dense, ~residual.two


def chosen_members(cases: RealCases, active: tuple[int, ...], preference: Array) -> tuple[int, ...]:
    """Components: active condensed phases, then gases by preference, then other solids."""
    gases = cases.gas[np.argsort(-preference[cases.gas], kind="stable")]
    taken = set(active)
    condensed = cases.real.condensed
    rest = condensed[np.argsort(-preference[condensed], kind="stable")]
    order = [*active, *gases.tolist(), *(i for i in rest.tolist() if i not in taken)]
    mixture = cases.mixture
    return tuple(sorted(choose_members(mixture.A, order, mixture.rank)))
