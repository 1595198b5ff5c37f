"""Balances and temperature solved together, for cases that share a set of phases.

The unknowns are those of `balance` and ln T; the further equation is the energy or entropy
held. Far from the solution the steps in T are kept short; what does not close in a few steps,
or ends beside a change of phases, is left to the bracketed search.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.balance import GasSystem, Vessel, residuals
from solver.core.basis import Basis, component_amounts
from solver.core.cases import Feed
from solver.core.extremes import newton_steps, wild
from solver.core.forced import one_sided
from solver.core.formation import Formation, Formed
from solver.core.mixture import P0, Mixture, R
from solver.core.searches import Searches

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ITERATIONS = 25
_MAX_STEP_T = 0.25  # of ln T
_MAX_STEP = 30.0  # of a component's ln activity
_EXP_LIMIT = 690.0
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
        ln of the gas amount (pressure held) or of p0 V/RT of the volume left to the gas.
    closed : ndarray of bool, shape (cases,)
    """

    T: Array
    log_a: Array
    nu: Array
    closed: NDArray[np.bool_]


def solve_joint(
    mixture: Mixture,
    feed: Feed,
    search: Searches,
    active: Sequence[int],
    basis: Basis,
    T: Array,
    log_a: Array,
    nu: Array,
) -> Joint:
    """Close balances and energy from a start near the solution.

    Parameters
    ----------
    feed : Feed
    search : Searches
        What is held, of the same cases.
    active : sequence of int
        Condensed phases present.
    T, nu : ndarray, shape (cases,)
    log_a : ndarray, shape (cases, components)
    """
    out = Joint(T.copy(), log_a.copy(), nu.copy(), np.zeros(len(T), dtype=bool))
    taken = set(active)
    gas_rows = [k for k, m in enumerate(basis.members) if m not in taken]
    b = component_amounts(feed.amounts, feed.vectors, basis)
    zero = b[:, gas_rows] == 0.0
    patterns = np.unique(zero, axis=0) if zero.any() else zero[:1]
    for pattern in patterns:
        some = np.flatnonzero((zero == pattern).all(axis=1))
        live, rows = np.ones(mixture.gas.size, dtype=bool), list(gas_rows)
        one_sided(basis.reactions[mixture.gas], b[some[0]], live, rows)
        if not rows or not b[some[0], rows].any():
            continue  # no gas, or one that forms at one pressure alone
        group = _Group(mixture, search.of(some), active, basis, b[some], live, rows)
        group.iterate(out, some)
    return out


class _Group:
    """Cases of one set of phases in which the same balances have a total."""

    def __init__(
        self,
        mixture: Mixture,
        search: Searches,
        active: Sequence[int],
        basis: Basis,
        b: Array,
        live: NDArray[np.bool_],
        rows: list[int],
    ) -> None:
        taken = set(active)
        present = np.array([k for k, m in enumerate(basis.members) if m in taken], dtype=np.intp)
        gas = mixture.gas[live]
        self.search, self.rows = search, np.array(rows, dtype=np.intp)
        self.formation = Formation(mixture, basis, gas, present, search.variable)
        phases = np.array(basis.members, dtype=np.intp)[present]
        volume = mixture.volume[phases]
        self.b, self.b_phases = b[:, rows], b[:, present]
        self.room = self.b_phases @ volume  # of the phases if all components were condensed
        self.swelling = basis.reactions[np.ix_(gas, present)] @ volume
        self.shares = search.V is not None and bool(volume.any())
        self.system = GasSystem.of(
            basis.reactions[np.ix_(gas, self.rows)],
            search.p is not None,
            self.swelling if self.shares else None,
        )
        sides = self.system.weights[:, : 2 * self.system.rows]
        self.sides = np.concatenate([sides, np.ones((gas.size, 1))], axis=1)

    def iterate(self, out: Joint, some: Indices) -> None:
        """Newton's method on the cases `some` of `out`."""
        search, m = self.search, len(self.rows)
        index = np.arange(len(some))
        T, nu = out.T[some], out.nu[some]
        log_a = out.log_a[np.ix_(some, self.rows)]
        w = np.zeros(len(some))
        for iteration in range(_MAX_ITERATIONS):
            p = None if search.p is None else search.p[index]
            V = None if search.V is None else search.V[index]
            formed = self.formation.at(T, p)
            b = self.b[index]
            if V is not None and not self.shares:
                nu = np.log(P0 * V / (R * T))
            log_n = log_a @ self.system.reactions.T - formed.kappa + nu[:, None]
            vessel = None
            if V is not None and self.shares:
                unit = R * T / P0
                if iteration == 0:
                    w = np.exp(log_n).sum(axis=1) * np.exp(-nu) / unit
                vessel = Vessel(V - self.room[index], unit, w)
                log_n += (w - 1.0 / unit)[:, None] * self.swelling
            n = np.exp(np.clip(log_n, -_EXP_LIMIT, _EXP_LIMIT))
            with np.errstate(all="ignore"):
                F, J, P, M = residuals(
                    self.system, n, nu, w, np.maximum(-b, 0.0), np.maximum(b, 0.0), vessel
                )
                F_T, heat = self._by_log_T(formed, n, P, M, nu, vessel)
                energy, by_n, by_unknowns, by_T = self._energy(formed, n, log_n, nu, T, p, index)
                off = energy - search.values[index] / R
                steps = newton_steps(J, np.stack([F, F_T], axis=2))
                delta, answer = steps[:, :, 0], steps[:, :, 1]
                slope = np.einsum("ij,ij->i", by_unknowns, answer) + by_T
                slope += np.einsum("ij,ij->i", by_n, heat)
                tau = -(off + np.einsum("ij,ij->i", by_unknowns, delta)) / slope
                unit_of = self.b_phases[index].sum(axis=1) + n.sum(axis=1)
                if search.variable != "S":
                    unit_of = unit_of * T
                worst = np.abs(F).max(axis=1)
                done = (worst <= _CLOSED) & (np.abs(off) <= _CLOSED * unit_of)
                bad = wild(delta) | ~np.isfinite(tau) | ~(slope > 0.0) | ~np.isfinite(worst)
            tau = np.clip(np.where(bad, 0.0, tau), -_MAX_STEP_T, _MAX_STEP_T)
            step = np.where(bad[:, None], 0.0, delta + answer * tau[:, None])
            if vessel is not None:
                step[:, -1] /= w  # densities change by a factor of ten at most
                fall = np.maximum(-step[:, -1], step[:, -1] / 9.0) / 0.9
                step /= np.maximum(fall, 1.0)[:, None]
                tau = tau / np.maximum(fall, 1.0)
            largest = np.abs(step).max(axis=1)
            certain = (largest <= 1e-9) & (np.abs(tau) <= 1e-10) & ~bad
            damp = np.minimum(1.0, _MAX_STEP / np.maximum(largest, 1e-300))
            damp[done] = 0.0
            step *= damp[:, None]
            log_a = log_a + step[:, :m]
            if self.system.extra:
                nu = nu + step[:, m]
            if vessel is not None:
                w = w * (1.0 + step[:, -1])
            T = np.clip(T * np.exp(tau * damp), search.T_low, search.T_high)
            going = ~(done | certain | bad)
            if not going.all():
                ended = ~going
                target = some[index[ended]]
                out.T[target], out.nu[target] = T[ended], nu[ended]
                out.log_a[np.ix_(target, self.rows)] = log_a[ended]
                out.closed[target] = (done | certain)[ended]
                index, T, nu, w, log_a = (x[going] for x in (index, T, nu, w, log_a))
            few = iteration > _TOGETHER and index.size < _STRAGGLERS * len(some)
            if not index.size or few:
                break

    def _by_log_T(
        self,
        formed: Formed,
        n: Array,
        P: Array,
        M: Array,
        nu: Array,
        vessel: Vessel | None,
    ) -> tuple[Array, Array]:
        """Derivatives by ln T of the residuals (cases, unknowns) and of ln n (cases, gas)."""
        system, rows = self.system, self.system.rows
        heat = formed.heat
        if system.extra == 0:
            heat = heat - 1.0
        if vessel is not None:
            heat = heat + self.swelling / vessel.unit[:, None]
        sums = (n * heat) @ self.sides
        F_T = np.empty((len(n), len(self.rows) + system.extra))
        F_T[:, :rows] = sums[:, :rows] / P - sums[:, rows:-1] / M
        if system.extra:
            F_T[:, -1] = sums[:, -1] / n.sum(axis=1)
        if vessel is not None:
            F_T[:, rows - 1] -= np.exp(nu) * vessel.unit / M[:, -1]
            F_T[:, -1] -= 1.0
        return F_T, heat

    def _energy(
        self,
        formed: Formed,
        n: Array,
        log_n: Array,
        nu: Array,
        T: Array,
        p: Array | None,
        index: Indices,
    ) -> tuple[Array, Array, Array, Array]:
        """The variable over R, and its derivatives by ln n, by the unknowns and by ln T."""
        b, N = self.b_phases[index], n.sum(axis=1)
        effect = self.system.effect
        cp = np.einsum("ij,ij->i", n, formed.cp) + np.einsum("ij,ij->i", b, formed.phase_cp)
        own = formed.own
        held = np.einsum("ij,ij->i", b, formed.phase_own)
        variable = self.search.variable
        if variable == "S":
            log_p = np.log(p / P0) - np.log(N) if p is not None else -nu
            partial = own - log_n - log_p[:, None]
            energy = np.einsum("ij,ij->i", n, partial) + held
            by_n = n * partial if p is not None else n * (partial - 1.0)
            by_unknowns = by_n @ effect
            if p is None and self.shares:
                by_unknowns[:, len(self.rows)] += N  # a larger volume at the same amounts
            elif p is None:
                cp = cp - N
            return energy, by_n, by_unknowns, cp
        pressing = np.full(len(T), -P0 / R)  # p v of the phases as H or U counts it
        if variable == "U":
            own, cp = own - 1.0, cp - N
        else:
            assert p is not None
            pressing += p / R
        own = own * T[:, None] - pressing[:, None] * self.swelling
        by_n = n * own
        energy = by_n.sum(axis=1) + T * held + self.room[index] * pressing
        return energy, by_n, by_n @ effect, T * cp
