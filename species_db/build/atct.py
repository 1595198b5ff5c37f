"""Moves records onto the formation enthalpies of the Active Thermochemical Tables, 1.112.

A record is shifted where CAS number, composition and charge all agree and the shift is credible
(`LIMIT`); a larger difference is a doubt to be noted, unless the species is on `TRUSTED`. Ions of
the tables use the stationary-electron convention, the others the thermal one: 6.197 kJ/mol a
charge. Condensed records follow their gas, so that vapour pressures stay.
"""

import math
import re

from species_db.build.crc import handbook
from species_db.build.draft import Draft, composition
from species_db.build.places import chemicals_rows, number
from species_db.build.poly import T0, g_at
from species_db.build.uncertainty import KIND_ATCT
from species_db.formula import parse_formula

LIMIT = 12e3
LIMIT_ION = 6e3
LIMIT_LIQUID = 6e3
LIMIT_FOLLOW = 3e3
VOLATILE = 15.0
"""A condensed record follows its gas only while the gas is less than this above it in g/RT at
298 K: a salt keeps the formation enthalpy that its own calorimetry gave it."""
ELECTRON = 6197.0
"""Enthalpy of the electron between 0 and 298.15 K, 5/2 RT, J/mol."""
TRUSTED = {
    "353-50-4",  # carbonyl fluoride
    "75-13-8",  # isocyanic acid
    "13774-92-0",  # imidogen
    "2122-48-7",  # ethynyl
    "22400-26-6",  # isocyanato
    "116-14-3",  # tetrafluoroethylene
    "75-01-4",  # vinyl chloride
    "13453-52-6",  # fluoromethylene
}
"""Differences beyond the limit where newer work stands behind the tables' value (by judgement)."""
REFUSED = {"506-85-4", "51060-05-0"}
"""Fulminic acid and its isomer: the package has their labels swapped."""


def move(drafts: list[Draft], everything: list[Draft]) -> list[str]:
    """Shift the chosen drafts in place; returns a line for every refusal.

    A condensed record follows the gas of its own source, chosen or not: what is kept is that
    source's enthalpy of vaporisation or sublimation.
    """
    gases = {r["CAS"]: r for r in chemicals_rows("Reactions/ATcT 1.112 (g).tsv")}
    liquids = {r["CAS"]: r for r in chemicals_rows("Reactions/ATcT 1.112 (l).tsv")}
    refused = []
    for d in drafts:
        if d.phase == "gas" and d.cas in gases and not d.is_reference:
            refused += _move_gas(d, gases[d.cas])
    final = {d.cas: d for d in drafts if d.phase == "gas" and d.cas and not d.charge}
    raw = {(d.cas, d.origin): d.h_as_read for d in everything if d.phase == "gas" and d.cas}
    for cas, row in handbook().items():
        if math.isfinite(float(row["Hfg"])):
            raw[(cas, "crc298")] = float(row["Hfg"])
    for d in drafts:
        if d.phase != "gas" and d.cas in final and len(d.elements) > 1:
            gas = final[d.cas]
            volatile = g_at(gas.pieces, T0) - g_at(d.pieces, T0) < VOLATILE
            follow = gas.h298 - raw.get((d.cas, d.origin), math.nan) if volatile else 0.0
            _move_condensed(d, liquids, follow)
    return refused


def _charge_of(formula: str) -> int:
    if re.search(r"\]\+|[A-Za-z0-9]\+ \(g\)", formula):
        return 1
    return -1 if re.search(r"\]-|[A-Za-z0-9]- \(g\)", formula) else 0


def _move_gas(d: Draft, row: dict[str, str]) -> list[str]:
    charge = _charge_of(row["Formula"])
    if charge != d.charge:
        return []
    plain = re.sub(r"\(g\)|\[|\]|[+-]\d?", "", row["Formula"]).strip()
    parsed = parse_formula(plain)
    if parsed and composition(dict(parsed[0])) != d.identity[0]:
        return [f"{d.rid} {d.label}: formula {row['Formula']}"]
    if d.cas in REFUSED:
        return [f"{d.rid} {d.label}: isomers swapped"]
    h = number(row["Hfg"]) + ELECTRON * charge
    shift = h - d.h298
    if "CAS shared by several gases" in d.flags and abs(shift) > 8e3:
        return []
    limit = LIMIT_ION if d.charge else LIMIT
    if abs(shift) > limit and d.cas not in TRUSTED:
        d.flags.append(f"doubtful: ATcT differs by {shift / 1000:+.0f} kJ/mol")
        return [f"{d.rid} {d.label}: {shift / 1000:+.1f} kJ/mol"]
    _apply(d, shift, number(row["uncertainty"]))
    return []


def _move_condensed(d: Draft, liquids: dict[str, dict[str, str]], follow: float) -> None:
    if d.phase == "liquid" and d.cas in liquids and d.cas != "7732-18-5" and not d.tied:
        row = liquids[d.cas]
        shift = number(row["Hfl"]) - d.h298
        if abs(shift) < LIMIT_LIQUID:
            _apply(d, shift, number(row["uncertainty"]))
        return
    if 10.0 < abs(follow) <= LIMIT_FOLLOW:
        d.shift(dh=follow)
        d.h_shift = follow
        d.flags.append(f"moved with its gas by {follow / 1000:+.2f} kJ/mol")


def _apply(d: Draft, shift: float, u95: float) -> None:
    d.shift(dh=shift)
    d.h_shift = shift
    d.u, d.u_kind = u95 / 2, KIND_ATCT
    d.flags.append("formation enthalpy: ATcT 1.112")
