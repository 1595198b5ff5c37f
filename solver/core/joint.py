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

from solver.core.balance import GasSystem, Residuals, Vessel, bounded_exp, residuals
from solver.core.basis import Basis, component_amounts
from solver.core.cases import Feed
from solver.core.extremes import newton_steps, wild
from solver.core.forced import one_sided
from solver.core.formation import Formation, Formed
from solver.core.mixture import P0, Mixture, R
from solver.core.searches import Searches

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

_MAX_ITERATIONS = 25
_MAX_STEP_T, _LARGE = 0.4, 0.15  # of ln T
_MAX_STEP = 30.0  # of a component's ln activity
_CLOSED = 1e-13
_STRAGGLERS, _FEW = 0.1, 4
_TOGETHER = 7


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
        self.b, self.b_phases = b[:, rows].T, b[:, present]
        self.room = self.b_phases @ volume  # of the phases if all components were condensed
        self.swelling = basis.reactions[np.ix_(gas, present)] @ volume
        self.shares = search.V is not None and bool(volume.any())
        self.system = GasSystem.of(
            basis.reactions[np.ix_(gas, self.rows)],
            search.p is not None,
            self.swelling if self.shares else None,
        )
        sides = self.system.weights[: 2 * self.system.rows]
        self.sides = np.concatenate([sides, np.ones((1, gas.size))])

    def iterate(self, out: Joint, some: Indices) -> None:
        """Newton's method on the cases `some` of `out`."""
        search, everyone = self.search, np.arange(len(some))
        at = _At(
            index=everyone,
            search=search,
            b_up=np.maximum(-self.b, 0.0),
            b_down=np.maximum(self.b, 0.0),
            b_phases=self.b_phases,
            room=self.room,
            T=out.T[some],
            nu=out.nu[some],
            w=np.zeros(len(some)),
            last=np.zeros(len(some)),
            reach=np.full(len(some), _MAX_STEP_T),
            log_a=out.log_a[np.ix_(some, self.rows)].T,
        )
        for iteration in range(_MAX_ITERATIONS):
            with np.errstate(all="ignore"):  # infinities are looked for, and given up
                closed, going = self._step(at)
            ended = ~going
            if ended.any():
                target = some[at.index[ended]]
                out.T[target], out.nu[target] = at.T[ended], at.nu[ended]
                out.log_a[np.ix_(target, self.rows)] = at.log_a[:, ended].T
                out.closed[target] = closed[ended]
                at.keep(going)
            few = iteration > _TOGETHER and at.index.size < max(_STRAGGLERS * len(some), _FEW)
            few = few and len(some) > 1
            if not at.index.size or few:
                break

    def _step(self, at: _At) -> tuple[Flags, Flags]:
        """One step of all cases that go on; which are closed by it, and which go on."""
        search, system, m = at.search, self.system, len(self.rows)
        formed = self.formation.at(at.T, search.p)
        if search.V is not None and not self.shares:
            at.nu = np.log(P0 * search.V / (R * at.T))
        log_n = at.log_a.T @ system.reactions.T
        log_n -= formed.kappa
        log_n += at.nu[:, None]
        vessel = self._vessel(at, log_n)
        n = bounded_exp(log_n)
        now = residuals(system, n, at.nu, at.w, at.b_up, at.b_down, vessel)
        sides = np.empty((len(now.F), 2, len(n)))
        sides[:, 0] = now.F
        heat = self._by_log_T(formed, n, now, at.nu, vessel, sides[:, 1])
        energy, by_n, by_unknowns, by_T = self._energy(formed, n, log_n, now.N, at)
        if vessel is not None:  # the density by its logarithm
            now.J[:, -1] *= at.w
            by_unknowns[-1] *= at.w
        off = energy - search.values / R
        steps = newton_steps(now.J, sides)
        delta, answer = steps[:, 0], steps[:, 1]
        slope = (by_unknowns * answer).sum(axis=0) + by_T
        slope += np.einsum("ij,ij->i", by_n, heat)
        tau = -(off + (by_unknowns * delta).sum(axis=0)) / slope
        size = at.b_phases.sum(axis=1) + now.N
        if search.variable != "S":
            size = size * at.T
        worst = np.abs(now.F).max(axis=0)
        done = (worst <= _CLOSED) & (np.abs(off) <= _CLOSED * size)
        bad = wild(delta) | ~np.isfinite(worst)
        # with the balances open the energy says little of T, and may even fall with it
        blind = bad | ~np.isfinite(tau) | ~(slope > 0.0)
        most = at.reach / np.maximum(worst, 1.0)
        tau = np.where(blind, 0.0, np.minimum(np.maximum(tau, -most), most))
        # a step back shows that the last one went too far
        turned = (tau * at.last < 0.0) & (np.abs(tau) > 0.7 * np.abs(at.last))
        turned &= np.abs(at.last) > _LARGE
        if turned.any():
            tau = np.where(turned, -0.5 * at.last, tau)
        at.reach = np.where(turned, np.abs(tau), np.minimum(2.0 * at.reach, _MAX_STEP_T))
        at.last = tau
        step = delta + answer * tau
        if bad.any():
            step[:, bad] = 0.0
        if vessel is not None:
            # densities change by a factor of ten at most
            fall = np.maximum(np.maximum(-step[-1], step[-1] / 9.0) / 0.9, 1.0)
            step, tau = step / fall, tau / fall
        largest = np.abs(step).max(axis=0)
        certain = (largest <= 1e-9) & (np.abs(tau) <= 1e-10) & ~blind
        damp = np.minimum(1.0, _MAX_STEP / np.maximum(largest, 1e-300))
        damp[done] = 0.0
        step *= damp
        at.log_a = at.log_a + step[:m]
        if system.extra:
            at.nu = at.nu + step[m]
        if vessel is not None:
            at.w = at.w * (1.0 + step[-1])
        at.T = np.minimum(np.maximum(at.T * np.exp(tau * damp), search.T_low), search.T_high)
        return done | certain, ~(done | certain | bad)

    def _vessel(self, at: _At, log_n: Array) -> Vessel | None:
        """The vessels, where condensed phases share them; what their pressure adds to ln n."""
        if not self.shares:
            return None
        assert at.search.V is not None
        unit = R * at.T / P0
        if not at.w.any():
            at.w = np.exp(log_n).sum(axis=1) * np.exp(-at.nu) / unit
        log_n += (at.w - 1.0 / unit)[:, None] * self.swelling
        return Vessel(at.search.V - at.room, unit, at.w)

    def _by_log_T(
        self,
        formed: Formed,
        n: Array,
        now: Residuals,
        nu: Array,
        vessel: Vessel | None,
        F_T: Array,
    ) -> Array:
        """Derivatives by ln T of ln n (cases, gas), and into F_T (unknowns, cases) of F."""
        rows, extra = self.system.rows, self.system.extra
        heat = formed.heat
        if extra == 0:
            heat = heat - 1.0
        if vessel is not None:
            heat = heat + self.swelling / vessel.unit[:, None]
        sums = self.sides @ (n * heat).T
        F_T[:rows] = sums[:rows] / now.P - sums[rows:-1] / now.M
        if extra:
            F_T[-1] = sums[-1] / now.N
        if vessel is not None:
            F_T[rows - 1] -= np.exp(nu) * vessel.unit / now.M[-1]
            F_T[-1] -= 1.0
        return heat

    def _energy(
        self, formed: Formed, n: Array, log_n: Array, N: Array, at: _At
    ) -> tuple[Array, Array, Array, Array]:
        """The variable over R, and its derivatives by ln n, by the unknowns and by ln T."""
        b, T, p, effect = at.b_phases, at.T, at.search.p, self.system.effect
        cp = np.einsum("ij,ij->i", n, formed.cp) + np.einsum("ij,ij->i", b, formed.phase_cp)
        held = np.einsum("ij,ij->i", b, formed.phase_own)
        if self.search.variable == "S":
            log_p = np.log(p / P0) - np.log(N) if p is not None else -at.nu
            partial = formed.own - log_n - log_p[:, None]
            energy = np.einsum("ij,ij->i", n, partial) + held
            by_n = n * partial if p is not None else n * (partial - 1.0)
            by_unknowns = effect.T @ by_n.T
            if p is None and self.shares:
                by_unknowns[len(self.rows)] += N  # a larger volume at the same amounts
            elif p is None:
                cp = cp - N
            return energy, by_n, by_unknowns, cp
        pressing = np.full(len(T), -P0 / R)  # on the phases, as H or U counts it
        own = formed.own
        if self.search.variable == "U":
            own, cp = own - 1.0, cp - N
        else:
            assert p is not None
            pressing += p / R
        own = own * T[:, None]
        if self.swelling.any():
            own -= pressing[:, None] * self.swelling
        by_n = n * own
        energy = by_n.sum(axis=1) + T * held + at.room * pressing
        return energy, by_n, effect.T @ by_n.T, T * cp


@dataclass
class _At:
    """The cases that go on, and where they are; `log_a` is (components, cases).

    The `last` step in ln T and the `reach` of the next one are kept beside.
    """

    index: Indices
    search: Searches
    b_up: Array
    b_down: Array
    b_phases: Array
    room: Array
    T: Array
    nu: Array
    w: Array
    last: Array
    reach: Array
    log_a: Array

    def keep(self, going: Flags) -> None:
        """Drop the others."""
        self.search = self.search.of(np.flatnonzero(going))
        for name in ("index", "b_phases", "room", "T", "nu", "w", "last", "reach"):
            setattr(self, name, getattr(self, name)[going])
        for name in ("b_up", "b_down", "log_a"):
            setattr(self, name, getattr(self, name)[:, going])
