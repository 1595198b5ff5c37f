"""The physical roots of a cubic equation of state, to rounding, for many cases at once.

With x = Z - B and c = 1 + d the equation of state reads

    P(x) = (x - 1)(x + c1 B)(x + c2 B) + A x = 0.

P(0) = -c1 c2 B^2 <= 0 and P(1) = A >= 0, so that there is always a root in (0, 1] and every root
with Z > B lies there. Between its point of inflection and 1 the curve is convex, below it concave:
Newton's method cannot leave the side it starts on.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.gas.equation import Equation

Array = NDArray[np.float64]
MOST_STEPS = 80
EPS = float(np.finfo(float).eps)


@dataclass(frozen=True)
class Roots:
    """x = Z - B of the vapour-like and of the liquid-like root, each (cases,).

    below_one holds x - 1 of both, which keeps its digits where the gas is nearly ideal. two is
    true where three distinct real roots exist; elsewhere vapour and liquid are the same root.
    """

    vapour: Array
    vapour_below_one: Array
    liquid: Array
    liquid_below_one: Array
    two: NDArray[np.bool_]


def physical_roots(A: Array, B: Array, equation: Equation) -> Roots:
    """Roots Z > B of the equation of state; A >= 0, B >= 0 of shape (cases,)."""
    c1, c2 = 1.0 + equation.d1, 1.0 + equation.d2
    total, product = c1 + c2, c1 * c2
    slope0 = product * B**2 - total * B + A  # P'(0)
    bend = (1.0 - total * B) / 3.0
    spread2 = bend**2 - slope0 / 3.0
    spread = np.sqrt(np.maximum(spread2, 0.0))
    right = bend + spread
    # the stationary points multiply to P'(0)/3: no digits lost where the left one is small
    with np.errstate(divide="ignore", invalid="ignore"):
        left = np.where((bend > 0.0) & (spread2 > 0.0), slope0 / (3.0 * right), bend - spread)
    value_left = _value(left, left - 1.0, A, B, c1, c2)
    value_right = _value(right, right - 1.0, A, B, c1, c2)
    two = (spread2 > 0.0) & (left > 0.0) & (value_left > 0.0) & (value_right < 0.0)
    large = (value_right < 0.0) | (value_left <= 0.0) | (left <= 0.0)

    largest, smallest = _analytic(A, B, c1, c2, bend, spread2, spread)
    # Newton from zero on the concave side: below the small root, and close where it is tiny
    with np.errstate(divide="ignore", invalid="ignore"):
        least = np.where(slope0 > 0.0, product * B**2 / slope0, 0.0)
    least = np.minimum(least, left)
    low = np.where(large, np.maximum(right, 0.0), least)
    high = np.where(large, 1.0, left)
    rows = np.flatnonzero(two)
    # the second root of the cases that have two goes along as further rows
    A2, B2, start, lower, upper, safe = (
        np.concatenate([first, second[rows]])
        for first, second in (
            (A, A),
            (B, B),
            (largest, smallest),
            (low, least),
            (high, left),
            (np.where(large, 1.0, least), least),
        )
    )
    x, u = _polished(A2, B2, start, lower, upper, safe, c1, c2)
    cases = A.size
    liquid, liquid_u = x[:cases].copy(), u[:cases].copy()
    liquid[rows], liquid_u[rows] = x[cases:], u[cases:]
    return Roots(x[:cases], u[:cases], liquid, liquid_u, two)


def _value(x: Array, u: Array, A: Array, B: Array, c1: float, c2: float) -> Array:
    """P at x = 1 + u, in the form that cancels nowhere but at its roots."""
    return u * (x + c1 * B) * (x + c2 * B) + A * x


def _analytic(
    A: Array, B: Array, c1: float, c2: float, bend: Array, spread2: Array, spread: Array
) -> tuple[Array, Array]:
    """Largest and smallest real root by formula (Cardano, Viete); the same where there is one.

    With x = bend + y: y^3 - 3 spread2 y + P(bend) = 0.
    """
    offset = _value(bend, bend - 1.0, A, B, c1, c2)
    beyond = 0.25 * offset**2 - spread2**3
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        third = np.arccos(np.clip(-offset / (2.0 * spread**3), -1.0, 1.0)) / 3.0
        lump = np.cbrt(0.5 * np.abs(offset) + np.sqrt(np.maximum(beyond, 0.0)))
        one = -np.sign(offset) * (lump + spread2 / lump)
    single = beyond > 0.0
    largest = np.where(single, one, 2.0 * spread * np.cos(third))
    smallest = np.where(single, one, 2.0 * spread * np.cos(third + 2.0 * np.pi / 3.0))
    return bend + largest, bend + smallest


def _polished(
    A: Array, B: Array, start: Array, low: Array, high: Array, safe: Array, c1: float, c2: float
) -> tuple[Array, Array]:
    """Newton's method inside [low, high] until P is zero to rounding: x and x - 1.

    Where rounding has put the start outside it begins at the end that is safe to begin from: the
    other end may be the stationary point.
    """
    x = np.where((start > low) & (start < high), start, safe)
    u = x - 1.0
    out_x, out_u = x, u
    active: NDArray[np.intp] | None = None
    for _ in range(MOST_STEPS):
        first, second = x + c1 * B, x + c2 * B
        bulk, pull = u * first * second, A * x
        value = bulk + pull
        slope = first * second + u * (first + second) + A
        # beside a double root the slope is rounding too: no step where P is already zero to it
        quiet = (np.abs(value) <= 4.0 * EPS * pull) | (slope <= 0.0)
        step = np.where(quiet, 0.0, value / np.where(quiet, 1.0, slope))
        near_one = x > 0.5
        moved_u = np.clip(u - step, low - 1.0, high - 1.0)
        moved_x = np.clip(x - step, low, high)
        moved = np.where(near_one, np.abs(moved_u - u), np.abs(moved_x - x))
        scale = np.where(near_one, -u, x)
        done = moved <= 1e-12 * scale
        x = np.where(near_one, 1.0 + moved_u, moved_x)
        u = np.where(near_one, moved_u, moved_x - 1.0)
        if active is None:
            out_x, out_u = x, u
        else:
            out_x[active], out_u[active] = x, u
        if np.all(done):
            break
        if np.any(done):
            left = ~done
            active = np.flatnonzero(left) if active is None else active[left]
            out_x, out_u = out_x.copy(), out_u.copy()
            A, B, x, u, low, high = A[left], B[left], x[left], u[left], low[left], high[left]
    return out_x, out_u
