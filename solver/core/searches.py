"""What is searched in many cases at once, and what is found."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Cases, Feed
from solver.core.mixture import Mixture
from solver.core.temperature import Point, Search

Array = NDArray[np.float64]
Indices = NDArray[np.intp]


@dataclass(frozen=True)
class Searches:
    """What is searched in many cases: the variable, its values, and what is held beside.

    Attributes
    ----------
    variable : str
        "H", "U" or "S".
    values : ndarray, shape (cases,)
    p, V : ndarray, shape (cases,), or None
    T_low, T_high : float
    """

    variable: str
    values: Array
    p: Array | None
    V: Array | None
    T_low: float
    T_high: float

    @classmethod
    def of_one(cls, search: Search) -> Searches:
        """The search of a single case."""
        p = None if search.p is None else np.array([search.p])
        V = None if search.V is None else np.array([search.V])
        values = np.array([search.value])
        return cls(search.variable, values, p, V, search.T_low, search.T_high)

    def of(self, which: Indices) -> Searches:
        """The searches of some of the cases."""
        p = None if self.p is None else self.p[which]
        V = None if self.V is None else self.V[which]
        return replace(self, values=self.values[which], p=p, V=V)

    def one(self, i: int) -> Search:
        """The search of one case."""
        return Search(
            self.variable,
            float(self.values[i]),
            None if self.p is None else float(self.p[i]),
            None if self.V is None else float(self.V[i]),
            self.T_low,
            self.T_high,
        )

    def cases(self, mixture: Mixture, feed: Feed, which: Indices, T: Array) -> Cases:
        """Some cases at given temperatures."""
        p = None if self.p is None else self.p[which]
        V = None if self.V is None else self.V[which]
        return Cases(mixture, feed.of(which), T, p, V)


@dataclass
class Found:
    """Points of many cases, filled in as they are found."""

    T: Array
    p: Array
    n: Array
    potentials: Array
    functions: dict[str, Array]
    """V, H, U, S and G, each (cases,)."""
    found: NDArray[np.bool_]
    why: dict[int, Exception]

    @classmethod
    def none_of(cls, mixture: Mixture, count: int) -> Found:
        """Nothing found yet."""
        return cls(
            T=np.full(count, np.nan),
            p=np.full(count, np.nan),
            n=np.full((count, len(mixture.species)), np.nan),
            potentials=np.full((count, mixture.A.shape[1]), np.nan),
            functions={name: np.full(count, np.nan) for name in ("V", "H", "U", "S", "G")},
            found=np.zeros(count, dtype=bool),
            why={},
        )

    def put(self, i: int, point: Point) -> None:
        """Take one case settled by itself."""
        self.T[i], self.p[i], self.n[i] = point.T, point.p, point.n
        self.potentials[i] = point.potentials
        for name, values in self.functions.items():
            values[i] = point.value(name)
        self.found[i] = True
