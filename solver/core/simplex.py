"""Linear program over pure species and gas mixtures: a first guess of who is present.

With every gas species taken as pure at the pressure of the case, and every condensed one
beside it, the least Gibbs energy under the element balances is a linear program of as many
rows as elements. Its optimum is a vertex: few species, exactly non-negative, and a good
basis for what follows. Gas mixtures found later enter as further columns (the decomposition
principle of Dantzig and Wolfe, Operations Research 8 (1960) 101), which makes the sequence
of programs converge to the true minimum from any start.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_EPS = float(np.finfo(float).eps)
_MAX_PIVOTS = 2000


class Endless(ArithmeticError):
    """More pivots than any program of this size needs."""


class Simplex:
    """min c.x under A^T x = b, x >= 0, by a dense tableau with artificial start columns.

    Parameters
    ----------
    A : ndarray, shape (columns, rows)
    b : ndarray, shape (rows,)
        Scaled so that its largest entry is of order one.
    c : ndarray, shape (columns,)
    """

    def __init__(self, A: Array, b: Array, c: Array) -> None:
        rows = A.shape[1]
        sign = np.where(b < 0, -1.0, 1.0)
        self._inverse = np.diag(sign)  # product of all row operations so far
        self._T = (A * sign).T.copy()
        self._level = np.abs(b).astype(float)
        self._error = _EPS * np.abs(self._level)
        self._c = np.asarray(c, dtype=float)
        self.basis = [-1] * rows  # -1: artificial
        self._rows = rows
        self._pivots = 0

    def add(self, vector: Array, cost: float) -> int:
        """Append a column; returns its index."""
        self._T = np.concatenate([self._T, (self._inverse @ vector)[:, None]], axis=1)
        self._c = np.append(self._c, cost)
        return len(self._c) - 1

    @property
    def levels(self) -> Array:
        """Amounts of the basic columns (rows,), rounding residues as zero."""
        level = self._level.copy()
        level[np.abs(level) <= 16.0 * self._error] = 0.0
        return level

    @property
    def potentials(self) -> Array:
        """Dual values over the original rows (rows,)."""
        cost = np.array([self._c[j] if j >= 0 else 0.0 for j in self.basis])
        return np.asarray(cost @ self._inverse)

    def run(self) -> None:
        """Pivot to the optimum. Raises Endless if there is none."""
        self._leave_artificials()
        c = self._c
        cost = np.array([c[j] if j >= 0 else 0.0 for j in self.basis])
        reduced = c - cost @ self._T
        tolerance = 2e-14 * (1.0 + float(np.abs(c).max()))
        stalled = 0
        while True:
            if stalled > 30:  # Bland's rule cannot cycle
                negative = np.flatnonzero(reduced < -tolerance)
                if not negative.size:
                    return
                j = int(negative[0])
            else:
                j = int(np.argmin(reduced))
                if reduced[j] >= -tolerance:
                    return
            k = self._leaving(j)
            if k < 0:
                return
            stalled = stalled + 1 if self._level[k] <= 16.0 * self._error[k] else 0
            self._pivot(k, j)
            reduced = reduced - reduced[j] * self._T[k]

    def _leave_artificials(self) -> None:
        """First phase: drive the artificial columns to zero, then out of the basis."""
        while True:
            artificial = [k for k in range(self._rows) if self.basis[k] < 0]
            positive = [k for k in artificial if self._level[k] > 16.0 * self._error[k]]
            if not positive:
                break
            gain = self._T[positive].sum(axis=0)
            j = int(np.argmax(gain))
            if gain[j] <= 1e-9:
                break
            k = self._leaving(j)
            if k < 0:
                break
            self._pivot(k, j)
        for k in range(self._rows):
            if self.basis[k] < 0 and self._level[k] <= 16.0 * self._error[k]:
                j = int(np.argmax(np.abs(self._T[k])))
                if abs(self._T[k, j]) > 1e-9:
                    self._pivot(k, j)

    def _leaving(self, j: int) -> int:
        column = self._T[:, j]
        best, row = np.inf, -1
        for k in range(self._rows):
            at_zero = self._level[k] <= 16.0 * self._error[k]
            if column[k] > 1e-9 or (self.basis[k] < 0 and at_zero and abs(column[k]) > 1e-9):
                ratio = 0.0 if at_zero else self._level[k] / column[k]
                if ratio < best or (ratio == best and abs(column[k]) > abs(column[row])):
                    best, row = ratio, k
        return row

    def _pivot(self, k: int, j: int) -> None:
        self._pivots += 1
        if self._pivots > _MAX_PIVOTS:
            raise Endless("the linear program does not end")
        column = self._T[:, j].copy()
        pivot = column[k]
        column[k] = 0.0
        self._T[k] /= pivot
        self._inverse[k] /= pivot
        self._level[k] /= pivot
        self._error[k] = self._error[k] / abs(pivot) + _EPS * abs(self._level[k])
        self._T -= column[:, None] * self._T[k]
        self._inverse -= column[:, None] * self._inverse[k]
        change = column * self._level[k]
        self._error += np.abs(column) * self._error[k] + _EPS * (
            np.abs(self._level) + np.abs(change)
        )
        self._level -= change
        self._T[:, j] = 0.0
        self._T[k, j] = 1.0
        self.basis[k] = j
