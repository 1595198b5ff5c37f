"""Minima of many cases of a real mixture, filled in as they are found."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.real.problem import SLOTS, RealCases

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
Flags = NDArray[np.bool_]


@dataclass(frozen=True)
class PhaseSet:
    """What is present: condensed species, components, and slots of the fluid phases."""

    active: tuple[int, ...]
    members: tuple[int, ...]
    fluids: tuple[int, ...]

    @property
    def rows(self) -> list[int]:
        """Components that are no condensed phase."""
        taken = set(self.active)
        return [k for k, m in enumerate(self.members) if m not in taken]


@dataclass
class Minima:
    """Minima at T and p.

    Attributes
    ----------
    sets, of : list of PhaseSet and ndarray (cases,)
        The sets of phases, and which of them each case has.
    log_a : ndarray, shape (cases, components)
        Potentials of the components over RT, less their g/RT at the pressure held.
    nu : ndarray, shape (cases, slots)
        ln of the amount of each fluid phase.
    theta : ndarray, shape (cases, slots, moments)
        Gradient of the residual Gibbs energy by the moments: ln phi = q . theta.
    fluids : ndarray, shape (cases, slots, gas species)
        Amounts in each fluid phase, mol.
    n : ndarray, shape (cases, species)
        Amounts of all species over all phases, mol.
    potentials : ndarray, shape (cases, rows)
    distance : ndarray, shape (cases,)
        Least tangent-plane distance found, in units of RT.
    found : ndarray of bool, shape (cases,)
    why : dict of int to Exception
    apart : dict of int to ndarray, shape (phases, gas species)
        Compositions among which the phases of a case are chosen afresh where it is not found:
        the trial that lay lowest, and those that were present.
    """

    sets: list[PhaseSet]
    of: Indices
    log_a: Array
    nu: Array
    theta: Array
    fluids: Array
    n: Array
    potentials: Array
    distance: Array
    found: Flags
    why: dict[int, Exception]
    apart: dict[int, Array]

    @classmethod
    def none_of(cls, cases: RealCases) -> Minima:
        """Nothing found yet."""
        count, mixture = len(cases), cases.mixture
        slots, gases, moments = len(SLOTS), cases.gas.size, cases.q.shape[2]
        return cls(
            sets=[],
            of=np.full(count, -1),
            log_a=np.zeros((count, mixture.rank)),
            nu=np.full((count, slots), -np.inf),
            theta=np.zeros((count, slots, moments)),
            fluids=np.zeros((count, slots, gases)),
            n=np.full((count, len(mixture.species)), np.nan),
            potentials=np.full((count, mixture.A.shape[1]), np.nan),
            distance=np.full(count, np.nan),
            found=np.zeros(count, dtype=bool),
            why={},
            apart={},
        )

    def number(self, chosen: PhaseSet) -> int:
        """Index of a set of phases."""
        if chosen not in self.sets:
            self.sets.append(chosen)
        return self.sets.index(chosen)

    def set_of(self, case: int) -> PhaseSet:
        """The set of one case."""
        return self.sets[int(self.of[case])]

    def part(self, keep: Indices) -> Minima:
        """The minima of some of the cases, not yet found again."""
        return Minima(
            sets=list(self.sets),
            of=self.of[keep].copy(),
            log_a=self.log_a[keep].copy(),
            nu=self.nu[keep].copy(),
            theta=self.theta[keep].copy(),
            fluids=self.fluids[keep].copy(),
            n=self.n[keep].copy(),
            potentials=self.potentials[keep].copy(),
            distance=self.distance[keep].copy(),
            found=self.found[keep].copy(),
            why={},
            apart={},
        )

    def take(self, which: Indices, other: Minima) -> None:
        """Take over what was found for some cases in a batch of their own."""
        numbers = np.array([self.number(chosen) for chosen in other.sets], dtype=np.intp)
        self.of[which] = numbers[other.of] if numbers.size else other.of
        for name in ("log_a", "nu", "theta", "fluids", "n", "potentials", "distance", "found"):
            getattr(self, name)[which] = getattr(other, name)
        for row, error in other.why.items():
            self.why[int(which[row])] = error
