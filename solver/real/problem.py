"""Cases of a real mixture at given T and p, as arrays.

Beside the ideal problem stand the moments of the equation of state. Where it can form a
liquid, the records of pure liquids whose substance it models are left out: the mixture's
own liquid holds that matter, and it would be counted twice.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.cases import Cases, Feed
from solver.core.mixture import Mixture

if TYPE_CHECKING:
    from collections.abc import Sequence

    from solver.gas.fluid import Fluid
    from species_db import Species

Array = NDArray[np.float64]
Indices = NDArray[np.intp]

SLOTS = ("gas", "liquid", "second liquid", "third liquid")
"""The fluid phases that a mixture can have, lightest first."""
ROOTS = ("vapour", "liquid", "liquid", "liquid")
"""Root of the equation of state that each of them takes."""


@dataclass(frozen=True, eq=False)
class RealMixture:
    """A candidate list with its equation of state.

    Attributes
    ----------
    mixture : Mixture
    fluid : Fluid
        Over the gas species, in the order of `mixture.gas`.
    stands_for : dict of int to int
        Pure liquid left out, to the gas species whose matter it is.
    condensed : ndarray of int
        Condensed species that stand as phases of their own.
    """

    mixture: Mixture
    fluid: Fluid
    stands_for: dict[int, int]
    condensed: Indices


def pure_liquids(species: Sequence[Species], modelled: Sequence[Species]) -> dict[str, str]:
    """Keys of pure liquids whose substance the equation of state models, to its gas' key.

    Parameters
    ----------
    species : sequence of Species
        The candidates.
    modelled : sequence of Species
        The gases that the equation of state holds.
    """
    out: dict[str, str] = {}
    for liquid in species:
        if liquid.phase != "liquid" or liquid.charge:
            continue
        for gas in modelled:
            same = bool(liquid.cas) and liquid.cas == gas.cas
            if same and dict(liquid.elements) == dict(gas.elements):
                out[liquid.key] = gas.key
                break
    return out


def make_real(mixture: Mixture, fluid: Fluid) -> RealMixture:
    """Join candidates and equation of state."""
    gases = [mixture.species[i] for i in mixture.gas]
    modelled = [sp for sp, held in zip(gases, fluid.modelled, strict=True) if held]
    keys = pure_liquids(mixture.species, modelled)
    # the reacting one of a species that stands twice comes last
    place = {sp.key: k for k, sp in enumerate(mixture.species)}
    stands_for = {k: place[keys[sp.key]] for k, sp in enumerate(mixture.species) if sp.key in keys}
    condensed = np.array([i for i in mixture.condensed if i not in stands_for], dtype=np.intp)
    return RealMixture(mixture, fluid, stands_for, condensed)


class RealCases:
    """Cases at given T and p.

    Parameters
    ----------
    real : RealMixture
    feed : Feed
    T, p : ndarray, shape (cases,)
        K, Pa.

    Attributes
    ----------
    ideal : Cases
        The same cases without the equation of state; `ideal.c` is g/RT at the pressure held.
    q, qT, qTT, qp : ndarray, shape (cases, gas species, moments)
        Moments of each gas species and their derivatives by ln T, ln T twice, and ln p.
    own : ndarray of int
        Gas species that the equation of state models.
    core : ndarray, shape (cases, modelled species, moments - 1)
        What of q is neither one (the first moment counts moles) nor zero.
    """

    def __init__(self, real: RealMixture, feed: Feed, T: Array, p: Array) -> None:
        self.real, self.mixture, self.fluid = real, real.mixture, real.fluid
        self.feed, self.T, self.p = feed, T, p
        self.ideal = Cases(real.mixture, feed, T, p, None)
        self._moments = real.fluid.at(T, p)
        self._rows: Indices | None = None  # of the moments, in some of the cases they are for
        self.q = self._moments.q
        self.gas = real.mixture.gas
        self.own = np.flatnonzero(real.fluid.modelled)
        self.core = self.q[:, self.own, 1:]

    @property
    def qT(self) -> Array:
        """T dq/dT."""
        return self._own(self._moments.qT)

    @property
    def qTT(self) -> Array:
        """(T d/dT)^2 q."""
        return self._own(self._moments.qTT)

    @property
    def qp(self) -> Array:
        """p dq/dp."""
        return self._own(self._moments.qp)

    def _own(self, whole: Array) -> Array:
        return whole if self._rows is None else whole[self._rows]

    def moments(self, n: Array, rows: Indices | slice = slice(None)) -> Array:
        """Moments (rows, moments) of amounts n (rows, gas species) of some of the cases."""
        rest = (n[:, self.own][:, None, :] @ self.core[rows])[:, 0]
        return np.concatenate([n.sum(axis=1, keepdims=True), rest], axis=1)

    def log_phi(self, theta: Array) -> Array:
        """q . theta (cases, fluids, gas species) of theta (cases, fluids, moments)."""
        out = np.repeat(theta[:, :, :1], self.gas.size, axis=2)
        out[:, :, self.own] += theta[:, :, 1:] @ self.core.transpose(0, 2, 1)
        return out

    def __len__(self) -> int:
        return len(self.T)

    def of(self, which: Indices) -> RealCases:
        """Some of the cases, nothing computed again."""
        if len(which) == len(self) and np.array_equal(which, np.arange(len(self))):
            return self
        out = object.__new__(RealCases)
        out.__dict__.update(self.__dict__)
        out.feed, out.ideal = self.feed.of(which), self.ideal.part(which)
        out.T, out.p, out.q = self.T[which], self.p[which], self.q[which]
        out.core = self.core[which]
        out._rows = which if self._rows is None else self._rows[which]
        return out
