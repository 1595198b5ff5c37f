"""Readable names and synonyms.

Order of a name: the editor's (``names.toml``), the CRC Handbook's, the identifier tables' common
name, the source's own label made readable. A name from another table is taken only if its formula
is the record's, hydrogen aside.
"""

import re
import tomllib
from functools import cache
from typing import Any

from species_db.build.crc import handbook
from species_db.build.draft import Draft
from species_db.build.identity import Known, known, same_but_hydrogen
from species_db.build.places import HERE
from species_db.build.trade import trade_formula

LONGEST = 60
KEEP = 6
"""So many synonyms of the identifier tables are kept."""
_ODD = re.compile(
    r"[;$]|anyl|ylidyne|\(9ci\)|\(1:\d\)|methane\(|, \([A-Z]+-\d|^[\d-]+$"
    r"|^(brn |ac1|mfcd|nsc|unii|einecs|chebi|dtxsid|schembl|[a-z]{0,6}\d{4,})",
    re.IGNORECASE,
)
"""Registry codes and machine-made names, which nobody would type."""
_GREEK = {"α": "alpha", "β": "beta", "γ": "gamma"}


@cache
def editor() -> dict[str, Any]:
    """Sections of ``names.toml``."""
    with (HERE / "names.toml").open("rb") as f:
        return tomllib.load(f)


def give_names(drafts: list[Draft]) -> None:
    """Set name and synonyms of every record."""
    for d in drafts:
        long_text = d.synonyms[0] if d.synonyms else ""
        entry = _entry(d)
        formula = trade_formula(d.elements, d.charge)
        choices = [
            d.name,
            editor()["by_cas"].get(d.cas, "") if d.cas not in editor()["not_by_cas"] else "",
            editor()["by_formula"].get(formula, "") if d.phase == "gas" or not d.cas else "",
            editor()["by_label"].get(d.label, ""),
            _crc_name(d),
            _common(entry) if d.origin != "janaf" or {"C", "H"} <= set(d.elements) else "",
            _label(d, long_text),
            _common(entry),
        ]
        names = [n for n in choices if n]
        d.name = names[0]
        if d.charge and d.elements and not re.search(r"ion\b|ium\b|proton|ide\b", d.name):
            d.name += " cation" if d.charge > 0 else " anion"
        synonyms = names[1:] if d.cas or d.origin == "janaf" else []
        if entry and not d.charge:
            synonyms += [entry.iupac, *entry.synonyms]
        synonyms += editor()["synonyms"].get(d.cas, [])[:]
        d.synonyms = _clean(d.name, synonyms, editor()["synonyms"].get(d.cas, []))


def _entry(d: Draft) -> Known | None:
    entry = known(d.cas) if d.cas else None
    return entry if entry and same_but_hydrogen(entry.identity, d.identity) else None


def _crc_name(d: Draft) -> str:
    row = handbook().get(d.cas)
    if not row or d.charge or (d.cas and _entry(d) is None and d.origin == "burcat"):
        return ""
    return _lower(re.sub(r" \((hexagonal|α|β|γ|rhombic)\)$", "", str(row["Chemical"])))


def _common(entry: Known | None) -> str:
    if not entry:
        return ""
    for name in (entry.common, entry.iupac):
        if name and not _ODD.match(name) and len(name) <= LONGEST:
            return _lower(name)
    return ""


def _label(d: Draft, long_text: str) -> str:
    if d.origin in ("janaf", "trc", "crc", "crc298", "hand"):
        text = re.sub(r", (Alpha|Beta|Gamma|Delta|Kappa|I|II|III|IV|V|Red|Ion)\b.*$", "", d.label)
        return (
            _lower(re.sub(r" \([^()]*\(?.*\)$", "", text)) if d.origin == "janaf" else _lower(text)
        )
    text = re.sub(r"\s+", " ", long_text.replace("??", "")).strip()
    text = re.split(r"\b(?:SIGMA|STATWT|T0=|IA=|REF|CALC|FC|DATA|FROM|HF298)\b|\|", text)[0]
    text = re.sub(r"\bRAD\b\.?", "radical", text, flags=re.IGNORECASE)
    text = re.sub(r"\bESTIMATED USING.*$|\bSYMNO=\d|\bTRC\b", "", text, flags=re.IGNORECASE)
    words = [
        w for w in text.split(" ") if w and not _STRUCTURE.match(w) and not re.search("[#!*]", w)
    ]
    name = " ".join(words).strip(" ,.;?|").lower()
    formula = trade_formula(d.elements, d.charge)
    if not re.search(r"[a-z]{4,}", name) or name.count("(") != name.count(")"):
        name = ""
    if re.fullmatch(r"(bi-?)?radical( singlet| triplet)?|singlet|triplet|cation|anion", name):
        name = f"{formula} {name}"
    return name if 0 < len(name) <= LONGEST else _tidy(d.label, formula)


_STRUCTURE = re.compile(r"^(?=.*[0-9=*#])(?:C|H|N|O|F|S|P|CL|Cl|BR|Br|I|cy|[0-9()\[\]=*#+/.'-])+$")
"""A word that is a structure: element symbols, digits and bonds only."""


def _tidy(label: str, formula: str) -> str:
    """A short name of the file, cut at 18 characters, as a name of last resort."""
    words = [w for w in label.split(" ") if w]
    rest = " ".join(words[1:]).strip(" ,.;()")
    return f"{formula} {rest.lower()}" if rest else formula


def _lower(name: str) -> str:
    for letter, word in _GREEK.items():
        name = name.replace(letter, word)
    name = re.sub(
        r" (\((?=[^)]*[A-Z0-9])[A-Z][A-Za-z0-9()]*\)|\[[A-Z][A-Za-z0-9]*\])$", "", name.strip()
    )
    if name[:1].isupper() and (name[1:2].islower() or name[1:2] == ""):
        name = name[0].lower() + name[1:]
    name = re.sub(r" \((\d+CI,?)+\)$", "", name)
    name = re.sub(r"(?<![A-Za-z])[A-Z](?=[a-z]{2})", lambda m: m.group().lower(), name)
    turned = re.fullmatch(r"([^ ,]*[a-z]{4}[^ ,]*), ([^,]*[a-z]{3}[^, ]*)-", name)
    if turned:  # an index entry, base name first
        base, front = turned.groups()
        return f"{front}-{base}" if base[0].isdigit() else front + base
    turned = re.fullmatch(r"(hydroperoxide|peroxide), ([a-z]+)", name)
    return f"{turned.group(2)} {turned.group(1)}" if turned else name


_NOTE = re.compile(r"\b(ref element|calculated|an?harmonic|rrho|generated|sigma)\b", re.IGNORECASE)
"""Remarks of the source files that stand where a name should."""


def _clean(name: str, synonyms: list[str], forced: list[str]) -> list[str]:
    out: list[str] = list(forced)
    seen = {name.casefold(), *(f.casefold() for f in forced)}
    for synonym in synonyms:
        text = re.sub(r"[\t|;]", " ", synonym).strip()
        text = text if any(c.isdigit() for c in text[:1]) else _lower(text)
        if not text or text.casefold() in seen or len(text) > 48:
            continue
        if _ODD.match(text) or _NOTE.search(text):
            continue
        if len(out) - len(forced) >= KEEP:
            break
        seen.add(text.casefold())
        out.append(text)
    return out
