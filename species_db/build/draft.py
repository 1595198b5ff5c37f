"""A record while it is being built, and the list of what is left out."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from species_db.build.poly import T0, Piece, h_at, s_at
from species_db.species import R

Identity = tuple[tuple[tuple[str, float], ...], int]


@dataclass
class Move:
    """A solid-solid transition inside a draft; heat in J/mol."""

    T: float
    heat: float
    lower: str = ""
    upper: str = ""


@dataclass
class Draft:
    """One substance in one state; energies in J/mol, entropies in J/(mol K)."""

    origin: str  # burcat, janaf, trc, crc, crc298, hand
    rid: str  # block or table inside the source
    label: str  # the source's own name
    elements: Mapping[str, float]
    charge: int
    phase: str
    pieces: list[Piece]
    cas: str = ""
    source: str = ""  # id in sources.toml
    reference: str = ""
    flags: list[str] = field(default_factory=list)
    moves: list[Move] = field(default_factory=list)
    form: str = ""  # of a solid: quartz, alpha ...
    u: float = math.nan
    u_kind: str = ""
    quality: str = ""
    year: int = 0
    compiler: str = ""  # source letter of the older polynomials
    h_shift: float = 0.0  # shift to the newer network, J/mol
    h_as_read: float = math.nan
    is_reference: bool = False  # element in its reference state
    is_sequence: bool = False  # the stable forms of one source, chained
    tied: bool = False  # to its solid (liquid)
    t_fusion: float = math.nan
    error_g: float = 0.0
    second: "Draft | None" = None
    key: str = ""
    name: str = ""
    synonyms: list[str] = field(default_factory=list)
    usual: bool = False
    molar_volume: float = math.nan
    critical: tuple[float, float, float] | None = None

    @property
    def identity(self) -> Identity:
        return composition(self.elements), self.charge

    @property
    def atoms(self) -> float:
        return sum(self.elements.values())

    @property
    def h298(self) -> float:
        return h_at(self.pieces, T0) * R

    @property
    def s298(self) -> float:
        return s_at(self.pieces, T0) * R

    @property
    def T_min(self) -> float:
        return self.pieces[0].low

    @property
    def T_max(self) -> float:
        return self.pieces[-1].high

    def shift(self, dh: float = 0.0, ds: float = 0.0) -> None:
        """Raise h by dh J/mol and s by ds J/(mol K) over the whole record."""
        self.pieces = [p.shifted(dh / R, ds / R) for p in self.pieces]


def composition(elements: Mapping[str, float]) -> tuple[tuple[str, float], ...]:
    return tuple(sorted((e, float(n)) for e, n in elements.items()))


@dataclass(frozen=True)
class LeftOut:
    source: str
    record: str
    name: str
    phase: str
    reason: str
