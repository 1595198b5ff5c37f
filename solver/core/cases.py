"""Many cases over one candidate list at fixed T and p or V, as arrays."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import choose_members
from solver.core.mixture import P0, Mixture, R

Array = NDArray[np.float64]
Indices = NDArray[np.intp]


@dataclass(frozen=True)
class Feed:
    """What is fed: amounts (cases, fed species) and formula vectors (fed species, rows)."""

    amounts: Array
    vectors: Array

    @property
    def totals(self) -> Array:
        """Element totals (cases, rows)."""
        return np.asarray(self.amounts @ self.vectors)

    def of(self, cases: Indices) -> Feed:
        """The feed of some of the cases."""
        return Feed(self.amounts[cases], self.vectors)


class Cases:
    """Cases at given temperatures and at given pressures or volumes.

    Parameters
    ----------
    mixture : Mixture
    feed : Feed
    T : ndarray, shape (cases,)
        K.
    p, V : ndarray, shape (cases,), or None
        Pa and m3; one of the two.

    Attributes
    ----------
    g : ndarray, shape (cases, species)
        g/RT at 1 bar.
    c : ndarray, shape (cases, species)
        g/RT at the pressure held, or at 1 bar where the volume is held.
    nu_fixed : ndarray, shape (cases,)
        ln of p0 V/RT where the volume is held, else zero.
    force_tolerance : ndarray, shape (cases,)
        Rounding of a driving force a.lambda - c.
    atoms, scale : ndarray, shape (cases,)
        Sum and largest of the element totals.
    """

    def __init__(
        self, mixture: Mixture, feed: Feed, T: Array, p: Array | None, V: Array | None
    ) -> None:
        self.mixture, self.feed, self.T, self.p, self.V = mixture, feed, T, p, V
        self.g = mixture.thermo.gibbs(T)
        self.gas, self.condensed = mixture.gas, mixture.condensed
        totals = np.abs(feed.totals)
        self.scale = totals.max(axis=1)
        self.atoms = totals.sum(axis=1)
        self.c = self.g + mixture.shifted(T) if mixture.shifts else self.g.copy()
        self.nu_fixed = np.zeros(len(T))
        if p is not None:
            self.c[:, mixture.gas_columns] += np.log(p / P0)[:, None]
            if self.condensed.size:
                self.c += mixture.volume * ((p - P0) / (R * T))[:, None]
        else:
            assert V is not None
            self.nu_fixed = np.log(P0 * V / (R * T))
        self.force_tolerance = 6e-14 * (1.0 + np.maximum(self.c.max(axis=1), -self.c.min(axis=1)))

    def __len__(self) -> int:
        return len(self.T)

    def part(self, which: Indices) -> Cases:
        """Some of the cases, nothing computed again."""
        out = object.__new__(Cases)
        out.__dict__.update(self.__dict__)
        out.feed = self.feed.of(which)
        for name in ("T", "g", "h", "cp", "c", "scale", "atoms", "nu_fixed", "force_tolerance"):
            if name in self.__dict__:  # h and cp may not have been asked for
                setattr(out, name, getattr(self, name)[which])
        out.p = None if self.p is None else self.p[which]
        out.V = None if self.V is None else self.V[which]
        return out

    @cached_property
    def h(self) -> Array:
        """h/RT (cases, species)."""
        return self.mixture.thermo.enthalpy(self.T)

    @cached_property
    def cp(self) -> Array:
        """cp/R (cases, species)."""
        return self.mixture.thermo.heat_capacity(self.T)

    @property
    def holds_pressure(self) -> bool:
        """Whether the gas may take any volume."""
        return self.p is not None

    def pressures(self, cases: Indices, n: Array) -> Array:
        """Pressure of the gas in what the condensed phases leave of the volume, Pa.

        Zero where nothing evaporates: a vessel with involatile solids alone; infinite where
        the condensed phases overfill it.
        """
        if self.p is not None:
            return self.p[cases]
        assert self.V is not None
        gas = n[:, self.gas].sum(axis=1)
        left = self.V[cases] - n @ self.mixture.volume
        with np.errstate(divide="ignore", invalid="ignore"):
            p = gas * R * self.T[cases] / left
        overfull = (gas > 0.0) | (left < -1e-12 * self.V[cases])
        return np.where(left > 0.0, p, np.where(overfull, np.inf, 0.0))

    def members(self, active: Sequence[int], amounts: Array) -> list[int]:
        """Components: active condensed phases, then gases by amounts (or their ln) (species,)."""
        gases = self.gas[np.argsort(-amounts[self.gas], kind="stable")]
        rest = self.condensed[np.argsort(-amounts[self.condensed], kind="stable")]
        taken = set(active)
        others = [i for i in rest.tolist() if i not in taken]
        order = [*active, *gases.tolist(), *others]
        return choose_members(self.mixture.A, order, self.mixture.rank)
