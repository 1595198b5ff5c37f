"""What a set of components makes of the records: each gas species as formed from them.

The energies of forming gas species from components are linear in the records' coefficients,
so that they are coefficients of the same powers of T. One product with those powers then
gives all that a Newton step in T needs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis
from solver.core.columns import run_of
from solver.core.mixture import P0, Mixture, R
from solver.core.thermo import powers_of

Array = NDArray[np.float64]
Indices = NDArray[np.intp]


@dataclass(frozen=True)
class Formed:
    """Gas species at given temperatures, (cases, gas species), and phases, (cases, phases).

    Attributes
    ----------
    kappa, heat : ndarray
        g/RT and h/RT of forming the gas species from all components at the pressure held, or
        at 1 bar where the volume is held.
    own, cp : ndarray
        h/RT (or s/R) and cp/R of forming them from the condensed phases present alone.
    phase_own, phase_cp : ndarray
        h/RT (or s/R) and cp/R of those phases.
    """

    kappa: Array
    heat: Array
    own: Array
    cp: Array
    phase_own: Array
    phase_cp: Array


class Formation:
    """Formation of gas species from components, with their enthalpies or their entropies.

    Parameters
    ----------
    mixture : Mixture
    basis : Basis
    gas : ndarray of int
        The gas species.
    present : ndarray of int
        Positions among the components of the condensed phases that are present.
    variable : str
        "S" for entropies, else enthalpies.
    """

    def __init__(
        self, mixture: Mixture, basis: Basis, gas: Indices, present: Indices, variable: str
    ) -> None:
        self._mixture, self._gas, self._entropy = mixture, gas, variable == "S"
        self._members = np.array(basis.members, dtype=np.intp)
        self._phases = self._members[present]
        self._from_all = basis.reactions[gas].T
        self._from_phases = self._from_all[present]
        self._cuts = np.cumsum([gas.size] * 4 + [len(present)])
        self._moles = 1.0 - self._from_all[mixture.is_gas[self._members]].sum(axis=0)
        self._volume = mixture.volume[self._members] @ self._from_all
        self._tables: dict[int, Array] = {}

    def at(self, T: Array, p: Array | None) -> Formed:
        """The species at temperatures T (cases,), K, and pressures p (cases,), Pa, if held."""
        intervals, powers = self._mixture.thermo.intervals(T), powers_of(T).T
        first = int(intervals[0])
        if (intervals == first).all():
            parts = powers @ self._table(first)
        else:
            parts = np.empty((len(T), self._cuts[-1] + len(self._phases)))
            for interval in np.unique(intervals):
                rows = run_of(np.flatnonzero(intervals == interval))
                parts[rows] = powers[rows] @ self._table(int(interval))
        a, b, c, d, e = self._cuts.tolist()
        kappa = parts[:, :a]
        if self._mixture.shifts:
            shifted = self._mixture.shifted(T)
            kappa += shifted[:, self._gas] - shifted[:, self._members] @ self._from_all
        if p is not None:
            kappa += np.log(p / P0)[:, None] * self._moles
            if self._volume.any():
                kappa -= ((p - P0) / (R * T))[:, None] * self._volume
        return Formed(
            kappa, parts[:, a:b], parts[:, b:c], parts[:, c:d], parts[:, d:e], parts[:, e:]
        )

    def _table(self, interval: int) -> Array:
        """Coefficients (powers, columns) of one interval of temperatures."""
        if interval not in self._tables:
            g, h, cp = self._mixture.thermo.table(interval)
            own = h - g if self._entropy else h
            gas, members, phases = self._gas, self._members, self._phases
            self._tables[interval] = np.concatenate(
                [
                    g[:, gas] - g[:, members] @ self._from_all,
                    h[:, gas] - h[:, members] @ self._from_all,
                    own[:, gas] - own[:, phases] @ self._from_phases,
                    cp[:, gas] - cp[:, phases] @ self._from_phases,
                    own[:, phases],
                    cp[:, phases],
                ],
                axis=1,
            )
        return self._tables[interval]
