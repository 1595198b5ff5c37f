"""Balances and temperature solved together, for many cases that share a set of phases.

The unknowns are those of `balance` and ln T; the further equation is the energy or entropy
held. Far from the solution the steps in T are kept short; what does not close in a few steps,
or ends beside a change of phases, is left to the bracketed search.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.balance import GasSystem, State
from solver.core.basis import Basis, component_amounts
from solver.core.cases import Cases
from solver.core.extremes import newton_steps, wild
from solver.core.mixture import R

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
CasesAt = Callable[[Indices, Array], Cases]

_MAX_ITERATIONS = 25
_MAX_STEP_T = 0.25  # of ln T
_MAX_STEP = 30.0  # of a component's ln activity
_CLOSED = 1e-13
_STRAGGLERS = 0.05
_TOGETHER = 9


@dataclass
class Joint:
    """Where the cases of one group have come to.

    Attributes
    ----------
    T : ndarray, shape (cases,)
    log_a : ndarray, shape (cases, components)
    nu : ndarray, shape (cases,)
    closed : ndarray of bool, shape (cases,)
    """

    T: Array
    log_a: Array
    nu: Array
    closed: NDArray[np.bool_]


def solve_joint(
    cases_at: CasesAt,
    which: Indices,
    active: Sequence[int],
    basis: Basis,
    T: Array,
    log_a: Array,
    nu: Array,
    variable: str,
    values: Array,
) -> Joint:
    """Close balances and energy from a start near the solution.

    Parameters
    ----------
    cases_at : callable
        Cases of given numbers at given temperatures.
    which : ndarray of int, shape (n,)
    T, nu : ndarray, shape (n,)
    log_a : ndarray, shape (n, components)
    variable : str
        "H", "U" or "S".
    values : ndarray, shape (n,)
        What is held.
    """
    out = Joint(T.copy(), log_a.copy(), nu.copy(), np.zeros(len(which), dtype=bool))
    rows = np.arange(len(which))
    system: GasSystem | None = None
    total = len(which)
    for iteration in range(_MAX_ITERATIONS):
        cases = cases_at(which[rows], out.T[rows])
        members = list(basis.members)
        gas = cases.gas
        taken = set(active)
        gas_rows = [k for k, m in enumerate(members) if m not in taken]
        present = [k for k, m in enumerate(members) if m in taken]
        reactions = basis.reactions[gas]
        b = component_amounts(cases.feed.amounts, cases.feed.vectors, basis)
        if iteration == 0:
            forced = bool((b[:, gas_rows] == 0.0).any())
            volumes = cases.mixture.volume[[members[k] for k in present]]
            if (
                forced
                or not gas_rows
                or not gas.size
                or (not cases.holds_pressure and volumes.any())
            ):
                return out  # amounts at zero and shared vessels are not for this method
        if system is None:
            system = GasSystem.of(reactions[:, gas_rows], cases.holds_pressure)
        kappa = cases.c[:, gas] - cases.c[:, members] @ reactions.T
        size = out.nu[rows] if cases.holds_pressure else cases.nu_fixed
        state = State(
            system, kappa, b[:, gas_rows], out.log_a[rows][:, gas_rows], size,
            np.full(len(rows), np.inf), None,
        )  # fmt: skip
        with np.errstate(all="ignore"):
            state.evaluate()
        drift = cases.h[:, gas] - cases.h[:, members] @ reactions.T
        if not cases.holds_pressure:
            drift = drift - 1.0
        energy, by_amount, by_T = _energy(cases, variable, state.n, b, present, members, reactions)
        off = energy - values[rows] / R
        F_T = _by_log_T(state, drift)
        with np.errstate(all="ignore"):
            delta, answer = newton_steps(state.J, state.F), newton_steps(state.J, F_T)
            moved = delta @ system.effect.T
            along = answer @ system.effect.T + drift
            slope = np.einsum("ij,ij->i", by_amount, along) + by_T
            tau = -(off + np.einsum("ij,ij->i", by_amount, moved)) / slope
        unit = (b[:, present].sum(axis=1) + state.n.sum(axis=1)) * (
            1.0 if variable == "S" else cases.T
        )
        worst = np.abs(state.F).max(axis=1)
        done = (worst <= _CLOSED) & (np.abs(off) <= _CLOSED * unit)
        bad = wild(delta) | ~np.isfinite(tau) | ~(slope > 0.0) | ~np.isfinite(worst)
        tau = np.clip(np.where(bad, 0.0, tau), -_MAX_STEP_T, _MAX_STEP_T)
        step = np.where(bad[:, None], 0.0, delta + answer * tau[:, None])
        largest = np.abs(step).max(axis=1)
        damp = np.minimum(1.0, _MAX_STEP / np.maximum(largest, 1e-300))
        certain = (largest <= 1e-9) & (np.abs(tau) <= 1e-10) & ~bad
        step[done], tau[done] = 0.0, 0.0
        m = len(gas_rows)
        new_log_a = out.log_a[rows]
        new_log_a[:, gas_rows] += step[:, :m] * damp[:, None]
        out.log_a[rows] = new_log_a
        if cases.holds_pressure:
            out.nu[rows] += step[:, m] * damp
        out.T[rows] *= np.exp(tau * damp)
        out.closed[rows] = done | certain
        rows = rows[~(done | certain | bad)]
        if not rows.size or (iteration > _TOGETHER and rows.size < _STRAGGLERS * total):
            break
    return out


def _by_log_T(state: State, drift: Array) -> Array:
    """Derivative of the balances by ln T (cases, unknowns)."""
    reactions = state.system.reactions
    m = reactions.shape[1]
    heat = state.n * drift
    up, down = np.maximum(reactions, 0.0), np.maximum(-reactions, 0.0)
    F_T = np.empty(state.F.shape)
    P, M = state.n @ up + state.b_up, state.n @ down + state.b_down
    F_T[:, :m] = (heat @ up) / P - (heat @ down) / M
    if state.system.extra:
        F_T[:, m] = heat.sum(axis=1) / state.n.sum(axis=1)
    return F_T


def _energy(
    cases: Cases,
    variable: str,
    n: Array,
    b: Array,
    present: list[int],
    members: list[int],
    reactions: Array,
) -> tuple[Array, Array, Array]:
    """The variable over R, its derivatives by ln n (cases, gas species) and by ln T."""
    gas, T = cases.gas, cases.T
    condensed = [members[k] for k in present]
    left = b[:, present] - n @ reactions[:, present]
    h = cases.h[:, gas] - cases.h[:, condensed] @ reactions[:, present].T
    cp = (n * cases.cp[:, gas]).sum(axis=1) + (left * cases.cp[:, condensed]).sum(axis=1)
    volume = cases.mixture.volume[condensed]
    if variable == "S":
        s = cases.h - cases.g
        N = n.sum(axis=1)
        with np.errstate(all="ignore"):
            log_y = np.log(n / N[:, None])
        pressure = np.log(cases.p / 1.0e5) if cases.p is not None else np.log(N) - cases.nu_fixed
        partial = s[:, gas] - log_y - pressure[:, None]
        total = (n * partial).sum(axis=1) + (left * s[:, condensed]).sum(axis=1)
        by_amount = n * (partial - s[:, condensed] @ reactions[:, present].T)
        if cases.p is None:
            by_amount = by_amount - n
            cp = cp - N
        return total, by_amount, cp
    if variable == "U":
        h = h - 1.0
        cp = cp - n.sum(axis=1)
        total = (n * (cases.h[:, gas] - 1.0)).sum(axis=1)
        total = T * (total + (left * cases.h[:, condensed]).sum(axis=1))
        total = total - left @ volume * (1.0e5 / R)
        return total, T[:, None] * n * h, T * cp
    total = T * ((n * cases.h[:, gas]).sum(axis=1) + (left * cases.h[:, condensed]).sum(axis=1))
    assert cases.p is not None
    total = total + left @ volume * ((cases.p - 1.0e5) / R)
    return total, T[:, None] * n * h, T * cp
