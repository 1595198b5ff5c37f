"""Reads ``data/species.tsv``: the index at once, each record when it is first asked for.

One row a record, tab-separated, the columns of `COLUMNS`. Lists inside a column are separated
by ``|``, their parts by a blank. Temperatures in K; h in J/mol; s in J/(mol K); volume in
m3/mol; pressure in Pa.
"""

from dataclasses import dataclass
from pathlib import Path

from species_db.elements import molar_mass
from species_db.species import SecondSource, Segment, Species, Transition

COLUMNS = (
    "key",
    "name",
    "elements",  # "C:1 O:2"
    "charge",
    "phase",
    "means",  # f: the bare formula means this record; n: the plain name does
    "synonyms",
    "cas",
    "source",
    "reference",
    "u_h298",
    "u_kind",
    "molar_volume",
    "Tc",
    "pc",
    "acentric",
    "transitions",  # "T latent_heat from to|..."  (blanks inside a form name are underscores)
    "second",  # "source;reference;h298;s298;g300;g500;g1000;g2000;g3000"
    "flags",
    "segments",  # "T_low T_high a1 ... a7|..."
)
TABLE = Path(__file__).with_name("data") / "species.tsv"
INDEXED = 7
"""So many leading columns are split when the file is read."""


@dataclass(slots=True)
class Entry:
    """A row of the file, split as far as look-up needs it."""

    key: str
    name: str
    elements: str
    charge: str
    phase: str
    usual: bool
    named: bool
    synonyms: str
    rest: str

    def composition(self) -> dict[str, float]:
        """Element counts of the row."""
        pairs = (part.partition(":") for part in self.elements.split())
        return {symbol: float(count) for symbol, _, count in pairs}


def read_entries() -> dict[str, Entry]:
    """Index of the built-in table: key -> row, in the order of the file."""
    text = TABLE.read_text("utf-8")
    lines = text.split("\n")
    if tuple(lines[0].split("\t")) != COLUMNS:
        raise ValueError("species.tsv: the heading does not match this version of the program")
    entries: dict[str, Entry] = {}
    for line in lines[1:]:
        if line:
            key, name, elements, charge, phase, means, synonyms, rest = line.split("\t", INDEXED)
            entries[key] = Entry(
                key, name, elements, charge, phase, "f" in means, "n" in means, synonyms, rest
            )
    return entries


def build_species(entry: Entry) -> Species:
    """Full record of a row."""
    column = dict(zip(COLUMNS[INDEXED:], entry.rest.split("\t"), strict=True))
    elements = {e: int(n) if n == int(n) else n for e, n in entry.composition().items()}
    charge = int(entry.charge)
    return Species(
        key=entry.key,
        name=entry.name,
        elements=elements,
        charge=charge,
        phase=entry.phase,
        segments=tuple(_segment(part) for part in column["segments"].split("|")),
        molar_mass=molar_mass(elements, charge),
        transitions=tuple(_transition(t) for t in column["transitions"].split("|") if t),
        cas=column["cas"],
        source=column["source"],
        reference=column["reference"],
        h298_uncertainty=_number(column["u_h298"]),
        h298_uncertainty_kind=column["u_kind"],
        synonyms=tuple(s for s in entry.synonyms.split("|") if s),
        molar_volume=_number(column["molar_volume"]),
        Tc=_number(column["Tc"]),
        pc=_number(column["pc"]),
        acentric=_number(column["acentric"]),
        second=_second(column["second"]),
        flags=tuple(f for f in column["flags"].split("|") if f),
    )


def _number(text: str) -> float | None:
    return float(text) if text else None


def _segment(text: str) -> Segment:
    low, high, *a = (float(x) for x in text.split())
    return Segment(low, high, tuple(a))


def _transition(text: str) -> Transition:
    T, heat, lower, upper = (text + "   ").split(" ")[:4]
    return Transition(float(T), float(heat), lower.replace("_", " "), upper.replace("_", " "))


def _second(text: str) -> SecondSource | None:
    if not text:
        return None
    source, reference, h298, s298, *g = text.split(";")
    return SecondSource(
        source, reference, float(h298), float(s298), tuple(float(x or "nan") for x in g)
    )
