"""Newton's method on the logarithm of the gas balances, many cases at once.

For given condensed phases the gas amounts follow from one unknown l_k per gas component and
one for the size of the gas:

    ln n_i = sum_k a'_ik l_k - kappa_i + nu

Each balance sum_i a'_ik n_i = b'_k is split into its positive and its negative terms, P_k and
M_k, and solved as ln P_k - ln M_k = 0. Where one species dominates each side the equation is
exactly linear in log_a, so that amounts which start wrong by e^100 are right after one step; near
the solution it is an ordinary Newton method, quadratic.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_MAX_ITERATIONS = 60
_MAX_STEP = 60.0  # largest change of any ln n in one step
_CLOSED = 2e-14
_EXP_LIMIT = 690.0


@dataclass(frozen=True)
class GasSystem:
    """What the cases of one batch share.

    Attributes
    ----------
    reactions : ndarray, shape (gas species, gas components)
    holds_pressure : bool
        True: the gas fills any volume at the case's pressure (one more unknown, nu).
        False: nu is given, the gas fills a fixed volume.
    """

    reactions: Array
    holds_pressure: bool
    weights: Array
    """Columns that turn amounts into all sums a Newton step needs, one matrix product."""

    @classmethod
    def of(cls, reactions: Array, holds_pressure: bool) -> GasSystem:
        """Gather the weights of one set of components."""
        species, m = reactions.shape
        unknowns = m + 1 if holds_pressure else m
        effect = np.ones((species, unknowns))
        effect[:, :m] = reactions
        up, down = np.maximum(reactions, 0.0), np.maximum(-reactions, 0.0)
        slopes_up = (up[:, :, None] * effect[:, None, :]).reshape(species, -1)
        slopes_down = (down[:, :, None] * effect[:, None, :]).reshape(species, -1)
        parts = [up, down, slopes_up, slopes_down, effect, np.ones((species, 1))]
        return cls(reactions, holds_pressure, np.concatenate(parts, axis=1))


@dataclass(frozen=True)
class GasSolution:
    """Amounts n (cases, gas species), log_a (cases, components), nu (cases,), closed (cases,)."""

    n: Array
    log_a: Array
    nu: Array
    closed: NDArray[np.bool_]
    iterations: int


def solve_balances(
    system: GasSystem, kappa: Array, b: Array, log_a: Array, nu: Array, nu_limit: Array
) -> GasSolution:
    """Solve the balances from the start (log_a, nu).

    Parameters
    ----------
    system : GasSystem
    kappa : ndarray, shape (cases, gas species)
        Minus ln K of each species' formation from the components.
    b : ndarray, shape (cases, gas components)
        Component amounts, mol; any sign.
    log_a, nu : ndarray, shape (cases, gas components) and (cases,)
        Start: ln of the components' mole fractions and ln of the gas amount (holding
        pressure), or of p0 V/RT (holding volume; then log_a is ln of p_k/p0).
    nu_limit : ndarray, shape (cases,)
        A gas grown beyond this cannot be fed by the case: the case stops unclosed.
    """
    m = b.shape[1]
    reactions, weights = system.reactions, system.weights
    unknowns = m + 1 if system.holds_pressure else m
    b_up, b_down = np.maximum(-b, 0.0), np.maximum(b, 0.0)
    log_a, nu = log_a.copy(), nu.copy()
    n = np.exp(np.clip(log_a @ reactions.T - kappa + nu[:, None], -_EXP_LIMIT, _EXP_LIMIT))
    closed = np.zeros(len(b), dtype=bool)
    failed = np.zeros(len(b), dtype=bool)
    last = np.full(len(b), np.inf)
    cut1, cut2 = 2 * m, 2 * m + m * unknowns
    cut3, cut4 = cut2 + m * unknowns, cut2 + m * unknowns + unknowns
    ridge = 1e-14 * np.eye(unknowns)
    iteration = 0
    if unknowns == 0:
        return GasSolution(n, log_a, nu, ~closed, 0)
    while iteration < _MAX_ITERATIONS:
        iteration += 1
        sums = n @ weights
        P, M = sums[:, :m] + b_up, sums[:, m:cut1] + b_down
        J = np.empty((len(b), unknowns, unknowns))
        F = np.empty((len(b), unknowns))
        J[:, :m] = sums[:, cut1:cut2].reshape(-1, m, unknowns) / P[:, :, None]
        J[:, :m] -= sums[:, cut2:cut3].reshape(-1, m, unknowns) / M[:, :, None]
        F[:, :m] = np.log(P / M)
        if system.holds_pressure:
            total = sums[:, cut4:]
            F[:, m] = np.log(total[:, 0]) - nu
            J[:, m] = sums[:, cut3:cut4] / total
            J[:, m, m] -= 1.0
        worst = np.abs(F).max(axis=1)
        closed = (worst <= _CLOSED) | ((worst <= 1e-11) & (worst >= 0.5 * last))
        failed |= ~np.isfinite(worst) | (nu > nu_limit)
        active = ~(closed | failed)
        if not active.any():
            break
        last = worst
        J[~np.isfinite(J)] = 0.0
        F[~np.isfinite(F)] = 0.0
        step = -np.linalg.solve(J + ridge, F[:, :, None])[:, :, 0]
        step[~active] = 0.0
        change = step[:, :m] @ reactions.T
        if system.holds_pressure:
            change += step[:, m:]
        size = np.abs(change).max(axis=1)
        damp = np.minimum(1.0, _MAX_STEP / np.maximum(size, 1e-300))
        if (damp < 1.0).any():
            step *= damp[:, None]
            change *= damp[:, None]
        log_a += step[:, :m]
        if system.holds_pressure:
            nu += step[:, m]
        small = size < 1.0
        if small.all():
            n = n * np.exp(change)
        else:
            fresh = np.exp(
                np.clip(log_a @ reactions.T - kappa + nu[:, None], -_EXP_LIMIT, _EXP_LIMIT)
            )
            n = np.where(small[:, None], n * np.exp(change), fresh)
    return GasSolution(n, log_a, nu, closed & ~failed, iteration)
