"""CAS numbers for the NIST-JANAF tables, which carry none.

The package ``chemicals`` holds the cp columns of many of the tables by CAS number: a table whose
cp values are the same number for number is that substance. Where one cp column fits several
tables (isomers of atoms, say) the formation enthalpy decides; what stays ambiguous gets no CAS.
"""

import json
import math
from collections import defaultdict

from species_db.build.draft import composition
from species_db.build.janaf_read import CP, HF, T, Table, read_tables
from species_db.build.places import chemicals_rows, number, package_dir

_FILES = {
    "gas": ("g",),
    "liq": ("l", "l,g", "ref", "fl"),
    "solid": ("cr", "ref"),
}
_ENTHALPY = {"gas": "Hfg", "liq": "Hfl"}
REFERENCE_GASES = {
    "Ar": "7440-37-1",
    "Cl2": "7782-50-5",
    "F2": "7782-41-4",
    "H2": "1333-74-0",
    "He": "7440-59-7",
    "Kr": "7439-90-9",
    "N2": "7727-37-9",
    "Ne": "7440-01-9",
    "O2": "7782-44-7",
    "Rn": "10043-92-2",
    "Xe": "7440-63-3",
}
"""Elements that are gases in their reference state, by formula."""

CAS_BY_TABLE = {
    "C-002": "7782-42-5",
    "Br-039": "7726-95-6",
    "O-039": "14808-60-7",
    "O-045": "1317-80-2",
    "H-075": "7664-93-9",
    "C-149": "13463-40-6",
}
"""Tables that the matching of cp columns does not reach (graphite, bromine, quartz, rutile ...)."""


def cas_of_tables() -> dict[str, str]:
    """Table index -> CAS number, for the tables that can be told apart."""
    tables = read_tables()
    heats = {r["CAS"]: r for r in chemicals_rows("Reactions/JANAF_1998.tsv")}
    hits: dict[str, set[str]] = defaultdict(set)
    for kind, states in _FILES.items():
        path = package_dir("chemicals") / f"Heat Capacity/JANAF_1998_{kind}_Cp.json"
        columns = json.loads(path.read_text("utf-8"))
        rows_of: dict[tuple[float, float], set[str]] = defaultdict(set)
        for table in tables.values():
            if table.state in states:
                for row in table.rows:
                    if not math.isnan(row[CP]):
                        rows_of[(round(row[T], 2), round(row[CP], 3))].add(table.index)
        for cas, (temperatures, cps) in columns.items():
            pairs = [
                rows_of[(round(t, 2), round(c, 3))]
                for t, c in zip(temperatures[:40], cps[:40], strict=True)
                if (round(t, 2), round(c, 3)) in rows_of
            ]
            if len(pairs) < 0.7 * min(40, len(temperatures)):
                continue
            for index in set.intersection(*pairs):
                if _enthalpy_fits(tables[index], heats.get(cas, {}).get(_ENTHALPY.get(kind, ""))):
                    hits[index].add(cas)
    found = {index: cas.pop() for index, cas in hits.items() if len(cas) == 1}
    found.update(CAS_BY_TABLE)
    for table in tables.values():
        if table.state == "ref":
            cas = REFERENCE_GASES.get(table.display.split(",")[0])
            if cas:
                found[table.index] = cas
    return found


def _enthalpy_fits(table: Table, text: str | None) -> bool:
    h = number(text)
    return math.isnan(h) or abs(table.at(298.15, HF) * 1000 - h) <= 60.0


def cas_of_compositions(found: dict[str, str]) -> dict[tuple[tuple[str, float], ...], str]:
    """CAS of a condensed composition, where all its tables with a CAS agree."""
    by: dict[tuple[tuple[str, float], ...], set[str]] = defaultdict(set)
    for index, cas in found.items():
        table = read_tables()[index]
        if table.state in ("cr", "l", "ref"):
            by[composition(table.elements)].add(cas)
    return {c: cas.pop() for c, cas in by.items() if len(cas) == 1}
