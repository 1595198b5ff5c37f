"""One problem, three general-purpose solvers: each set up beforehand, only the solving timed.

The problem: minimise g.n + sum over gas of n ln(n/N) with A n = b, n >= 0. Every peer gets exact
derivatives and data measured from the same element datum, which helps their scaling.
"""

from __future__ import annotations

from collections.abc import Callable

import casadi as ca
import clarabel
import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.optimize import minimize

from tests.solver.peers.conic import reference_potentials
from tests.solver.peers.problems import Arrays

Vector = npt.NDArray[np.float64]
SMALLEST = 1e-30
"""Amounts are kept above this where a logarithm needs it."""


def from_datum(problem: Arrays) -> Arrays:
    """The same problem with g measured from the potentials of its reference substances."""
    datum = reference_potentials(problem)
    return Arrays(problem.A, problem.b, problem.g - problem.A.T @ datum, problem.gas)


def flat_start(problem: Arrays) -> Vector:
    """The same amount of everything, of about the right size."""
    return np.full(len(problem.g), problem.b.sum() / problem.A.sum())


def slsqp(problem: Arrays) -> Callable[[], Vector]:
    """Sequential quadratic programming of scipy, with the exact gradient."""
    data, gas = from_datum(problem), problem.gas
    start = flat_start(data)

    def cost(n: Vector) -> float:
        y = np.log(np.maximum(n[gas], SMALLEST) / n[gas].sum())
        return float(data.g @ n + n[gas] @ y)

    def gradient(n: Vector) -> Vector:
        slope = data.g.copy()
        slope[gas] += np.log(np.maximum(n[gas], SMALLEST) / n[gas].sum())
        return slope

    balance = {"type": "eq", "fun": lambda n: data.A @ n - data.b, "jac": lambda _: data.A}

    def solve() -> Vector:
        found = minimize(
            cost,
            start,
            jac=gradient,
            method="SLSQP",
            bounds=[(0.0, None)] * len(start),
            constraints=[balance],
            options={"maxiter": 500, "ftol": 1e-12},
        )
        return np.maximum(found.x, 0.0)

    return solve


def ipopt(problem: Arrays) -> Callable[[], Vector]:
    """Interior point method with exact first and second derivatives, through casadi."""
    data, gas = from_datum(problem), problem.gas
    n = ca.SX.sym("n", len(data.g))
    total = ca.sum1(n[np.flatnonzero(gas).tolist()])
    cost = ca.dot(ca.DM(data.g), n)
    for i in np.flatnonzero(gas):
        cost += n[int(i)] * ca.log(n[int(i)] / total)
    solver = ca.nlpsol(
        "thalweg_peer",
        "ipopt",
        {"x": n, "f": cost, "g": ca.mtimes(ca.DM(data.A), n)},
        {
            "print_time": False,
            "ipopt": {"print_level": 0, "sb": "yes", "tol": 1e-9, "max_iter": 500},
        },
    )
    start = flat_start(data)

    def solve() -> Vector:
        found = solver(x0=start, lbx=SMALLEST, ubx=np.inf, lbg=data.b, ubg=data.b)
        return np.asarray(found["x"]).ravel()

    return solve


def conic(problem: Arrays) -> Callable[[], Vector]:
    """Clarabel called directly: an exponential cone for each gas, its matrices built beforehand.

    Unknowns n, t (one for each gas) and N: t_i >= n_i ln(n_i / N), so that (-t, n, N) lies in the
    exponential cone.
    """
    data, gas = from_datum(problem), problem.gas
    m, k, elements = len(data.g), int(gas.sum()), len(data.b)
    unknowns = m + k + 1
    cost = np.concatenate([data.g, np.ones(k), [0.0]])
    rows: list[sparse.csc_matrix] = []
    where_gas = np.flatnonzero(gas)
    sum_row = np.zeros((1, unknowns))
    sum_row[0, where_gas], sum_row[0, -1] = 1.0, -1.0
    rows.append(sparse.csc_matrix(np.hstack([data.A, np.zeros((elements, k + 1))])))
    rows.append(sparse.csc_matrix(sum_row))
    rows.append(-sparse.eye(m, unknowns, format="csc"))
    cones = np.zeros((3 * k, unknowns))
    for j, i in enumerate(where_gas):
        cones[3 * j, m + j] = 1.0
        cones[3 * j + 1, i] = -1.0
        cones[3 * j + 2, -1] = -1.0
    rows.append(sparse.csc_matrix(cones))
    A = sparse.vstack(rows, format="csc")
    b = np.concatenate([data.b, [0.0], np.zeros(m + 3 * k)])
    kinds = [clarabel.ZeroConeT(elements + 1), clarabel.NonnegativeConeT(m)]
    kinds += [clarabel.ExponentialConeT()] * k
    settings = clarabel.DefaultSettings()
    settings.verbose = False
    P = sparse.csc_matrix((unknowns, unknowns))

    def solve() -> Vector:
        found = clarabel.DefaultSolver(P, cost, A, b, kinds, settings).solve()
        return np.maximum(np.asarray(found.x[:m]), 0.0)

    return solve
