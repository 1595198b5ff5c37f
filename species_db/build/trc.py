"""Organic gases: TRC heat capacity and entropy with a formation enthalpy of another table.

The enthalpy column of the TRC table mixes values at 0 K and 298 K and is not used.
"""

import math
from collections import Counter

import numpy as np

from species_db.build.draft import Draft, LeftOut
from species_db.build.identity import known
from species_db.build.places import chemicals_rows, number
from species_db.build.poly import T0, fit
from species_db.species import R

TABLE = "Heat Capacity/TRC Thermodynamics of Organic Compounds in the Gas State.tsv"
ORDER = ("ATCT_G", "CRC", "WEBBOOK")
NAMES = {"ATCT_G": "ATcT 1.112", "CRC": "CRC Handbook", "WEBBOOK": "NIST WebBook"}
AGREE = 4000.0
"""Two enthalpies of formation that agree within this, J/mol, confirm each other."""


def trc_drafts(have: set[str]) -> tuple[list[Draft], list[LeftOut]]:
    """Gases whose CAS number is not in `have`."""
    drafts, out = [], []
    for row in chemicals_rows(TABLE):
        cas = row["CAS"]
        entry = known(cas)
        if cas in have or entry is None or entry.identity[1]:
            if entry is None:
                out.append(LeftOut("trc", cas, row["Chemical"], "gas", "no formula found"))
            continue
        made = _draft(row, entry.identity)
        if isinstance(made, str):
            out.append(LeftOut("trc", cas, row["Chemical"], "gas", made))
        else:
            drafts.append(made)
    return drafts, out


def _draft(row: dict[str, str], identity: tuple[object, int]) -> Draft | str:
    from chemicals.heat_capacity import TRCCp, TRCCp_integral, TRCCp_integral_over_T

    cas, low, high, J = row["CAS"], number(row["Tmin"]), number(row["Tmax"]), number(row["J"])
    if high < 1000 or low > 300 or not J or math.isnan(J):
        return "range or entropy constant missing"
    heats = {m: h for m in ORDER if (h := _heat(cas, m)) is not None}
    if not heats:
        return "no formation enthalpy at 298 K"
    source = next(iter(heats))
    flags = []
    others = [h for m, h in heats.items() if m != source]
    if not others:
        flags.append("formation enthalpy from one source")
    elif min(abs(heats[source] - h) for h in others) > AGREE:
        flags.append("doubtful: formation enthalpy disputed")
    a = [number(row[f"a{i}"]) for i in range(8)]
    I = number(row["I"])  # noqa: E741 - the table's own letter
    T = np.unique(
        np.r_[T0, np.arange(max(200.0, low), 298, 25), np.arange(300, high + 1, 50), high]
    )
    try:
        cp = np.array([TRCCp(t, *a) for t in T])
        base = TRCCp_integral(T0, *a, I=I)
        h = np.array([heats[source] + TRCCp_integral(t, *a, I=I) - base for t in T])
        s = np.array([TRCCp_integral_over_T(t, *a, J=J) for t in T])
    except (ValueError, ZeroDivisionError, OverflowError):
        return "heat capacity cannot be evaluated"
    entropies = [x for m in ("CRC", "WEBBOOK") if (x := _entropy(cas, m)) is not None]
    s298 = float(s[T == T0][0])
    if entropies and min(abs(s298 - x) for x in entropies) > 2:
        if any("disputed" in f for f in flags):
            return "enthalpy and entropy both disputed"
        flags.append("entropy disputed")
    if not np.all(np.isfinite(cp)) or cp.min() <= 20 or np.any(np.diff(cp) < -0.02 * cp[:-1]):
        return "heat capacity odd"
    atoms = sum(n for _, n in identity[0])  # type: ignore[attr-defined]
    if cp.max() / R > 1.3 * (3 * atoms - 2):
        return "cp above 1.3 times the classical limit"
    result = fit(T, cp / R, h / (R * T), s / R, int(np.where(T == T0)[0][0]))
    draft = Draft(
        "trc", cas, row["Chemical"], dict(identity[0]), 0, "gas", result.pieces, cas,  # type: ignore[call-overload]
        "trc", f"TRC, gas-state table (cp, S); {NAMES[source]} (formation enthalpy)", flags,
        error_g=result.error_g,
    )  # fmt: skip
    return draft


def _heat(cas: str, method: str) -> float | None:
    from chemicals.reaction import Hfg

    return _value(Hfg, cas, method)


def _entropy(cas: str, method: str) -> float | None:
    from chemicals.reaction import S0g

    return _value(S0g, cas, method)


def _value(function, cas, method):  # type: ignore[no-untyped-def]
    try:
        return function(cas, method=method)
    except Exception:
        return None


def reasons(out: list[LeftOut]) -> Counter[str]:
    """Count of each reason."""
    return Counter(x.reason for x in out)
