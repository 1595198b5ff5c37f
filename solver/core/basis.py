"""The formula matrix and its rewriting in terms of component species.

Written over elements, the balances of a nearly exact stoichiometry are degenerate: with all
hydrogen and oxygen in water, the two rows differ by amounts of 1e-27 mol that no rounding
survives. Written over the *components* (as many species as there are independent balances,
chosen among the abundant ones) the same balances are well scaled whatever the amounts are,
because a component's abundant species leaves all other rows. All Newton work is done there.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

CHARGE = "charge"
_EPS = float(np.finfo(float).eps)


def formula_vector(species: Species, rows: Mapping[str, int]) -> Array:
    """Element counts (and charge) of one species over the given rows."""
    vector = np.zeros(len(rows))
    for element, count in species.elements.items():
        vector[rows[element]] = count
    if species.charge:
        vector[rows[CHARGE]] = species.charge
    return vector


def balance_rows(species: Iterable[Species]) -> dict[str, int]:
    """A row for each element that occurs, in alphabetical order, and one for charge."""
    elements: set[str] = set()
    charged = False
    for sp in species:
        elements.update(sp.elements)
        charged = charged or sp.charge != 0
    names = sorted(elements) + ([CHARGE] if charged else [])
    return {name: row for row, name in enumerate(names)}


@dataclass(frozen=True)
class Basis:
    """Balances rewritten over component species.

    Attributes
    ----------
    members : tuple[int, ...]
        Indices of the component species, one per independent balance.
    reactions : ndarray, shape (species, components)
        Row i holds how many of each component make up species i.
    transform : ndarray, shape (rows, components)
        Takes formula vectors over elements to component amounts.
    """

    members: tuple[int, ...]
    reactions: Array
    transform: Array

    def of(self, vectors: Array) -> Array:
        """Component amounts of formula vectors (n, rows) -> (n, components), exact zeros kept."""
        return _cleaned(vectors @ self.transform)

    def potentials(self, mu: Array) -> Array:
        """Element potentials (..., rows) from the components' potentials (..., components)."""
        return mu @ self.transform.T


def make_basis(A: Array, members: Sequence[int]) -> Basis:
    """Rewrite the formula matrix A (species, rows) over independent member species."""
    B = A[list(members)]  # (components, rows)
    rows = _independent_columns(B)
    inverse = np.linalg.inv(B[:, rows])
    transform = np.zeros((A.shape[1], len(members)))
    transform[rows] = inverse
    if np.all(A == np.rint(A)):
        # whole-number formulas: entries are multiples of 1/det, so remove the rounding
        det = abs(float(np.linalg.det(B[:, rows])))
        whole = np.rint(det)
        if 0.5 < whole < 1e6 and abs(det - whole) < 1e-6:
            scaled = transform * whole
            if np.allclose(scaled, np.rint(scaled), atol=1e-7):
                transform = np.rint(scaled) / whole
    reactions = _cleaned(A @ transform)
    reactions[list(members)] = np.eye(len(members))
    return Basis(tuple(int(i) for i in members), reactions, transform)


def choose_members(A: Array, order: Iterable[int], rank: int) -> list[int]:
    """Greedy choice of independent species in the given order of preference."""
    chosen: list[int] = []
    reduced: list[tuple[int, Array]] = []
    for i in order:
        row = A[i].copy()
        for pivot, vector in reduced:
            if row[pivot] != 0.0:
                row -= row[pivot] * vector
        pivot = int(np.argmax(np.abs(row)))
        if abs(row[pivot]) > 1e-9 * max(1.0, float(np.abs(A[i]).max())):
            reduced.append((pivot, row / row[pivot]))
            chosen.append(int(i))
            if len(chosen) == rank:
                break
    return chosen


def component_amounts(feed: Array, vectors: Array, basis: Basis) -> Array:
    """Amounts b' of each component in the feed, with rounding residues set to exact zero.

    Parameters
    ----------
    feed : ndarray, shape (cases, fed species)
        Amounts, mol.
    vectors : ndarray, shape (fed species, rows)
        Formula vectors of what is fed.

    Returns
    -------
    ndarray, shape (cases, components)
    """
    per_mole = basis.of(vectors)
    total = feed @ per_mole
    size = feed @ np.abs(per_mole)
    total[np.abs(total) <= 8.0 * _EPS * size] = 0.0
    return total


def _independent_columns(B: Array) -> list[int]:
    """Column indices of a square nonsingular block of B (components, rows)."""
    work = B.copy()
    columns: list[int] = []
    for k in range(work.shape[0]):
        column = int(np.argmax(np.abs(work[k])))
        columns.append(column)
        work[k] /= work[k, column]
        for j in range(k + 1, work.shape[0]):
            work[j] -= work[j, column] * work[k]
    return columns


def _cleaned(values: Array) -> Array:
    values[np.abs(values) < 1e-11] = 0.0
    return values
