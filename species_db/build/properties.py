"""Critical constants of gases and molar volumes of condensed substances, by CAS number."""

import math
import warnings
from functools import cache

from species_db.build.draft import Draft
from species_db.build.places import chemicals_rows, number
from species_db.elements import molar_mass

ESTIMATES = {"JOBACK", "WILSON_JASPERSON", "FEDORS", "PSRK_EST"}
"""Group-contribution estimates, not taken: they were never meant for radicals or metal vapours."""


HIGHEST_TC = 2000.0
"""Above this a critical temperature, K, is an extrapolation (metals) and is not taken."""


def critical_constants(d: Draft) -> tuple[float, float, float] | None:
    """Critical temperature K, pressure Pa and acentric factor, all three measured or none."""
    from chemicals import Pc, Pc_methods, Tc, Tc_methods, omega, omega_methods

    found = []
    for value, methods in ((Tc, Tc_methods), (Pc, Pc_methods), (omega, omega_methods)):
        x = _first(value, methods, d.cas)
        if x is None:
            return None
        found.append(x)
    t, p, w = found
    plausible = 3.0 < t < HIGHEST_TC and 1e5 < p < 5e7 and -0.6 < w < 2.0
    return (t, p, w) if plausible else None


def _first(value, methods, cas):  # type: ignore[no-untyped-def]
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            for method in methods(cas):
                if method not in ESTIMATES:
                    return float(value(cas, method=method))
        except Exception:
            return None
    return None


@cache
def _volumes() -> dict[str, dict[str, float]]:
    """Molar volume, m3/mol, by state and CAS number."""
    out: dict[str, dict[str, float]] = {"solid": {}, "liquid": {}}
    for state, path in (
        ("solid", "Density/CRC Solid Inorganic Constant Densities.tsv"),
        ("liquid", "Density/CRC Liquid Inorganic Constant Densities.tsv"),
    ):
        for row in chemicals_rows(path):
            volume = number(row["Vm"])
            if volume > 0:
                out[state].setdefault(row["CAS"], volume)
    for row in chemicals_rows("Density/CRC Inorganics densties of molten compounds and salts.tsv"):
        mass, density = number(row["MW"]), number(row["rho"])
        if mass > 0 and density > 0:
            out["liquid"].setdefault(row["CAS"], mass * 1e-3 / density)
    return out


@cache
def _organic_densities() -> dict[str, float]:
    rows = chemicals_rows("Misc/Physical Constants of Organic Compounds.csv")
    column = next((c for c in (rows[0] if rows else {}) if c.lower().startswith("rho")), "")
    return {r["CAS"]: number(r[column]) for r in rows if column and number(r[column]) > 0}


PLAUSIBLE = (1.5e-6, 30e-6)
"""Bounds on the molar volume of a condensed substance per atom, m3/mol."""


def molar_volume(d: Draft) -> float:
    """Molar volume of a condensed record, m3/mol, or nan.

    The densities are taken at 298 K or, of a molten salt, at its melting point; a form whose CAS
    number is not in the tables takes that of its composition only through the editor's entries.
    """
    volume = _volumes()[d.phase].get(d.cas, math.nan)
    if (math.isnan(volume) and d.phase == "liquid") or d.cas not in _volumes()[d.phase]:
        density = _organic_densities().get(d.cas, math.nan)
        if "C" in d.elements and density > 300:
            volume = molar_mass(d.elements) / density
    if d.cas in VOLUME_BY_CAS and (d.phase, d.cas) in VOLUME_STATE:
        volume = VOLUME_BY_CAS[d.cas]
    per_atom = volume / d.atoms
    return volume if PLAUSIBLE[0] <= per_atom <= PLAUSIBLE[1] else math.nan


VOLUME_BY_CAS = {
    "7732-18-5": 18.07e-6,
    "7726-95-6": 51.5e-6,
    "7782-42-5": 5.30e-6,
    "7782-40-3": 3.42e-6,
    "14808-60-7": 22.69e-6,
    "14464-46-1": 25.74e-6,
    "1317-80-2": 18.82e-6,
    "13397-26-7": 36.93e-6,
    "471-34-1": 36.93e-6,
    "17125-56-3": 12.04e-6,
    "1309-36-0": 23.94e-6,
    "1317-66-4": 24.58e-6,
    "1317-60-8": 30.27e-6,
    "1309-38-2": 44.52e-6,
    "1317-96-0": 18.20e-6,
    "14791-73-2": 34.15e-6,
    "16389-88-1": 64.34e-6,
    "10101-41-4": 74.69e-6,
    "13983-17-0": 39.93e-6,
    "10034-77-2": 51.60e-6,
    "1302-76-7": 44.09e-6,
    "12183-80-1": 51.53e-6,
    "12141-46-7": 49.90e-6,
    "12011-67-5": 23.23e-6,
    "10179-73-4": 46.39e-6,
}
"""Molar volumes of named forms, m3/mol (Robie and Hemingway 1995, from memory; water and
bromine at 298 K, from memory)."""
_LIQUIDS = ("7732-18-5", "7726-95-6")
VOLUME_STATE = {("solid", cas) for cas in VOLUME_BY_CAS if cas not in _LIQUIDS} | {
    ("liquid", cas) for cas in _LIQUIDS
}
