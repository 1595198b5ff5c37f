"""Balances whose amounts leave the range of floating point, and small systems of equations."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from solver.core.balance import GasSystem

Array = NDArray[np.float64]

_WILD = 1e4
_LOG_FAINT = -550.0
_MANY = 24  # cases from which eliminating all of them side by side beats one by one


def newton_steps(J: Array, F: Array) -> Array:
    """Newton steps, of the shape of F; see `shortest` for those that are `wild`.

    Parameters
    ----------
    J : ndarray, shape (unknowns, unknowns, cases)
    F : ndarray, shape (unknowns, cases) or (unknowns, sides, cases)
        Several right-hand sides share the elimination.
    """
    sides = F if F.ndim == 3 else F[:, None]
    step = _eliminate(J, sides) if J.shape[2] >= _MANY else _one_by_one(J, sides)
    return step if F.ndim == 3 else step[:, 0]


def wild(step: Array) -> NDArray[np.bool_]:
    """Which steps (unknowns, cases) the slopes do not determine."""
    return np.asarray(~(np.abs(step).max(axis=0) < _WILD))


def shortest(J: Array, F: Array) -> Array:
    """The shortest of the steps that solve one case best."""
    return np.asarray(-np.linalg.lstsq(J, F, rcond=1e-7)[0])


def _one_by_one(J: Array, F: Array) -> Array:
    ridge = 1e-14 * np.eye(len(J))
    slopes, right = J.transpose(2, 0, 1), F.transpose(2, 0, 1)
    try:
        step = np.linalg.solve(slopes + ridge, -right)
    except np.linalg.LinAlgError:  # one is singular to the last digit
        step = np.array([shortest(one, side) for one, side in zip(slopes, right, strict=True)])
    return np.asarray(step.transpose(1, 2, 0))


def _eliminate(J: Array, F: Array) -> Array:
    """Gaussian elimination of all cases at once, without exchange of rows.

    The rows are logarithmic balances with positive diagonals, so that exchanges are rarely
    needed; where the residual says otherwise the case is solved by itself.
    """
    unknowns = len(J)
    A = np.concatenate([J, -F], axis=1)
    with np.errstate(all="ignore"):
        for k in range(unknowns):
            A[k, k + 1 :] /= A[k, k]
            if k + 1 < unknowns:
                A[k + 1 :, k + 1 :] -= A[k + 1 :, k, None] * A[k, k + 1 :]
        step = A[:, unknowns:]
        for k in range(unknowns - 1, 0, -1):
            step[:k] -= A[:k, k, None] * step[k]
        rest = np.abs(np.einsum("ijr,jsr->isr", J, step) + F).max(axis=0)
        bad = ~(rest <= 1e-9 * np.abs(F).max(axis=0)).all(axis=0)
    if bad.any():
        step[:, :, bad] = _one_by_one(J[:, :, bad], F[:, :, bad])
    return step


def rescale(
    system: GasSystem,
    log_n: Array,
    b: Array,
    nu: Array,
    rows: NDArray[np.bool_],
    J: Array,
    F: Array,
) -> None:
    """Rewrite balances whose amounts underflow or overflow, each by its own largest term.

    A potential that only amounts below 1e-250 decide still decides which condensed phases
    may form, so that these balances are solved like all others.

    Parameters
    ----------
    log_n : ndarray, shape (cases, gas species)
    b : ndarray, shape (components, cases)
    rows : ndarray of bool, shape (components, cases)
        The balances to rewrite in J (unknowns, unknowns, cases) and F (unknowns, cases).
    """
    species, m = system.reactions.shape
    effect = system.effect
    for row, case in zip(*np.nonzero(rows), strict=True):
        column = system.reactions[:, row]
        up = _log_sum(log_n[case], column, effect, -b[row, case])
        down = _log_sum(log_n[case], -column, effect, b[row, case])
        rest = up[0] - down[0]
        # of amounts that underflow, nine digits are as good as all
        F[row, case] = 0.0 if max(up[0], down[0]) < _LOG_FAINT and abs(rest) < 1e-9 else rest
        J[row, :, case] = up[1] - down[1]
    if system.extra:
        for case in np.flatnonzero(rows.any(axis=0)):
            value, slope = _log_sum(log_n[case], np.ones(species), effect, 0.0)
            F[m, case] = value - nu[case]
            J[m, :, case] = slope
            J[m, m, case] -= 1.0


def _log_sum(
    log_n: Array, coefficients: Array, effect: Array, constant: float
) -> tuple[float, Array]:
    """ln of the positive terms of a balance and its slopes, free of overflow."""
    side = coefficients > 0.0
    logs = log_n[side] + np.log(coefficients[side])
    top = float(logs.max(initial=-np.inf))
    if constant > 0.0:
        top = max(top, float(np.log(constant)))
    weights = np.exp(logs - top)
    total = float(weights.sum()) + (np.exp(np.log(constant) - top) if constant > 0.0 else 0.0)
    return top + float(np.log(total)), (weights / total) @ effect[side]
