"""Newton's method for given phases of a real mixture, many cases at once.

The residual Gibbs energy of a fluid phase depends on its amounts through a few moments M
alone, so that ln phi_i = q_i . theta with theta = grad F(M). With theta among the unknowns
the composition stays explicit,

    ln n_i = sum_k a'_ik l_k - kappa_i + nu - q_i . theta

in each fluid phase, and the system has one unknown per component, and one and the moments
per fluid phase, however many species there are (reduced variables: Hendriks, Ind. Eng. Chem.
Res. 27 (1988) 1728). Its slopes hold the whole composition derivative of the fugacity
coefficients, so that the end is quadratic. Balances are solved as logarithms of their two
sides, as for the ideal gas.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis, component_amounts
from solver.core.extremes import newton_steps, shortest, wild
from solver.core.forced import Sink, combined, one_sided
from solver.core.phaseset import parted, sink
from solver.real.problem import RealCases
from solver.real.slopes import EXP_LIMIT, Terms, Unknowns, slopes_of
from solver.real.states import PhaseSet

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

_EPS = float(np.finfo(float).eps)
_MAX_ITERATIONS = 60
_MET = 1e-12  # sum of squares of the residuals before the last step
_CERTAIN = 3e-9  # a last step this small leaves an error of its square
_STEP, _PHI_STEP, _SIZE_STEP = 300.0, 2.0, 4.0
_MATTERS = 1e-4  # mole fraction from which a change of ln phi is kept small
_GONE = -26.0  # ln of the share of all moles at which a fluid phase is given up
_STALE = 12
_DOMINANCE = 1e6


@dataclass(frozen=True)
class Solved:
    """What solving one set of phases gave, arrays over the cases asked.

    Attributes
    ----------
    log_a, mu : ndarray, shape (cases, components)
    nu : ndarray, shape (cases, fluids)
    theta : ndarray, shape (cases, fluids, moments)
    fluids : ndarray, shape (cases, fluids, gas species)
    n, force : ndarray, shape (cases, species)
        Amounts over all phases (a condensed one may be negative), and a.lambda - c.
    closed, well_based : ndarray of bool, shape (cases,)
    vanishing : ndarray of int, shape (cases,)
        Position of a fluid phase that has nothing left, or -1.
    dead : ndarray of bool, shape (gas species,)
        Gas species that the balances force to zero.
    """

    basis: Basis
    log_a: Array
    mu: Array
    nu: Array
    theta: Array
    fluids: Array
    n: Array
    force: Array
    closed: Flags
    well_based: Flags
    vanishing: Indices
    dead: Flags


def solve_phases(
    cases: RealCases, chosen: PhaseSet, log_a: Array, nu: Array, theta: Array, calm: int
) -> list[tuple[Indices, Solved]]:
    """Solve the balances of cases that share their phases and components.

    Parameters
    ----------
    cases : RealCases
        All of them are solved.
    chosen : PhaseSet
    log_a : ndarray, shape (cases, components)
    nu : ndarray, shape (cases, fluids)
    theta : ndarray, shape (cases, fluids, moments)
        Where to start.
    calm : int
        Steps at first in which the fugacity coefficients follow instead of being foreseen
        (successive substitution), for a start that is far off.

    Returns
    -------
    list of (positions, Solved)
        Parted by which balances have a zero total.
    """
    basis = cases.mixture.basis(chosen.members)
    b = component_amounts(cases.feed.amounts, cases.feed.vectors, basis)
    out = []
    for rows in parted(b):
        part = cases if len(rows) == len(cases) else cases.of(rows)
        out.append(
            (rows, _solve(part, chosen, basis, b[rows], log_a[rows], nu[rows], theta[rows], calm))
        )
    return out


def _solve(
    cases: RealCases,
    chosen: PhaseSet,
    basis: Basis,
    b: Array,
    log_a: Array,
    nu: Array,
    theta: Array,
    calm: int,
) -> Solved:
    gas, members = cases.gas, list(basis.members)
    reactions, c = basis.reactions[gas], cases.ideal.c
    live = np.ones(gas.size, dtype=bool)
    rows = chosen.rows
    sinks: list[Sink] = one_sided(reactions, b[0], live, rows)
    if sum(b[0, k] == 0.0 for k in rows) > 1:
        sinks += combined(reactions, b[0], live, rows)
    count = len(chosen.fluids)
    kappa = c[:, gas] - c[:, members] @ reactions.T
    if count and live.any():
        state, closed, vanishing = _iterate(
            cases,
            chosen.fluids,
            reactions[:, rows],
            live,
            kappa,
            b[:, rows],
            log_a[:, rows],
            nu,
            theta,
            calm,
        )
    else:
        state = Unknowns(log_a[:, rows], nu, theta, np.full((len(cases), count, gas.size), -np.inf))
        closed = ~(b[:, rows] != 0.0).any(axis=1)  # without a fluid nothing else is held
        vanishing = np.full(len(cases), -1)
    fluids = np.exp(np.clip(state.log_n, None, EXP_LIMIT))
    total = fluids.sum(axis=1)
    n = np.zeros(c.shape)
    n[:, gas] = total
    taken = set(chosen.active)
    present = [k for k, m in enumerate(members) if m in taken]
    if present:
        left = b[:, present] - total @ reactions[:, present]
        rounding = (left < 0.0) & (left >= -16.0 * _EPS * np.abs(b[:, present]))
        left[rounding] = 0.0
        n[:, [members[k] for k in present]] = left
    full = np.zeros(b.shape)
    full[:, rows] = state.log_a
    mu = c[:, members] + full
    sink(c, mu, sinks, basis, gas[live])
    well = np.ones(len(cases), dtype=bool)
    if rows:
        own = n[:, [members[k] for k in rows]]
        built = total @ np.abs(reactions[:, rows]) - own
        well = np.all(own * _DOMINANCE >= built, axis=1)
    return Solved(
        basis=basis,
        log_a=mu - c[:, members],
        mu=mu,
        nu=state.nu,
        theta=state.theta,
        fluids=fluids,
        n=n,
        force=mu @ basis.reactions.T - c,
        closed=closed,
        well_based=well,
        vanishing=vanishing,
        dead=~live,
    )


def _iterate(
    cases: RealCases,
    slots: tuple[int, ...],
    a: Array,
    live: Flags,
    kappa: Array,
    b: Array,
    log_a: Array,
    nu: Array,
    theta: Array,
    calm: int,
) -> tuple[Unknowns, Flags, Indices]:
    count, r = b.shape
    log_n = (log_a @ a.T - kappa)[:, None, :] + nu[:, :, None]
    log_n -= cases.log_phi(theta)
    log_n[:, :, ~live] = -np.inf
    state = Unknowns(log_a.copy(), nu.copy(), theta.copy(), log_n)
    whole = Unknowns(state.log_a.copy(), state.nu.copy(), state.theta.copy(), log_n.copy())
    index = np.arange(count)
    closed, vanishing = np.zeros(count, dtype=bool), np.full(count, -1)
    terms = Terms.of(a, cases.own)
    best, stale = np.full(count, np.inf), np.zeros(count, dtype=int)
    merit_last = np.full(count, np.inf)
    step = np.zeros((count, r + len(slots) * (1 + theta.shape[2])))
    with np.errstate(all="ignore"):
        for iteration in range(_MAX_ITERATIONS):
            J, F, weight = slopes_of(cases, slots, terms, b, state, iteration < calm)
            merit = ((F * weight) ** 2).sum(axis=1)
            back = (merit > merit_last) & (merit > 1e-16) & (iteration > calm)
            stale = np.where(merit < 0.5 * best, 0, stale + 1)
            best = np.minimum(best, merit)
            # while the coefficients only follow, their steps stand by themselves
            free = r + len(slots) if iteration < calm else J.shape[1]
            newton = -F
            newton[:, :free] = newton_steps(J[:, :free, :free].transpose(1, 2, 0), F[:, :free].T).T
            off = wild(newton.T)
            for case in np.flatnonzero(off):
                finite = np.isfinite(J[case]).all() and np.isfinite(F[case]).all()
                newton[case] = shortest(J[case], F[case]) if finite else np.nan
            _damp(newton, cases, r, len(slots), state)
            move = np.where(back[:, None], -0.75 * step, newton)
            step = np.where(back[:, None], 0.25 * step, newton)
            merit_last = np.where(back, merit_last, merit)
            size = _apply(state, move, a, cases, len(slots))
            # the shortest of many possible steps is no sign of an end while balances are open
            done = (size <= _CERTAIN) & ~back & (merit <= _MET)
            done &= iteration >= calm
            gone = state.nu - np.logaddexp.reduce(state.nu, axis=1)[:, None] < _GONE
            lost = ~np.isfinite(size) | (stale > _STALE + calm) | (gone.any(axis=1) & ~done)
            closed[index[done]] = True
            vanishing[index[lost & gone.any(axis=1)]] = gone[lost & gone.any(axis=1)].argmax(axis=1)
            going = ~(done | lost)
            if going.all():
                continue
            _put(whole, index, state)
            if not going.any():
                return whole, closed, vanishing
            cases = cases.of(np.flatnonzero(going))
            b, index = b[going], index[going]
            best, stale, merit_last = best[going], stale[going], merit_last[going]
            step = step[going]
            state = Unknowns(
                state.log_a[going], state.nu[going], state.theta[going], state.log_n[going]
            )
    _put(whole, index, state)
    return whole, closed, vanishing


def _put(whole: Unknowns, index: Indices, state: Unknowns) -> None:
    whole.log_a[index], whole.nu[index] = state.log_a, state.nu
    whole.theta[index], whole.log_n[index] = state.theta, state.log_n


def _damp(step: Array, cases: RealCases, r: int, fluids: int, state: Unknowns) -> None:
    """Shorten steps (cases, unknowns) in place that leave the reach of their slopes."""
    nu = step[:, r : r + fluids]
    if fluids > 1:  # a phase that is not there would fall without end
        np.clip(nu, -_SIZE_STEP, _SIZE_STEP, out=nu)
    change = cases.log_phi(step[:, r + fluids :].reshape(len(step), fluids, -1))
    share = state.log_n - state.nu[:, :, None]
    change = np.where(share > np.log(_MATTERS), np.abs(change), 0.0).max(axis=(1, 2))
    size = np.abs(step[:, : r + fluids]).max(axis=1)
    factor = np.minimum(1.0, _PHI_STEP / np.maximum(change, 1e-300))
    factor = np.minimum(factor, _STEP / np.maximum(size, 1e-300))
    step *= factor[:, None]


def _apply(state: Unknowns, move: Array, a: Array, cases: RealCases, fluids: int) -> Array:
    """Take a step; its size (cases,) in terms of ln of amounts."""
    r = state.log_a.shape[1]
    dtheta = move[:, r + fluids :].reshape(len(move), fluids, -1)
    state.log_a += move[:, :r]
    state.nu += move[:, r : r + fluids]
    state.theta += dtheta
    change = (move[:, :r] @ a.T)[:, None, :] + move[:, r : r + fluids, None]
    change -= cases.log_phi(dtheta)
    state.log_n += change
    there = state.log_n > state.nu[:, :, None] - 690.0
    size = np.where(there, np.abs(change), 0.0).max(axis=(1, 2), initial=0.0)
    size = np.maximum(size, np.abs(move[:, : r + fluids]).max(axis=1))
    return np.asarray(np.where(np.isfinite(move).all(axis=1), size, np.nan))
