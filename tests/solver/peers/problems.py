"""Random equilibrium problems with real species of the library, each from its own seed."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
import numpy.typing as npt

import species_db
from species_db import Species

FUZZ = int(os.environ.get("THALWEG_FUZZ", "1"))
"""How many times the usual number of random problems to try."""

COMMON = ("C", "H", "O", "N")
OTHERS = ("S", "Cl", "Fe", "Ca", "Si", "Al", "Na", "Mg", "Ti", "Cu", "F", "K", "P", "B", "Ni", "Ar")


@dataclass(frozen=True)
class Problem:
    """Candidates, feed in mol, T in K and p in Pa."""

    seed: int
    species: tuple[Species, ...]
    feed: dict[Species, float]
    T: float
    p: float

    def __str__(self) -> str:
        feed = ", ".join(f"{n:.3g} {s.key}" for s, n in self.feed.items())
        return (
            f"seed {self.seed}: {feed} at {self.T:.1f} K, {self.p:.4g} Pa; "
            f"candidates {' '.join(s.key for s in self.species)}"
        )


@dataclass(frozen=True)
class Arrays:
    """The same as arrays, per RT: minimise g.n + sum over gas of n ln(n/N) with A n = b."""

    A: npt.NDArray[np.float64]
    b: npt.NDArray[np.float64]
    g: npt.NDArray[np.float64]
    gas: npt.NDArray[np.bool_]


@cache
def library() -> species_db.Library:
    return species_db.load()


def random_problem(seed: int) -> Problem:
    """One to six elements, up to 40 gases and 12 condensed candidates, 300-4000 K, 0.01-200 bar."""
    rng = np.random.default_rng(seed)
    count = int(rng.integers(1, 7))
    likely = rng.permutation(COMMON)[: int(rng.integers(1, 5))]
    rest = rng.permutation(OTHERS)
    elements = [str(e) for e in [*likely, *rest][:count]]
    gas = pick(rng, library().made_of(elements, phases=("gas",)), 40)
    condensed = pick(rng, library().made_of(elements, phases=("liquid", "solid")), 12)
    if not gas:
        gas = library().made_of(["N"], phases=("gas",))
    species = (*gas, *condensed)
    fed = pick(rng, list(species), int(rng.integers(1, 6)))
    feed = {s: float(10.0 ** rng.uniform(-3, 1)) for s in fed}
    T = float(rng.uniform(300.0, 4000.0))
    p = float(10.0 ** rng.uniform(3.0, np.log10(2e7)))
    return Problem(seed, species, feed, T, p)


def pick(rng: np.random.Generator, species: list[Species], most: int) -> list[Species]:
    """At most so many, without preference, in the library's order."""
    chosen = np.sort(rng.permutation(len(species))[:most])
    return [species[i] for i in chosen]


def arrays(problem: Problem) -> Arrays:
    """Formula matrix (elements, species), element amounts and g/RT at the problem's T and p."""
    elements = sorted({e for s in (*problem.species, *problem.feed) for e in s.elements})
    A = np.array([[s.elements.get(e, 0.0) for s in problem.species] for e in elements])
    b = np.array(
        [sum(n * s.elements.get(e, 0.0) for s, n in problem.feed.items()) for e in elements]
    )
    gas = np.array([s.phase == "gas" for s in problem.species])
    return Arrays(A, b, pure_potentials(problem.species, problem.T, problem.p), gas)


def pure_potentials(species: Sequence[Species], T: float, p: float) -> npt.NDArray[np.float64]:
    """mu/RT of each species alone at T and p: an ideal gas, or a phase of constant volume."""
    over = p - species_db.P_STANDARD
    return np.array(
        [
            s.g(T) / (species_db.R * T)
            + (
                np.log(p / species_db.P_STANDARD)
                if s.phase == "gas"
                else (s.molar_volume or 0.0) * over / (species_db.R * T)
            )
            for s in species
        ]
    )


def gibbs(problem: Arrays, n: npt.NDArray[np.float64]) -> float:
    """G/RT of amounts in mol; a species of amount zero adds nothing."""
    gas = n[problem.gas]
    total = gas.sum()
    some = gas > 0
    return float(problem.g @ n + gas[some] @ np.log(gas[some] / total))


def lower_bound(problem: Arrays, potentials: npt.NDArray[np.float64]) -> float:
    """Bound of G/RT from below by weak duality, whatever the element potentials.

    The potentials are shifted until no phase could form from them: every formula holds at least
    `least` atoms, so lowering all potentials by d lowers each a.lambda by at least `least` d.
    """
    reach = problem.A.T @ potentials - problem.g
    gas = reach[problem.gas]
    excess = 0.0
    if gas.size:
        top = float(gas.max())
        excess = max(excess, top + float(np.log(np.exp(gas - top).sum())))
    if not problem.gas.all():
        excess = max(excess, float(reach[~problem.gas].max()))
    least = problem.A.sum(axis=0).min()
    shift = excess / least
    return float(problem.b @ potentials - shift * problem.b.sum())
