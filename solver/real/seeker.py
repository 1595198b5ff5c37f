"""One real case at any T and p: its minimum, its phases followed, and where two coexist."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Feed
from solver.core.minimise import Unsettled
from solver.core.totals import Totals
from solver.real.functions import Response, respond, state_functions
from solver.real.minimise import minimise_real
from solver.real.newton import solve_phases
from solver.real.problem import RealCases, RealMixture
from solver.real.stability import tangent_plane
from solver.real.states import Minima, PhaseSet

Array = NDArray[np.float64]

_ASIDE = (0.0, 1e-7, -1e-6, 1e-5, -1e-4)
_COEXIST_STEPS = 12
_COEXIST_REACH = 0.3  # largest relative change of T or p in one step


@dataclass(frozen=True)
class Ends:
    """One end point: a minimum, or the split of two at one T and p."""

    T: float
    p: float
    fluids: Array  # (slots, gas species)
    n: Array
    potentials: Array
    distance: float
    state: Totals
    answer: Response | None = None
    """How it answers to ln T and ln p; None for a split."""
    chosen: PhaseSet | None = None
    log_a: Array | None = None
    nu: Array | None = None
    theta: Array | None = None
    """Its phases and unknowns, from which its phases can be followed; None for a split."""

    def value(self, name: str) -> float:
        """One state function, or ``p``."""
        return float(getattr(self.state, name)[0])

    def volume_by_log_p(self) -> float:
        """d(ln V)/d(ln p) at fixed T, or zero where it is not known."""
        slope = 0.0 if self.answer is None else float(self.answer.V_p[0]) / self.value("V")
        return slope if np.isfinite(slope) and slope < 0.0 else 0.0

    def by_log_T(self, variable: str, holds_volume: bool) -> float:
        """d(variable)/d(ln T) at fixed p or V, or zero where it is not known."""
        if self.answer is None:
            return 0.0
        H_T, V_T, H_p, V_p = (
            float(getattr(self.answer, k)[0]) for k in ("H_T", "V_T", "H_p", "V_p")
        )
        T, p, V = self.T, self.p, self.value("V")
        slope = {"H": H_T, "U": H_T - p * V_T, "S": H_T / T}[variable]
        if holds_volume:
            by_p = {"H": H_p, "U": H_p - p * (V_p + V), "S": (H_p - V * p) / T}[variable]
            with np.errstate(all="ignore"):
                slope -= by_p * float(np.float64(V_T) / V_p)
        return slope if np.isfinite(slope) and slope > 0.0 else 0.0


class Seeker:
    """Evaluates one case at any T and p, each from the last."""

    def __init__(self, real: RealMixture, feed: Feed) -> None:
        self._real, self._feed = real, feed
        self._last: Minima | None = None

    def near_T(self, T: float, p: float) -> Ends:
        """The minimum at p and T, or close by where phases all but coexist."""
        return self._first([(T * (1.0 + shift), p) for shift in _ASIDE])

    def near_p(self, T: float, p: float) -> Ends:
        """The minimum at T and p, or close by where phases all but coexist."""
        return self._first([(T, p * (1.0 + shift)) for shift in _ASIDE])

    def _first(self, places: list[tuple[float, float]]) -> Ends:
        for T, p in places[:-1]:
            try:
                return self._at(T, p)
            except Unsettled:
                continue
        return self._at(*places[-1])

    def _at(self, T: float, p: float) -> Ends:
        cases = RealCases(self._real, self._feed, np.array([T]), np.array([p]))
        minima = minimise_real(cases, np.zeros((1, 1)), self._last)
        if not minima.found[0] and self._last is not None:
            minima = minimise_real(cases, np.zeros((1, 1)))
        if not minima.found[0]:
            raise minima.why.get(0, Unsettled("a real mixture was not settled"))
        self._last = minima
        state = state_functions(cases, minima.fluids, minima.n)
        chosen = minima.set_of(0)
        answer = respond(cases, chosen, minima.fluids[:, list(chosen.fluids)], minima.n)
        return Ends(
            T,
            p,
            minima.fluids[0],
            minima.n[0],
            minima.potentials[0],
            float(minima.distance[0]),
            state,
            answer,
            chosen,
            minima.log_a[0],
            minima.nu[0],
            minima.theta[0],
        )

    def blend(self, low: Ends, high: Ends, share: float) -> Ends:
        """A split with a share of `high` in it."""
        fluids = (1.0 - share) * low.fluids + share * high.fluids
        n = (1.0 - share) * low.n + share * high.n
        cases = RealCases(self._real, self._feed, np.array([high.T]), np.array([high.p]))
        state = state_functions(cases, fluids[None], n[None])
        distance = min(low.distance, high.distance)
        return Ends(high.T, high.p, fluids, n, high.potentials, distance, state)

    def coexisting(self, first: Ends, second: Ends, by_T: bool) -> tuple[Ends, Ends] | None:
        """Minima of unlike phases brought to the T (else the p) where both are the least.

        There their Gibbs energies are equal; Newton's method on the difference, whose slopes
        are those of entropy and volume. None where no such place is found near by.
        """
        if first.chosen is None or second.chosen is None or not self._excludes(first, second):
            return None
        T, p = 0.5 * (first.T + second.T), float(np.sqrt(first.p * second.p))
        last = np.inf
        for _ in range(_COEXIST_STEPS):
            a, b = self._branch(first, T, p), self._branch(second, T, p)
            if a is None or b is None:
                return None
            gap, apart = a.value("G") - b.value("G"), a.value("V") - b.value("V")
            if abs(apart) <= 1e-6 * abs(b.value("V")):
                return None
            relative = -gap / (p * apart)
            if by_T:
                relative = gap / (T * (a.value("S") - b.value("S")))
            if not abs(relative) < _COEXIST_REACH:
                return None
            if abs(relative) <= 1e-14 or (abs(relative) <= 1e-10 and abs(relative) >= 0.5 * last):
                return self._proven(a, b)
            last = abs(relative)
            T, p = (T * (1.0 + relative), p) if by_T else (T, p * (1.0 + relative))
            first, second = a, b
        return None

    def _excludes(self, first: Ends, second: Ends) -> bool:
        """Whether the phase rule lets both sets of phases be present at one p (or T) alone."""
        a, b = first.chosen, second.chosen
        assert a is not None
        assert b is not None
        phases = len({*a.active, *b.active}) + len({*a.fluids, *b.fluids})
        return phases > self._real.mixture.rank

    def _branch(self, ends: Ends, T: float, p: float) -> Ends | None:
        """The phases of an end followed to another T and p, stable or not."""
        chosen, cases = ends.chosen, RealCases(self._real, self._feed, np.array([T]), np.array([p]))
        assert chosen is not None and ends.log_a is not None  # noqa: PT018
        assert ends.nu is not None and ends.theta is not None  # noqa: PT018
        slots = list(chosen.fluids)
        ((_, solved),) = solve_phases(
            cases, chosen, ends.log_a[None], ends.nu[None, slots], ends.theta[None, slots], 0
        )
        if not solved.closed[0] or not np.isfinite(solved.n).all() or solved.n.min() < 0.0:
            return None
        nu, theta, fluids = ends.nu.copy(), ends.theta.copy(), np.zeros(ends.fluids.shape)
        nu[slots], theta[slots], fluids[slots] = solved.nu[0], solved.theta[0], solved.fluids[0]
        potentials = solved.basis.potentials(solved.mu[0])
        state = state_functions(cases, fluids[None], solved.n)
        parts = (solved.n[0], potentials, ends.distance, state, None, chosen)
        return Ends(T, p, fluids, *parts, solved.log_a[0], nu, theta)

    def _proven(self, a: Ends, b: Ends) -> tuple[Ends, Ends] | None:
        """Both ends with what the tangent-plane test comes to beside all their phases."""
        cases = RealCases(self._real, self._feed, np.array([a.T]), np.array([a.p]))
        force = b.potentials @ cases.mixture.A.T - cases.ideal.c[0]
        condensed = self._real.condensed
        tolerance = 4.0 * float(cases.ideal.force_tolerance[0])
        if condensed.size and force[condensed].max() > tolerance:
            return None
        fluids = np.concatenate([a.fluids, b.fluids])
        present = fluids / np.maximum(fluids.sum(axis=1, keepdims=True), 1e-300)
        d = force[None, cases.gas]
        distance = float(tangent_plane(cases, d, d > -650.0, present[None]).distance[0])
        if distance < -tolerance:
            return None
        return replace(a, distance=distance), replace(b, distance=distance)
