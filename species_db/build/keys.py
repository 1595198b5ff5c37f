"""Keys, and which record a bare formula or a name means.

Gas: the formula as the trade writes it; where a composition has several isomers, the usual one has
the bare formula and each other one its name as a suffix, or every one a suffix if none is usual.
Condensed: the same with ``(l)``, ``(s)``; several solid forms of one composition are told apart by
their form, the stable one taking ``(s)`` unless it has a mineral name.
"""

import re
from collections import defaultdict

from species_db.build.draft import Draft
from species_db.build.names import editor
from species_db.build.poly import T0, g_at
from species_db.build.trade import hill, trade_formula

STATE = {"gas": "", "liquid": "l", "solid": "s"}
MINERAL = {
    "quartz", "cristobalite", "rutile", "anatase", "andalusite", "kyanite", "sillimanite",
    "calcite", "aragonite", "pyrite", "marcasite", "gr", "diamond", "white", "red", "black",
}  # fmt: skip
"""Forms whose name stands in the key of the stable form too."""
VOLATILE = 15.0
"""A name means the gas while g/RT of the gas is less than this above the condensed one, 298 K."""


def give_keys(drafts: list[Draft]) -> None:
    """Set key and `usual`, and the letter n of `named` in flags-free form."""
    by: dict[object, list[Draft]] = defaultdict(list)
    for d in drafts:
        by[d.identity].append(d)
    for group in by.values():
        _group_keys(group)
    _part_equal_keys(drafts)


def _substance(d: Draft) -> str:
    return d.cas if d.cas and "CAS shared by several gases" not in d.flags else d.name


def _group_keys(group: list[Draft]) -> None:
    formula = trade_formula(group[0].elements, group[0].charge)
    plain = hill(group[0].elements) if "C" in group[0].elements else formula
    gases = [d for d in group if d.phase == "gas"]
    molecular = "C" in group[0].elements and "H" in group[0].elements
    members = group if molecular else gases
    ids = list(dict.fromkeys(_substance(d) for d in members))
    wanted = editor()["usual"].get(hill(group[0].elements), "") if not group[0].charge else ""
    usual = wanted if wanted in ids else ids[0] if len(ids) == 1 else ""
    for phase in ("gas", "liquid", "solid"):
        same = [d for d in group if d.phase == phase]
        if phase == "solid" and not molecular:
            _solid_keys(formula, same)
            continue
        for d in same:
            letter = STATE[phase]
            alone = phase != "gas" and not molecular and len(same) == 1
            d.usual = alone or _substance(d) == usual
            if d.usual:
                d.key = formula + (f"({letter})" if letter else "")
            else:
                special = editor()["key_by_cas"].get(d.cas, "")
                suffix = suffix_of(d.name)
                d.key = (
                    special
                    if special and not letter
                    else (f"{plain}({suffix},{letter})" if letter else f"{plain}({suffix})")
                )


def suffix_of(name: str) -> str:
    """Name made fit to stand in brackets."""
    text = re.sub(r"\((.*?)\)", r"\1", name)
    text = re.sub(r"[()\[\]{}|\t;]", "", text).strip()
    return re.sub(r"\s+", " ", text)


def _solid_keys(formula: str, solids: list[Draft]) -> None:
    if not solids:
        return
    for d in solids:
        d.form = _form(d)
    stable = min(solids, key=lambda d: (not d.is_reference, g_at(d.pieces, T0)))
    stable.usual = True
    for d in solids:
        if d is stable and (len(solids) == 1 or d.form not in MINERAL):
            d.key = f"{formula}(s)"
        else:
            d.key = f"{formula}({d.form or suffix_of(d.name)})"
        if formula == "C" and d is stable:
            d.key = "C(gr)"
        elif d.form and len(solids) > 1 and d.form not in d.name and d is not stable:
            d.name = f"{d.name} ({d.form})"


def _form(d: Draft) -> str:
    """Form as it stands in a key."""
    by_editor = editor()["form_by_cas"].get(d.cas)
    if by_editor:
        return str(by_editor)
    if d.form == "White" or (d.is_reference and dict(d.elements) == {"P": 1.0}):
        return "white"
    red = re.search(r"Red, (IV|V)\b", d.label)
    if red:
        return "red" if red.group(1) == "V" else "red IV"
    return d.form if re.fullmatch(r"[IVX]+", d.form) else d.form.lower()


def _part_equal_keys(drafts: list[Draft]) -> None:
    """Two records with one key: the later gets its own label as suffix."""
    seen: dict[str, Draft] = {}
    for d in drafts:
        if d.key in seen:
            base = d.key[: d.key.index("(")] if "(" in d.key else d.key
            d.key = f"{base}({suffix_of(d.label).lower()})"
            d.usual = False
        if d.key in seen:
            raise SystemExit(f"keys: {d.key} stands for {d.rid} and {seen[d.key].rid}")
        seen[d.key] = d


def named_records(drafts: list[Draft]) -> set[str]:
    """Keys that a plain name means: one state of each substance.

    The reference state of an element; else the gas, unless it has next to no vapour pressure at
    298 K; else the liquid that is stable there, else the solid.
    """
    by: dict[str, list[Draft]] = defaultdict(list)
    for d in drafts:
        by[d.name.casefold()].append(d)
    elements = {tuple(d.elements) for d in drafts if d.is_reference}
    chosen = set()
    for group in by.values():
        reference = [d for d in group if d.is_reference]
        condensed = sorted(
            (d for d in group if d.phase != "gas"), key=lambda d: (not d.usual, g_at(d.pieces, T0))
        )
        gas = next((d for d in group if d.phase == "gas"), None)
        if reference:
            chosen.add(reference[0].key)
        elif gas and (
            not condensed or g_at(gas.pieces, T0) - g_at(condensed[0].pieces, T0) < VOLATILE
        ):
            chosen.add(gas.key)
        else:
            chosen.add((condensed or group)[0].key)
    return chosen - {d.key for d in drafts if tuple(d.elements) in elements and not d.is_reference}
