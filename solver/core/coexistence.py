"""Forms of one make that share a sealed vessel: their temperature and pressure in one solution.

While ice melts in a vessel beside air, the condensed volume changes, the pressure of the air
with it, and with the pressure the melting point: both forms are present over a sliver of
temperatures too narrow to be searched. With the energy or entropy held the state is a plain
root all the same. Its unknowns are those of `balance` with the logarithm of T, p, and the
amounts of the phases that the other condensed ones could make up; its equations are the
balances, the size of the gas, the volume, the energy, and the equilibrium of each such phase
with those that make it up.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis, choose_members, component_amounts
from solver.core.cases import Feed
from solver.core.forced import Sink, one_sided
from solver.core.mixture import P0, Mixture, R
from solver.core.phaseset import sink

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_ITERATIONS = 40
_MAX_STEP = 3.0  # of a potential or a logarithm
_MAX_STEP_T = 0.02  # of ln T
_CLOSED = 1e-12
_FORCE = 1e-12  # ln activity of an absent phase, over the largest potential


@dataclass(frozen=True)
class Sealed:
    """A state of the vessel.

    Attributes
    ----------
    T, p : float
        K, Pa.
    n : ndarray, shape (species,)
        mol.
    potentials : ndarray, shape (rows,)
        Element potentials over RT.
    """

    T: float
    p: float
    n: Array
    potentials: Array


def coexist(
    mixture: Mixture,
    feed: Feed,
    phases: tuple[int, ...],
    variable: str,
    value: float,
    V: float,
    start: Sealed,
) -> Sealed | None:
    """The state of a vessel with all of `phases` in it.

    Parameters
    ----------
    phases : tuple of int
        Condensed species, more of them than their balances are independent.
    variable : str
        "U" or "S".
    value, V : float
        What is held, J or J/K, and m3.
    start : Sealed
        A state nearby.

    Returns
    -------
    Sealed or None
        None where these phases do not share the vessel, or are not found to.
    """
    if mixture.shifts or mixture.twins or not start.p > 0.0:
        return None  # restricted so, or empty of gas: rare enough to be left to the search
    gases = mixture.gas[np.argsort(-start.n[mixture.gas], kind="stable")]
    order = [*phases, *gases.tolist(), *mixture.condensed.tolist()]
    chosen = choose_members(mixture.A, order, mixture.rank)
    if set(phases) <= set(chosen):
        return None
    basis = mixture.basis(chosen)
    b = component_amounts(feed.amounts, feed.vectors, basis)[0]
    taken = set(phases)
    rows = [k for k, m in enumerate(basis.members) if m not in taken]
    live = np.ones(mixture.gas.size, dtype=bool)
    sinks = one_sided(basis.reactions[mixture.gas], b, live, rows)
    vessel = _Vessel(mixture, basis, b, phases, rows, mixture.gas[live], variable, value, V)
    with np.errstate(all="ignore"):  # what is not finite is not taken
        found = vessel.solve(start)
    return None if found is None else vessel.taken(*found, sinks)


class _Vessel:
    """The equations of one vessel and their slopes.

    The unknowns in order: potentials of the gas components, ln(p0 Vgas/RT), p, ln T, and the
    amounts of the phases that are no components.
    """

    def __init__(
        self,
        mixture: Mixture,
        basis: Basis,
        b: Array,
        phases: tuple[int, ...],
        rows: list[int],
        gas: Indices,
        variable: str,
        value: float,
        V: float,
    ) -> None:
        self.mixture, self.basis, self.b, self.rows = mixture, basis, b, rows
        self.variable, self.value, self.V = variable, value, V
        self.gas = gas
        own = [k for k, m in enumerate(basis.members) if m in set(phases)]
        self.own, self.members = own, [basis.members[k] for k in own]
        self.extra = [i for i in phases if i not in set(basis.members)]
        self.by_gas = basis.reactions[self.gas][:, rows]
        self.of_own = basis.reactions[self.gas][:, own]
        self.extra_of_own = basis.reactions[self.extra][:, own]
        self.condensed = [*self.members, *self.extra]

    def solve(self, start: Sealed) -> tuple[Array, Array] | None:
        """Newton's method from a start nearby: the unknowns, and the amounts (species,)."""
        mixture, rows = self.mixture, self.rows
        mu = mixture.A[list(self.basis.members)] @ start.potentials
        room = self.V - float(start.n @ mixture.volume)
        nu = np.log(max(room, 1e-12 * self.V) * P0 / (R * start.T))
        x = np.concatenate([mu[rows], [nu, start.p, np.log(start.T)], start.n[self.extra]])
        m, last = len(rows), np.inf
        if not self.gas.size:
            x[m] = 0.0
        for _ in range(_MAX_ITERATIONS):
            F, J, n = self._equations(x)
            worst = float(np.abs(F).max())
            if not np.isfinite(worst):
                return None
            if worst <= _CLOSED and (worst <= 1e-15 or worst >= 0.3 * last):
                return x, n
            last = worst
            try:
                step = -np.linalg.solve(J, F)
            except np.linalg.LinAlgError:
                return None
            damp = np.abs(step[: m + 1]).max() / _MAX_STEP
            damp = max(damp, abs(step[m + 2]) / _MAX_STEP_T, -step[m + 1] / (0.9 * x[m + 1]), 1.0)
            x = x + step / damp
        return None

    def _equations(self, x: Array) -> tuple[Array, Array, Array]:
        """Residuals, their slopes, and the amounts (species,)."""
        mixture, gas, own, extra = self.mixture, self.gas, self.members, self.extra
        m, count = len(self.rows), len(x)
        mu_gas, nu, p, T = x[:m], x[m], x[m + 1], float(np.exp(x[m + 2]))
        at_nu, at_p, at_T = m, m + 1, m + 2
        g, h, cp = (part[0] for part in mixture.thermo.over(np.array([T])))
        v, RT = mixture.volume, R * T
        press = (p - P0) / RT
        mu = g[own] + v[own] * press
        # ln of the gas amounts and their slopes by all unknowns
        log_y = self.by_gas @ mu_gas + self.of_own @ mu - g[gas]  # of partial pressures over p0
        D = np.zeros((gas.size, count))
        D[:, :m] = self.by_gas
        D[:, at_nu] = 1.0
        D[:, at_p] = self.of_own @ v[own] / RT
        D[:, at_T] = h[gas] - self.of_own @ (h[own] + v[own] * press)
        n_gas = np.exp(np.minimum(log_y + nu, 600.0))
        n_extra = x[m + 3 :]
        n_own = self.b[self.own] - n_gas @ self.of_own - n_extra @ self.extra_of_own
        by_gas = n_gas[:, None] * D
        by_condensed = np.zeros((len(self.condensed), count))
        by_condensed[: len(own)] = -(self.of_own.T @ by_gas)
        by_condensed[: len(own), m + 3 :] = -self.extra_of_own.T
        by_condensed[len(own) :, m + 3 :] = np.eye(len(extra))
        condensed = self.condensed
        n_condensed = np.concatenate([n_own, n_extra])
        N = float(n_gas.sum())
        F, J = np.zeros(count), np.zeros((count, count))
        for k, row in enumerate(self.rows):
            column, total = self.by_gas[:, k], self.b[row]
            up, down = np.maximum(column, 0.0), np.maximum(-column, 0.0)
            P, M = n_gas @ up + max(-total, 0.0), n_gas @ down + max(total, 0.0)
            F[k] = np.log(P / M)
            J[k] = up @ by_gas / P - down @ by_gas / M
        # the size of the gas and the volume
        room = np.exp(nu) * RT / P0
        if gas.size:
            F[at_nu] = np.log(N) - nu - np.log(p / P0)
            J[at_nu] = by_gas.sum(axis=0) / N
            J[at_nu, at_nu] -= 1.0
            J[at_nu, at_p] -= 1.0 / p
        else:
            room, J[at_nu, at_nu] = 0.0, 1.0
        F[at_p] = (room + n_condensed @ v[condensed] - self.V) / self.V
        J[at_p] = v[condensed] @ by_condensed / self.V
        J[at_p, [at_nu, at_T]] += room / self.V
        # the energy or entropy
        size = float(n_gas.sum() + np.abs(n_condensed).sum())
        if self.variable == "U":
            each_gas, each = h[gas] - 1.0, h[condensed] - P0 * v[condensed] / RT
            X = RT * (n_gas @ each_gas + n_condensed @ each)
            by_T = n_gas @ (cp[gas] - 1.0) + n_condensed @ cp[condensed]
            unit = RT * size
            slope = RT * (each_gas @ by_gas + each @ by_condensed)
            slope[at_T] += RT * by_T
        else:
            each_gas, each = h[gas] - g[gas] - log_y, (h - g)[condensed]
            X = R * (n_gas @ each_gas + n_condensed @ each)
            unit = R * size
            slope = R * (each_gas @ by_gas + each @ by_condensed)
            slope -= R * (n_gas @ D)
            slope[at_nu] += R * N
            slope[at_T] += R * (n_gas @ cp[gas] + n_condensed @ cp[condensed])
        F[at_T], J[at_T] = (X - self.value) / unit, slope / unit
        # each further phase with those that make it up
        k = m + 3
        made = self.extra_of_own
        F[k:] = g[extra] + v[extra] * press - made @ mu
        J[k:, at_p] = (v[extra] - made @ v[own]) / RT
        J[k:, at_T] = -(h[extra] + v[extra] * press - made @ (h[own] + v[own] * press))
        n = np.zeros(len(mixture.species))
        n[gas], n[condensed] = n_gas, n_condensed
        return F, J, n

    def taken(self, x: Array, n: Array, sinks: list[Sink]) -> Sealed | None:
        """The solution, unless an amount is negative or a phase that is absent would form."""
        mixture, m = self.mixture, len(self.rows)
        T, p = float(np.exp(x[m + 2])), float(x[m + 1])
        g = mixture.thermo.over(np.array([T]))[0][0] + mixture.volume * ((p - P0) / (R * T))
        mu = g[list(self.basis.members)].copy()
        mu[self.rows] = x[:m]
        sink(g[None, :], mu[None, :], sinks, self.basis, self.gas)
        force = self.basis.reactions @ mu - g
        others = np.setdiff1d(mixture.condensed, self.condensed)
        highest = float(force[others].max(initial=-np.inf))
        if n.min() < 0.0 or highest > _FORCE * (1.0 + float(np.abs(g).max())):
            return None
        return Sealed(T, p, n, self.basis.potentials(mu))
