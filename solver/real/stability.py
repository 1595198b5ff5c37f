"""The tangent-plane test: whether another fluid phase would lower the Gibbs energy.

At given element potentials a mole of a trial phase of composition w lies

    tm(w) = sum w_i (ln w_i + ln phi_i(w) - d_i),    d_i = a_i . lambda - g_i - ln(p/p0)

above the tangent plane of the state, in units of RT (Baker, Pierce and Luks, SPE J. 22 (1982)
731; Michelsen, Fluid Phase Equilib. 9 (1982) 1). A negative value anywhere disproves the state.
The function is not convex: its stationary points are sought by substitution from several
starts, and finding no negative one is no rigorous bound.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.real.problem import RealCases

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]

PURE = 3
"""Trial phases that start from a nearly pure substance."""
STARTS = 2 + PURE
_MAX_STEPS, _STEPS_AT_FIRST = 120, 12
_DONE, _SAME = 1e-11, 1e-5
_LOW = -1e-7
_PURE = 0.98
_LIQUEFIES = 1.3  # T/Tc up to which a substance is tried as a liquid


@dataclass(frozen=True)
class Trials:
    """The best trial phase of each case.

    Attributes
    ----------
    distance : ndarray, shape (cases,)
        Least distance found; not above zero, because the phases present lie at zero.
    w : ndarray, shape (cases, gas species)
        Its composition.
    """

    distance: Array
    w: Array


def tangent_plane(cases: RealCases, d: Array, live: Flags, present: Array) -> Trials:
    """Seek the trial phase that lies farthest below the tangent plane.

    Parameters
    ----------
    cases : RealCases
    d : ndarray, shape (cases, gas species)
        ln of the fugacity over p that the potentials give each species.
    live : ndarray of bool, shape (cases, gas species)
        Species that may be there.
    present : ndarray, shape (cases, slots, gas species)
        Compositions of the fluid phases present; rows of zeros where there is none.
    """
    starts = _starts(cases, d, live)
    count, tries, gases = starts.shape
    case = np.repeat(np.arange(count), tries)
    w = starts.reshape(-1, gases)
    may = live[case]
    used = w.sum(axis=1) > 0.0
    case, w, may = case[used], w[used], may[used]
    best = np.zeros(count)
    found = np.zeros((count, gases))
    with np.errstate(all="ignore"):
        for step in range(_MAX_STEPS):
            top = np.where(may, d[case] - _log_phi(cases, case, w), -np.inf)
            height = np.where(w > 0.0, w * (np.log(w) - top), 0.0).sum(axis=1)
            _lowest(case, w, height, best, found)
            W = np.exp(top - top.max(axis=1, keepdims=True))
            new = W / W.sum(axis=1, keepdims=True)
            change = np.abs(new - w).max(axis=1)
            same = np.abs(new[:, None, :] - present[case]).max(axis=2).min(axis=1) < _SAME
            going = (change > _DONE) & ~same & np.isfinite(change)
            if step >= _STEPS_AT_FIRST:  # a case is lost to the state by its first low trial
                going &= best[case] > _LOW
            if not going.any():
                break
            case, w, may = case[going], new[going], may[going]
    return Trials(best, found)


def _lowest(case: Indices, w: Array, height: Array, best: Array, found: Array) -> None:
    """Keep the lowest trial of each case."""
    lower = np.flatnonzero(height < best[case])
    if not lower.size:
        return
    lower = lower[np.argsort(-height[lower], kind="stable")]  # the lowest is written last
    best[case[lower]], found[case[lower]] = height[lower], w[lower]


def _log_phi(cases: RealCases, case: Indices, w: Array) -> Array:
    core = cases.core[case]
    M = np.empty((len(case), core.shape[2] + 1))
    M[:, 0] = w.sum(axis=1)
    M[:, 1:] = (w[:, cases.own][:, None, :] @ core)[:, 0]
    grad = cases.fluid.residual(M, "least").grad
    out = np.repeat(grad[:, :1], w.shape[1], axis=1)
    out[:, cases.own] += (core @ grad[:, 1:, None])[:, :, 0]
    return out


def _starts(cases: RealCases, d: Array, live: Flags) -> Array:
    """Compositions (cases, STARTS, gas species) to start from; zero where one is not needed.

    An ideal gas, a liquid in which every substance has the fugacity coefficient of its own
    pure liquid, and the substances that lie lowest as pure liquids, each nearly pure.
    """
    count, gases = d.shape
    out = np.zeros((count, STARTS, gases))
    d = np.where(live, d, -np.inf)
    some = np.flatnonzero(live.any(axis=1))
    out[some, 0] = np.exp(d[some] - d[some].max(axis=1, keepdims=True))
    out[some, 0] /= out[some, 0].sum(axis=1, keepdims=True)
    fluid = cases.fluid
    cold = cases.fluid.modelled & (cases.T[:, None] < _LIQUEFIES * fluid.Tc) & (d > -60.0)
    pairs = np.nonzero(cold)
    if not pairs[0].size:
        return out
    q = cases.q[pairs]
    residual = fluid.residual(q, "least")
    pure = np.full(d.shape, -np.inf)
    pure[pairs] = d[pairs] - (q * residual.grad).sum(axis=1)
    some = np.flatnonzero(cold.any(axis=1))
    high = pure[some].max(axis=1, keepdims=True)
    mixed = np.exp(pure[some] - high)
    out[some, 1] = mixed / mixed.sum(axis=1, keepdims=True)
    order = np.argsort(-pure[some], axis=1)[:, :PURE]
    for k in range(order.shape[1]):
        able = np.isfinite(np.take_along_axis(pure[some], order[:, k : k + 1], axis=1)[:, 0])
        rows = some[able]
        out[rows, 2 + k] = (1.0 - _PURE) * out[rows, 1]
        out[rows, 2 + k, order[able, k]] += _PURE
    return out
