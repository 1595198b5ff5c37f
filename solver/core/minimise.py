"""Least Gibbs energy at given T and p, or least Helmholtz energy at given T and V: one case.

The phases that are present are found by an active set on a convex problem. A linear program
(`simplex`) gives a first set; for a given set the gas balances are solved (`phaseset`); a
condensed phase whose amount would turn negative leaves where it reaches zero, one whose
driving force is positive enters. The Gibbs energy falls at every change, so no set returns.
Where the balances of a set have no solution, the gas found so far becomes a column of the
linear program, which then names the next set; that sequence converges from anywhere.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis, component_amounts
from solver.core.cases import Cases, Feed
from solver.core.mixture import P0, Held, Mixture, R
from solver.core.phaseset import Solved, solve_set
from solver.core.simplex import Endless, Simplex
from solver.core.vessel import TooSmall, Unfilled, fill

Array = NDArray[np.float64]

_MAX_ROUNDS = 80
_VACUUM = 1e-20  # Pa; no gas feels it
# Pa; liquids of fixed volume and an ideal gas say nothing of a vessel pressed together so far
CRUSHING, _CALM = 1e9, 1e7
_FIRST = np.zeros(1, dtype=np.intp)


class Unsettled(ArithmeticError):
    """The active set did not end; the caller reports it."""


class NotHeld(ArithmeticError):
    """No mixture of the candidates holds the feed; `rows` are the balances left open."""

    def __init__(self, rows: list[int]) -> None:
        super().__init__("the candidates cannot hold the feed")
        self.rows = rows


class _Stuck(ArithmeticError):
    """The set has no solution; y is the gas composition reached."""

    def __init__(self, y: Array | None) -> None:
        super().__init__("no solution for this set of phases")
        self.y = y if y is not None and y.any() and np.all(np.isfinite(y)) else None


@dataclass(frozen=True)
class Present:
    """A start for a neighbouring case: condensed phases, components and their activities.

    `log_p` is set where a volume was met through the pressure: the neighbour needs that too.
    """

    active: tuple[int, ...]
    members: tuple[int, ...]
    log_a: Array
    nu: float
    log_p: float | None = None


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
        Pressure, Pa: given, or that of the gas in the given volume (zero where nothing
        evaporates: a vessel with involatile solids alone).
    gas : ndarray
        Gas species that are not forced to zero.
    """

    n: Array
    potentials: Array
    p: float
    present: Present
    basis: Basis
    gas: NDArray[np.intp]


def minimise(mixture: Mixture, feed: Feed, held: Held, start: Present | None = None) -> Minimum:
    """Find the minimum of one case from a neighbour's `start`, or from a linear program.

    Raises
    ------
    NotHeld
        The candidates cannot hold the feed.
    Unsettled
        No end within the allowed rounds.
    TooSmall
        The vessel cannot hold what must stay condensed.
    """
    case = Cases(
        mixture,
        feed,
        np.array([held.T]),
        None if held.p is None else np.array([held.p]),
        None if held.V is None else np.array([held.V]),
    )
    if held.V is not None and not mixture.gas.size:
        return _without_gas(case, held)
    if held.V is not None and start is not None and start.log_p is not None:
        return _by_pressure(case, held, start.log_p)
    if start is not None:
        basis = mixture.basis(start.members)
        try:
            return _exchange(case, list(start.active), basis, start.log_a, start.nu, None)
        except (Unsettled, _Stuck):
            pass  # too far: start cold
    try:
        return _from_program(case)
    except Unsettled:
        if held.V is None:
            raise
    guess = float(np.log(0.5 * case.atoms[0]) - case.nu_fixed[0])
    return _by_pressure(case, held, guess)


def check_room(mixture: Mixture, feed: Feed, T: float, n: Array, p: float, V: float) -> None:
    """Refuse an end state that holds its volume only by crushing what is condensed in it.

    Parameters
    ----------
    n : ndarray, shape (species,)
        Amounts found at T (K) and p (Pa) in the vessel V (m3).

    Raises
    ------
    TooSmall
    """
    if p > CRUSHING and float(n @ mixture.volume) > 0.5 * V:
        calm = minimise(mixture, feed, Held(T, p=_CALM))
        needed = float(calm.n @ mixture.volume)
        if needed > V:
            raise TooSmall(needed)


def _by_pressure(case: Cases, held: Held, guess: float) -> Minimum:
    """Meet the volume through the pressure, for vessels that defeat the direct search."""
    mixture, feed = case.mixture, case.feed

    def minimum_at(at: Held, last: Minimum | None) -> Minimum:
        return minimise(mixture, feed, at, last.present if last else None)

    try:
        last, n, p = fill(
            minimum_at,
            lambda found: found.n,
            lambda found: R * held.T * float(feed.totals[0] @ found.potentials),
            mixture.gas,
            mixture.volume,
            held,
            guess,
        )
    except Unfilled as error:
        raise Unsettled(str(error)) from None
    log_p = float(np.log(p / P0)) if p > 0.0 else guess
    return replace(last, n=n, p=p, present=replace(last.present, log_p=log_p))


def _without_gas(case: Cases, held: Held) -> Minimum:
    """A vessel whose candidates are all condensed: no pressure, unless it must make them fit."""
    assert held.V is not None
    found = minimise(case.mixture, case.feed, Held(held.T, p=_VACUUM))
    if float(found.n @ case.mixture.volume) > held.V * (1.0 + 1e-12):
        return _by_pressure(case, held, 0.0)
    return replace(found, p=0.0)


def _from_program(case: Cases) -> Minimum:
    """Start cold: the linear program names the sets."""
    mixture, gas = case.mixture, case.gas
    c, atoms, scale = case.c[0].copy(), float(case.atoms[0]), float(case.scale[0])
    log_p = 0.0
    if not case.holds_pressure:
        # the program needs a pressure: that of half as many moles as there are atoms
        log_p = max(float(np.log(0.5 * atoms) - case.nu_fixed[0]), -60.0)
        c[gas] += log_p
    program = Simplex(mixture.A, case.feed.totals[0] / scale, c)
    try:
        program.run()
        short = [k for k, j in enumerate(program.basis) if j < 0 and program.levels[k] > 0.0]
        if short:
            raise NotHeld(short)
        columns: list[Array] = []
        # in a volume the program's pressure is a guess: more columns need not help there
        for _ in range(_MAX_ROUNDS if case.holds_pressure else 4):
            n, active = _read(case, program, columns)
            e = mixture.A @ program.potentials - c
            scarce = 1e-40 * scale * np.exp(np.clip(e, -100.0, 0.0))
            basis = mixture.basis(case.members(active, n + scarce))
            members = np.array(basis.members)
            gas_amount = float(n[gas].sum())
            nu = float(np.log(gas_amount)) if gas_amount > 0.0 else np.log(atoms) - 30.0
            # where the vertex has none, its potentials say how active a component is at most
            log_a = e[members] + log_p
            some = n[members] > 0.0
            log_a[some] = np.log(n[members][some])
            log_a[some] -= nu if case.holds_pressure else case.nu_fixed[0]
            log_a[~mixture.is_gas[members]] = 0.0
            try:
                return _exchange(case, active, basis, log_a, nu, n)
            except _Stuck as stuck:
                for y in (stuck.y, _gas_at(case, program.potentials, c)):
                    if y is not None:
                        entropy = float(y[y > 0.0] @ np.log(y[y > 0.0]))
                        program.add(y @ mixture.A, float(y @ c) + entropy)
                        columns.append(y)
                program.run()
    except Endless as error:
        raise Unsettled(str(error)) from None
    raise Unsettled("no end of the search for the phases")


def _gas_at(case: Cases, potentials: Array, c: Array) -> Array | None:
    """The gas that would form at given element potentials, mole fractions (species,)."""
    gas = case.gas
    if not gas.size:
        return None
    e = case.mixture.A[gas] @ potentials - c[gas]
    y = np.zeros(len(c))
    y[gas] = np.exp(e - e.max())
    return np.asarray(y / y.sum())


def _read(case: Cases, program: Simplex, columns: list[Array]) -> tuple[Array, list[int]]:
    """Amounts (species,) and active condensed phases of a vertex."""
    species = case.c.shape[1]
    n = np.zeros(species)
    members = [j for j in program.basis if j >= 0]
    if max(members) < species and len(members) == case.mixture.rank:
        # pure species alone: their amounts afresh, so that no trace is lost to rounding
        basis = case.mixture.basis(members)
        amounts = component_amounts(case.feed.amounts, case.feed.vectors, basis)[0]
        n[list(basis.members)] = np.maximum(amounts, 0.0)
        return n, [i for i in case.condensed.tolist() if n[i] > 0.0]
    for j, level in zip(program.basis, program.levels * case.scale[0], strict=True):
        if 0 <= j < species:
            n[j] += level
        elif j >= species:
            n += level * columns[j - species]
    return n, [i for i in case.condensed.tolist() if n[i] > 0.0]


def _exchange(
    case: Cases, active: list[int], basis: Basis, log_a: Array, nu: float, n: Array | None
) -> Minimum:
    """Follow the active set from feasible amounts n (None: not known) to the minimum."""
    scale = float(case.scale[0])
    before: Solved | None = None  # the set before the last phase came in
    for _ in range(_MAX_ROUNDS):
        try:
            solved = _with_good_components(case, active, basis, log_a, nu)
        except _Stuck:
            # one phase too many: the newcomer takes the place of what it uses up first
            leaving = _used_first(before, active) if before is not None else None
            if before is None or leaving is None:
                raise
            active = [i for i in active if i != leaving]
            n = before.n[0].copy()
            n[leaving] = 0.0
            basis, log_a, nu = restart(case, active, n, before.force[0], scale)
            before = None
            continue
        new, force = solved.n[0], solved.force[0]
        negative = [i for i in active if new[i] < 0.0]
        if negative:
            if n is None:
                raise _Stuck(None)
            step, leaving = min((n[i] / (n[i] - new[i]), i) for i in negative)
            n = np.maximum(n + step * (new - n), 0.0)
            n[leaving] = 0.0
            active = [i for i in active if i != leaving]
            basis, log_a, nu = restart(
                case, active, np.where(n > 0.0, n, np.abs(new)), force, scale
            )
            before = None
            continue
        n = new
        entering = leading(case, active, force)
        if entering is None or force[entering] <= case.force_tolerance[0]:
            return _finish(active, solved)
        before = solved
        active, n = _enter(entering, active, n, solved.basis)
        basis, log_a, nu = restart(case, active, n, force, scale)
    raise Unsettled("no end of the exchange of phases")


def _used_first(before: Solved, active: Sequence[int]) -> int | None:
    """The phase that the newcomer of `active` uses up first, in the set solved before it."""
    row = before.basis.reactions[active[-1]]
    taken = set(active)
    uses = [
        (before.n[0, m] / row[k], m)
        for k, m in enumerate(before.basis.members)
        if row[k] > 0.0 and m in taken
    ]
    return min(uses)[1] if uses else None


def leading(case: Cases, active: Sequence[int], force: Array) -> int | None:
    """The absent condensed species with the largest driving force, if any is absent."""
    taken = set(active)
    absent = [i for i in case.condensed.tolist() if i not in taken]
    return max(absent, key=lambda i: float(force[i]), default=None)


def restart(
    case: Cases, active: Sequence[int], n: Array, force: Array, scale: float
) -> tuple[Basis, Array, float]:
    """Components, log_a (components,) and nu for a changed set, from amounts n (species,)."""
    # scarce ones by their activity, which does not underflow as amounts do
    preference = np.where(n > 0.0, np.log(np.where(n > 0.0, n, 1.0)), force - 800.0)
    basis = case.mixture.basis(case.members(active, preference))
    log_a = force[list(basis.members)].copy()
    total = float(n[case.gas].sum())
    nu = float(np.log(total)) if total > 0.0 else float(np.log(scale)) - 30.0
    return basis, log_a, nu


def _with_good_components(
    case: Cases, active: Sequence[int], basis: Basis, log_a: Array, nu: float
) -> Solved:
    """Solve one set, changing the components until they are the abundant species."""
    scale, lost = float(case.scale[0]), False
    for _ in range(8):
        ((_, solved),) = solve_set(case, _FIRST, active, basis, log_a[None, :], np.array([nu]))
        if not solved.closed[0]:
            basis, log_a, nu = restart(case, active, solved.n[0], solved.force[0], scale)
            if lost or basis.members == solved.basis.members or not np.all(np.isfinite(log_a)):
                raise _Stuck(solved.y[0])
            lost = True  # once more, over the components that have become abundant
            continue
        if solved.well_based[0]:
            break
        basis, log_a, nu = restart(case, active, solved.n[0], solved.force[0], float(case.scale[0]))
        if basis.members == solved.basis.members:
            break
    return solved


def _enter(j: int, active: list[int], n: Array, basis: Basis) -> tuple[list[int], Array]:
    """Take phase j in; where it only exchanges with condensed phases, one leaves."""
    row = basis.reactions[j]
    taken = set(active)
    if any(row[k] != 0.0 and m not in taken for k, m in enumerate(basis.members)):
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


def _finish(active: list[int], solved: Solved) -> Minimum:
    basis = solved.basis
    present = Present(tuple(active), basis.members, solved.log_a[0], float(solved.nu[0]))
    potentials = basis.potentials(solved.mu[0])
    return Minimum(solved.n[0], potentials, float(solved.p[0]), present, basis, solved.gas)
