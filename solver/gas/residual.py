"""The residual Gibbs energy of a fluid phase as a function of a few moments of its amounts.

With B = M_B / M_0 and A = sum_c w_c M_c^2 / M_0^2,

    F = G_res / RT = M_0 f(A, B),
    f = Z - 1 - ln(Z - B) - A L,      L = ln((Z + d1 B) / (Z + d2 B)) / (B (d1 - d2)).

At a root of the equation of state f does not change with Z at first order, so that the first
derivatives are those at fixed Z. Nothing below divides by A or B: an ideal gas is no special case.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from solver.gas.equation import Equation
from solver.gas.roots import EPS, physical_roots

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

ROOTS = ("least", "vapour", "liquid")
SERIES_BELOW = 0.06
SERIES_TERMS = 14
# of artanh(t) / t = sum y^k / (2 k + 1), y = t^2, and of its first two derivatives by y
SERIES: Array = np.array(
    [
        [1.0 / (2 * k + 1) for k in range(SERIES_TERMS)],
        [(k + 1.0) / (2 * k + 3) for k in range(SERIES_TERMS)],
        [(k + 1.0) * (k + 2) / (2 * k + 5) for k in range(SERIES_TERMS)],
    ]
)


@dataclass(frozen=True)
class Residual:
    """F = G_res / RT of each case and its derivatives by the moments.

    F (cases,) in mol, grad (cases, m) without unit, hess (cases, m, m) in 1/mol, Z (cases,) the
    compressibility factor, two (cases,) whether the equation of state
    has three distinct real roots here. hess @ M = 0 and grad . M = F (F is homogeneous).
    The second derivatives are worked out when first asked for.
    """

    F: Array
    grad: Array
    Z: Array
    two: Flags
    second: Callable[[], Array]

    @cached_property
    def hess(self) -> Array:
        """Second derivatives of F by the moments."""
        return self.second()


def residual_of(M: Array, weights: Array, equation: Equation, root: str) -> Residual:
    """F and its derivatives at moments M (cases, m); weights (m - 2,) of the squares in A.

    root: "vapour", "liquid" (the same where there is one root) or "least", the one of lesser F.
    """
    if root not in ROOTS:
        raise ValueError(f"root {root!r} is none of {', '.join(ROOTS)}")
    empty = M[:, 0] <= 0.0
    total = np.where(empty, 1.0, M[:, 0])
    share = np.where(empty[:, None], 0.0, M / total[:, None])
    B = share[:, 1]
    weighted = weights * share[:, 2:]
    # a mixture of repelling pairs can round to a trace below zero
    A = np.maximum(np.einsum("cj,cj->c", weighted, share[:, 2:]), 0.0)

    roots = physical_roots(A, B, equation)
    x, u = roots.vapour, roots.vapour_below_one
    if root == "liquid":
        x, u = roots.liquid, roots.liquid_below_one
    elif root == "least" and np.any(roots.two):
        liquid = roots.two.copy()
        pick = np.flatnonzero(liquid)
        at = [(roots.vapour, roots.vapour_below_one), (roots.liquid, roots.liquid_below_one)]
        vapour_f, liquid_f = (
            _energy(A[pick], B[pick], xs[pick], us[pick], equation) for xs, us in at
        )
        liquid[pick] = liquid_f < vapour_f
        x = np.where(liquid, roots.liquid, x)
        u = np.where(liquid, roots.liquid_below_one, u)
    return _derivatives(A, B, x, u, total, weighted, weights, empty, roots.two, equation)


def _log(x: Array, u: Array) -> Array:
    """Logarithm of x = 1 + u."""
    return np.where(x > 0.5, np.log1p(np.maximum(u, -0.6)), np.log(x))


def _energy(A: Array, B: Array, x: Array, u: Array, equation: Equation) -> Array:
    """f of the module's head."""
    width = (equation.d1 - equation.d2) * B
    lump = _lump(width / (2.0 * (x + B) + (equation.d1 + equation.d2) * B))[0]
    L = 2.0 * lump / (2.0 * (x + B) + (equation.d1 + equation.d2) * B)
    return u + B - _log(x, u) - A * L


def _lump(t: Array) -> tuple[Array, Array, Array]:
    """artanh(t) / t and its first two derivatives by t^2, for 0 <= t < 1."""
    y = t**2
    series = y < SERIES_BELOW
    # the closed forms would cancel near zero: a power series there
    value, first, second = SERIES @ np.vander(np.where(series, y, 0.0), SERIES_TERMS, True).T
    if not np.all(series):
        far = ~series
        t, y = t[far], y[far]
        a = np.arctanh(t) / t
        a1 = (1.0 / (1.0 - y) - a) / (2.0 * y)
        value[far], first[far] = a, a1
        second[far] = (1.0 / (1.0 - y) ** 2 - 3.0 * a1) / (2.0 * y)
    return value, first, second


def _derivatives(
    A: Array,
    B: Array,
    x: Array,
    u: Array,
    total: Array,
    weighted: Array,
    weights: Array,
    empty: Flags,
    two: Flags,
    equation: Equation,
) -> Residual:
    """F, grad and hess at the root x = Z - B = 1 + u."""
    d_sum, d_product = equation.d1 + equation.d2, equation.d1 * equation.d2
    width2 = (equation.d1 - equation.d2) ** 2
    Z = x + B
    E = 1.0 / (2.0 * Z + d_sum * B)
    D = (Z + equation.d1 * B) * (Z + equation.d2 * B)
    a, a1, a2 = _lump((equation.d1 - equation.d2) * B * E)
    E2 = E**2
    L = 2.0 * E * a
    L_B = E2 * (-2.0 * d_sum * a + 8.0 * width2 * B * Z * E2 * a1)
    f_A, f_B = -L, 1.0 / x - A * L_B
    F_0 = -_log(x, u)
    cases, m = A.size, weights.size + 2
    grad = np.empty((cases, m))
    grad[:, 0], grad[:, 1] = F_0, f_B
    grad[:, 2:] = 2.0 * f_A[:, None] * weighted
    F = total * (F_0 + B * f_B + 2.0 * A * f_A)

    def second() -> Array:
        L_BB = (
            4.0 * d_sum**2 * E * E2 * a
            + 8.0 * width2 * Z * E2**2 * (1.0 - 5.0 * d_sum * B * E) * a1
            + 32.0 * (width2 * B * Z * E2) ** 2 * E2 * E * a2
        )
        # second derivatives at fixed Z, less what Z gives as it follows the root; the leading parts
        # w = 1/x^2 cancel by algebra, not by subtraction
        w = 1.0 / x**2
        beta = A / (E * D**2)
        alpha = A * (d_sum * Z + 2.0 * d_product * B) / D**2
        gamma = A * L_BB
        # zero where the phase is at its limit of stability: kept finite
        stiff = np.maximum(w - beta, EPS * w)
        f_BB = (gamma * beta - alpha**2 - w * (gamma + beta + 2.0 * alpha)) / stiff
        f_AB = -L_B + (w + alpha) / (D * stiff)
        f_AA = -1.0 / (D**2 * stiff)

        per = np.where(empty, 0.0, 1.0 / total)
        along = f_A + B * f_AB + 2.0 * A * f_AA
        hess = np.empty((cases, m, m))
        hess[:, 0, 0] = per * (B * (B * f_BB + 2.0 * A * f_AB) + 2.0 * A * along)
        hess[:, 1, 1] = per * f_BB
        hess[:, 0, 1] = hess[:, 1, 0] = -per * (B * f_BB + 2.0 * A * f_AB)
        hess[:, 1, 2:] = hess[:, 2:, 1] = (2.0 * per * f_AB)[:, None] * weighted
        hess[:, 0, 2:] = hess[:, 2:, 0] = (-2.0 * per * along)[:, None] * weighted
        outer = weighted[:, :, None] * weighted[:, None, :]
        hess[:, 2:, 2:] = (4.0 * per * f_AA)[:, None, None] * outer
        diagonal = np.arange(2, m)
        hess[:, diagonal, diagonal] += (2.0 * per * f_A)[:, None] * weights
        return hess

    return Residual(np.where(empty, 0.0, F), grad, Z, two, second)
