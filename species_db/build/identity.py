"""What ``chemicals`` knows of a CAS number: formula, names, melting and boiling points."""

import warnings
from dataclasses import dataclass
from functools import cache

from species_db.build.draft import Identity, composition
from species_db.formula import parse_formula


@dataclass(frozen=True)
class Known:
    identity: Identity
    common: str
    iupac: str
    synonyms: tuple[str, ...]
    pubchem: int
    inchi: str


@cache
def known(cas: str) -> Known | None:
    """Entry of the identifier tables, or None."""
    from chemicals.identifiers import pubchem_db

    try:
        found = pubchem_db.search_CAS(cas)
    except Exception:
        return None
    if not found or not found.formula:
        return None
    parsed = parse_formula(found.formula)  # None for deuterium and tritium
    if parsed is None:
        return None
    return Known(
        (composition(dict(parsed[0])), parsed[1]),
        found.common_name or "",
        found.iupac_name or "",
        tuple(found.synonyms or ()),
        int(found.pubchemid),
        found.InChI or "",
    )


def same_but_hydrogen(a: Identity, b: Identity) -> bool:
    """Compositions agree, hydrogen and charge aside (the tables protonate some salts)."""
    return {e: n for e, n in a[0] if e != "H"} == {e: n for e, n in b[0] if e != "H"}


@cache
def melting_point(cas: str) -> float | None:
    """Measured melting point, K, or None."""
    from chemicals import Tm, Tm_methods

    return _measured(Tm, Tm_methods, cas)


@cache
def boiling_point(cas: str) -> float | None:
    """Measured normal boiling point, K, or None."""
    from chemicals import Tb, Tb_methods

    return _measured(Tb, Tb_methods, cas)


def _measured(value, methods, cas):  # type: ignore[no-untyped-def]
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            for method in methods(cas):
                if method != "JOBACK":
                    return value(cas, method=method)
        except Exception:
            return None
    return None
