"""Laws that tie the properties of a fluid to one another, whatever its equation of state."""

from __future__ import annotations

import numpy as np
import pytest

from solver.gas.properties import (
    dlnphi_dn,
    dlnphi_dp,
    dlnphi_dT,
    ln_phi,
    residual_properties,
)
from species_db.species import R
from tests.solver.gas.states import MIXED, PAIRS, fluid_of, random_states, slope

BOTH = pytest.mark.parametrize("key", ["srk", "pr"])
# a root that comes or goes within the step of a difference spoils it; not more states than this
SPOILT = 0.04


def compare(numeric: np.ndarray, exact: np.ndarray, scale: np.ndarray) -> None:
    off = np.abs(numeric - exact) / scale
    assert np.mean(off > 1e-6) <= SPOILT
    assert np.median(off) < 1e-8


@BOTH
def test_gibbs_duhem(key: str):
    """sum n_i d ln phi_i = 0 at fixed T, p, for a change of any n_j."""
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    change = dlnphi_dn(fluid, T, p, n)
    size = np.einsum("ci,cij->cj", n, np.abs(change))
    assert np.all(np.abs(np.einsum("ci,cij->cj", n, change)) <= 1e-11 * size + 1e-13)


@BOTH
def test_symmetry_of_composition_derivatives(key: str):
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    change = n.sum(axis=1)[:, None, None] * dlnphi_dn(fluid, T, p, n)
    np.testing.assert_allclose(change, change.transpose(0, 2, 1), rtol=1e-9, atol=1e-13)


@BOTH
@pytest.mark.parametrize("root", ["vapour", "liquid"])
def test_composition_derivatives_by_differences(key: str, root: str):
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    exact = dlnphi_dn(fluid, T, p, n, root)
    total = n.sum(axis=1)
    for j in range(len(MIXED)):

        def moved(x: np.ndarray, j: int = j) -> np.ndarray:
            other = n.copy()
            other[:, j] += (x - 1.0) * total
            return ln_phi(fluid, T, p, other, root)

        numeric = slope(moved, np.ones(T.size), step=2e-4)
        compare(
            numeric, exact[:, :, j] * total[:, None], 1.0 + np.abs(exact[:, :, j] * total[:, None])
        )


@BOTH
def test_pressure_derivative_is_the_partial_volume(key: str):
    """p d ln phi_i / dp = p V_i,res / RT (Maxwell): the volume is the n-derivative's partner."""
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    exact = dlnphi_dp(fluid, T, p, n, "vapour") * p[:, None]
    numeric = slope(lambda there: ln_phi(fluid, T, there, n, "vapour"), p)
    compare(numeric, exact, 1.0 + np.abs(exact))
    volume = residual_properties(fluid, T, p, n, "vapour").V_res
    np.testing.assert_allclose(
        np.einsum("cs,cs->c", n, exact) * R * T / p,
        volume,
        rtol=1e-10,
        atol=1e-13 * (n.sum(axis=1) * R * T / p).max(),
    )


@BOTH
def test_temperature_derivative_is_the_partial_enthalpy(key: str):
    """T d ln phi_i / dT = -H_i,res / RT (van 't Hoff)."""
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    exact = dlnphi_dT(fluid, T, p, n, "vapour") * T[:, None]
    numeric = slope(lambda there: ln_phi(fluid, there, p, n, "vapour"), T)
    compare(numeric, exact, 1.0 + np.abs(exact))
    H = residual_properties(fluid, T, p, n, "vapour").H
    scale = n.sum(axis=1) * R * T
    np.testing.assert_allclose(
        -np.einsum("cs,cs->c", n, exact), H / (R * T), rtol=1e-9, atol=1e-12 * n.sum(axis=1).max()
    )
    assert np.all(np.isfinite(scale))


@BOTH
@pytest.mark.parametrize("root", ["vapour", "liquid"])
def test_heat_capacity_and_the_rest(key: str, root: str):
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    at = residual_properties(fluid, T, p, n, root)
    numeric = slope(lambda there: residual_properties(fluid, there, p, n, root).H, T)
    compare(numeric, at.cp * T, n.sum(axis=1) * R * T + np.abs(at.cp * T))
    numeric = slope(lambda there: residual_properties(fluid, there, p, n, root).G, T)
    compare(numeric, -at.S * T, n.sum(axis=1) * R * T + np.abs(at.S * T))
    numeric = slope(lambda there: residual_properties(fluid, T, there, n, root).G, p)
    compare(numeric, at.V_res * p, n.sum(axis=1) * R * T)
    np.testing.assert_allclose(at.G, at.H - T * at.S, rtol=1e-9, atol=1e-9)
    np.testing.assert_allclose(at.U, at.H - p * at.V_res, rtol=1e-12)
    total = n.sum(axis=1)
    np.testing.assert_allclose(at.V, total * at.Z * R * T / p, rtol=1e-13)
    np.testing.assert_allclose(
        at.V, total * R * T / p + at.V_res, rtol=1e-9, atol=1e-11 * (total * R * T / p).max()
    )


@BOTH
def test_volume_gives_the_pressure_back(key: str):
    """p = n RT / (V - b) - a / ((V + d1 b)(V + d2 b)) with a and b mixed by hand."""
    keys = ("N2", "H2", "NH3", "CO2")
    fluid = fluid_of(keys, key, (("N2", "CO2", -0.03),))
    k = np.zeros((4, 4))
    for pair in fluid.k:
        i, j = keys.index(pair.a), keys.index(pair.b)
        k[i, j] = k[j, i] = pair.k
    n = np.array([[1.0, 3.0, 0.5, 0.2]])
    T, p = np.array([450.0]), np.array([2.5e7])
    eq = fluid.equation
    root_alpha = eq.root_alpha(T[:, None], fluid.Tc, eq.m(fluid.acentric))[0]
    root_a = np.sqrt(eq.omega_a / fluid.pc) * R * fluid.Tc * root_alpha
    a = np.einsum("ci,cj,ij->c", n * root_a, n * root_a, 1.0 - k)
    b = n @ fluid.b
    V = residual_properties(fluid, T, p, n).V
    found = n.sum() * R * T / (V - b) - a / ((V + eq.d1 * b) * (V + eq.d2 * b))
    np.testing.assert_allclose(found, p, rtol=1e-12)


@BOTH
def test_enthalpy_passes_smoothly_where_an_attraction_ends(key: str):
    """Across the temperature where nitrogen's bracket is zero H moves as its heat capacity says."""
    fluid = fluid_of(("N2", "H2O", "CO2"), key)
    n = np.array([[0.7, 0.2, 0.1]])
    p = np.array([3e7])
    end = fluid.Tc[0] * (1.0 + 1.0 / fluid.equation.m(fluid.acentric[:1])) ** 2
    start = fluid.Tc[0] * (1.0 + 0.9 / fluid.equation.m(fluid.acentric[:1])) ** 2
    for T in (end, start):
        below, above = (residual_properties(fluid, T * s, p, n) for s in (1 - 1e-7, 1 + 1e-7))
        assert abs(above.H - below.H)[0] < 1e-5 * R * T[0]


def test_a_species_left_out_is_ideal():
    """phi = 1 exactly, its volume nRT/p, and no change to the others but through T and p."""
    with_radical = fluid_of(("CO2", "OH"), "srk")
    alone = fluid_of(("CO2",), "srk")
    T, p = np.array([400.0]), np.array([1e7])
    n = np.array([[2.0, 3.0]])
    assert ln_phi(with_radical, T, p, n)[0, 1] == 0.0
    assert ln_phi(with_radical, T, p, n)[0, 0] == ln_phi(alone, T, p, n[:, :1])[0, 0]
    both, one = (
        residual_properties(fluid, T, p, amounts)
        for fluid, amounts in ((with_radical, n), (alone, n[:, :1]))
    )
    assert both.H == one.H
    assert both.V[0] == pytest.approx(one.V[0] + 3.0 * R * T[0] / p[0], rel=1e-14)


@BOTH
@pytest.mark.parametrize("root", ["least", "vapour", "liquid"])
def test_finite_at_any_temperature_and_pressure(key: str, root: str):
    """10 to 10,000 K, 1e-30 to 1e13 Pa, traces and tonnes: finite, and never below the covolume."""
    fluid = fluid_of((*MIXED, "He"), key)
    rng = np.random.default_rng(6)
    T, p = 10.0 ** rng.uniform(1, 4, 3000), 10.0 ** rng.uniform(-30, 13, 3000)
    n = rng.dirichlet(np.full(8, 0.2), 3000) * 10.0 ** rng.uniform(-20, 10, (3000, 1))
    at = residual_properties(fluid, T, p, n, root)
    for part in (at.G, at.H, at.S, at.U, at.cp, at.V_res, dlnphi_dn(fluid, T, p, n, root)):
        assert np.isfinite(part).all()
    assert np.all(at.V > n @ fluid.b)
