"""Mixtures of every kind the minimiser must settle, for the laws. Invented; no stored answers."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import species_db
from species_db import Species


@cache
def library() -> species_db.Library:
    return species_db.load()


@dataclass(frozen=True)
class Mixture:
    """Candidates, feed (mol), T (K) and p (Pa) as a test wants them."""

    name: str
    candidates: str
    feed: str
    T: float
    p: float

    @property
    def species(self) -> list[Species]:
        """Keys, or `{C H}` for all gases of those elements, `{C H}+` for condensed ones too."""
        found: dict[str, Species] = {}
        for part in self.candidates.replace("{", "|{").replace("}+", "}+|").split("|"):
            part = part.strip()
            if part.startswith("{"):
                elements, _, rest = part[1:].partition("}")
                phases = ("gas", "liquid", "solid") if rest.startswith("+") else ("gas",)
                listed = library().made_of(elements.split(), phases=phases)
                found |= {s.key: s for s in listed}
                part = rest.removeprefix("+")
            found |= {library()[key].key: library()[key] for key in part.split()}
        return list(found.values())

    @property
    def feed_amounts(self) -> dict[Species, float]:
        words = self.feed.split()
        return {library()[key]: float(n) for key, n in zip(words[::2], words[1::2], strict=True)}

    def __str__(self) -> str:
        return self.name


# Temperatures keep off 1000 K and 298.15 K, where the segments of many records join.
MIXTURES = [
    Mixture("reformer", "CH4 H2O CO CO2 H2 C(gr)", "CH4 1 H2O 3", 1120.0, 2.4e6),
    Mixture("soot from methane", "CH4 H2 C2H2 C2H4 C6H6 C(gr)", "CH4 1", 1200.0, 1.0e5),
    Mixture("flame gas", "{C H O N}", "CH4 1 O2 2 N2 7.52", 2230.0, 101325.0),
    Mixture("flame gas over carbon", "{C H O N} C(gr)", "C2H2 1 O2 0.6 N2 1", 1900.0, 3.0e5),
    Mixture(
        "burnt and cold, exact stoichiometry",
        "CH4 O2 CO2 CO H2 H2O H2O(l)",
        "CH4 1 O2 2",
        300.0,
        1.0e5,
    ),
    Mixture("water condensing from air", "N2 O2 H2O H2O(l)", "N2 3 O2 0.8 H2O 1", 310.0, 1.0e5),
    Mixture("one candidate", "N2", "N2 2.5", 500.0, 1.0e6),
    Mixture("dependent balances", "CO2 H2O", "CO2 1 H2O 2", 800.0, 1.0e5),
    Mixture("steam alone at 3500 K", "{H O}", "H2O 1", 3500.0, 1.0e4),
    Mixture(
        "elements absent from the feed",
        "{H O} SO2 H2S Cl2 HCl CO2 CH4 N2 NH3 C(gr) S(l)",
        "H2 1 O2 0.2",
        1500.0,
        1.0e5,
    ),
    Mixture(
        "feed over twelve decades",
        "N2 O2 Ar CO2 CO H2O H2 NO SO2 SO3 H2S COS HCl Cl2 NH3",
        "N2 1e3 O2 200 Ar 1 CO2 1e-3 SO2 1e-6 HCl 1e-9",
        1100.0,
        1.0e5,
    ),
    Mixture("lime kiln", "CaCO3(s) CaO(s) CO2 CO O2 N2", "CaCO3(s) 1 N2 5", 1050.0, 1.0e5),
    Mixture(
        "iron ore in reducing gas",
        "Fe(s) Fe0.947O(s) Fe3O4(s) Fe2O3(s) C(gr) CO CO2 H2 H2O CH4",
        "Fe2O3(s) 1 CO 2 H2 1",
        987.0,
        1.5e5,
    ),
    Mixture("no gas at all", "Fe2O3(s) Al(s) Fe(s) Al2O3(s)", "Fe2O3(s) 1 Al(s) 2.2", 700.0, 1.0e5),
    Mixture("sulfur vapour and liquid", "{H S O} S(l)", "H2S 1 O2 0.5", 480.0, 1.0e5),
    Mixture("ammonia converter", "H2 N2 NH3 H N NH NH2", "H2 3 N2 1", 700.0, 1.5e7),
    Mixture("salt and silica", "{Na Cl H O Si}+", "NaCl(s) 1 SiO2(s) 2 H2O 3", 1400.0, 1.0e5),
    Mixture("low pressure, hot", "{C H O N}", "CO2 1 N2 1 H2 1", 3900.0, 1.0e3),
    Mixture("high pressure, cool", "{C H O} H2O(l)", "CH3OH 1 O2 0.3", 420.0, 2.0e7),
]
BY_NAME = {mixture.name: mixture for mixture in MIXTURES}
