"""The minimum for one given set of condensed phases."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.balance import GasSolution, GasSystem, Vessel, solve_balances
from solver.core.basis import Basis, choose_members, component_amounts
from solver.core.descent import descend
from solver.core.forced import Sink, combined, infeasible, one_sided
from solver.core.mixture import P0, Held, Mixture, R

Array = NDArray[np.float64]

_EPS = float(np.finfo(float).eps)
_DOMINANCE = 1e3  # a component this much scarcer than a species it builds is a poor component
_ABSENT = -50.0  # ln activity at most, of a species that the balances force to zero
_EXP_LIMIT = 650.0


@dataclass(frozen=True)
class Case:
    """Feed of one case: amounts (fed species,) and formula vectors (fed species, rows)."""

    feed: Array
    vectors: Array

    @property
    def totals(self) -> Array:
        """Element totals (rows,)."""
        return np.asarray(self.feed @ self.vectors)


class Problem:
    """One case at one temperature and pressure or volume, as the search needs it.

    Attributes
    ----------
    c : ndarray, shape (species,)
        g/RT at the pressure held, or at 1 bar where the volume is held.
    nu_fixed : float
        ln of p0 V/RT where the volume is held.
    force_tolerance : float
        Rounding of a driving force c - a.lambda.
    """

    def __init__(self, mixture: Mixture, case: Case, held: Held) -> None:
        self.mixture, self.case, self.held = mixture, case, held
        g, _, _ = mixture.thermo.at(held.T)
        self.gas, self.condensed = mixture.gas, mixture.condensed
        totals = case.totals
        self.scale = float(np.abs(totals).max())
        self.atoms = float(np.abs(totals).sum())
        self.nu_fixed = 0.0
        self.c = g.copy()
        if held.p is not None:
            self.c[self.gas] += float(np.log(held.p / P0))
            self.c += mixture.volume * ((held.p - P0) / (R * held.T))
        else:
            assert held.V is not None
            self.nu_fixed = float(np.log(P0 * held.V / (R * held.T)))
        self.force_tolerance = 6e-14 * (1.0 + float(np.abs(self.c).max()))

    @property
    def holds_pressure(self) -> bool:
        """Whether the gas may take any volume."""
        return self.held.p is not None

    def pressure(self, n: Array) -> float:
        """Pressure of the gas in what the condensed phases leave of the volume, Pa.

        Zero where nothing evaporates: a vessel with involatile solids alone.
        """
        assert self.held.V is not None
        gas = float(n[self.gas].sum())
        left = self.held.V - float(n @ self.mixture.volume)
        if left <= 0.0:
            return 0.0 if gas == 0.0 else np.inf
        return gas * R * self.held.T / left

    def members(self, active: Sequence[int], amounts: Array) -> list[int]:
        """Components: the active condensed phases, then the most abundant gases."""
        gases = self.gas[np.argsort(-amounts[self.gas], kind="stable")]
        rest = self.condensed[np.argsort(-amounts[self.condensed], kind="stable")]
        taken = set(active)
        others = [i for i in rest.tolist() if i not in taken]
        order = [*active, *gases.tolist(), *others]
        return choose_members(self.mixture.A, order, self.mixture.rank)


@dataclass(frozen=True)
class Attempt:
    """What solving one set of phases gave.

    Attributes
    ----------
    n : ndarray, shape (species,)
        Amounts; a condensed one is negative where the set asks for too much.
    potentials : ndarray, shape (rows,)
        Element potentials over RT.
    activity : ndarray, shape (species,)
        At those potentials.
    stuck_with : ndarray, shape (species,), or None
        None when the balances were solved, else the gas composition reached.
    log_a : ndarray, shape (gas components,)
        ln activity of the gas components, in the order of the basis.
    log_gas : float
        nu: ln of the gas amount (pressure held) or of p0 V/RT of the volume left to it.
    p : float
        Pressure, Pa.
    force : ndarray, shape (species,)
        ln activity of every species at the potentials and the pressure reached.
    gas : ndarray
        Gas species that are not forced to zero.
    """

    n: Array
    potentials: Array
    basis: Basis
    activity: Array
    stuck_with: Array | None
    log_a: Array
    log_gas: float
    p: float
    force: Array
    gas: NDArray[np.intp]


def solve_set(
    problem: Problem, active: Sequence[int], basis: Basis, log_a: Array, nu: float
) -> Attempt:
    """Solve the balances of one set, changing the components until they are abundant."""
    for _ in range(8):
        attempt = _solve_over(problem, active, basis, log_a, nu)
        if attempt.stuck_with is not None or _well_based(problem, active, attempt):
            return attempt
        basis, log_a, nu = restart(problem, active, attempt.n, attempt)
        if basis.members == attempt.basis.members:
            return attempt
    return attempt


def restart(
    problem: Problem, active: Sequence[int], n: Array, attempt: Attempt
) -> tuple[Basis, Array, float]:
    """Components, log_a and nu for a changed set, from the amounts reached so far."""
    scarce = attempt.activity * 1e-40 * problem.scale
    basis = problem.mixture.basis(problem.members(active, np.where(n > 0.0, n, scarce)))
    taken = set(active)
    gas_members = [i for i in basis.members if i not in taken]
    log_a = np.log(np.maximum(attempt.activity[gas_members], 1e-290))
    total = float(n[problem.gas].sum())
    nu = float(np.log(total)) if total > 0.0 else float(np.log(problem.atoms)) - 30.0
    return basis, log_a, nu


def _solve_over(
    problem: Problem, active: Sequence[int], basis: Basis, log_a: Array, nu: float
) -> Attempt:
    c, gas = problem.c, problem.gas
    members = list(basis.members)
    taken = set(active)
    gas_rows = [k for k, m in enumerate(members) if m not in taken]
    b = component_amounts(problem.case.feed[None, :], problem.case.vectors, basis)[0]
    reactions = basis.reactions[gas]
    kappa = c[gas] - reactions @ c[members]
    start = np.zeros(len(members))
    start[gas_rows] = log_a
    live = np.ones(gas.size, dtype=bool)
    rows = list(gas_rows)
    sinks = one_sided(reactions, b, live, rows)
    result = _solve_gas(problem, active, basis, reactions, kappa, b, start, nu, live, rows)
    if not result.closed and sum(b[k] == 0.0 for k in rows) > 1:
        more = combined(reactions, b, live, rows)
        if more:
            sinks += more
            result = _solve_gas(problem, active, basis, reactions, kappa, b, start, nu, live, rows)
    mu = c[members] + result.log_a
    n = np.zeros(len(c))
    n[gas[live]] = result.n
    for k, m in enumerate(members):
        if m in taken:
            n[m] = b[k] - float(reactions[:, k] @ n[gas])
            if -16.0 * _EPS * abs(b[k]) <= n[m] < 0.0:
                n[m] = 0.0
    p = problem.held.p
    if p is None:
        p = problem.pressure(n)
        c = c + problem.mixture.volume * ((p - P0) / (R * problem.held.T))
        mu = c[members] + result.log_a
    _sink(c, mu, sinks, basis, gas[live])
    stuck_with = None
    if not result.closed:
        stuck_with = np.zeros(len(c))
        stuck_with[gas[live]] = result.y
    force = basis.reactions @ mu - c
    return Attempt(
        n=n,
        potentials=basis.potentials(mu),
        basis=basis,
        activity=np.exp(np.clip(force, -_EXP_LIMIT, _EXP_LIMIT)),
        stuck_with=stuck_with,
        log_a=(mu - c[members])[gas_rows],
        log_gas=result.nu,
        p=p,
        force=force,
        gas=gas[live],
    )


@dataclass(frozen=True)
class _GasResult:
    n: Array  # amounts of the live gas species
    y: Array  # their composition, mole fractions
    log_a: Array  # (components,), zero for condensed ones
    nu: float
    closed: bool


def _solve_gas(
    problem: Problem,
    active: Sequence[int],
    basis: Basis,
    reactions: Array,
    kappa: Array,
    b: Array,
    start: Array,
    nu: float,
    live: NDArray[np.bool_],
    rows: list[int],
) -> _GasResult:
    log_a = np.zeros(len(b))
    if not live.any():
        return _GasResult(np.zeros(0), np.zeros(0), log_a, nu, True)
    part = reactions[np.ix_(live, np.array(rows, dtype=np.intp))]
    b_rows = b[rows]
    if infeasible(part, b_rows):
        y = np.exp(np.clip(part @ start[rows] - kappa[live], -_EXP_LIMIT, _EXP_LIMIT))
        return _GasResult(np.zeros(live.sum()), y / y.sum(), log_a, nu, False)
    # no gas component is fed: what the gas would be is sought first, at any amount
    homogeneous = problem.holds_pressure and not b_rows.any()
    grows = problem.holds_pressure and not homogeneous
    nu_start = nu if grows else (0.0 if homogeneous else problem.nu_fixed)
    limit = float(np.log(4.0 * problem.atoms)) + 2.0 if grows else np.inf
    vessel = None
    swelling = None
    if not problem.holds_pressure:
        swelling, vessel = _shared(problem, basis, active, b, live)
    system = GasSystem.of(part, grows, swelling)

    def solve(log_a: Array, nu: float) -> GasSolution:
        return solve_balances(
            system,
            kappa[live][None, :],
            b_rows[None, :],
            log_a[None, :],
            np.array([nu]),
            np.array([limit]),
            vessel,
        )

    solution = solve(start[rows], nu_start)
    if not solution.closed[0]:
        near = descend(part, kappa[live], b_rows, start[rows], nu_start, grows, limit)
        solution = solve(*near)
    n, closed = solution.n[0], bool(solution.closed[0])
    log_a[rows] = solution.log_a[0]
    y = n / n.sum()
    if homogeneous:
        forms = float(np.log(n.sum())) > problem.force_tolerance
        return _GasResult(np.zeros(n.size), y, log_a, nu, closed and not forms)
    return _GasResult(n, y, log_a, float(solution.nu[0]), closed)


def _shared(
    problem: Problem,
    basis: Basis,
    active: Sequence[int],
    b: Array,
    live: NDArray[np.bool_],
) -> tuple[Array | None, Vessel | None]:
    """The vessel as the condensed phases share it; None where they take no room."""
    V, T = problem.held.V, problem.held.T
    assert V is not None
    taken = set(active)
    room = np.array([problem.mixture.volume[m] if m in taken else 0.0 for m in basis.members])
    if not room.any():
        return None, None
    swelling = basis.reactions[problem.gas[live]] @ room
    left = V - float(room @ b)
    unit = R * T / P0
    w = 0.5 * problem.atoms / V if left <= 0.0 else 1.0 / unit
    return swelling, Vessel(np.array([left]), np.array([unit]), np.array([w]))


def _sink(c: Array, mu: Array, sinks: list[Sink], basis: Basis, live: NDArray[np.intp]) -> None:
    """Lower the potentials of forced-out combinations until nothing made of them counts."""
    if not sinks:
        return
    others = np.ones(len(c), dtype=bool)
    others[live] = False
    members = list(basis.members)
    others[[m for k, m in enumerate(members) if not any(s.direction[k] for s in sinks)]] = False
    dead = np.flatnonzero(others)
    # the last one found may raise what an earlier one forces out: the earlier come after it
    for sink in reversed(sinks):
        use = basis.reactions[dead] @ sink.direction
        own, use = dead[use > 1e-9], use[use > 1e-9]
        if own.size:
            over = (basis.reactions[own] @ mu - c[own] - _ABSENT) / use
            mu -= max(0.0, float(over.max())) * sink.direction


def _well_based(problem: Problem, active: Sequence[int], attempt: Attempt) -> bool:
    """Whether no gas component is much scarcer than a species made of it."""
    taken = set(active)
    rows = [k for k, m in enumerate(attempt.basis.members) if m not in taken]
    members = [attempt.basis.members[k] for k in rows]
    n = attempt.n
    size = np.abs(attempt.basis.reactions[np.ix_(problem.gas, np.array(rows, dtype=np.intp))])
    most = (size * n[problem.gas][:, None]).max(axis=0, initial=0.0)
    return bool(np.all(n[members] * _DOMINANCE >= most))
