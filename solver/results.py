"""Arrays that the chunks of a batch fill."""

from __future__ import annotations

from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from solver.endstates import EndStates
from solver.posed import Posed

Array = NDArray[np.float64]
Indices = NDArray[np.intp]


class Results:
    """Arrays of all cases; NaN where a case is not settled."""

    def __init__(self, count: int, species: int) -> None:
        names = ("T", "p", "V", "H", "U", "S", "G", "element_residual", "energy_residual", "gap")
        self.values = {name: np.full(count, np.nan) for name in names}
        self.amounts = np.full((count, species), np.nan)
        self.settled = np.zeros(count, dtype=bool)
        self.liquids: dict[str, Array] = {}

    def end_states(self, pair: str, keys: tuple[str, ...], why: dict[int, str]) -> EndStates:
        """The public result, arrays read-only."""
        for array in (*self.values.values(), *self.liquids.values(), self.amounts, self.settled):
            array.flags.writeable = False
        reasons = MappingProxyType(dict(sorted(why.items())))
        return EndStates(
            pair=pair,
            keys=keys,
            amounts=self.amounts,
            settled=self.settled,
            why=reasons,
            liquids=MappingProxyType(self.liquids),
            **self.values,
        )

    def put_amounts(self, rows: Indices, posed: Posed, n: Array) -> None:
        """Amounts (rows, species of the mixture), mol, by candidate."""
        self.amounts[rows] = self._by_candidate(posed, n)

    def put_liquid(self, phase: str, rows: Indices, posed: Posed, n: Array) -> None:
        """Amounts (rows, gas species of the mixture) in a liquid of the equation of state."""
        if phase not in self.liquids:
            self.liquids[phase] = np.zeros(self.amounts.shape)
        every = np.zeros((len(rows), len(posed.mixture.species)))
        every[:, posed.mixture.gas] = n
        self.liquids[phase][rows] = self._by_candidate(posed, every)

    def _by_candidate(self, posed: Posed, n: Array) -> Array:
        out = np.zeros((len(n), self.amounts.shape[1]))
        out[:, posed.place] = n
        for first, second in posed.mixture.twins:  # an inert part adds to its species
            out[:, posed.place[first]] = n[:, first] + n[:, second]
        return out
