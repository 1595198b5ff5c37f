"""F(M), its gradient and its Hessian: by differences, and by what must hold for any fluid."""

from __future__ import annotations

import numpy as np
import pytest

from solver.gas.fluid import Fluid
from tests.solver.gas.states import MIXED, PAIRS, fluid_of, random_states

EVERY = pytest.mark.parametrize(
    ("key", "root"), [(k, r) for k in ("srk", "pr") for r in ("least", "vapour", "liquid")]
)


def moments(fluid: Fluid) -> np.ndarray:
    T, p, n = random_states()
    return np.einsum("cs,csm->cm", n, fluid.at(T, p).q)


def by_difference(of, M: np.ndarray, j: int) -> np.ndarray:
    """Derivative by moment j of `of`, fourth order."""
    h = 1e-3 * np.maximum(np.abs(M[:, j]), 1e-6 * M[:, 0])

    def moved(times: float) -> np.ndarray:
        there = M.copy()
        there[:, j] += times * h
        return of(there)

    shape = (-1,) + (1,) * (moved(0.0).ndim - 1)
    near, far = moved(1.0) - moved(-1.0), moved(2.0) - moved(-2.0)
    return (8.0 * near - far) / (12.0 * h.reshape(shape))


@EVERY
def test_gradient_and_hessian_by_differences(key: str, root: str):
    """To 1e-6 of each entry's own size, in the scale of the moments.

    A state within the step of a limit of stability has no difference to compare with; few may.
    """
    fluid = fluid_of(MIXED, key, PAIRS)
    M = moments(fluid)
    at = fluid.residual(M, root)
    poor = 0
    for j in range(fluid.count):
        first = by_difference(lambda there: fluid.residual(there, root).F, M, j)
        second = by_difference(lambda there: fluid.residual(there, root).grad, M, j)
        scale = np.abs(at.grad[:, j]) + np.abs(at.F) / M[:, 0] + 1e-6
        off = np.abs(first - at.grad[:, j]) / scale
        off2 = (
            np.abs(second - at.hess[:, j])
            * M[:, :1]
            / (np.abs(at.hess[:, j] * M[:, :1]) + np.abs(at.grad) + 1e-6)
        )
        bad = (off > 1e-6) | (off2.max(axis=1) > 1e-6)
        poor += int(bad.sum())
        assert np.median(off) < 1e-9
    assert poor <= 0.02 * M.size


@EVERY
def test_homogeneous_of_degree_one(key: str, root: str):
    fluid = fluid_of(MIXED, key, PAIRS)
    M = moments(fluid)
    at = fluid.residual(M, root)
    np.testing.assert_allclose(
        np.einsum("cm,cm->c", at.grad, M), at.F, rtol=1e-12, atol=1e-14 * M[:, 0].max()
    )
    np.testing.assert_array_equal(at.hess, at.hess.transpose(0, 2, 1))
    product = np.einsum("cij,cj->ci", at.hess, M)
    size = np.einsum("cij,cj->ci", np.abs(at.hess), np.abs(M))
    assert np.all(np.abs(product) <= 1e-11 * size + 1e-14)
    double = fluid.residual(2.0 * M, root)
    np.testing.assert_allclose(double.F, 2.0 * at.F, rtol=1e-13)
    np.testing.assert_allclose(double.grad, at.grad, rtol=1e-13)
    np.testing.assert_allclose(2.0 * double.hess, at.hess, rtol=1e-12, atol=1e-300)


@pytest.mark.parametrize("key", ["srk", "pr"])
def test_thin_gas_follows_its_virial_series(key: str):
    """F / n = (B - A) + (s A B + 2 A B - A^2) / 2 + O(p^3), s = d1 + d2; from B2 and B3.

    The first neglected term is about the cube of A: the comparison is to that, down to 1e-12.
    """
    fluid = fluid_of(("CO2",), key)
    total = fluid.equation.d1 + fluid.equation.d2
    for p in 10.0 ** np.arange(-6.0, 6.0):
        q = fluid.at(np.array([320.0]), np.array([p])).q[:, 0]
        at = fluid.residual(q, "vapour")
        A, B = q[0, 2] ** 2, q[0, 1]
        series = B - A + 0.5 * ((total + 2.0) * A * B - A**2)
        assert at.F[0] == pytest.approx(series, rel=4.0 * A**2 + 1e-14)
        # derivatives by M_0, M_B, M_s of M_B - M_s^2/M_0 and of the next term
        assert at.grad[0, 0] == pytest.approx(A, rel=30.0 * A + 1e-14)
        assert at.grad[0, 1] == pytest.approx(1.0 + 0.5 * (total + 2.0) * A, rel=30 * A**2 + 1e-14)
        assert at.hess[0, 2, 2] == pytest.approx(-2.0, rel=30.0 * A + 1e-14)
        assert at.hess[0, 1, 1] == pytest.approx(
            0.0, abs=100.0 * A
        )  # of third order: no rest of a cancellation


@pytest.mark.parametrize("key", ["srk", "pr"])
def test_least_root_is_the_lesser(key: str):
    fluid = fluid_of(("C3H8", "C4H10"), key)
    p = np.geomspace(1e4, 3e6, 200)
    T = np.full(200, 300.0)
    M = np.einsum("s,csm->cm", [0.5, 0.5], fluid.at(T, p).q)
    least, vapour, liquid = (fluid.residual(M, root) for root in ("least", "vapour", "liquid"))
    assert least.two.any()
    np.testing.assert_array_equal(least.F, np.minimum(vapour.F, liquid.F))
    assert np.all(liquid.Z[least.two] < vapour.Z[least.two])
    assert {*np.unique(least.Z == liquid.Z)} == {True, False}
    assert np.array_equal(vapour.grad[~least.two], liquid.grad[~least.two])


def test_nothing_modelled_is_ideal():
    fluid = fluid_of(("OH", "H", "CO2"), "pr")
    assert fluid.not_modelled == ("OH", "H")
    n = np.array([[1.0, 2.0, 0.0], [0.0, 0.0, 0.0]])
    T, p = np.array([900.0, 900.0]), np.array([1e7, 1e7])
    moments = fluid.at(T, p)
    for root in ("least", "vapour", "liquid"):
        at = fluid.residual(np.einsum("cs,csm->cm", n, moments.q), root)
        np.testing.assert_array_equal(at.F, 0.0)
        assert np.isfinite(at.grad).all()
        assert np.isfinite(at.hess).all()
        assert not at.two.any()
    assert np.all(moments.q[:, :2] == 0.0)


def test_unknown_root_is_named():
    fluid = fluid_of(("CO2",), "pr")
    with pytest.raises(ValueError, match="middle"):
        fluid.residual(np.ones((1, fluid.count)), "middle")


@pytest.mark.parametrize("key", ["srk", "pr"])
def test_moments_give_the_double_sum(key: str):
    """A M_0^2 by eigenvectors of k equals sum n_i n_j sqrt(A_i A_j) (1 - k_ij)."""
    fluid = fluid_of(MIXED, key, PAIRS)
    T, p, n = random_states()
    q = fluid.at(T, p).q
    k = np.zeros((len(MIXED), len(MIXED)))
    for pair in fluid.k:
        i, j = MIXED.index(pair.a), MIXED.index(pair.b)
        k[i, j] = k[j, i] = pair.k
    s = q[:, :, 2] * n
    straight = np.einsum("ci,cj,ij->c", s, s, 1.0 - k)
    M = np.einsum("cs,csm->cm", n, q)
    np.testing.assert_allclose(M[:, 2:] ** 2 @ fluid.weights, straight, rtol=1e-13)


def test_one_hydrogen_star_needs_two_moments_more():
    """All known pairs share one species: the matrix k has rank two, whatever their number."""
    keys = ("H2", "N2", "CO", "CH4")
    fluid = fluid_of(keys, "srk", (("H2", "N2", 0.1), ("H2", "CO", 0.05), ("H2", "CH4", -0.02)))
    assert fluid.count == 5
    assert fluid_of(keys, "srk").count == 3
