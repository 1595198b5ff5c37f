"""Dimensionless g, h, cp of many species at many temperatures, in one matrix product."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.columns import run_of

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]


class ThermoTable:
    """Seven-coefficient records of a species list, cut at the union of all segment joins.

    Between two neighbouring joins every species follows one polynomial, so that all species
    at all temperatures of that interval come from one product of powers of T with a
    coefficient matrix. Below and above a record's range its cp is held constant.
    """

    def __init__(self, species: Sequence[Species]) -> None:
        pieces = [_extended(sp) for sp in species]
        joins = sorted({low for piece in pieces for low, _ in piece[1:]})
        self._joins = np.array(joins, dtype=float)
        self._pieces = pieces
        self._tables: dict[int, tuple[Array, Array, Array]] = {}
        self.T_min = np.array([sp.T_min for sp in species])
        self.T_max = np.array([sp.T_max for sp in species])

    def table(self, interval: int) -> tuple[Array, Array, Array]:
        """Coefficient matrices (powers, species) of g, h and cp on one interval."""
        if interval not in self._tables:
            T = self._joins[interval - 1] if interval else 0.0
            rows = np.array(
                [
                    next(a for low, a in reversed(piece) if low <= T or low == -np.inf)
                    for piece in self._pieces
                ]
            ).reshape(-1, 7)
            a1, a2, a3, a4, a5, a6, a7 = rows.T
            zero = np.zeros_like(a1)
            h = np.stack([a1, a2 / 2, a3 / 3, a4 / 4, a5 / 5, a6, zero])
            cp = np.stack([a1, a2, a3, a4, a5, zero, zero])
            # g = h - s with s = a1 ln T + a2 T + a3 T^2/2 + a4 T^3/3 + a5 T^4/4 + a7
            g = np.stack([a1 - a7, -a2 / 2, -a3 / 6, -a4 / 12, -a5 / 20, a6, -a1])
            self._tables[interval] = (g, h, cp)
        return self._tables[interval]

    def intervals(self, T: Array) -> NDArray[np.intp]:
        """Number of the interval between joins in which each T (cases,) lies."""
        return np.searchsorted(self._joins, T, side="right")

    def over(self, T: Array) -> tuple[Array, Array, Array]:
        """g/RT, h/RT and cp/R at 1 bar at temperatures T (cases,), each (cases, species)."""
        g, h, cp = self._evaluated(T, (0, 1, 2))
        return g, h, cp

    def gibbs(self, T: Array) -> Array:
        """g/RT at 1 bar at temperatures T (cases,), (cases, species)."""
        return self._evaluated(T, (0,))[0]

    def enthalpy(self, T: Array) -> Array:
        """h/RT at temperatures T (cases,), (cases, species)."""
        return self._evaluated(T, (1,))[0]

    def heat_capacity(self, T: Array) -> Array:
        """cp/R at temperatures T (cases,), (cases, species)."""
        return self._evaluated(T, (2,))[0]

    def _evaluated(self, T: Array, which: tuple[int, ...]) -> list[Array]:
        intervals = self.intervals(T)
        powers = powers_of(T).T
        first = int(intervals[0]) if T.size else 0
        if np.all(intervals == first):
            tables = self.table(first)
            return [powers @ tables[k] for k in which]
        out = [np.empty((T.size, len(self._pieces))) for _ in which]
        for interval in np.unique(intervals):
            rows = run_of(np.flatnonzero(intervals == interval))
            tables, here = self.table(int(interval)), powers[rows]
            for part, k in zip(out, which, strict=True):
                part[rows] = here @ tables[k]
        return out


def powers_of(T: Array) -> Array:
    """The powers of T that the coefficients multiply (powers, cases)."""
    T2 = T * T
    return np.array([np.ones_like(T), T, T2, T2 * T, T2 * T2, 1.0 / T, np.log(T)])


def _extended(sp: Species) -> list[tuple[float, tuple[float, ...]]]:
    """Segments as (lower end, coefficients), with constant-cp pieces outside the range."""
    first, last = sp.segments[0], sp.segments[-1]
    out = [(-np.inf, _constant_cp(first.a, first.T_low))]
    out += [(seg.T_low, tuple(seg.a)) for seg in sp.segments]
    out.append((np.nextafter(last.T_high, np.inf), _constant_cp(last.a, last.T_high)))
    return out


def _constant_cp(a: Sequence[float], T: float) -> tuple[float, ...]:
    """Coefficients that continue a record beyond T with the cp it has there."""
    a1, a2, a3, a4, a5, a6, a7 = a
    cp = a1 + T * (a2 + T * (a3 + T * (a4 + T * a5)))
    h = a1 + T * (a2 / 2 + T * (a3 / 3 + T * (a4 / 4 + T * a5 / 5))) + a6 / T
    s = a1 * np.log(T) + T * (a2 + T * (a3 / 2 + T * (a4 / 3 + T * a5 / 4))) + a7
    return (cp, 0.0, 0.0, 0.0, 0.0, (h - cp) * T, float(s - cp * np.log(T)))
