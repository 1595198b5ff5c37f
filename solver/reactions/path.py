"""A feed along the extent of one reaction: amounts, limits, and the equilibrium extent."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import P0, R, condensed_volume
from solver.errors import InputError
from solver.reactions.reaction import Reaction
from solver.reactions.root import bracketed_root

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

_EPS = 2.220446049250313e-16
_SMALLEST = 600.0
"""How far, in powers of e, an equilibrium may be from the end of the admissible extents."""


@dataclass(frozen=True)
class Stop:
    """One end of the admissible extents.

    Attributes
    ----------
    extent : float
        mol.
    amounts : ndarray, shape (species,)
        mol at the end; what is used up is exactly zero.
    used_up : tuple of int
        Indices of the species used up; none where a full vessel is what stops the reaction.
    """

    extent: float
    amounts: Array
    used_up: tuple[int, ...]


@dataclass(frozen=True)
class Place:
    """A point on the path: a distance from one end, so that small rests keep all their digits."""

    extent: float
    amounts: Array
    off: float
    """ln Q - ln K; where it is an end of the path, pure phases used up count as present."""
    at_end: Stop | None = None


class Path:
    """Amounts n0 + nu extent of all fed and reacting species, in a held p or V.

    Parameters
    ----------
    reaction : Reaction
    feed : mapping of Species to float
        mol; species that are not in the reaction stay as they are.
    p, V : float or None
        Pa or m3, one of them held.

    Raises
    ------
    InputError
        The condensed species do not fit into the vessel.
    """

    def __init__(
        self,
        reaction: Reaction,
        feed: Mapping[Species, float],
        *,
        p: float | None = None,
        V: float | None = None,
    ) -> None:
        self.reaction, self.p, self.V = reaction, p, V
        self.species = tuple(dict.fromkeys([*reaction.species, *feed]))
        numbers = reaction.numbers
        self.nu = np.array([float(numbers.get(sp, 0)) for sp in self.species])
        self.start = np.array([feed.get(sp, 0.0) for sp in self.species])
        self.is_gas = np.array([sp.phase == "gas" for sp in self.species])
        self.volume = np.array([condensed_volume(sp) for sp in self.species])
        self._reacts = np.flatnonzero(self.nu)
        self.low, self.high = self._stop(-1.0), self._stop(1.0)

    def _stop(self, way: float) -> Stop:
        """The end of the path in one direction (+1: to the right)."""
        left = way * self.nu
        consumed = np.flatnonzero(left < 0.0)
        reach = self.start[consumed] / -left[consumed]
        distance = float(reach.min())
        used_up = [
            int(i) for i, r in zip(consumed, reach, strict=True) if r <= distance * (1 + 4 * _EPS)
        ]
        if self.V is not None:
            room = self.V - float(self.volume @ self.start)
            swelling = way * float(self.volume @ self.nu)
            if swelling > 0.0 and room / swelling < distance:
                distance, used_up = room / swelling, []
            fits = max(room, room - swelling * distance)
            if fits <= 0.0:
                least = self.V - fits
                raise InputError(
                    f"The condensed species take up {least:.6g} m3 at the least, which leaves no "
                    f"room in the vessel of {self.V:.6g} m3; give a larger volume.",
                    "fixed.V",
                    self.V,
                    f"above {least:.6g} m3",
                )
        amounts = np.maximum(self.start + left * distance, 0.0)
        amounts[used_up] = 0.0
        return Stop(way * distance + 0.0, amounts, tuple(used_up))  # + 0.0: no minus zero

    @property
    def width(self) -> float:
        """From end to end, mol."""
        return self.high.extent - self.low.extent

    def at(self, extent: float, T: float) -> Place:
        """The point of a given extent (mol) at T (K)."""
        amounts = np.maximum(self.start + self.nu * extent, 0.0)
        return Place(extent, amounts, self._off(amounts, T))

    def _from(self, stop: Stop, d: float, T: float) -> Place:
        inward = 1.0 if stop is self.low else -1.0
        amounts = stop.amounts + inward * d * self.nu
        return Place(stop.extent + inward * d, amounts, self._off(amounts, T))

    def pressure(self, amounts: Array, T: float) -> float:
        """Pa; zero where there is no gas in a vessel."""
        if self.p is not None:
            return self.p
        assert self.V is not None
        gas = float(amounts[self.is_gas].sum())
        left = self.V - float(self.volume @ amounts)
        if gas <= 0.0:
            return 0.0
        return gas * R * T / left if left > 0.0 else math.inf

    def ln_q(self, amounts: Array, T: float) -> float:
        """ln of the reaction quotient; pure condensed species count as present."""
        p = self.pressure(amounts, T)
        gas = float(amounts[self.is_gas].sum())
        total = 0.0
        infinite = 0.0
        for i in self._reacts:
            nu = float(self.nu[i])
            if not self.is_gas[i]:
                total += nu * float(self.volume[i]) * (p - P0) / (R * T)
            elif amounts[i] <= 0.0 or p <= 0.0:
                infinite -= nu
            elif math.isinf(p):
                infinite += nu
            else:
                total += nu * (math.log(float(amounts[i]) / gas) + math.log(p / P0))
        return math.copysign(math.inf, infinite) if infinite else total

    def _off(self, amounts: Array, T: float) -> float:
        return self.ln_q(amounts, T) - self.reaction.ln_k(T)

    def end(self, stop: Stop, T: float) -> Place:
        """An end of the path with the limit of ln Q - ln K there."""
        used_gas = [i for i in stop.used_up if self.is_gas[i]]
        outward = -1.0 if stop is self.low else 1.0
        gas = float(stop.amounts[self.is_gas].sum())
        if not stop.used_up or (used_gas and (gas > 0.0 or self.V is not None)):
            off = outward * math.inf
        elif gas > 0.0 or not used_gas:
            off = self._off(stop.amounts, T)
        else:  # the last gas goes; at a held pressure its composition has a limit
            off = self._from(stop, 1e-9 * self.width, T).off
        return Place(stop.extent, stop.amounts, off, stop)

    def equilibrium(self, T: float) -> Place:
        """Where ln Q - ln K, which never falls with the extent, changes sign; else an end."""
        low = self.end(self.low, T)
        if low.off >= 0.0 or self.width <= 0.0:
            return low
        high = self.end(self.high, T)
        if high.off <= 0.0:
            return high
        half = 0.5 * self.width
        middle = self._from(self.low, half, T)
        stop = self.low if middle.off > 0.0 else self.high
        edge = low if stop is self.low else high

        def off(x: float) -> float:
            return self._from(stop, math.exp(x), T).off

        top = math.log(half)
        far = max(top - _SMALLEST, -700.0)
        off_far = off(far)
        if (off_far > 0.0) == (middle.off > 0.0) and off_far != 0.0:
            return edge  # closer to the end than floats can tell
        x = bracketed_root(off, far, top, off_far, middle.off)
        return self._from(stop, math.exp(x), T)

    def ln_activity_of_absent(self, place: Place) -> dict[int, float]:
        """ln activity of the one pure phase that is used up at an end of the path."""
        if place.at_end is None or not math.isfinite(place.off):
            return {}
        gone = [i for i in self._reacts if not self.is_gas[i] and place.amounts[i] <= 0.0]
        return {int(gone[0]): -place.off / float(self.nu[gone[0]])} if len(gone) == 1 else {}
