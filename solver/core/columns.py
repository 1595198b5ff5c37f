"""Columns of wide arrays, without copying where they stand in one run."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Indices = NDArray[np.intp]


def run_of(columns: Indices) -> slice | Indices:
    """The same columns as a slice where they follow each other."""
    count = len(columns)
    if count and int(columns[-1]) - int(columns[0]) == count - 1:
        first = int(columns[0])
        if count < 3 or bool((columns[1:] > columns[:-1]).all()):
            return slice(first, first + count)
    return columns


def rows_of(which: Indices, count: int) -> slice | Indices:
    """The same rows as a slice where they are all of `count` rows in their order."""
    run = run_of(which) if len(which) == count else which
    return run if isinstance(run, slice) and run.start == 0 else which
