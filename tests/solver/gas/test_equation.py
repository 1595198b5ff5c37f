"""The constants of the two equations, from what defines them."""

from __future__ import annotations

import numpy as np
import pytest

from solver.gas.equation import EQUATIONS, FADES_BELOW

BOTH = pytest.mark.parametrize("key", ["srk", "pr"])


@BOTH
def test_critical_point_is_an_inflection(key: str):
    """At Tc and pc the three roots Z are one: the cubic in Z is (Z - Zc)^3."""
    eq = EQUATIONS[key]
    A, B = eq.omega_a, eq.omega_b
    total, product = eq.d1 + eq.d2, eq.d1 * eq.d2
    one = (total - 1.0) * B - 1.0
    two = A + product * B**2 - total * B * (B + 1.0)
    three = -(A * B + product * B**2 * (B + 1.0))
    Zc = -one / 3.0
    assert two == pytest.approx(3.0 * Zc**2, rel=1e-14)
    assert three == pytest.approx(-(Zc**3), rel=1e-14)


def test_constants_as_printed():
    """Soave (1972) prints 0.42747 and 0.08664, Peng and Robinson (1976) 0.45724 and 0.07780."""
    srk, pr = EQUATIONS["srk"], EQUATIONS["pr"]
    assert (round(srk.omega_a, 5), round(srk.omega_b, 5)) == (0.42748, 0.08664)
    assert abs(srk.omega_a - 0.42747) < 1.1e-5
    assert (round(pr.omega_a, 5), round(pr.omega_b, 5)) == (0.45724, 0.07780)
    # m of a fluid with acentric factor 0.3, by hand from the quadratics of the two papers
    assert float(srk.m(np.array(0.3))) == pytest.approx(0.480 + 0.4722 - 0.01584, abs=1e-12)
    assert float(pr.m(np.array(0.3))) == pytest.approx(0.37464 + 0.462678 - 0.0242928, abs=1e-12)


@BOTH
@pytest.mark.parametrize("acentric", [-0.38, -0.22, 0.0, 0.34, 0.9])
def test_attraction_falls_and_never_returns(key: str, acentric: float):
    """alpha(Tc) = 1; as published while it pulls; afterwards it only falls, smoothly."""
    eq = EQUATIONS[key]
    T = np.geomspace(0.3, 300.0, 4000)
    m = eq.m(np.array(acentric))
    value, first, second = eq.root_alpha(T, np.array(1.0), m)
    assert eq.root_alpha(np.array(1.0), np.array(1.0), m)[0] == pytest.approx(1.0, abs=1e-15)
    published = 1.0 + m * (1.0 - np.sqrt(T))
    pulls = published >= FADES_BELOW
    np.testing.assert_allclose(value[pulls], published[pulls], rtol=1e-14)
    assert np.all(value >= 0.0)
    if m > 0.0:
        assert np.all(np.diff(value) <= 0.0)
        assert np.all(value[~pulls] <= FADES_BELOW)
    ends = np.array([0.5, 3.0, 9.0, 20.0, 100.0])
    h = 1e-5
    up, down = (eq.root_alpha(ends * np.exp(s), np.array(1.0), m) for s in (h, -h))
    here = eq.root_alpha(ends, np.array(1.0), m)
    np.testing.assert_allclose((up[0] - down[0]) / (2 * h), here[1], rtol=1e-7, atol=1e-10)
    np.testing.assert_allclose((up[1] - down[1]) / (2 * h), here[2], rtol=1e-7, atol=1e-10)
    assert first.shape == second.shape == T.shape
