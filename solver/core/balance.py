"""Newton's method on the logarithm of the gas balances, many cases at once.

For given condensed phases the gas amounts follow from one unknown l_k per gas component and
one for the size of the gas:

    ln n_i = sum_k a'_ik l_k - kappa_i + nu

Each balance sum_i a'_ik n_i = b'_k is split into its positive and its negative terms, P_k and
M_k, and solved as ln P_k - ln M_k = 0. Where one species dominates each side the equation is
exactly linear in log_a, so that amounts which start wrong by e^100 are right after one step; near
the solution it is an ordinary Newton method, quadratic.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.extremes import newton_steps, rescale, shortest, wild

Array = NDArray[np.float64]

_MAX_ITERATIONS = 80
_MAX_STEP = 300.0  # largest change of a component's ln activity in one step
_CLOSED = 2e-14
_EXP_LIMIT = 690.0
_FAINT, _CUT_OFF = 1e-250, 1e-295
_CASES_FIRST = ("n", "log_n")  # of the arrays of a State
_CERTAIN = 3e-9  # a last step this small leaves an error of its square
_STALE = 14  # steps forward without halving the sum of squares
# of many cases, the last few are left: they get a nearer start from their neighbours
_TOGETHER, _STRAGGLERS = 7, 0.08
_NEAR = 0.1  # residual of a start worth keeping
_PATIENCE = 6  # iterations that a gas may be larger than its feed


@dataclass(frozen=True)
class GasSystem:
    """What the cases of one batch share.

    The gas is held in one of three ways. At a pressure, its size nu = ln N is unknown. In a
    volume, nu = ln(p0 V/RT) is given. In a vessel that condensed phases share, the volume
    left to the gas and the pressure upon those phases are unknown too.

    Attributes
    ----------
    reactions : ndarray, shape (gas species, gas components)
    extra : int
        Unknowns beyond the components' activities: 1 at a pressure, 0 in a volume, 2 in a
        shared vessel (nu and the molar density w = p/RT).
    swelling : ndarray, shape (gas species,)
        Condensed volume used up by a mole of each gas species, m3/mol.
    """

    reactions: Array
    extra: int
    swelling: Array
    effect: Array
    weights: Array
    """Rows that turn amounts into all sums a Newton step needs, one matrix product."""

    @property
    def rows(self) -> int:
        """Balances: one for each component, and one for the volume of a shared vessel."""
        return int(self.reactions.shape[1]) + (1 if self.extra == 2 else 0)

    @classmethod
    def of(cls, reactions: Array, holds_pressure: bool, swelling: Array | None = None) -> GasSystem:
        """Gather the weights of one set of components; `swelling` for a shared vessel."""
        species, m = reactions.shape
        extra = 1 if holds_pressure else (0 if swelling is None else 2)
        sides, effect = reactions, np.ones((species, m + extra))
        effect[:, :m] = reactions
        if swelling is not None:
            effect[:, m + 1] = swelling
            sides = np.column_stack([reactions, swelling])
        up, down = np.maximum(sides, 0.0), np.maximum(-sides, 0.0)
        slopes_up = (up[:, :, None] * effect[:, None, :]).reshape(species, -1)
        slopes_down = (down[:, :, None] * effect[:, None, :]).reshape(species, -1)
        parts = [up, down, slopes_up, slopes_down, effect, np.ones((species, 1))]
        if swelling is None:
            swelling = np.zeros(species)
        weights = np.ascontiguousarray(np.concatenate(parts, axis=1).T)
        return cls(reactions, extra, swelling, effect, weights)


@dataclass(frozen=True)
class Vessel:
    """The cases' shared vessels.

    Attributes
    ----------
    left : ndarray, shape (cases,)
        Vessel less the condensed volume when all components are condensed, m3; any sign.
    unit : ndarray, shape (cases,)
        RT/p0, m3/mol.
    w : ndarray, shape (cases,)
        Start of the molar density p/RT, mol/m3; kappa refers to the standard pressure.
    """

    left: Array
    unit: Array
    w: Array


@dataclass(frozen=True)
class GasSolution:
    """Solution of many cases.

    Attributes
    ----------
    n : ndarray, shape (cases, gas species)
    log_a : ndarray, shape (cases, gas components)
    nu, w : ndarray, shape (cases,)
    closed : ndarray of bool, shape (cases,)
    """

    n: Array
    log_a: Array
    nu: Array
    w: Array
    closed: NDArray[np.bool_]
    iterations: int

    def put(self, index: NDArray[np.intp], state: State) -> None:
        """Fill in the cases that were iterated on."""
        self.n[index], self.log_a[index] = state.n, state.log_a.T
        self.nu[index], self.w[index] = state.nu, state.w


def solve_balances(
    system: GasSystem,
    kappa: Array,
    b: Array,
    log_a: Array,
    nu: Array,
    nu_limit: Array,
    vessel: Vessel | None = None,
) -> GasSolution:
    """Solve the balances from the start (log_a, nu).

    Parameters
    ----------
    system : GasSystem
    kappa : ndarray, shape (cases, gas species)
        Minus ln K of each species' formation from the components.
    b : ndarray, shape (cases, gas components)
        Component amounts, mol; any sign.
    log_a, nu : ndarray, shape (cases, gas components) and (cases,)
        Start: ln of the components' mole fractions and ln of the gas amount (at a
        pressure), or of p0 V/RT (in a volume; then log_a is ln of p_k/p0).
    nu_limit : ndarray, shape (cases,)
        A gas grown beyond this cannot be fed by the case: the case stops unclosed.
    vessel : Vessel, optional
        Where condensed phases share the volume.
    """
    cases, m = b.shape
    state = State(system, kappa, b, log_a, nu, nu_limit, vessel)
    if m + system.extra == 0:
        return state.solution(np.ones(cases, dtype=bool), 0)
    with np.errstate(all="ignore"):  # infinities are looked for, and mended or given up
        return _iterate(state, cases)


def _iterate(state: State, cases: int) -> GasSolution:
    whole = None  # results of all cases, once some have been set aside
    index = np.arange(cases)
    closed_all = np.zeros(cases, dtype=bool)
    iteration = 0
    while iteration < _MAX_ITERATIONS:
        iteration += 1
        closed, failed = state.evaluate()
        closed_all[index] = closed & ~failed
        going = state.going
        count = int(going.sum())
        if count == 0 or (iteration > _TOGETHER and count < _STRAGGLERS * cases):
            break
        if count <= 0.7 * len(index):
            if whole is None:
                whole = state.solution(closed_all, iteration)
            else:
                whole.put(index, state)
            state, index = state.part(going), index[going]
        closed_all[index] |= state.advance()
        if closed_all[index].all():
            break
    if whole is None:
        return state.solution(closed_all, iteration)
    whole.put(index, state)
    return whole


@dataclass(frozen=True)
class Residuals:
    """How far balances are from being met. The cases come last: short sums then run fast.

    Attributes
    ----------
    F : ndarray, shape (unknowns, cases)
        Logarithm of the ratio of the two sides.
    J : ndarray, shape (unknowns, unknowns, cases)
        Slopes.
    P, M : ndarray, shape (balances, cases)
        Positive and negative terms.
    N : ndarray, shape (cases,)
        Gas amount.
    """

    F: Array
    J: Array
    P: Array
    M: Array
    N: Array


def residuals(
    system: GasSystem,
    n: Array,
    nu: Array,
    w: Array,
    b_up: Array,
    b_down: Array,
    vessel: Vessel | None,
) -> Residuals:
    """Evaluate the balances.

    Parameters
    ----------
    n : ndarray, shape (cases, gas species)
    nu, w : ndarray, shape (cases,)
    b_up, b_down : ndarray, shape (gas components, cases)
        What the component amounts add to the positive and the negative terms.
    vessel : Vessel, optional
        Where condensed phases share the volume.
    """
    rows, m, count = system.rows, len(b_up), len(n)
    unknowns = m + system.extra
    cut1, cut2 = 2 * rows, 2 * rows + rows * unknowns
    cut3 = cut2 + rows * unknowns
    sums = system.weights @ n.T
    P, M, N = sums[:rows], sums[rows:cut1], sums[-1]
    P[:m] += b_up
    M[:m] += b_down
    J = np.empty((unknowns, unknowns, count))
    F = np.empty((unknowns, count))
    if vessel is not None:
        free = np.exp(nu) * vessel.unit
        P[m] += np.maximum(vessel.left, 0.0)
        M[m] += np.maximum(-vessel.left, 0.0) + free
    np.divide(sums[cut1:cut2].reshape(rows, unknowns, count), P[:, None], out=J[:rows])
    J[:rows] -= sums[cut2:cut3].reshape(rows, unknowns, count) / M[:, None]
    F[:rows] = np.log(P / M)
    if system.extra:
        F[-1] = np.log(N) - nu
        J[-1] = sums[cut3:-1] / N
        J[-1, m] -= 1.0
    if vessel is not None:
        J[m, m] -= free / M[m]
        F[-1] -= np.log(w * vessel.unit)
        J[-1, -1] -= 1.0 / w
    return Residuals(F, J, P, M, N)


def nearer_start(
    system: GasSystem, kappa: Array, b: Array, log_a: Array, nu: Array, given: Array, vessel: Vessel
) -> tuple[Array, Vessel]:
    """The size and density of a neighbour's gas, where its start all but meets the balances.

    Parameters
    ----------
    kappa, b, log_a : ndarray
        As for `solve_balances`.
    nu : ndarray, shape (cases,)
        ln of p0 V/RT as if the condensed phases took no room: the start from afar.
    given : ndarray, shape (cases,)
        That of the neighbour, or what is no such thing.
    """
    if not np.isfinite(given).all() or np.abs(given).max(initial=0.0) > _EXP_LIMIT:
        return nu, vessel
    with np.errstate(all="ignore"):
        log_n = log_a @ system.reactions.T - kappa + given[:, None]
        w = bounded_exp(log_n).sum(axis=1) * np.exp(-given) / vessel.unit
        log_n += (w - 1.0 / vessel.unit)[:, None] * system.swelling
        up, down = np.maximum(-b.T, 0.0), np.maximum(b.T, 0.0)
        F = residuals(system, bounded_exp(log_n), given, w, up, down, vessel).F
        near = np.abs(F).max(axis=0) < _NEAR
    w = np.where(near, w, vessel.w)
    return np.where(near, given, nu), Vessel(vessel.left, vessel.unit, w)


def bounded_exp(log_n: Array) -> Array:
    """Amounts from their logarithms, kept inside the range of floating point."""
    n = np.clip(log_n, -_EXP_LIMIT, _EXP_LIMIT)
    return np.exp(n, out=n)


class State:
    """Unknowns, residuals and slopes of the cases that are still being iterated.

    But for the amounts, the cases come last.
    """

    def __init__(
        self,
        system: GasSystem,
        kappa: Array,
        b: Array,
        log_a: Array,
        nu: Array,
        nu_limit: Array,
        vessel: Vessel | None,
    ) -> None:
        cases, m = b.shape
        self.system, self.vessel, self.b, self.nu_limit = system, vessel, b.T, nu_limit
        self.m, self.rows, self.unknowns = m, system.rows, m + system.extra
        self.b_up, self.b_down = np.maximum(-self.b, 0.0), np.maximum(self.b, 0.0)
        self.log_a, self.nu = log_a.T.copy(), nu.copy()
        self.w = vessel.w.copy() if vessel is not None else np.zeros(cases)
        self.log_n = log_a @ system.reactions.T - kappa + nu[:, None]
        if vessel is not None:
            self.log_n += (self.w - 1.0 / vessel.unit)[:, None] * system.swelling
        self.n = bounded_exp(self.log_n)
        self.last = np.full(cases, np.inf)
        self.merit_last = np.full(cases, np.inf)
        self.too_large = np.zeros(cases, dtype=int)
        self.best = np.full(cases, np.inf)
        self.stale = np.zeros(cases, dtype=int)
        self.step = np.zeros((self.unknowns, cases))
        self.back = np.zeros(cases, dtype=bool)
        self.going = np.ones(cases, dtype=bool)
        self.J = self.F = np.zeros((0, cases))
        self.settled = np.zeros(cases, dtype=bool)  # by a step small enough
        self.many = cases > 1
        self.lost = np.zeros(cases, dtype=bool)

    def evaluate(self) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Residuals F and slopes J at the present amounts; which cases are closed or lost."""
        now = residuals(self.system, self.n, self.nu, self.w, self.b_up, self.b_down, self.vessel)
        F, J = now.F, now.J
        if self.system.extra:
            grown = self.nu > self.nu_limit
            self.too_large = (self.too_large + 1) * grown
        if self.vessel is None:
            self._rescale_extremes(now)
        worst = np.abs(F).max(axis=0)
        closed = self.settled | (worst <= _CLOSED) | ((worst <= 1e-11) & (worst >= 0.5 * self.last))
        merit = (F * F).sum(axis=0)
        far = worst > 1e-8
        self.back = (merit > self.merit_last) & far
        better = merit < 0.5 * self.best
        self.stale = (self.stale + ~self.back) * ~better
        self.best = np.where(better, merit, self.best)
        failed = ~np.isfinite(worst) | (self.too_large > _PATIENCE) | ((self.stale > _STALE) & far)
        failed |= self.lost
        failed &= ~self.settled
        if self.back.any():
            self.merit_last = np.where(self.back, self.merit_last, merit)
            self.last = np.where(self.back, self.last, worst)
        else:
            self.merit_last, self.last = merit, worst
        self.going = ~(closed | failed)
        self.J, self.F = J, F
        return closed, failed

    def _rescale_extremes(self, now: Residuals) -> None:
        P, M, F, J = now.P, now.M, now.F, now.J
        # faint balances, and those of which one side is cut off where the exponential ends
        faint = (np.maximum(P, M) < _FAINT) | (np.minimum(P, M) < _CUT_OFF)
        plain = self.log_n.max(initial=0.0) <= 300.0 and not faint.any()
        if plain and np.isfinite(F).all():
            return
        over = self.log_n.max(axis=1) > 300.0
        beyond = faint | over | ~np.isfinite(F[: self.rows])
        if self.many:
            # a start so far off is better given up for a nearer one
            self.lost |= over
            beyond &= ~self.lost
        if beyond.any():
            rescale(self.system, self.log_n, self.b, self.nu, beyond, J, F)
        J[~np.isfinite(J)] = 0.0

    def advance(self) -> NDArray[np.bool_]:
        """One Newton step; where the last one made matters worse, back along it instead.

        Returns which cases are closed by it for certain.
        """
        m, back, step = self.m, self.back, self.step
        some_back = bool(back.any())
        newton = step
        if not (some_back and back.all()):
            newton = newton_steps(self.J, self.F)
            off = wild(newton)
            if off.any():
                self.lost |= off & self.many
                for case in np.flatnonzero(off):
                    newton[:, case] = (
                        0.0 if self.many else shortest(self.J[:, :, case], self.F[:, case])
                    )
        if self.vessel is not None:  # densities change by a factor of ten at most
            fall = np.maximum(-newton[-1], newton[-1] / 9.0) / (0.9 * self.w)
            newton = newton / np.maximum(fall, 1.0)
        if some_back:
            # worse than before: return three quarters of the way, and try the rest again
            move = np.where(back, -0.75 * step, newton)
            step = np.where(back, 0.25 * step, newton)
        else:
            move = step = newton
        move[:, ~self.going] = 0.0
        size = np.abs(move[: m + 1]).max(axis=0)
        if size.max() > _MAX_STEP:
            damp = np.where(back, 1.0, np.minimum(1.0, _MAX_STEP / np.maximum(size, 1e-300)))
            move = move * damp
            step = np.where(back, step, step * damp)
        self.step = step
        self.log_a += move[:m]
        self.log_n += move.T @ self.system.effect.T
        if self.system.extra:
            self.nu += move[m]
        if self.vessel is not None:
            self.w += move[-1]
        self.n = bounded_exp(self.log_n)
        certain: NDArray[np.bool_] = self.going & (size <= _CERTAIN) & ~back
        if self.vessel is not None:
            # where little room is left to the gas, small steps say less
            roomy = self.vessel.left > 0.5 * np.exp(self.nu) * self.vessel.unit
            certain &= roomy & (np.abs(move[-1]) <= _CERTAIN * self.w)
        self.settled = self.settled | certain
        return certain

    def part(self, keep: NDArray[np.bool_]) -> State:
        """The cases that go on."""
        out = object.__new__(State)
        out.__dict__.update(self.__dict__)
        for name, value in self.__dict__.items():
            if isinstance(value, np.ndarray):
                setattr(out, name, value[keep] if name in _CASES_FIRST else value[..., keep])
        if self.vessel is not None:
            vessel = self.vessel
            out.vessel = Vessel(vessel.left[keep], vessel.unit[keep], vessel.w[keep])
        return out

    def solution(self, closed: NDArray[np.bool_], iterations: int) -> GasSolution:
        """What has been reached."""
        return GasSolution(self.n, self.log_a.T.copy(), self.nu, self.w, closed, iterations)
