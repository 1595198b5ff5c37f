"""A slow but certain way into the neighbourhood of the gas balances' solution.

In a held volume the balances are the stationary point of the convex function

    D(l) = sum_i n_i(l) - b'.l,   n_i = exp(a'_i.l - kappa_i + nu)

(the dual of the Helmholtz energy), which Newton's method with a line search on the slope
descends from anywhere. At a held pressure the size of the gas, N = exp(nu), is sought
outside: sum n / N falls as N grows, because the minimum is convex in N. Used where the
faster method of `balance` has lost its way; that method then finishes.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_NEAR = 0.5  # ln of the ratio of the two sides of every balance
_MAX_STEPS = 400
_MAX_GROWTH = 4.0  # ln, of any amount in one step


def descend(
    reactions: Array, kappa: Array, b: Array, log_a: Array, nu: float, grows: bool, top: float
) -> tuple[Array, float]:
    """A start (log_a, nu) near the solution.

    Parameters
    ----------
    reactions : ndarray, shape (gas species, components)
    kappa : ndarray, shape (gas species,)
    b, log_a : ndarray, shape (components,)
    nu : float
        ln of p0 V/RT, or where the gas `grows` a first ln of its amount.
    grows : bool
        Whether the pressure is held and nu is sought.
    top : float
        The largest nu that the feed can fill.
    """
    with np.errstate(all="ignore"):  # far-off amounts overflow on the way
        return _descend(reactions, kappa, b, log_a, nu, grows, top)


def _descend(
    reactions: Array, kappa: Array, b: Array, log_a: Array, nu: float, grows: bool, top: float
) -> tuple[Array, float]:
    if not grows:
        return _at_volume(reactions, kappa, b, log_a, nu), nu
    # mole fractions at the start do not depend on nu: carry l + nu, the ln amounts
    low, high = top - 80.0, top
    nu = float(np.clip(nu, low, high))
    for _ in range(60):
        log_a = _at_volume(reactions, kappa, b, log_a, nu)
        filled = float(np.log(np.exp(reactions @ log_a - kappa + nu).sum()))
        if abs(filled - nu) < 0.2 or high - low < 0.1:
            break
        if filled > nu:
            low = nu
        else:
            high = nu
        nu = filled if low < filled < high else 0.5 * (low + high)
    return log_a, nu


def _at_volume(reactions: Array, kappa: Array, b: Array, log_a: Array, nu: float) -> Array:
    """Descend D at one nu."""
    up, down = np.maximum(reactions, 0.0), np.maximum(-reactions, 0.0)
    log_a = log_a.copy()
    shift = float((reactions @ log_a - kappa + nu).max())
    if shift > 200.0:
        log_a = np.zeros_like(log_a)
    for _ in range(_MAX_STEPS):
        n = _amounts(reactions, kappa, log_a, nu)
        P, M = n @ up + np.maximum(-b, 0.0), n @ down + np.maximum(b, 0.0)
        far = np.abs(np.log(P / M))
        if np.all(far < _NEAR):
            break
        slope = n @ reactions - b
        hessian = reactions.T @ (n[:, None] * reactions)
        scale = 1.0 / np.sqrt(np.maximum(np.diag(hessian), 1e-290))
        scaled = hessian * scale[:, None] * scale + 1e-12 * np.eye(len(b))
        step = -np.linalg.solve(scaled, slope * scale) * scale
        change = reactions @ step
        step *= min(1.0, _MAX_GROWTH / max(float(change.max()), 1e-300))
        step *= min(1.0, 50.0 / max(float(np.abs(step).max()), 1e-300))
        first = float(slope @ step)
        for _ in range(40):
            ahead = _amounts(reactions, kappa, log_a + step, nu)
            if float((ahead @ reactions - b) @ step) <= 0.9 * abs(first):
                break
            step *= 0.5
        log_a = log_a + step
    return log_a


def _amounts(reactions: Array, kappa: Array, log_a: Array, nu: float) -> Array:
    return np.exp(np.clip(reactions @ log_a - kappa + nu, -690.0, 300.0))
