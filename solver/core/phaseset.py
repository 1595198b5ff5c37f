"""The minimum for a given set of condensed phases and given components, many cases at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.balance import GasSolution, GasSystem, Vessel, nearer_start, solve_balances
from solver.core.basis import Basis, component_amounts
from solver.core.cases import Cases
from solver.core.columns import rows_of
from solver.core.descent import descend
from solver.core.forced import Sink, combined, infeasible, one_sided
from solver.core.mixture import P0, R

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

_EPS = float(np.finfo(float).eps)
_DOMINANCE = 1e6  # a component this much scarcer than a species it builds is a poor component
_FAINT = 1e-250
_MET = 1e-10  # ln of the ratio of two sides; a proper last step leaves far less
_ABSENT = -50.0  # ln activity at most, of a species that the balances force to zero


@dataclass(frozen=True)
class Solved:
    """What solving one set of phases gave, for the cases asked.

    Attributes
    ----------
    n : ndarray, shape (cases, species)
        Amounts; a condensed one is negative where the set asks for too much.
    log_a : ndarray, shape (cases, components)
        ln activity of the components, zero for the condensed phases that are present.
    nu : ndarray, shape (cases,)
        ln of the gas amount (pressure held) or of p0 V/RT of the volume left to it.
    p : ndarray, shape (cases,)
        Pa.
    mu : ndarray, shape (cases, components)
        Potentials of the components over RT.
    force : ndarray, shape (cases, species)
        ln activity of every species at those potentials.
    closed : ndarray of bool, shape (cases,)
        Whether the balances were solved.
    y : ndarray, shape (cases, species)
        Composition of the gas reached, where they were not.
    well_based : ndarray of bool, shape (cases,)
        No component is much scarcer than a species made of it.
    gas : ndarray of int
        Gas species that are not forced to zero.
    """

    basis: Basis
    n: Array
    log_a: Array
    nu: Array
    p: Array
    mu: Array
    force: Array
    closed: Flags
    y: Array
    well_based: Flags
    gas: Indices


def solve_set(
    cases: Cases,
    which: Indices,
    active: Sequence[int],
    basis: Basis,
    log_a: Array,
    nu: Array,
) -> list[tuple[Indices, Solved]]:
    """Solve the balances of some cases that share a set and components.

    Cases are parted by which balances have a zero total, because those decide what is forced
    to zero.

    Parameters
    ----------
    which : ndarray of int, shape (n,)
        The cases.
    active : sequence of int
        Condensed phases present.
    log_a : ndarray, shape (n, components)
    nu : ndarray, shape (n,)

    Returns
    -------
    list of (positions in `which`, Solved)
    """
    b = component_amounts(cases.feed.amounts[which], cases.feed.vectors, basis)
    return [
        (rows, _solve(cases, which[rows], active, basis, b[rows], log_a[rows], nu[rows]))
        for rows in parted(b)
    ]


def parted(b: Array) -> list[Indices]:
    """Rows of component amounts b (cases, components), parted by which of them are zero."""
    zero = b == 0.0
    if not zero.any():
        return [np.arange(len(b))]
    patterns: dict[bytes, list[int]] = {}
    for i, row in enumerate(zero):
        patterns.setdefault(row.tobytes(), []).append(i)
    return [np.array(rows, dtype=np.intp) for rows in patterns.values()]


def _solve(
    cases: Cases,
    which: Indices,
    active: Sequence[int],
    basis: Basis,
    b: Array,
    start: Array,
    nu: Array,
) -> Solved:
    gas, members = cases.gas, list(basis.members)
    columns = cases.mixture.gas_columns
    taken = set(active)
    gas_rows = [k for k, m in enumerate(members) if m not in taken]
    reactions = basis.reactions[gas]
    c = cases.c[rows_of(which, len(cases))]
    kappa = c[:, columns] - c[:, members] @ reactions.T
    live = np.ones(gas.size, dtype=bool)
    rows = list(gas_rows)
    sinks = one_sided(reactions, b[0], live, rows)
    result = _solve_gas(cases, which, active, basis, kappa, b, start, nu, live, rows)
    if len(which) == 1 and not result.closed[0] and sum(b[0, k] == 0.0 for k in rows) > 1:
        more = combined(reactions, b[0], live, rows)
        if more:
            sinks += more
            result = _solve_gas(cases, which, active, basis, kappa, b, start, nu, live, rows)
    n = np.zeros(c.shape)
    live_gas = gas[live]
    n[:, columns if live.all() else live_gas] = result.n
    present = [k for k, m in enumerate(members) if m in taken]
    if present:
        left = b[:, present] - n[:, columns] @ reactions[:, present]
        rounding = (left < 0.0) & (left >= -16.0 * _EPS * np.abs(b[:, present]))
        left[rounding] = 0.0
        n[:, [members[k] for k in present]] = left
    p = cases.pressures(which, n)
    if not cases.holds_pressure:
        finite = np.where(np.isfinite(p), p, P0)
        c = c + cases.mixture.volume * ((finite - P0) / (R * cases.T[which]))[:, None]
    mu = c[:, members] + result.log_a
    sink(c, mu, sinks, basis, live_gas)
    y = n
    if not result.closed.all():
        y = np.zeros(c.shape)
        y[:, live_gas] = result.y
    force = mu @ basis.reactions.T
    well = np.ones(len(which), dtype=bool)
    if rows:
        own = n[:, [members[k] for k in rows]]
        built = n[:, columns] @ np.abs(reactions[:, rows]) - own
        well = np.all(own * _DOMINANCE >= built, axis=1)
    return Solved(
        basis=basis,
        n=n,
        log_a=mu - c[:, members],
        nu=result.nu,
        p=p,
        mu=mu,
        force=np.subtract(force, c, out=force),
        closed=result.closed & np.isfinite(p),
        y=y,
        well_based=well,
        gas=live_gas,
    )


@dataclass(frozen=True)
class _GasResult:
    n: Array  # (cases, live gas species)
    y: Array  # composition, meant only where the balances are not closed
    log_a: Array  # (cases, components), zero for condensed ones
    nu: Array
    closed: Flags


def _solve_gas(
    cases: Cases,
    which: Indices,
    active: Sequence[int],
    basis: Basis,
    kappa: Array,
    b: Array,
    start: Array,
    nu: Array,
    live: Flags,
    rows: list[int],
) -> _GasResult:
    count = len(which)
    log_a = np.zeros(b.shape)
    if not live.any():
        empty = np.zeros((count, 0))
        return _GasResult(empty, empty, log_a, nu, np.ones(count, dtype=bool))
    part = basis.reactions[np.ix_(cases.gas[live], np.array(rows, dtype=np.intp))]
    kappa = kappa if live.all() else kappa[:, live]
    b, start = b[:, rows], start[:, rows]
    # no gas component is fed: what the gas would be is sought first, at any amount
    homogeneous = cases.holds_pressure and not b.any()
    grows = cases.holds_pressure and not homogeneous
    swelling, vessel = (None, None)
    limit = np.full(count, np.inf)
    if grows:
        limit = np.log(4.0 * cases.atoms[which]) + 2.0
    elif homogeneous:
        nu = np.zeros(count)
    else:
        given, nu = nu, cases.nu_fixed[which]
        swelling, vessel = _shared(cases, which, active, basis, live)
    system = GasSystem.of(part, grows, swelling)
    if vessel is not None:
        nu, vessel = nearer_start(system, kappa, b, start, nu, given, vessel)
    solution = solve_balances(system, kappa, b, start, nu, limit, vessel)
    closed = _closed(system, b, solution)
    if vessel is not None and count == 1 and not closed[0]:
        solution = _rarefied(system, kappa, b, start, limit, vessel) or solution
        closed = solution.closed
    if count == 1 and not closed[0] and not infeasible(part, b[0]):
        near, size = descend(part, kappa[0], b[0], start[0], float(nu[0]), grows, float(limit[0]))
        solution = solve_balances(system, kappa, b, near[None, :], np.array([size]), limit, vessel)
        closed = _closed(system, b, solution)
    log_a[:, rows] = solution.log_a
    n = solution.n
    total = n.sum(axis=1)
    amounts = n
    if homogeneous:
        closed = closed & (np.log(total) <= cases.force_tolerance[which])  # else the gas forms
        amounts = np.zeros(n.shape)
    y = amounts if closed.all() else n / total[:, None]
    return _GasResult(amounts, y, log_a, nu if homogeneous else solution.nu, closed)


def _closed(system: GasSystem, b: Array, solution: GasSolution) -> Flags:
    """Which cases are solved; one by itself has to meet its equations, however short its last step.

    Where the slopes hardly determine a step, as of a gas that a solid of the same make feeds,
    the shortest of all possible steps is taken: it is no sign of an end.
    """
    if len(b) > 1 or system.extra > 1 or not solution.closed[0]:
        return solution.closed  # many cases give such a step up; a shared vessel takes none
    n = solution.n[0]
    up = n @ np.maximum(system.reactions, 0.0) + np.maximum(-b[0], 0.0)
    down = n @ np.maximum(-system.reactions, 0.0) + np.maximum(b[0], 0.0)
    seen = np.minimum(up, down) > _FAINT
    off = float(np.abs(np.log(up[seen] / down[seen])).max(initial=0.0))
    if system.extra:
        off = max(off, abs(float(np.log(n.sum()) - solution.nu[0])))
    return np.array([off <= _MET])


def _shared(
    cases: Cases, which: Indices, active: Sequence[int], basis: Basis, live: Flags
) -> tuple[Array | None, Vessel | None]:
    """The vessels as the condensed phases share them; None where those take no room."""
    taken = set(active)
    volume = cases.mixture.volume
    room = np.array([volume[m] if m in taken else 0.0 for m in basis.members])
    if not room.any():
        return None, None
    assert cases.V is not None
    V = cases.V[which]
    swelling = basis.reactions[cases.gas[live]] @ room
    b = component_amounts(cases.feed.amounts[which], cases.feed.vectors, basis)
    left = V - b @ room
    unit = R * cases.T[which] / P0
    w = np.where(left <= 0.0, 0.5 * cases.atoms[which] / V, 1.0 / unit)
    return swelling, Vessel(left, unit, w)


def _rarefied(
    system: GasSystem, kappa: Array, b: Array, start: Array, limit: Array, vessel: Vessel
) -> GasSolution | None:
    """The gas above condensed phases that it neither presses nor shrinks, to rounding.

    Such gases may be fainter than any number: in a volume given beforehand their balances
    are solved in logarithms.
    """
    if not vessel.left[0] > 0.0:
        return None
    nu = np.log(vessel.left / vessel.unit)
    alone = kappa + system.swelling / vessel.unit[:, None]
    apart = GasSystem.of(system.reactions, holds_pressure=False)
    solution = solve_balances(apart, alone, b, start, nu, limit)
    felt = float(solution.n[0] @ np.abs(system.swelling)) / vessel.left[0]
    return solution if solution.closed[0] and felt <= _EPS else None


def sink(c: Array, mu: Array, sinks: list[Sink], basis: Basis, live: Indices) -> None:
    """Lower the potentials of forced-out combinations until nothing made of them counts."""
    if not sinks:
        return
    others = np.ones(c.shape[1], dtype=bool)
    others[live] = False
    members = list(basis.members)
    others[[m for k, m in enumerate(members) if not any(s.direction[k] for s in sinks)]] = False
    dead = np.flatnonzero(others)
    # the last one found may raise what an earlier one forces out: the earlier come after it
    for sink in reversed(sinks):
        use = basis.reactions[dead] @ sink.direction
        own, use = dead[use > 1e-9], use[use > 1e-9]
        if own.size:
            over = (mu @ basis.reactions[own].T - c[:, own] - _ABSENT) / use
            mu -= np.maximum(over.max(axis=1), 0.0)[:, None] * sink.direction
