"""A polynomial through what a few cases have reached, to start the others from."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_ENOUGH = 2  # known values for each coefficient


def surmise(known: Array, values: Array, asked: Array) -> Array:
    """Values at other features, by least squares of the second degree.

    Of first degree, or their mean, where the known ones are too few.

    Parameters
    ----------
    known : ndarray, shape (known cases, features)
    values : ndarray, shape (known cases,)
    asked : ndarray, shape (cases, features)

    Returns
    -------
    ndarray, shape (cases,)
    """
    middle, width = known.mean(axis=0), known.std(axis=0)
    varies = width > 1e-9
    known = (known[:, varies] - middle[varies]) / width[varies]
    asked = (asked[:, varies] - middle[varies]) / width[varies]
    count = known.shape[1]
    pairs = [(i, j) for i in range(count) for j in range(i, count)]
    if len(values) < _ENOUGH * (1 + count + len(pairs)):
        pairs = []
    if len(values) < _ENOUGH * (1 + count):
        return np.full(len(asked), values.mean())
    # element shares add up to one: of dependent columns the smallest coefficients are taken
    coefficients = np.linalg.lstsq(_columns(known, pairs), values, rcond=1e-6)[0]
    return np.asarray(_columns(asked, pairs) @ coefficients)


def _columns(features: Array, pairs: list[tuple[int, int]]) -> Array:
    products = [features[:, i] * features[:, j] for i, j in pairs]
    return np.column_stack([np.ones(len(features)), features, *products])
