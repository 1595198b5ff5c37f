"""Species whose amount the balances force to zero, whatever the Gibbs energies are.

A feed of CO2 and water, with CO but no oxygen among the candidates, cannot form CO: a
combination of balances has a zero total and no negative term, so every species in it is
zero. The minimum then lies on a face of the amounts, where logarithms have no place; such
species are taken out beforehand and the potentials of the combination are let sink.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Sink:
    """A combination y (components,) of balances, and the row that it makes superfluous."""

    direction: Array
    row: int


def one_sided(reactions: Array, b: Array, live: NDArray[np.bool_], rows: list[int]) -> list[Sink]:
    """Take out what single balances force to zero; `live` and `rows` are narrowed in place.

    Parameters
    ----------
    reactions : ndarray, shape (gas species, components)
    b : ndarray, shape (components,)
    live : ndarray, shape (gas species,)
        Species still considered.
    rows : list of int
        Balances still considered.
    """
    sinks: list[Sink] = []
    changed = True
    while changed:
        changed = False
        for k in list(rows):
            column = reactions[live, k]
            if b[k] != 0.0:
                continue
            sign = 1.0 if np.all(column >= 0.0) else (-1.0 if np.all(column <= 0.0) else 0.0)
            if sign:
                direction = np.zeros(reactions.shape[1])
                direction[k] = sign
                live &= reactions[:, k] == 0.0
                rows.remove(k)
                sinks.append(Sink(direction, k))
                changed = True
    return sinks


def combined(reactions: Array, b: Array, live: NDArray[np.bool_], rows: list[int]) -> list[Sink]:
    """As `one_sided`, for combinations of several balances of zero total.

    Each is found by a linear program: y with a'_i.y >= 0 for every live species and
    sum a'_i.y as large as |y| <= 1 allows (Farkas' lemma: if it is zero, every live species
    can be positive).
    """
    from scipy.optimize import linprog  # rare: only after the balances found no solution

    sinks: list[Sink] = []
    while True:
        sinks += one_sided(reactions, b, live, rows)
        zero = [k for k in rows if b[k] == 0.0]
        if len(zero) < 2 or not live.any():
            return sinks
        part = reactions[np.ix_(live, np.array(zero, dtype=np.intp))]
        found = linprog(-part.sum(axis=0), A_ub=-part, b_ub=np.zeros(len(part)), bounds=(-1.0, 1.0))
        if found.x is None or found.fun is None or found.fun > -1e-7:
            return sinks
        y = np.where(np.abs(found.x) < 1e-9, 0.0, found.x)
        direction = np.zeros(reactions.shape[1])
        direction[zero] = y
        row = zero[int(np.argmax(np.abs(y)))]
        live &= ~(reactions @ direction > 1e-7)
        rows.remove(row)
        sinks.append(Sink(direction, row))


def infeasible(part: Array, b: Array) -> bool:
    """Whether a balance has all its terms on one side and its total on the other."""
    up, down = (part > 0.0).any(axis=0), (part < 0.0).any(axis=0)
    return bool(np.any(((b > 0.0) & ~up) | ((b < 0.0) & ~down)))
