"""Species, their thermochemical data, and where each number comes from.

``species_db.load()`` gives the library; ``lib["CO2"].g(1000.0)`` a Gibbs energy in J/mol.
"""

from species_db.elements import ATOMIC_MASS, molar_mass
from species_db.errors import UnknownSpecies
from species_db.formula import parse_formula
from species_db.library import Library, load
from species_db.sources import sources
from species_db.species import (
    P_STANDARD,
    SECOND_T,
    T_STANDARD,
    R,
    SecondSource,
    Segment,
    Species,
    Transition,
)

__all__ = [
    "ATOMIC_MASS",
    "P_STANDARD",
    "SECOND_T",
    "T_STANDARD",
    "Library",
    "R",
    "SecondSource",
    "Segment",
    "Species",
    "Transition",
    "UnknownSpecies",
    "load",
    "molar_mass",
    "parse_formula",
    "sources",
]
