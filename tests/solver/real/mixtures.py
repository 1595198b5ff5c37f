"""Real mixtures of every kind the minimiser must settle, for the laws. Invented; no answers."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import solver
from species_db import Species
from tests.solver.mixtures import Mixture


@dataclass(frozen=True)
class RealMixture:
    """Candidates, feed, T, p and gas model as a test wants them."""

    mixture: Mixture
    gas: str
    fluids: str
    """The fluid phases to be expected."""

    def __str__(self) -> str:
        return f"{self.mixture.name}, {self.gas}"

    @property
    def name(self) -> str:
        return self.mixture.name

    @property
    def species(self) -> list[Species]:
        return self.mixture.species

    @property
    def feed(self) -> dict[Species, float]:
        return self.mixture.feed_amounts

    @property
    def T(self) -> float:
        return self.mixture.T

    @property
    def p(self) -> float:
        return self.mixture.p

    def settle(self, pair: str = "T,p", size: float = 1.0, **held: float) -> solver.EndState:
        """The end state at these values, by default the mixture's own T and p."""
        if not held:
            held = {"T": self.T, "p": self.p}
        feed = {s: size * n for s, n in self.feed.items()}
        return solver.settle(self.species, feed, solver.Fixed(pair, **held), gas=self.gas)


@cache
def settled(real: RealMixture) -> solver.EndState:
    """The end state at the mixture's own T and p, computed once."""
    return real.settle()


def _real(
    name: str, candidates: str, feed: str, T: float, p: float, gas: str, fluids: str
) -> RealMixture:
    return RealMixture(Mixture(name, candidates, feed, T, p), gas, fluids)


CRACKED = (
    "CH4 C2H2 C2H4 C2H6 C3H6 C3H8 C4H8 C6H6 H2 H2O CO CO2 H CH3 C2H5 C2H3 OH HCO"  # with radicals
)
# Temperatures keep off 1000 K and 298.15 K, where the segments of many records join.
MIXTURES = [
    _real(
        "ammonia converter",
        "H2 N2 NH3 CH4 Ar",
        "H2 3 N2 1 CH4 0.3 Ar 0.1",
        705.0,
        2.5e7,
        "srk",
        "gas",
    ),
    _real(
        "ammonia converter",
        "H2 N2 NH3 CH4 Ar",
        "H2 3 N2 1 CH4 0.3 Ar 0.1",
        705.0,
        2.5e7,
        "pr",
        "gas",
    ),
    _real(
        "ammonia chilled", "H2 N2 NH3 Ar", "H2 3 N2 1 Ar 0.2", 301.0, 1.2e7, "srk", "gas, liquid"
    ),
    _real(
        "methanol with condensate",
        "CO CO2 H2 CH3OH H2O CH4 CH3OH(l) H2O(l)",
        "CO 1 CO2 0.5 H2 3 H2O 0.4",
        405.0,
        8.0e6,
        "pr",
        "gas, liquid",
    ),
    _real(
        "methanol without methane",
        "CO CO2 H2 CH3OH H2O N2 CH3OH(l) H2O(l)",
        "CO 1 CO2 0.5 H2 4 N2 0.3",
        405.0,
        8.0e6,
        "srk",
        "gas, liquid",
    ),
    _real(
        "wet syngas with carbon",
        "CO CO2 H2 H2O CH4 N2 NH3 C(gr) H2O(l)",
        "CO 2 CO2 0.5 H2 1 H2O 2 N2 0.2",
        430.0,
        3.0e6,
        "srk",
        "gas, liquid",
    ),
    _real(
        "hydrocarbons and water",
        "CH4 C6H14 H2O N2 H2O(l) C6H14(l)",
        "CH4 1 C6H14 1 H2O 1 N2 0.2",
        330.0,
        2.0e6,
        "pr",
        "gas, liquid, second liquid",
    ),
    _real("carbon dioxide near critical", "CO2", "CO2 1", 304.6, 7.3e6, "pr", "gas"),
    _real(
        "lime under wet carbon dioxide",
        "CaCO3(s) CaO(s) Ca(OH)2(s) CO2 H2O H2O(l) CO O2",
        "CaO(s) 1 CO2 2 H2O 1.5",
        370.0,
        5.0e6,
        "srk",
        "gas, liquid",
    ),
    _real("cracked gas with radicals", CRACKED, "C2H6 1 H2O 0.6", 1105.0, 2.5e5, "pr", "gas"),
    _real("steam alone", "H2O H2O(l)", "H2O 1", 455.0, 9.0e5, "srk", "gas"),
    _real("water alone", "H2O H2O(l)", "H2O 1", 445.0, 9.0e5, "srk", "liquid"),
    _real(
        "supercritical water burning",
        "H2O O2 CO2 CO H2 CH4 CH3OH OH N2",
        "H2O 10 CH3OH 1 O2 1.6 N2 0.1",
        871.0,
        2.6e7,
        "pr",
        "gas",
    ),
    _real(
        "acid gas with sulfur",
        "H2S SO2 COS CO2 CO CH4 H2O H2 S2 S8 S(l) H2O(l)",
        "H2S 2 CO2 1 O2 0.5",
        405.0,
        2.0e6,
        "srk",
        "gas, liquid",
    ),
    _real(
        "benzene hydrogenated",
        "C6H6 C6H12 H2 N2",
        "C6H6 1 H2 3.6 N2 0.2",
        470.0,
        3.0e6,
        "pr",
        "gas, liquid",
    ),
    _real("methane and propane", "CH4 C3H8", "CH4 1 C3H8 1", 241.0, 2.0e6, "pr", "gas, liquid"),
]
BY_NAME = {real.name: real for real in MIXTURES}
