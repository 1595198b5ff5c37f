"""NIST-JANAF tables as fitted drafts.

Only H298, S298, H - H298, S and cp are taken, never the derived columns. Gases: one table, one
record. Condensed: the package's ``cr,l`` tables give the stable sequence of a composition, which
becomes one chained solid record; the liquid comes from its own table and is tied to the solid at
the melting point; a crystal table that is no part of the sequence is a form with its own key.
"""

import re
from collections import defaultdict

import numpy as np

from species_db.build import chain
from species_db.build.draft import Draft, LeftOut, composition
from species_db.build.janaf_cas import REFERENCE_GASES, cas_of_compositions, cas_of_tables
from species_db.build.janaf_read import CP, DH, HF, S, T, Table, inconsistency, read_tables
from species_db.build.poly import T0, Piece, fit
from species_db.species import R

T_LOW = 200.0
POOR_FIT = 0.02
MISPRINT = 0.05
"""A table whose derived columns miss by more than this, kJ/mol, is flagged."""
FORM = re.compile(
    r", (Alpha-Delta|Alpha|Beta|Gamma|Delta|Kappa|Rutile|Anatase|Quartz|Cristobalite|Red|Yellow|"
    r"White|Black|Pyrite|Marcasite|Andalusite|Kyanite|Sillimanite|Mullite|Orthorhombic|Monoclinic|I|II|III|IV|V)\b",
)


class Fitted:
    """A single-phase run of rows of one table, fitted."""

    def __init__(self, table: Table, rows: list[int]) -> None:
        a = table.rows[rows]
        self.low, self.high = float(a[0, T]), float(a[-1, T])
        h298 = table.at(T0, HF) * 1000
        anchor = int(np.argmin(np.abs(a[:, T] - T0))) if self.low <= T0 <= self.high else 0
        h = (h298 + a[:, DH] * 1000) / (R * a[:, T])
        result = fit(a[:, T], a[:, CP] / R, h, a[:, S] / R, anchor)
        self.pieces: list[Piece] = result.pieces
        self.error_g = result.error_g


def runs_of(table: Table) -> list[list[int]]:
    """Row numbers of each single-phase run from `T_LOW` up; two rows of one T divide runs.

    Below 298.15 K the condensed tables hold misprints: rows there are kept only if cp integrates
    to the tabulated H and S.
    """
    a = table.rows
    good = np.isfinite(a[:, CP]) & np.isfinite(a[:, DH]) & np.isfinite(a[:, S])
    rows = [int(i) for i in np.where(good & (a[:, T] >= T_LOW - 1e-6))[0]]
    runs: list[list[int]] = []
    for i in rows:
        if not runs or abs(a[i, T] - a[runs[-1][-1], T]) < 1e-6:
            runs.append([])
        runs[-1].append(i)
    kept = []
    for run in runs:
        if a[run[-1], T] < T0 - 1e-6:
            continue
        if a[run[0], T] < T0 - 1 and not _integrates(a, [i for i in run if a[i, T] <= T0 + 1e-6]):
            run = [i for i in run if a[i, T] >= T0 - 1e-6]
        if len(run) >= 2 and a[run[-1], T] - a[run[0], T] >= 1:
            kept.append(run)
    return kept


def _integrates(a: np.ndarray, rows: list[int]) -> bool:
    """Whether cp integrates from the first to the last of the rows (Simpson's rule per step)."""
    t, cp = a[rows, T], a[rows, CP]
    if len(rows) < 3:
        return False
    middle = 0.5 * (t[1:] + t[:-1])
    degree = min(3, len(rows) - 1)
    c = np.polyval(np.polyfit(t, cp, degree), middle)
    step = np.diff(t) / 6
    dh = float((step * (cp[1:] + 4 * c + cp[:-1])).sum())
    ds = float((step * (cp[1:] / t[1:] + 4 * c / middle + cp[:-1] / t[:-1])).sum())
    error_h = abs(dh - 1000 * (a[rows[-1], DH] - a[rows[0], DH])) / T0
    error_s = abs(ds - (a[rows[-1], S] - a[rows[0], S]))
    return max(error_h, error_s) <= 0.15 + 0.002 * cp[-1]


def janaf_drafts() -> tuple[list[Draft], list[LeftOut]]:
    """Gases, chained solids, other crystal forms and liquids."""
    found = cas_of_tables()
    by_composition = cas_of_compositions(found)
    drafts: list[Draft] = []
    out: list[LeftOut] = []
    condensed: dict[tuple[tuple[str, float], ...], dict[str, list[Table]]] = defaultdict(
        lambda: defaultdict(list)
    )
    for table in read_tables().values():
        if "D" in table.elements:
            out.append(left(table, "deuterium compound"))
        elif not np.isfinite(table.at(T0, HF)) or not runs_of(table):
            out.append(left(table, "no value at 298.15 K or no run of rows"))
        elif _is_gas(table):
            if all(n == int(n) for n in table.elements.values()):
                drafts.append(_gas(table, found.get(table.index, "")))
        elif table.charge == 0 and table.state in ("cr", "l", "cr,l", "ref"):
            condensed[composition(table.elements)][table.state].append(table)
        else:
            out.append(left(table, "ion in a condensed state, or a fluid table"))
    for elements, tables in condensed.items():
        cas = [found[t.index] for s in ("cr", "l", "ref") for t in tables[s] if t.index in found]
        made = chain.condensed(tables, out)
        for d in made:
            d.cas = found.get(d.rid, "") or by_composition.get(elements, "")
            if not d.cas and len(set(cas)) == 1:
                d.cas = cas[0]
        drafts += made
    for d in drafts:
        if d.error_g > POOR_FIT:
            d.flags.append(f"fit poor: {d.error_g:.3f} in g/RT")
        miss = inconsistency(read_tables()[d.rid])
        if miss > MISPRINT:
            d.flags.append(f"table's formation columns miss its H and S by {miss:.2f} kJ/mol")
    return drafts, out


def _is_gas(table: Table) -> bool:
    first = table.display.split(",")[0]
    return table.state == "g" or (
        table.state == "ref" and (first in REFERENCE_GASES or not table.elements)
    )


def left(table: Table, reason: str) -> LeftOut:
    """Entry of the list of what is left out."""
    phase = {"g": "gas", "l": "liquid"}.get(table.state, "solid")
    return LeftOut("janaf", table.index, table.name, phase, reason)


def _gas(table: Table, cas: str) -> Draft:
    fitted = Fitted(table, max(runs_of(table), key=len))
    d = draft_of(table, "gas", fitted.pieces, fitted.error_g)
    d.cas = cas
    d.is_reference = table.state == "ref" and bool(table.elements)
    return d


def draft_of(table: Table, phase: str, pieces: list[Piece], error_g: float) -> Draft:
    """Draft with the table's own labels."""
    form = FORM.search(table.display)
    return Draft(
        origin="janaf",
        rid=table.index,
        label=re.sub(r" \([^)]*\)+$", "", table.name),
        elements=table.elements,
        charge=table.charge,
        phase=phase,
        pieces=pieces,
        source="janaf",
        reference=f"NIST-JANAF table {table.index}",
        form=form.group(1) if form else "",
        year=1998,
        error_g=error_g,
    )
