"""Which record of a species stands, and which stands beside it as the second source.

Gases: one record for each composition, charge and CAS number (CAS ignored up to two atoms, where
composition says it all, and for `ONE_SPECIES`). Burcat-Ruscic first if compiled in 1986 or later,
from neither the JANAF tables nor Barin and not marked D; else NIST-JANAF; else TRC.
Condensed: NIST-JANAF, then Burcat-Ruscic, then the CRC Handbook; the first that has the
composition and state; entries by hand where `hand_entries.toml` says that they replace one.
"""

import copy
from collections import defaultdict

from species_db.build.draft import Draft, LeftOut

ONE_SPECIES = {
    (("N", 3.0),),
    (("C", 2.0), ("O", 1.0)),
    (("Cl", 2.0), ("Fe", 1.0)),
}
"""Compositions of three atoms that the sources file under several CAS numbers."""
SAME_SPECIES = {
    "12440-00-5": "10248-58-5",  # (P2O3)2 and P4O6
    "15626-42-3": "3618-05-1",  # diazene: the tables' "cis" has the energy of the usual form
    "1320-41-8": "75-38-7",  # 1,1-difluoroethylene
    "62958-68-3": "75-65-0",  # tert-butanol
    "625-44-5": "1634-04-4",  # the block's formula is that of tert-butyl methyl ether
}
"""CAS number as given -> CAS number of the species meant (each read by eye)."""
CAS_BY_LABEL = {"C7H8O CRESOL": "108-39-4", "C7H16 ISOHEPTANE": "591-76-4"}
"""Blocks whose energy and entropy are those of 3-methylphenol and 2-methylhexane."""
CONFORMERS = {
    "Nitrous Acid, Cis": "conformer, counted in the record of the mixture",
    "Nitrogen Fluoride, Cis": "conformer, counted in the record of the mixture",
    "Nitrogen Fluoride, Trans": "conformer, counted in the record of the mixture",
}
"""Tables that a Burcat-Ruscic record of both conformers makes redundant."""
BURCAT_PICK = {
    "74-82-8": ("RRHO",),  # CH4: agrees with NIST-JANAF up to 3000 K, the anharmonic one does not
    "7664-41-7": ("ANHARM",),  # NH3: the anharmonic one agrees
}
"""Of several blocks of one species, the one whose name holds this."""
BURCAT_DROP = {
    "2465-56-7": ("EQUILB",),  # CH2: singlet and triplet are kept, their mixture is not
    "14541-24-3": ("RRHO",),
    "506-85-4": ("RRHO",),
}
ONE_OF_BURCAT = {"10031-22-8", "75-38-7"}
"""PbBr2 and 1,1-difluoroethylene stand twice in the file: the newer block is taken."""
MODERN = 1986


def gases(drafts: list[Draft], out: list[LeftOut]) -> list[Draft]:
    """Chosen gases, each with its second source."""
    out += [
        LeftOut(d.origin, d.rid, d.label, "gas", CONFORMERS[d.label])
        for d in drafts
        if d.label in CONFORMERS
    ]
    drafts = [d for d in drafts if d.label not in CONFORMERS]
    _settle_cas(drafts)
    shared = _shared_cas(drafts)
    groups: dict[tuple[object, str], list[Draft]] = defaultdict(list)
    for d in drafts:
        one = d.atoms <= 2 or d.identity[0] in ONE_SPECIES
        groups[(d.identity, "*" if one else d.cas or f"none {d.rid}")].append(d)
    chosen = []
    for (_, cas), group in groups.items():
        group = _narrowed(cas, group, out)
        burcat = [d for d in group if d.origin == "burcat"]
        if len(burcat) > 1 and cas in shared:
            kept = burcat  # isomers or spin states under one CAS number
            for d in kept:
                d.flags.append("CAS shared by several gases")
        else:
            kept = [max(group, key=_rank)]
        others = [d for d in group if d not in kept]
        for d in others:
            if d.origin == kept[0].origin:
                out.append(
                    LeftOut(d.origin, d.rid, d.label, "gas", "another block of this species")
                )
        second = next((d for d in others if d.origin != kept[0].origin), None)
        if len(kept) == 1 and second:
            kept[0].second = copy.deepcopy(second)
        chosen += kept
    return chosen


def _settle_cas(drafts: list[Draft]) -> None:
    """Repair CAS numbers; a JANAF gas without one is the one Burcat gas of its composition."""
    burcat: dict[object, list[Draft]] = defaultdict(list)
    for d in drafts:
        d.cas = CAS_BY_LABEL.get(d.label, SAME_SPECIES.get(d.cas, d.cas))
        if d.origin == "burcat":
            burcat[d.identity].append(d)
    for d in drafts:
        if d.origin == "janaf" and not d.cas and len(burcat[d.identity]) == 1:
            d.cas = burcat[d.identity][0].cas


def _shared_cas(drafts: list[Draft]) -> set[str]:
    """CAS numbers under which Burcat-Ruscic files several different gases."""
    heats: dict[str, list[float]] = defaultdict(list)
    for d in drafts:
        if d.origin == "burcat" and d.cas and d.atoms > 2 and d.identity[0] not in ONE_SPECIES:
            heats[d.cas].append(d.h298)
    return {c for c, h in heats.items() if len(h) > 1 and c not in ONE_OF_BURCAT}


def _narrowed(cas: str, group: list[Draft], out: list[LeftOut]) -> list[Draft]:
    wanted, unwanted = BURCAT_PICK.get(cas, ()), BURCAT_DROP.get(cas, ())
    kept = []
    for d in group:
        label = d.label.upper()
        burcat = d.origin == "burcat"
        lacks = burcat and wanted and not any(w in label for w in wanted)
        if lacks or (burcat and any(w in label for w in unwanted)):
            out.append(LeftOut(d.origin, d.rid, d.label, "gas", "another block of this species"))
        else:
            kept.append(d)
    return kept or group


def _rank(d: Draft) -> tuple[int, int]:
    if d.origin == "hand":
        return 9, 0
    if d.origin != "burcat":
        return (2 if d.origin == "janaf" else 0), 0
    good = (
        d.year >= MODERN
        and d.compiler.upper() not in ("J", "B")
        and d.quality != "D"
        and "cp steps at 1000 K" not in d.flags
    )
    return (3 if good else 1), d.year


WATER = ((("H", 2.0), ("O", 1.0)), 0)
"""Water: the Burcat-Ruscic liquid runs from 273.15 to 600 K and joins its ice; the other source's
from 298.15 to 500 K."""


def _order(d: Draft) -> int:
    if d.identity == WATER and d.origin == "burcat":
        return 0
    return {"hand": 1, "janaf": 2, "burcat": 3, "crc": 4, "crc298": 5}[d.origin]


def condensed(drafts: list[Draft], out: list[LeftOut]) -> list[Draft]:
    """Chosen condensed records; a composition's liquid comes with its solid's source."""
    groups: dict[object, list[Draft]] = defaultdict(list)
    for d in drafts:
        groups[d.identity].append(d)
    chosen = []
    for group in groups.values():
        for phase in ("solid", "liquid"):
            forms = [d for d in group if d.phase == phase and d.origin == "hand" and d.form]
            chosen += forms  # a form of its own stands beside the others
            same = sorted((d for d in group if d.phase == phase and d not in forms), key=_order)
            if not same:
                continue
            first = [d for d in same if d.origin == same[0].origin]
            rest = [d for d in same if d.origin != same[0].origin]
            for d in first:
                match = [r for r in rest if not (r.cas and d.cas and r.cas != d.cas)]
                if match and len(first) == 1:
                    d.second = copy.deepcopy(match[0])
            chosen += first
            kept_cas = {d.cas for d in first}
            for d in rest:
                if "H" in d.elements and "C" in d.elements and d.cas not in kept_cas:
                    chosen.append(d)  # another organic of the same formula
                    kept_cas.add(d.cas)
                elif d.origin != "crc298":
                    out.append(LeftOut(d.origin, d.rid, d.label, phase, "better source chosen"))
    return chosen
