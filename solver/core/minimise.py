"""Least Gibbs energy at given T and p, or least Helmholtz energy at given T and V: one case.

The phases that are present are found by an active set on a convex problem. A linear program
(`simplex`) gives a first set; for a given set the gas balances are solved (`balance`); a
condensed phase whose amount would turn negative leaves where it reaches zero, one whose
driving force is positive enters. The Gibbs energy falls at every change, so no set returns.
Where the balances of a set have no solution, the gas found so far becomes a column of the
linear program, which then names the next set; that sequence converges from anywhere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.balance import GasSystem, solve_balances
from solver.core.basis import Basis, choose_members, component_amounts
from solver.core.mixture import P0, Held, Mixture, R
from solver.core.simplex import Simplex

Array = NDArray[np.float64]

_EPS = float(np.finfo(float).eps)
_MAX_ROUNDS = 80
_DOMINANCE = 1e3  # a component this much scarcer than a species it builds is a poor component
_ABSENT = -50.0  # ln activity given to species that the balances force to zero


class Unsettled(ArithmeticError):
    """The active set did not end; the caller reports it."""


class NotHeld(ArithmeticError):
    """No mixture of the candidates holds the feed; `rows` are the balances left open."""

    def __init__(self, rows: list[int]) -> None:
        super().__init__("the candidates cannot hold the feed")
        self.rows = rows


@dataclass(frozen=True)
class Present:
    """A start for a neighbouring case: the condensed phases and the amounts."""

    active: tuple[int, ...]
    members: tuple[int, ...]
    log_a: Array
    nu: float


@dataclass(frozen=True)
class Minimum:
    """The minimiser at one T and p or V.

    Attributes
    ----------
    n : ndarray, shape (species,)
        Amounts, mol (in the scale of the feed handed in).
    potentials : ndarray, shape (rows,)
        Element potentials over RT.
    p : float
        Pressure, Pa (given, or that of the gas in the given volume).
    """

    n: Array
    potentials: Array
    p: float
    present: Present
    basis: Basis
    gas: NDArray[np.intp]
    """Gas species that are not forced to zero."""


@dataclass(frozen=True)
class Case:
    """Feed of one case: amounts (fed species,) and their formula vectors."""

    feed: Array
    vectors: Array

    @property
    def totals(self) -> Array:
        """Element totals (rows,)."""
        return self.feed @ self.vectors


def minimise(mixture: Mixture, case: Case, held: Held, start: Present | None = None) -> Minimum:
    """Find the minimum from a neighbour's `start`, or from a linear program.

    Raises
    ------
    NotHeld
        The candidates cannot hold the feed.
    Unsettled
        No end within the allowed rounds.
    """
    search = _Search(mixture, case, held)
    if start is not None:
        found = search.from_start(start)
        if found is not None:
            return found
    return search.from_program()


class _Search:
    """State of the active set of one case."""

    def __init__(self, mixture: Mixture, case: Case, held: Held) -> None:
        self.mixture, self.case, self.held = mixture, case, held
        g, _, _ = mixture.thermo.at(held.T)
        self.is_gas = mixture.is_gas
        self.gas = np.flatnonzero(mixture.is_gas)
        self.condensed = np.flatnonzero(~mixture.is_gas)
        totals = case.totals
        self.scale = float(np.abs(totals).max())
        self.atoms = float(np.abs(totals).sum())
        if held.p is not None:
            self.log_p = float(np.log(held.p / P0))
            self.nu_fixed = 0.0
        else:
            assert held.V is not None
            self.nu_fixed = float(np.log(P0 * held.V / (R * held.T)))
            self.log_p = 0.0
        self.c = g + np.where(self.is_gas, self.log_p, 0.0)
        self.force_tolerance = 6e-14 * (1.0 + float(np.abs(self.c).max()))

    # ---- starts -------------------------------------------------------------------------

    def from_start(self, start: Present) -> Minimum | None:
        """Continue from a neighbouring case; None if that leads nowhere."""
        basis = self.mixture.basis(start.members)
        n = np.zeros(len(self.c))
        try:
            return self._settle_sets(list(start.active), basis, start.log_a, start.nu, n, None)
        except (Unsettled, _Stuck):
            return None

    def from_program(self) -> Minimum:
        """Start cold: the linear program names the first set."""
        c = self.c
        if self.held.V is not None and self.gas.size:
            # the program needs a pressure: that of as many moles as there are atoms, halved
            guess = max(np.log(0.5 * self.atoms) - self.nu_fixed, -60.0)
            c = c + np.where(self.is_gas, guess, 0.0)
        program = Simplex(self.mixture.A, self.case.totals / self.scale, c)
        program.run()
        short = [k for k, j in enumerate(program.basis) if j < 0 and program.levels[k] > 0.0]
        if short:
            raise NotHeld(short)
        columns: list[Array] = []
        for _ in range(_MAX_ROUNDS):
            n, active, members, gas_amount = self._read(program, columns)
            basis = self.mixture.basis(members)
            gas_members = [i for i in basis.members if i not in active]
            with np.errstate(divide="ignore"):
                log_a = (
                    np.log(n[gas_members] / gas_amount)
                    if gas_amount > 0
                    else np.zeros(len(gas_members))
                )
            log_a = np.where(np.isfinite(log_a), log_a, 0.0)
            nu = np.log(gas_amount) if gas_amount > 0 else np.log(self.atoms) - 30.0
            if self.held.V is not None:
                log_a = log_a + nu - self.nu_fixed
            try:
                return self._settle_sets(active, basis, log_a, nu, n, program)
            except _Stuck as stuck:
                for y in (stuck.y, self._mixture_at(program.potentials, c)):
                    if y is None:
                        continue
                    vector = y @ self.mixture.A
                    cost = float(y @ (c + np.log(np.maximum(y, 1e-300))))
                    program.add(vector, cost)
                    columns.append(y)
                program.run()
        raise Unsettled("no end of the search for the phases")

    def _mixture_at(self, potentials: Array, c: Array) -> Array | None:
        """The gas that would form at the given element potentials, mole fractions (species,)."""
        if not self.gas.size:
            return None
        e = self.mixture.A[self.gas] @ potentials - c[self.gas]
        e -= e.max()
        y = np.zeros(len(c))
        y[self.gas] = np.exp(e)
        return np.asarray(y / y.sum())

    def _read(
        self, program: Simplex, columns: list[Array]
    ) -> tuple[Array, list[int], list[int], float]:
        """Amounts, active condensed phases, component species and gas amount of a vertex."""
        species = len(self.c)
        n = np.zeros(species)
        levels = program.levels * self.scale
        hint = np.zeros(species)
        for j, level in zip(program.basis, levels, strict=True):
            if j < 0:
                continue
            if j < species:
                n[j] += level
                hint[j] += max(level, 1e-30 * self.scale)
            else:
                n += level * columns[j - species]
                hint += max(level, 1e-30 * self.scale) * columns[j - species]
        active = [int(i) for i in self.condensed if n[i] > 0.0]
        # scarce gases by what the potentials of the vertex make of them
        e = self.mixture.A @ program.potentials - self.c
        hint = hint + 1e-40 * self.scale * np.exp(np.clip(e - e.max(), -100.0, 0.0))
        members = self._members(active, hint)
        return n, active, members, float(n[self.gas].sum())

    def _members(self, active: list[int], amounts: Array) -> list[int]:
        """Components: the active condensed phases, then the most abundant gases."""
        rank = self._rank()
        gases = self.gas[np.argsort(-amounts[self.gas], kind="stable")]
        rest = self.condensed[np.argsort(-amounts[self.condensed], kind="stable")]
        others = [int(i) for i in rest if int(i) not in active]
        order = [*active, *(int(i) for i in gases), *others]
        return choose_members(self.mixture.A, order, rank)

    def _rank(self) -> int:
        return int(np.linalg.matrix_rank(self.mixture.A))

    # ---- the active set -----------------------------------------------------------------

    def _settle_sets(
        self,
        active: list[int],
        basis: Basis,
        log_a: Array,
        nu: float,
        n: Array,
        program: Simplex | None,
    ) -> Minimum:
        """Follow the active set from a feasible n (all zero: unknown) to the minimum."""
        known = bool(n.any())
        for _ in range(_MAX_ROUNDS):
            attempt = self._solve(active, basis, log_a, nu)
            new = attempt.n
            if attempt.y is not None:
                raise _Stuck(attempt.y)
            negative = [i for i in active if new[i] < 0.0]
            if negative:
                if not known:
                    raise _Stuck(None)
                step, leaving = min(
                    (n[i] / (n[i] - new[i]) if n[i] > 0 else 0.0, i) for i in negative
                )
                n = n + step * (new - n)
                n[leaving] = 0.0
                n = np.maximum(n, 0.0)
                active = [i for i in active if i != leaving]
                basis, log_a, nu = self._restart(active, np.where(n > 0, n, np.abs(new)), attempt)
                continue
            n, known = new, True
            force = self.mixture.A @ attempt.potentials - self.c
            absent = [i for i in self.condensed if i not in active]
            entering = max(absent, key=lambda i: force[i], default=None)
            if entering is None or force[entering] <= self.force_tolerance:
                return self._finish(active, attempt)
            active, n = self._enter(int(entering), active, n, attempt.basis)
            basis, log_a, nu = self._restart(active, n, attempt)
        raise Unsettled("no end of the exchange of phases")

    def _enter(self, j: int, active: list[int], n: Array, basis: Basis) -> tuple[list[int], Array]:
        """Take phase j in; where it only exchanges with condensed phases, one leaves."""
        row = basis.reactions[j]
        if any(row[k] != 0.0 and m not in active for k, m in enumerate(basis.members)):
            return [*active, j], n
        uses = [(n[m] / row[k], m) for k, m in enumerate(basis.members) if row[k] > 0.0]
        if not uses:
            raise Unsettled("a phase forms from nothing")
        amount, leaving = min(uses)
        n = n.copy()
        n[list(basis.members)] -= amount * row
        n[j] += amount
        n[leaving] = 0.0
        return [*(i for i in active if i != leaving), j], np.maximum(n, 0.0)

    def _restart(
        self, active: list[int], n: Array, attempt: _Attempt
    ) -> tuple[Basis, Array, float]:
        """Components, log_a and nu for a changed set, from the amounts reached so far."""
        scarce = attempt.activity * 1e-40 * self.scale
        basis = self.mixture.basis(self._members(active, np.where(n > 0, n, scarce)))
        gas_members = [i for i in basis.members if i not in active]
        log_a = np.log(np.maximum(attempt.activity[gas_members], 1e-290))
        total = float(n[self.gas].sum())
        nu = float(np.log(total)) if total > 0.0 else float(np.log(self.atoms)) - 30.0
        return basis, log_a, nu

    # ---- one set ------------------------------------------------------------------------

    def _solve(self, active: list[int], basis: Basis, log_a: Array, nu: float) -> _Attempt:
        """Solve the gas balances of one set, with good components."""
        for _ in range(8):
            attempt = self._solve_over(active, basis, log_a, nu)
            if attempt.y is not None or attempt.well_based:
                return attempt
            basis, log_a, nu = self._restart(active, attempt.n, attempt)
            if basis.members == attempt.basis.members:
                return attempt
        return attempt

    def _solve_over(self, active: list[int], basis: Basis, log_a: Array, nu: float) -> _Attempt:
        c = self.c
        members = list(basis.members)
        position = {m: k for k, m in enumerate(members)}
        gas_rows = [position[m] for m in members if m not in active]
        b = component_amounts(self.case.feed[None, :], self.case.vectors, basis)[0]
        kappa = c[self.gas] - basis.reactions[self.gas] @ c[members]
        live = np.ones(self.gas.size, dtype=bool)
        rows = list(gas_rows)
        l_all = dict(zip(gas_rows, log_a, strict=True))
        reactions = basis.reactions[self.gas]
        _remove_forced(reactions, b, live, rows)
        l_live = np.array([[l_all[k] for k in rows]]).reshape(1, len(rows))
        part = reactions[np.ix_(live, np.array(rows, dtype=np.intp))]
        b_live = b[rows][None, :]
        n = np.zeros(len(c))
        gas_absent = False
        solved_l, log_gas = l_live[0], nu
        ok = True
        if live.any():
            ok = not np.any(_infeasible(part, b_live[0]))
            homogeneous = self.held.p is not None and not b_live.any()
            holds_p = self.held.p is not None and not homogeneous
            start = nu if holds_p else (0.0 if self.held.p is not None else self.nu_fixed)
            if ok:
                system = GasSystem.of(part, holds_p)
                limit = np.array([np.log(4.0 * self.atoms) + 2.0 if holds_p else np.inf])
                solution = solve_balances(
                    system, kappa[live][None, :], b_live, l_live, np.array([start]), limit
                )
                ok = bool(solution.closed[0])
                amounts, solved_l = solution.n[0], solution.log_a[0]
                log_gas = float(solution.nu[0])
                if homogeneous:
                    gas_absent = True
                    if ok and np.log(amounts.sum()) > self.force_tolerance:
                        ok = False  # the gas would form: it must enter
                    y = amounts
                else:
                    n[self.gas[live]] = amounts
                    y = amounts
            else:
                y = np.exp(np.clip(l_live @ part.T - kappa[live], -600.0, 600.0))[0]
        # potentials of the components, then activities of everything
        mu = c[members].copy()
        for k, value in zip(rows, solved_l, strict=True):
            mu[k] = c[members[k]] + value
        removed = [k for k in gas_rows if k not in rows]
        self._sink(mu, removed, basis, live)
        potentials = basis.potentials(mu)
        for k, m in enumerate(members):
            if m in active:
                n[m] = b[k] - float(basis.reactions[self.gas, k] @ n[self.gas])
                if abs(n[m]) <= 16.0 * _EPS * max(abs(b[k]), 1e-300) and n[m] < 0.0:
                    n[m] = 0.0
        column = None
        if not ok:
            column = np.zeros(len(c))
            column[self.gas[live]] = y
            total = column.sum()
            column = column / total if np.isfinite(total) and total > 0 else np.zeros(len(c))
        activity = np.exp(np.clip(basis.reactions @ mu - c, -650.0, 650.0))
        well_based = True
        for k in rows:
            size = np.abs(reactions[:, k]) * n[self.gas]
            if n[members[k]] * _DOMINANCE < float(size.max(initial=0.0)):
                well_based = False
        return _Attempt(
            n,
            potentials,
            basis,
            activity,
            column,
            well_based,
            solved_l_of(gas_rows, mu, c, members),
            log_gas,
            gas_absent,
            self.gas[live],
        )

    def _sink(self, mu: Array, removed: list[int], basis: Basis, live: NDArray[np.bool_]) -> None:
        """Give forced-out components potentials so low that nothing made of them counts."""
        members = list(basis.members)
        dead = self.gas[~live]
        for k in removed:
            mu[k] = self.c[members[k]]
        for k in removed:
            own = dead[basis.reactions[dead, k] > 0.0]
            if own.size:
                over = (basis.reactions[own] @ mu - self.c[own] - _ABSENT) / basis.reactions[own, k]
                mu[k] -= max(0.0, float(over.max()))

    def _finish(self, active: list[int], attempt: _Attempt) -> Minimum:
        p = self.held.p
        if p is None:
            assert self.held.V is not None
            p = float(attempt.n[self.gas].sum()) * R * self.held.T / self.held.V
        present = Present(tuple(active), attempt.basis.members, attempt.log_a, attempt.log_gas)
        return Minimum(attempt.n, attempt.potentials, p, present, attempt.basis, attempt.gas)


@dataclass(frozen=True)
class _Attempt:
    n: Array
    potentials: Array
    basis: Basis
    activity: Array
    y: Array | None
    """None when the balances were solved; else the gas reached."""
    well_based: bool
    log_a: Array
    log_gas: float
    gas_absent: bool
    gas: NDArray[np.intp]


class _Stuck(ArithmeticError):
    """The set has no solution; y is the gas composition reached."""

    def __init__(self, y: Array | None) -> None:
        super().__init__("no solution for this set of phases")
        self.y = y if y is not None and y.any() else None


def solved_l_of(gas_rows: list[int], mu: Array, c: Array, members: list[int]) -> Array:
    """ln activity of each gas component."""
    return np.array([mu[k] - c[members[k]] for k in gas_rows])


def _remove_forced(reactions: Array, b: Array, live: NDArray[np.bool_], rows: list[int]) -> None:
    """Drop species whose amount a one-sided balance of zero total forces to zero."""
    changed = True
    while changed:
        changed = False
        for k in list(rows):
            column = reactions[live, k]
            if b[k] == 0.0 and (np.all(column >= 0.0) or np.all(column <= 0.0)):
                live &= reactions[:, k] == 0.0
                rows.remove(k)
                changed = True


def _infeasible(part: Array, b: Array) -> NDArray[np.bool_]:
    """Balances that no amounts can meet: all terms on one side, the total on the other."""
    up, down = (part > 0.0).any(axis=0), (part < 0.0).any(axis=0)
    return ((b > 0.0) & ~up) | ((b < 0.0) & ~down)
