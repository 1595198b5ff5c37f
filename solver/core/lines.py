"""Cases that follow each other closely, as along a line of temperatures."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_COARSE = (16, 8)  # every so many cases of a line are settled first
_NEAR = 0.15  # distance of features between those
_JUMP = 4.0  # times the usual distance: no line, but the end of one and the start of another


def coarseness(features: Array) -> int:
    """Distance of the cases to settle first, 0 where the cases follow no line.

    Parameters
    ----------
    features : ndarray, shape (cases, features)
        Coordinates in which near cases have similar minima.
    """
    if len(features) < 4 * _COARSE[-1]:
        return 0
    step = float(np.median(np.abs(np.diff(features, axis=0)).max(axis=1)))
    for coarse in _COARSE:
        if step * coarse < _NEAR and len(features) >= 4 * coarse:
            return coarse
    return _COARSE[-1] if step * _COARSE[-1] < 2.0 * _NEAR else 0


def weights_between(features: Array, coarse: Indices) -> tuple[Indices, Indices, Array]:
    """Cubic interpolation between every so many cases of a line.

    Parameters
    ----------
    features : ndarray, shape (cases, features)
    coarse : ndarray of int
        The cases to interpolate between, evenly spaced, four or more.

    Returns
    -------
    which : ndarray of int, shape (n,)
        Cases that have neighbours close enough.
    nodes : ndarray of int, shape (n, 4)
        Their neighbours among the coarse ones.
    weights : ndarray, shape (n, 4)
    """
    count, step = len(features), int(coarse[1] - coarse[0])
    lengths = np.sqrt((np.diff(features, axis=0) ** 2).sum(axis=1))
    along = np.concatenate([[0.0], np.cumsum(lengths)])
    which = np.setdiff1d(np.arange(count), coarse)
    first = np.clip(which // step - 1, 0, len(coarse) - 4)
    nodes = coarse[first[:, None] + np.arange(4)]
    at, x = along[nodes], along[which][:, None]
    weights = np.ones(nodes.shape)
    with np.errstate(all="ignore"):
        for k in range(4):
            for j in range(4):
                if j != k:
                    weights[:, k] *= (x[:, 0] - at[:, j]) / (at[:, k] - at[:, j])
    usual = 3.0 * step * float(np.median(lengths))
    good = np.isfinite(weights).all(axis=1) & (at[:, 3] - at[:, 0] <= _JUMP * usual)
    return which[good], nodes[good], weights[good]
