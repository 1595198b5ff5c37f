"""Roots of the cubic: to rounding, whatever A and B."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from solver.gas.equation import EQUATIONS
from solver.gas.roots import physical_roots

BOTH = pytest.mark.parametrize("key", ["srk", "pr"])


def many(seed: int, cases: int = 20000) -> tuple[np.ndarray, np.ndarray]:
    """A and B from 1e-12 to 1e6, half of them where two phases are likely."""
    rng = np.random.default_rng(seed)
    A, B = 10.0 ** rng.uniform(-12, 6, cases), 10.0 ** rng.uniform(-12, 6, cases)
    half = cases // 2
    B[:half] = 10.0 ** rng.uniform(-4, -0.5, half)
    A[:half] = B[:half] * 10.0 ** rng.uniform(0.0, 1.5, half)
    return A, B


@BOTH
def test_every_root_satisfies_the_cubic(key: str):
    eq = EQUATIONS[key]
    A, B = many(1)
    roots = physical_roots(A, B, eq)
    for x, below in (
        (roots.vapour, roots.vapour_below_one),
        (roots.liquid, roots.liquid_below_one),
    ):
        assert np.all((x > 0.0) & (x <= 1.0))
        off = below * (x + (1.0 + eq.d1) * B) * (x + (1.0 + eq.d2) * B) + A * x
        assert np.max(np.abs(off) / (A * x)) < 1e-15
    assert 0.1 < roots.two.mean() < 0.5
    assert np.all(roots.liquid[roots.two] < roots.vapour[roots.two])
    assert np.array_equal(roots.liquid[~roots.two], roots.vapour[~roots.two])


@BOTH
def test_same_roots_as_eigenvalues_of_the_companion_matrix(key: str):
    eq = EQUATIONS[key]
    c1, c2 = 1.0 + eq.d1, 1.0 + eq.d2
    rng = np.random.default_rng(2)
    B = 10.0 ** rng.uniform(-2.0, 0.5, 400)
    A = B * 10.0 ** rng.uniform(0.0, 1.0, 400)
    roots = physical_roots(A, B, eq)
    for i in range(400):
        found = np.roots(
            [1.0, (c1 + c2) * B[i] - 1.0, c1 * c2 * B[i] ** 2 - (c1 + c2) * B[i] + A[i],
             -c1 * c2 * B[i] ** 2]
        )  # fmt: skip
        real = np.sort(found[np.abs(found.imag) < 1e-9].real)
        real = real[real > 0.0]
        assert roots.vapour[i] == pytest.approx(real[-1], rel=1e-9)
        assert roots.liquid[i] == pytest.approx(real[0], rel=1e-9)
        assert roots.two[i] == (real.size == 3)


@BOTH
def test_nearly_ideal_gas_keeps_its_digits(key: str):
    """x - 1 = -A + ...: to rounding where A is 1e-12, for rational A and B exactly summed."""
    eq = EQUATIONS[key]
    c = Fraction(1) + Fraction(eq.d1), Fraction(1) + Fraction(eq.d2)
    for A, B in ((2.0**-40, 2.0**-41), (2.0**-60, 2.0**-39), (2.0**-20, 2.0**-22)):
        below = physical_roots(np.array([A]), np.array([B]), eq).vapour_below_one[0]
        exact = Fraction(below)
        for _ in range(3):  # Newton in rational numbers
            x = 1 + exact
            first, second = x + c[0] * Fraction(B), x + c[1] * Fraction(B)
            value = exact * first * second + Fraction(A) * x
            gradient = first * second + exact * (first + second) + Fraction(A)
            exact -= value / gradient
        assert abs(float(Fraction(below) / exact - 1)) < 1e-15


@BOTH
def test_triple_root_and_its_neighbourhood(key: str):
    """At the critical point the cubic is (Z - Zc)^3: rounding to the power 1/3 is the limit."""
    eq = EQUATIONS[key]
    rng = np.random.default_rng(3)
    off = 10.0 ** rng.uniform(-17.0, -3.0, (2, 3000)) * rng.choice([-1.0, 1.0], (2, 3000))
    A, B = eq.omega_a * (1.0 + off[0]), eq.omega_b * (1.0 + off[1])
    roots = physical_roots(A, B, eq)
    Zc = (1.0 - (eq.d1 + eq.d2 - 1.0) * eq.omega_b) / 3.0
    away = 3.0 * np.cbrt(np.abs(off).max(axis=0) + 3e-16)
    assert np.all(np.abs(roots.vapour + B - Zc) < away)
    assert np.all(np.abs(roots.liquid + B - Zc) < away)


@BOTH
def test_no_pressure_and_no_attraction(key: str):
    eq = EQUATIONS[key]
    roots = physical_roots(np.array([0.0, 0.0, 1e-300]), np.array([0.0, 3.0, 1e-300]), eq)
    np.testing.assert_array_equal(roots.vapour, 1.0)
    assert not roots.two.any()


@BOTH
def test_no_case_depends_on_its_neighbours(key: str):
    eq = EQUATIONS[key]
    A, B = many(4, 200)
    together = physical_roots(A, B, eq)
    for i in range(0, 200, 7):
        alone = physical_roots(A[i : i + 1], B[i : i + 1], eq)
        assert alone.vapour[0] == together.vapour[i]
        assert alone.liquid[0] == together.liquid[i]
