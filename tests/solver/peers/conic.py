"""The same minimum from a general conic solver: entropy written with exponential cones."""

from __future__ import annotations

from dataclasses import dataclass

import cvxpy as cp
import numpy as np
import numpy.typing as npt
from scipy.optimize import linprog

from tests.solver.peers.problems import Arrays, gibbs, lower_bound


class NoAnswerError(Exception):
    """The conic solver gave up."""


@dataclass(frozen=True)
class Answer:
    """Amounts in mol; G/RT, and its bound from below by the peer's own dual.

    The peer's amounts miss the balance by `residual` (over the largest element amount); G/RT is
    corrected for that to first order with its element potentials.
    """

    n: npt.NDArray[np.float64]
    gibbs: float
    bound: float
    residual: float


def reference_potentials(problem: Arrays) -> npt.NDArray[np.float64]:
    """Element potentials of the pure substances' linear program.

    Measuring g from them leaves small numbers of one sign, and the minimum where it was: only a
    change of datum for each element.
    """
    rows = problem.b > 0
    found = linprog(
        -problem.b[rows],
        A_ub=problem.A[rows].T,
        b_ub=problem.g,
        bounds=(None, None),
        method="highs",
    )
    assert found.status == 0, found.message
    potentials = np.zeros(len(problem.b))
    potentials[rows] = found.x
    return potentials


def minimise(problem: Arrays) -> Answer:
    """Minimise G/RT with cvxpy and Clarabel, all tolerances at 1e-10 (or 1e-8, second try)."""
    possible = ~(problem.A[problem.b <= 0] > 0).any(axis=0)
    rows = problem.b > 0
    A, b = problem.A[np.ix_(rows, possible)], problem.b[rows]
    gas = problem.gas[possible]
    part = Arrays(A, b, problem.g[possible], gas)
    datum = reference_potentials(part)
    scale = b.sum()
    g = part.g - A.T @ datum
    n = cp.Variable(len(g), nonneg=True)
    cost = g @ n
    if gas.any():
        gases = n[np.flatnonzero(gas)]
        total = cp.sum(gases)
        cost += cp.sum(cp.rel_entr(gases, total * np.ones(int(gas.sum()))))
    balance = A @ n == b / scale
    question = cp.Problem(cp.Minimize(cost), [balance])
    for tolerance in (1e-10, 1e-8):
        try:
            question.solve(
                solver=cp.CLARABEL,
                tol_gap_abs=tolerance,
                tol_gap_rel=tolerance,
                tol_feas=tolerance,
                max_iter=500,
            )
        except cp.SolverError:
            continue
        break
    else:
        raise NoAnswerError(str(question.status))
    amounts = np.zeros(len(problem.g))
    amounts[possible] = np.maximum(np.asarray(n.value), 0.0) * scale
    multipliers = np.asarray(balance.dual_value)
    missing = b - A @ amounts[possible]
    signed = [datum + sign * multipliers for sign in (-1.0, 1.0)]
    bound, potentials = max(
        ((lower_bound(part, one), one) for one in signed), key=lambda pair: pair[0]
    )
    return Answer(
        n=amounts,
        gibbs=gibbs(problem, amounts) + float(potentials @ missing),
        bound=bound,
        residual=float(np.abs(missing).max() / problem.b.max()),
    )
