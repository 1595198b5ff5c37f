"""First sets of phases for many cases: the linear programs of `simplex`, side by side.

A vertex is its component species. All cases that stand at one vertex share its matrices, so
that their amounts, potentials and driving forces are a few matrix products; each then moves
to its own next vertex. A case with a negative amount takes a dual step, any other a primal
one. Neighbouring cases walk the same way, and most of them little of it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import component_amounts
from solver.core.cases import Cases

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

_MAX_STEPS = 40

Vertex = tuple[int, ...]


def walk(
    cases: Cases, which: Indices, c: Array, first: Vertex
) -> list[tuple[Indices, Vertex, Array]]:
    """Take cases from one vertex to their best ones.

    Parameters
    ----------
    which : ndarray of int, shape (n,)
        The cases.
    c : ndarray, shape (n, species)
        g/RT with the pressure of gases in it.
    first : tuple of int
        Component species to start from.

    Returns
    -------
    list of (positions in `which`, component species, amounts (cases, components))
        Cases that did not arrive are left out.
    """
    arrived: list[tuple[Indices, Vertex, Array]] = []
    standing: dict[Vertex, list[Indices]] = {first: [np.arange(len(which))]}
    tolerance = 1e-10 * (1.0 + np.abs(c).max(axis=1))
    for _ in range(_MAX_STEPS):
        moved: dict[Vertex, list[Indices]] = {}
        for vertex, parts in standing.items():
            rows = parts[0] if len(parts) == 1 else np.concatenate(parts)
            basis = cases.mixture.basis(vertex)
            amounts = component_amounts(cases.feed.amounts[which[rows]], cases.feed.vectors, basis)
            force = c[np.ix_(rows, np.array(vertex))] @ basis.reactions.T - c[rows]
            leaving, entering = _next(amounts, force, basis.reactions, tolerance[rows])
            here = entering == -1
            if here.any():
                arrived.append((rows[here], vertex, amounts[here]))
            going = np.flatnonzero(entering >= 0)
            code = entering[going] * len(vertex) + leaving[going]
            for value in np.unique(code):
                j, k = divmod(int(value), len(vertex))
                onward = tuple(sorted((*vertex[:k], *vertex[k + 1 :], j)))
                moved.setdefault(onward, []).append(rows[going[code == value]])
        standing = moved
        if not standing:
            break
    return arrived


def _next(
    amounts: Array, force: Array, reactions: Array, tolerance: Array
) -> tuple[Indices, Indices]:
    """Component that leaves and species that enters; -1 where the vertex is the best, -2 lost."""
    count = len(amounts)
    leaving, entering = np.zeros(count, dtype=np.intp), np.full(count, -1)
    short = amounts.min(axis=1) < 0.0
    rows = np.flatnonzero(~short)
    if rows.size:  # primal: the largest force enters, what it uses up first leaves
        best = force[rows].argmax(axis=1)
        gains = force[rows, best] > tolerance[rows]
        rows, best = rows[gains], best[gains]
        use = reactions[best]
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = np.where(use > 1e-9, amounts[rows] / use, np.inf)
        leaving[rows] = ratio.argmin(axis=1)
        entering[rows] = np.where(np.isfinite(ratio.min(axis=1)), best, -2)
    rows = np.flatnonzero(short)
    if rows.size:  # dual: the most negative leaves, the least unwilling replacement enters
        worst = amounts[rows].argmin(axis=1)
        give = -reactions[:, worst].T
        with np.errstate(divide="ignore", invalid="ignore"):
            price = np.where(give > 1e-9, np.maximum(-force[rows], 0.0) / give, np.inf)
        best = price.argmin(axis=1)
        leaving[rows] = worst
        entering[rows] = np.where(np.isfinite(price.min(axis=1)), best, -2)
    return leaving, entering
