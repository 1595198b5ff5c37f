"""Residuals and slopes of the balances of a real mixture, for Newton's method."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.real.problem import ROOTS, RealCases

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

EXP_LIMIT = 690.0
"""ln of the largest amount that is taken as a number."""
_CUT_OFF = 1e-295  # mol; sums below are taken in logarithms


@dataclass
class Unknowns:
    """Unknowns of the cases still iterated on."""

    log_a: Array  # (cases, rows)
    nu: Array  # (cases, fluids)
    theta: Array  # (cases, fluids, moments)
    log_n: Array  # (cases, fluids, gases)


@dataclass(frozen=True)
class Terms:
    """What the balances of one set of components are made of; the two sides apart.

    Attributes
    ----------
    a : ndarray, shape (gas species, rows)
    sides : two of ndarray, shape (gas species, rows)
        Positive and negative terms.
    pairs : two of ndarray, shape (gas species, rows * rows)
        Terms times the components of each species, for slopes in one product.
    own : two of ndarray, shape (rows, modelled species)
    """

    a: Array
    sides: tuple[Array, Array]
    pairs: tuple[Array, Array]
    own: tuple[Array, Array]

    @classmethod
    def of(cls, a: Array, own: Indices) -> Terms:
        """Of the components' numbers a in each gas species; `own` are the modelled species."""
        up, down = np.maximum(a, 0.0), np.maximum(-a, 0.0)
        pairs = [(side[:, :, None] * a[:, None, :]).reshape(len(a), -1) for side in (up, down)]
        return cls(a, (up, down), (pairs[0], pairs[1]), (up[own].T.copy(), down[own].T.copy()))


def slopes_of(
    cases: RealCases,
    slots: tuple[int, ...],
    terms: Terms,
    b: Array,
    state: Unknowns,
    follow: bool,
) -> tuple[Array, Array, Array]:
    """Slopes J and residuals F of balances, sizes of the phases, and moments; weights of F.

    A residual of theta weighs as much as the moment makes of it in ln phi.
    """
    count, r = b.shape
    fluids, m = len(slots), state.theta.shape[2]
    unknowns = r + fluids * (1 + m)
    own, core = cases.own, cases.core
    a, sides = terms.a, terms.sides
    n = np.exp(np.clip(state.log_n, None, EXP_LIMIT))
    total = n.sum(axis=1)
    P = total @ sides[0] + np.maximum(-b, 0.0)
    M = total @ sides[1] + np.maximum(b, 0.0)
    J, F = np.zeros((count, unknowns, unknowns)), np.empty((count, unknowns))
    F[:, :r] = np.log(P / M)
    weight = np.ones(F.shape)
    faint = _faint(state.log_n, sides, b, np.minimum(P, M), F)
    for f, slot in enumerate(slots):
        amounts = n[:, f]
        N = amounts.sum(axis=1)
        at = r + fluids + f * m
        theta = slice(at, at + m)
        share = amounts / N[:, None]
        pairs = [(amounts @ pair).reshape(count, r, r) for pair in terms.pairs]
        J[:, :r, :r] += pairs[0] / P[:, :, None] - pairs[1] / M[:, :, None]
        J[:, :r, r + f] = (amounts @ sides[0]) / P - (amounts @ sides[1]) / M
        J[:, r + f, :r] = share @ a
        F[:, r + f] = np.log(N) - state.nu[:, f]
        # moments per mole of the phase: the gradient does not depend on its size
        moments = cases.moments(share)
        residual = cases.fluid.residual(moments, ROOTS[slot])
        F[:, theta] = state.theta[:, f] - residual.grad
        weight[:, theta] = np.abs(moments)
        J[:, range(at, at + m), range(at, at + m)] = 1.0
        if follow:
            continue
        J[:, :r, at] = -J[:, :r, r + f]
        held = amounts[:, own, None] * core
        J[:, :r, at + 1 : at + m] = (
            terms.own[1] @ held / M[:, :, None] - terms.own[0] @ held / P[:, :, None]
        )
        held /= N[:, None, None]
        J[:, r + f, theta] = -moments
        by_a, by_q = np.empty((count, m, r)), np.empty((count, m, m))
        by_a[:, 0], by_q[:, 0] = J[:, r + f, :r], moments
        by_a[:, 1:], by_q[:, 1:, 0] = held.transpose(0, 2, 1) @ a[own], moments[:, 1:]
        by_q[:, 1:, 1:] = held.transpose(0, 2, 1) @ core
        J[:, theta, :r] = -residual.hess @ by_a
        J[:, theta, theta] += residual.hess @ by_q
    for (case, row), shares in faint.items():
        J[case, row, :r] = (shares @ a).sum(axis=0)
        sizes = shares.sum(axis=1)
        J[case, row, r : r + fluids] = sizes
        if not follow:
            by_theta = np.column_stack([sizes, shares[:, own] @ core[case]])
            J[case, row, r + fluids :] = -by_theta.ravel()
    return J, F, weight


def _faint(
    log_n: Array, sides: tuple[Array, Array], b: Array, least: Array, F: Array
) -> dict[tuple[int, int], Array]:
    """Balances whose amounts underflow, each by its own largest term; F is set in place.

    Returns the share that each species in each fluid has in the two sides, (fluids, gases).
    """
    out: dict[tuple[int, int], Array] = {}
    for case, row in zip(*np.nonzero(least < _CUT_OFF), strict=True):
        shares, logs = np.zeros(log_n.shape[1:]), []
        for sign, side in zip((1.0, -1.0), sides, strict=True):
            terms = log_n[case] + np.log(side[:, row])
            constant = np.log(max(-sign * b[case, row], 0.0))
            top = max(float(terms.max(initial=-np.inf)), float(constant))
            each = np.exp(terms - top)
            total = float(each.sum() + np.exp(constant - top))
            shares += sign * each / total
            logs.append(top + np.log(total))
        F[case, row] = logs[0] - logs[1]
        out[int(case), int(row)] = shares
    return out
