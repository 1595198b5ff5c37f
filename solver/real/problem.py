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

SLOTS = ("gas", "liquid", "second liquid")
"""The fluid phases that a mixture can have, lightest first."""
ROOTS = ("vapour", "liquid", "liquid")
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
    """

    def __init__(self, real: RealMixture, feed: Feed, T: Array, p: Array) -> None:
        self.real, self.mixture, self.fluid = real, real.mixture, real.fluid
        self.feed, self.T, self.p = feed, T, p
        self.ideal = Cases(real.mixture, feed, T, p, None)
        moments = real.fluid.at(T, p)
        self.q, self.qT, self.qTT, self.qp = moments.q, moments.qT, moments.qTT, moments.qp
        self.gas = real.mixture.gas
        self.modelled = real.fluid.modelled

    def __len__(self) -> int:
        return len(self.T)

    def of(self, which: Indices) -> RealCases:
        """Some of the cases, nothing computed again."""
        out = object.__new__(RealCases)
        out.__dict__.update(self.__dict__)
        out.feed, out.ideal = self.feed.of(which), self.ideal.part(which)
        for name in ("T", "p", "q", "qT", "qTT", "qp"):
            setattr(out, name, getattr(self, name)[which])
        return out
