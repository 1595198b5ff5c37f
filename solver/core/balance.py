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
_CERTAIN = 3e-9  # a last step this small leaves an error of its square
_STALE = 14  # steps forward without halving the sum of squares
# of many cases, the last few are left: they get a nearer start from their neighbours
_TOGETHER, _STRAGGLERS = 7, 0.08
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
    """Columns that turn amounts into all sums a Newton step needs, one matrix product."""

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
        return cls(reactions, extra, swelling, effect, np.concatenate(parts, axis=1))


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
        self.n[index], self.log_a[index] = state.n, state.log_a
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


class State:
    """Unknowns, residuals and slopes of the cases that are still being iterated."""

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
        self.system, self.vessel, self.b, self.nu_limit = system, vessel, b, nu_limit
        self.m, self.rows = m, m + (1 if vessel is not None else 0)
        self.unknowns = m + system.extra
        self.b_up, self.b_down = np.maximum(-b, 0.0), np.maximum(b, 0.0)
        self.log_a, self.nu = log_a.copy(), nu.copy()
        self.w = vessel.w.copy() if vessel is not None else np.zeros(cases)
        self.log_n = log_a @ system.reactions.T - kappa + nu[:, None]
        if vessel is not None:
            self.log_n += (self.w - 1.0 / vessel.unit)[:, None] * system.swelling
        self.n = np.exp(np.clip(self.log_n, -_EXP_LIMIT, _EXP_LIMIT))
        self.last = np.full(cases, np.inf)
        self.merit_last = np.full(cases, np.inf)
        self.too_large = np.zeros(cases, dtype=int)
        self.best = np.full(cases, np.inf)
        self.stale = np.zeros(cases, dtype=int)
        self.step = np.zeros((cases, self.unknowns))
        self.back = np.zeros(cases, dtype=bool)
        self.going = np.ones(cases, dtype=bool)
        self.J = self.F = np.zeros((cases, 0))
        self.settled = np.zeros(cases, dtype=bool)  # by a step small enough
        self.many = cases > 1
        self.lost = np.zeros(cases, dtype=bool)

    def evaluate(self) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """Residuals F and slopes J at the present amounts; which cases are closed or lost."""
        m, rows, unknowns, vessel = self.m, self.rows, self.unknowns, self.vessel
        cut1, cut2 = 2 * rows, 2 * rows + rows * unknowns
        cut3 = cut2 + rows * unknowns
        sums = self.n @ self.system.weights
        P, M = sums[:, :rows], sums[:, rows:cut1]
        P[:, :m] += self.b_up
        M[:, :m] += self.b_down
        J = np.empty((len(P), unknowns, unknowns))
        F = np.empty((len(P), unknowns))
        if vessel is not None:
            free = np.exp(self.nu) * vessel.unit
            P[:, m] += np.maximum(vessel.left, 0.0)
            M[:, m] += np.maximum(-vessel.left, 0.0) + free
        J[:, :rows] = sums[:, cut1:cut2].reshape(-1, rows, unknowns) / P[:, :, None]
        J[:, :rows] -= sums[:, cut2:cut3].reshape(-1, rows, unknowns) / M[:, :, None]
        F[:, :rows] = np.log(P / M)
        if self.system.extra:
            total = sums[:, -1:]
            F[:, -1] = np.log(total[:, 0]) - self.nu
            J[:, -1] = sums[:, cut3:-1] / total
            J[:, -1, m] -= 1.0
            grown = self.nu > self.nu_limit
            self.too_large = (self.too_large + 1) * grown
        if vessel is not None:
            J[:, m, m] -= free / M[:, m]
            F[:, -1] -= np.log(self.w * vessel.unit)
            J[:, -1, -1] -= 1.0 / self.w
        else:
            self._rescale_extremes(P, M, J, F)
        worst = np.abs(F).max(axis=1)
        closed = self.settled | (worst <= _CLOSED) | ((worst <= 1e-11) & (worst >= 0.5 * self.last))
        merit = np.einsum("ij,ij->i", F, F)
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

    def _rescale_extremes(self, P: Array, M: Array, J: Array, F: Array) -> None:
        # faint balances, and those of which one side is cut off where the exponential ends
        faint = (np.maximum(P, M) < _FAINT) | (np.minimum(P, M) < _CUT_OFF)
        plain = self.log_n.max(initial=0.0) <= 300.0 and not faint.any()
        if plain and np.isfinite(F).all():
            return
        over = self.log_n.max(axis=1) > 300.0
        beyond = faint | over[:, None] | ~np.isfinite(F[:, : self.rows])
        if self.many:
            # a start so far off is better given up for a nearer one
            self.lost |= over
            beyond &= ~self.lost[:, None]
        if beyond.any():
            rescale(self.system, self.log_n, self.b, self.nu, beyond, J, F)
        self.J, self.F = J, F
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
                    newton[case] = 0.0 if self.many else shortest(self.J[case], self.F[case])
        if self.vessel is not None:  # densities change by a factor of ten at most
            fall = np.maximum(-newton[:, -1], newton[:, -1] / 9.0) / (0.9 * self.w)
            newton = newton / np.maximum(fall, 1.0)[:, None]
        if some_back:
            # worse than before: return three quarters of the way, and try the rest again
            move = np.where(back[:, None], -0.75 * step, newton)
            step = np.where(back[:, None], 0.25 * step, newton)
        else:
            move = step = newton
        move[~self.going] = 0.0
        size = np.abs(move[:, : m + 1]).max(axis=1)
        if size.max() > _MAX_STEP:
            damp = np.where(back, 1.0, np.minimum(1.0, _MAX_STEP / np.maximum(size, 1e-300)))
            move = move * damp[:, None]
            step = np.where(back[:, None], step, step * damp[:, None])
        self.step = step
        self.log_a += move[:, :m]
        self.log_n += move @ self.system.effect.T
        if self.system.extra:
            self.nu += move[:, m]
        if self.vessel is not None:
            self.w += move[:, -1]
        self.n = np.exp(np.clip(self.log_n, -_EXP_LIMIT, _EXP_LIMIT))
        if self.vessel is not None:
            return np.zeros(len(size), dtype=bool)
        certain: NDArray[np.bool_] = self.going & (size <= _CERTAIN) & ~back
        self.settled = self.settled | certain
        return certain

    def part(self, keep: NDArray[np.bool_]) -> State:
        """The cases that go on."""
        out = object.__new__(State)
        out.__dict__.update(self.__dict__)
        for name, value in self.__dict__.items():
            if isinstance(value, np.ndarray):
                setattr(out, name, value[keep])
        if self.vessel is not None:
            vessel = self.vessel
            out.vessel = Vessel(vessel.left[keep], vessel.unit[keep], vessel.w[keep])
        return out

    def solution(self, closed: NDArray[np.bool_], iterations: int) -> GasSolution:
        """What has been reached."""
        return GasSolution(self.n, self.log_a, self.nu, self.w, closed, iterations)
