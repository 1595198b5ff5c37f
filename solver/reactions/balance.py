"""Exact arithmetic of reactions: element and charge balance, independence, tidy numbers.

Stoichiometric numbers are fractions, so that "balances" and "follows from" are decided
without a tolerance, for formulas such as Fe0.947O too.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from fractions import Fraction
from functools import lru_cache
from math import gcd, lcm
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from species_db import Species

CHARGE = "charge"
LARGEST_WHOLE = 60
"""Beyond this a reaction with an odd formula such as Fe0.947O is written in decimals."""


@lru_cache(maxsize=8192)
def composition(species: Species) -> Mapping[str, Fraction]:
    """Atoms of each element, and charge, of one formula unit as exact fractions."""
    out = {element: Fraction(repr(float(n))) for element, n in species.elements.items()}
    if species.charge:
        out[CHARGE] = Fraction(species.charge)
    return out


def surplus(numbers: Mapping[Species, Fraction]) -> dict[str, Fraction]:
    """Right side less left side of each element (and charge) that does not balance."""
    total: dict[str, Fraction] = {}
    for sp, nu in numbers.items():
        for name, count in composition(sp).items():
            total[name] = total.get(name, Fraction(0)) + nu * count
    return {name: total[name] for name in sorted(total) if total[name]}


def null_vectors(columns: Sequence[Mapping[str, Fraction]]) -> list[list[Fraction]]:
    """A basis of the combinations of columns that vanish, exactly.

    Parameters
    ----------
    columns : sequence of mapping
        Sparse vectors.

    Returns
    -------
    list of list of Fraction
        Each of the length of `columns`; vector j is 1 at the j-th column that depends on the
        columns before it, and 0 at the other dependent ones.
    """
    names = sorted({name for column in columns for name in column})
    rows = [[column.get(name, Fraction(0)) for column in columns] for name in names]
    pivots: list[int] = []
    for col in range(len(columns)):
        at = len(pivots)
        found = next((r for r in range(at, len(rows)) if rows[r][col]), None)
        if found is None:
            continue
        rows[at], rows[found] = rows[found], rows[at]
        lead = rows[at][col]
        rows[at] = [value / lead for value in rows[at]]
        for r, row in enumerate(rows):
            if r != at and row[col]:
                factor = row[col]
                rows[r] = [a - factor * b for a, b in zip(row, rows[at], strict=True)]
        pivots.append(col)
    out = []
    for free in (c for c in range(len(columns)) if c not in pivots):
        vector = [Fraction(0)] * len(columns)
        vector[free] = Fraction(1)
        for row, pivot in zip(rows, pivots, strict=False):
            vector[pivot] = -row[free]
        out.append(vector)
    return out


def rank(columns: Sequence[Mapping[str, Fraction]]) -> int:
    """Number of independent vectors, exactly."""
    return len(columns) - len(null_vectors(columns))


def balanced(species: Sequence[Species]) -> dict[Species, Fraction] | None:
    """The one reaction among these species with all of them in it; None where there is none.

    The sign is such that the first species is on the left.
    """
    vectors = null_vectors([composition(sp) for sp in species])
    if len(vectors) != 1 or not all(vectors[0]):
        return None
    sign = -1 if vectors[0][0] > 0 else 1
    return tidy({sp: sign * nu for sp, nu in zip(species, vectors[0], strict=True)})


def tidy(numbers: Mapping[Species, Fraction]) -> dict[Species, Fraction]:
    """Scaled (by a positive factor) to the smallest whole numbers, or to short decimals.

    A formula such as Fe0.947O has no small whole numbers; the reaction is then written for
    one mole of the species, or as many as the formula counts, that gives the shortest text.
    """
    values = [nu for nu in numbers.values() if nu]
    common = lcm(*(v.denominator for v in values))
    whole = [int(v * common) for v in values]
    scale = Fraction(common, gcd(*whole))
    counts = {n for sp in numbers for n in composition(sp).values() if n.denominator > 1}
    if counts and max(abs(v * scale) for v in values) > LARGEST_WHOLE:
        wanted: Iterable[Fraction] = [Fraction(k) for k in (1, 2, 3, 4)] + sorted(map(abs, counts))
        scales = [w / abs(v) for v in values for w in wanted]
        scale = min(scales, key=lambda s: (sum(_length(v * s) for v in values), s))
    return {sp: nu * scale for sp, nu in numbers.items() if nu}


def _length(value: Fraction) -> int:
    """Characters a reader has to take in; an odd fraction counts as many."""
    text = number_text(abs(value))
    return 0 if text == "1" else len(text) + 10 * ("/" in text)


def number_text(value: Fraction, decimals: bool = True) -> str:
    """A positive stoichiometric number as text that reads back exactly: 3, 1/2, 0.947.

    Parameters
    ----------
    value : Fraction
    decimals : bool
        Write 0.5 rather than 1/2.
    """
    if value.denominator == 1:
        return str(value.numerator)
    if (decimals or value.denominator > 12) and (10**9) % value.denominator == 0:
        return f"{float(value):.9f}".rstrip("0")
    return f"{value.numerator}/{value.denominator}"
