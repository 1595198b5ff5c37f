"""Reads the NIST-JANAF tables that the package ``janaf`` carries as text."""

import json
import math
import re
from dataclasses import dataclass, field
from functools import cache

import numpy as np

from species_db.build.places import package_dir

T, CP, S, GEF, DH, HF, GF = range(7)
"""Columns: K, J/(mol K), J/(mol K), J/(mol K), H - H298 kJ/mol, formation enthalpy and Gibbs
energy of formation kJ/mol."""


@dataclass
class Table:
    index: str
    display: str
    name: str
    elements: dict[str, float]
    charge: int
    state: str  # g, l, cr, ref ...
    rows: np.ndarray
    notes: list[tuple[float, str]] = field(default_factory=list)

    def at(self, T_asked: float, column: int) -> float:
        """Tabulated value, nan where the table has no such row."""
        found = np.where(np.abs(self.rows[:, T] - T_asked) < 1e-6)[0]
        return float(self.rows[found[0], column]) if len(found) else math.nan

    def per_atom(self, T_asked: float, column: int) -> float:
        """Tabulated value divided by the atoms of the formula."""
        return self.at(T_asked, column) / (sum(self.elements.values()) or 1.0)

    def noted(self, pattern: str) -> list[float]:
        """Temperatures of the notes that a pattern finds."""
        return sorted({t for t, note in self.notes if re.search(pattern, note)})


def inconsistency(table: Table) -> float:
    """Largest miss of the table's own formation columns against its H, S and the elements, kJ/mol.

    The derived columns are not used; a miss tells that the table holds a misprint somewhere.
    """
    parts = dict(table.elements)
    if table.charge:
        parts["e"] = -float(table.charge)
    references = _references()
    if any(e not in references for e in parts):
        return 0.0
    h298 = table.at(298.15, HF)
    worst = 0.0
    for row in table.rows:
        if row[T] < 298 or not math.isfinite(row[GF]):
            continue
        h = h298 + row[DH] - sum(n * references[e].per_atom(row[T], DH) for e, n in parts.items())
        s = row[S] - sum(n * references[e].per_atom(row[T], S) for e, n in parts.items())
        miss = max(abs(h - row[T] * s / 1000 - row[GF]), abs(h - row[HF]))
        worst = max(worst, miss) if math.isfinite(miss) else worst
    return float(worst)


@cache
def _references() -> dict[str, Table]:
    """Reference-state table of each element, graphite and the electron among them."""
    out = {}
    for table in read_tables().values():
        if table.state == "ref" and len(table.elements) <= 1:
            out[next(iter(table.elements), "e")] = table
    return out


@cache
def read_tables() -> dict[str, Table]:
    """All tables by index, in the package's order."""
    folder = package_dir("janaf")
    listing = json.loads((folder / "janaf.json").read_text("utf-8"))
    tables = {}
    for display, index in zip(listing["display"], listing["index"], strict=True):
        lines = (folder / "data" / f"{index}.txt").read_text("utf-8").split("\n")
        name, form = lines[0].split("\t", 1)
        elements, charge, state = _formula(form)
        rows, notes = [], []
        for line in lines[2:]:
            cells = line.split("\t")
            values = [_number(c) for c in cells[:5]]
            if len(cells) < 2 or math.isnan(values[0]):
                continue
            extra = [c.strip() for c in cells[5:]]
            is_note = bool(extra and extra[0] and math.isnan(_number(extra[0])))
            formed = [_number(c) for c in extra[:2]] if extra and not is_note else []
            rows.append([*values, *formed, *[math.nan] * (2 - len(formed))])
            if is_note:
                notes.append((values[0], extra[0]))
        tables[index] = Table(
            index, display, name, elements, charge, state, np.array(rows, float), notes
        )
    return tables


def _number(text: str) -> float:
    text = text.strip()
    try:
        return math.inf if "INF" in text.upper() else float(text)
    except ValueError:
        return math.nan


def _formula(text: str) -> tuple[dict[str, float], int, str]:
    found = re.match(r"^(.*?)\(([^()]*)\)\s*$", text.strip())
    assert found, text
    body, state = found.group(1), found.group(2)
    if body.startswith("e1"):
        return {}, -1, state
    charge = 0
    sign = re.search(r"([+-])(\d*)$", body)
    if sign:
        charge = int(sign.group(1) + (sign.group(2) or "1"))
        body = body[: sign.start()]
    elements: dict[str, float] = {}
    for symbol, n in re.findall(r"([A-Z][a-z]?)([\d.]*)", body):
        elements[symbol] = elements.get(symbol, 0.0) + float(n or 1)
    return elements, charge, state
