"""Condensed substances from the CRC Handbook: H, S with a heat capacity from Perry or constant.

Solids first with the heat capacity polynomials of Perry's Table 2-151 (matched by formula: a
seventh of that table's CAS numbers are wrong), then solids and liquids with the Handbook's cp at
298.15 K held constant over a short range.
"""

import json
import math
from functools import cache

import numpy as np

from species_db.build.draft import Draft, Identity, LeftOut, composition
from species_db.build.identity import boiling_point, known, melting_point
from species_db.build.janaf_read import S, read_tables
from species_db.build.places import cas_from_digits, chemicals_rows, number, package_dir
from species_db.build.poly import T0, Piece, constant_cp, cp_of, fit, h_of, s_of
from species_db.elements import ATOMIC_MASS
from species_db.formula import parse_formula
from species_db.species import R

HANDBOOK = "Heat Capacity/CRC Standard Thermodynamic Properties of Chemical Substances.tsv"
CALORIE = 4.184
HELD_TO = {(("C", 1.0), ("Ca", 1.0), ("O", 3.0)): 1300.0}
"""Solids whose cp is held from the end of the table up to this temperature, K: calcite is wanted
through its decomposition, Perry's polynomial ends at 1033 K."""
KOPP = {"C": 7.5, "H": 9.6, "B": 11.3, "Be": 11.3, "Si": 15.9, "O": 16.7, "F": 20.9}
KOPP |= {"P": 22.6, "S": 22.6}
"""Kopp's rule, J/(mol K) an atom of a solid at room temperature (Perry's Handbook, section on
prediction of heat capacity)."""
KOPP_OTHER = 26.0
GRAY_TIN = "7440-31-5"
"""The Handbook's row of this CAS number is gray tin; the white form is entered by hand."""


def handbook() -> dict[str, dict[str, float | str]]:
    """Rows of the CRC table by CAS (the first of each), numbers as floats."""
    rows: dict[str, dict[str, float | str]] = {}
    for row in chemicals_rows(HANDBOOK):
        if row["CAS"] not in rows:
            rows[row["CAS"]] = {
                k: v if k in ("CAS", "Chemical") else number(v) for k, v in row.items()
            }
    return rows


def webbook() -> dict[str, dict[str, str]]:
    """Rows of the NIST WebBook constants by CAS."""
    rows = chemicals_rows("Misc/webbook_constants.tsv")
    return {cas_from_digits(r["CAS"]): r for r in rows if r["CAS"].isdigit()}


@cache
def element_entropies() -> dict[str, float]:
    """S298 of each element in its reference state, J/(mol K) an atom: NIST-JANAF, else the CRC."""
    out = {}
    for table in read_tables().values():
        if table.state == "ref" and len(table.elements) == 1:
            ((symbol, n),) = table.elements.items()
            out[symbol] = table.at(T0, S) / n
    for cas, row in handbook().items():
        entry = known(cas)
        if entry and len(entry.identity[0]) == 1 and not entry.identity[1]:
            ((symbol, n),) = entry.identity[0]
            if row["Hfs"] == 0.0 and math.isfinite(float(row["S0s"])):
                out.setdefault(symbol, float(row["S0s"]) / n)
    out["Sn"] = 51.18  # white tin, CODATA 1989
    return out


FORMULA_BY_CAS = {
    "1312-81-8": "La2O3",
    "1314-36-9": "Y2O3",
    "1304-76-3": "Bi2O3",
    "1313-97-9": "Nd2O3",
    "12060-08-1": "Sc2O3",
    "1344-59-8": "U3O8",
    "1314-37-0": "Yb2O3",
    "1345-13-7": "Ce2O3",
    "1303-36-2": "As2Se3",
    "1345-07-9": "Bi2S3",
    "12018-01-8": "CrO2",
    "13410-01-0": "Na2SeO4",
    "10031-22-8": "PbBr2",
    "13870-24-1": "FeWO4",
    "13597-65-4": "Zn2SiO4",
    "1317-35-7": "Mn3O4",
    "20427-59-2": "Cu(OH)2",
}
"""Formulas that the identifier tables garble beyond a count of hydrogen."""
GIBBS_FITS = 5000.0
"""H - G - T (S - elements) of a row must be zero within this, J/mol: a quarter of an atom of H."""


def composition_of(cas: str, row: dict[str, float | str], state: str) -> Identity | None:
    """Composition of a row, confirmed by its own H, G and S.

    The identifier tables add or lose hydrogen in many salts. One atom of hydrogen is 19 kJ/mol in
    T S, so the row's figures tell: the listed composition, or else the same without hydrogen, is
    taken if they agree with it. Organic compounds, which mostly carry no G, are taken as listed.
    """
    given = parse_formula(FORMULA_BY_CAS.get(cas, ""))
    entry = known(cas)
    listed = given or (entry.identity if entry else None)
    if listed is None or listed[1] or any(e not in ATOMIC_MASS for e, _ in listed[0]):
        return None
    symbols = {e for e, _ in listed[0]}
    h, g, s = (float(row[c + state]) for c in ("Hf", "Gf", "S0"))
    if not math.isfinite(g):
        organic = "C" in symbols and symbols <= set("C H N O S F Cl Br I P".split())
        return listed if organic or len(symbols) == 1 else None
    for elements in dict.fromkeys((listed[0], _bare(listed))):
        if any(e not in element_entropies() for e, _ in elements) or not elements:
            continue
        total = sum(element_entropies()[e] * n for e, n in elements)
        if abs(h - g - T0 * (s - total)) < GIBBS_FITS:
            return elements, 0
    return None


def _bare(identity: Identity) -> tuple[tuple[str, float], ...]:
    """Composition without its hydrogen."""
    return tuple((e, n) for e, n in identity[0] if e != "H")


def perry_solids(have: set[tuple[object, str]]) -> list[Draft]:
    """Solids with the Handbook's H, S and Perry's cp, for compositions not in `have`."""
    path = package_dir("chemicals") / "Heat Capacity/Perrys Table 2-151.json"
    perry = json.loads(path.read_text("utf-8"))
    crc = handbook()
    by_composition: dict[object, list[str]] = {}
    for cas, row in crc.items():
        if _finite(row, "Hfs", "S0s") and (identity := composition_of(cas, row, "s")):
            by_composition.setdefault(identity[0], []).append(cas)
    drafts = []
    for cas_given, phases in perry.items():
        solid = phases.get("c")
        if not solid or not _covers(solid):
            continue
        parsed = parse_formula(solid["Formula"].replace(" ", ""))
        if parsed is None:
            continue
        identity = (composition(dict(parsed[0])), 0)
        if (identity, "solid") in have:
            continue
        choices = list(by_composition.get(identity[0], []))
        if not choices or GRAY_TIN in choices:
            continue
        cas = cas_given if cas_given in choices else min(choices, key=lambda c: _gf(crc[c]))
        draft = _perry_draft(solid, crc[cas], cas, dict(parsed[0]))
        if draft:
            drafts.append(draft)
            have.add((identity, "solid"))
    return drafts


def _gf(row: dict[str, float | str]) -> float:
    g = row["Gfs"]
    return float(g) if isinstance(g, float) and math.isfinite(g) else 0.0


def _finite(row: dict[str, float | str], *columns: str) -> bool:
    return all(math.isfinite(float(row[c])) for c in columns)


def _covers(entry: dict[str, object]) -> bool:
    low, high = entry["Tmin"], entry["Tmax"]
    number_ = (int, float)
    return isinstance(low, number_) and isinstance(high, number_) and low <= 298.2 and high >= 400


def _perry_draft(
    entry: dict[str, float], row: dict[str, float | str], cas: str, elements: dict[str, float]
) -> Draft | None:
    def cp(t: np.ndarray) -> np.ndarray:
        poly = entry["Const"] + (entry["Lin"] or 0) * t + (entry["Quad"] or 0) * t**2
        return np.asarray(CALORIE * (poly + (entry["Quadinv"] or 0) / t**2))

    top = float(entry["Tmax"])
    flags = []
    H, S0 = float(row["Hfs"]), float(row["S0s"])
    T = np.unique(np.r_[T0, np.linspace(T0, top, 40)])
    if cp(T).min() <= 0:
        return None
    cp298 = float(row["Cps"])
    if math.isfinite(cp298) and abs(float(cp(np.array([T0]))[0]) / cp298 - 1) > 0.08:
        flags.append("cp at 298 K differs from the Handbook's by more than 8 %")
    fine = [np.linspace(T0, t, 400) for t in T]
    dh = np.array([np.trapezoid(cp(x), x) for x in fine])
    ds = np.array([np.trapezoid(cp(x) / x, x) for x in fine])
    result = fit(T, cp(T) / R, (H + dh) / (R * T), (S0 + ds) / R, 0)
    pieces = result.pieces
    held = HELD_TO.get(composition(elements))
    if held and held > top:
        a = pieces[-1].a
        k = float(cp_of(a, top))
        tail = np.array(
            [k, 0, 0, 0, 0, float(h_of(a, top)) - k * top, float(s_of(a, top)) - k * np.log(top)]
        )
        pieces = [*pieces, Piece(top, held, tail)]
        flags.append(f"cp held constant from {top:g} to {held:g} K")
    return Draft(
        "crc", cas, str(row["Chemical"]), elements, 0, "solid", pieces, cas, "crc+perry",
        "CRC Handbook, standard thermodynamic properties; Perry 8th ed., table 2-151", flags,
        error_g=result.error_g,
    )  # fmt: skip


UNCONFIRMED = "composition not confirmed by the row's own figures"


def constant_cp_drafts(have: set[tuple[object, str]], out: list[LeftOut]) -> list[Draft]:
    """Solids and liquids with the Handbook's H, S, cp at 298.15 K, cp held constant."""
    web = webbook()
    drafts = []
    for phase, h, s, c in (("solid", "Hfs", "S0s", "Cps"), ("liquid", "Hfl", "S0l", "Cpl")):
        for cas, row in handbook().items():
            flags = ["cp of 298 K held constant"]
            s298 = float(row[s])
            if not math.isfinite(s298):
                s298 = number(web.get(cas, {}).get(s))
                flags.append("entropy from the NIST WebBook")
            if not _finite(row, h) or not math.isfinite(s298) or cas == GRAY_TIN:
                continue
            identity = composition_of(cas, {**row, s: s298}, phase[0])
            if identity is None:
                entry = known(cas)
                guesses = {entry.identity, (_bare(entry.identity), 0)} if entry else set()
                if any((guess, phase) in have for guess in guesses):
                    continue  # another source has it
                out.append(LeftOut("crc", cas, str(row["Chemical"]), phase, UNCONFIRMED))
                continue
            cp = float(row[c])
            if not math.isfinite(cp):
                if phase == "liquid":
                    continue
                cp = sum(KOPP.get(e, KOPP_OTHER) * n for e, n in identity[0])
                flags = ["cp estimated by Kopp's rule and held constant", *flags[1:]]
            if (identity, phase) in have:
                continue
            limits = _range(cas, phase)
            if limits is None:
                continue
            pieces = constant_cp(*limits, cp, float(row[h]), s298)
            drafts.append(
                Draft(
                    "crc298",
                    cas,
                    str(row["Chemical"]),
                    dict(identity[0]),
                    0,
                    phase,
                    pieces,
                    cas,
                    "crc",
                    "CRC Handbook, standard thermodynamic properties",
                    flags,
                )
            )
    return drafts


def _range(cas: str, phase: str) -> tuple[float, float] | None:
    """Range over which a constant cp may stand, from melting and boiling points."""
    melts, boils = melting_point(cas), boiling_point(cas)
    if phase == "solid":
        return T0, max(min(600.0, melts or 500.0), 310.0)
    low, high = max(200.0, melts or 250.0), min(500.0, (boils or 400.0) + 30)
    return (low, high) if high > 310 and low <= 300 else None
