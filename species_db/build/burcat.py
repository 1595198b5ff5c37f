"""Burcat-Ruscic polynomials: repair, check, and drop what fails.

Every repair is a rule that must pass a check of its own (molar mass, stated enthalpy,
continuity); each is noted in the record's flags. What is dropped goes to the list of records
left out, with its reason.
"""

import itertools
import re

import numpy as np

from species_db.build.burcat_read import Block, read_blocks
from species_db.build.draft import Draft, LeftOut
from species_db.build.places import cas_ok
from species_db.build.poly import R_1986, T0, Piece, cp_of, h_of, s_of
from species_db.build.uncertainty import stated_in_text
from species_db.elements import ATOMIC_MASS, ELECTRON_MASS
from species_db.formula import parse_formula
from species_db.species import R

CAS_BY_NAME = {
    "C2H2O KETENE": "463-51-4",
    "C4H6  1,2-butadi": "590-19-2",
    "C4H4  1-butene-3": "689-97-4",
    "C6H6   Benzvalen": "659-85-8",
    "S2F2 (SSF2)": "16860-99-4",
    "Disulfane H-S-S-": "13465-07-1",
    "Mg2F4": "58790-41-3",
    "H+": "12408-02-5",
    "He+": "14234-48-1",
    "CCL4": "56-23-5",
    "C3H7 i-propyl": "2025-55-0",
    "FeCL2": "7758-94-3",
}
"""CAS numbers that the file lacks or garbles, by short name."""
CAS_TYPOS = {"740-42-8": "7440-42-8", "7349-97-6": "7439-97-6", "1012-44-0": "10102-44-0"}
H_FROM_FIELD = {"HS2  RRHO", "SiH3", "SiHCL3", "2,4-c-C5H5O"}
"""Gases whose polynomial misses the stated enthalpy while the text agrees with it."""
NIO_H298 = -239700.0
"""NiO: the enthalpy field holds a placeholder, -1000 K; the block's text says -239.70 kJ/mol."""
LIQUID_CAPS = {"H2O2(L)": 600.0}
"""Liquids whose stated range runs past any use of them."""
_MASS = {**ATOMIC_MASS, "D": 2.01410178, "e": ELECTRON_MASS}
_PHASE = {"G": "gas", "L": "liquid", "S": "solid", "C": "solid"}
_COMPILERS = {
    "T": "Technion", "J": "JANAF", "j": "JANAF", "L": "NASA Lewis", "g": "NASA Glenn",
    "G": "NASA Glenn", "A": "Argonne", "P": "TRC", "RUS": "TSIV", "tpis": "TPIS", "TPIS": "TPIS",
    "R": "TSIV", "B": "Barin", "IU": "IUPAC", "S": "LSU", "ATcT": "ATcT", "ATCT": "ATcT",
    "CODA": "CODATA", "coda": "CODATA", "TT": "adjusted",
}  # fmt: skip


class Reject(Exception):
    """Why a block is left out."""


def burcat_drafts() -> tuple[list[Draft], list[LeftOut]]:
    """Usable blocks as drafts, and the others with their reason."""
    drafts, out = [], []
    for block in read_blocks():
        try:
            drafts.append(_draft(block))
        except Reject as why:
            out.append(
                LeftOut(
                    "burcat",
                    f"{block.index}.{block.sub}",
                    re.sub(r"\s+", " ", block.name),
                    _PHASE[block.phase],
                    str(why),
                )
            )
    return drafts, out


def _draft(b: Block) -> Draft:
    name = b.name.upper()
    flags = list(b.repairs)
    if name == "AIR" or name.startswith("JET-A"):
        raise Reject("mixture")
    elements, charge = _elements(b, flags)
    if b.unreadable or (name.startswith("KNO3") and b.phase != "G"):
        raise Reject("coefficient unreadable")
    if "D" in elements:
        raise Reject("deuterium compound")
    if b.quality in ("E", "F"):
        raise Reject("quality mark E or F")
    phase = _PHASE[b.phase]
    if phase != "liquid" and re.search(r"\(L\)|LIQUID", name):
        phase = "liquid"
        flags.append("phase taken from the name")
    low = np.array(b.low if b.low else b.high) * R_1986 / R
    high = np.array(b.high if b.high else b.low) * R_1986 / R
    if not b.low and not b.high:
        raise Reject("no coefficients")
    low, high = _enthalpy(b, phase, low, high, flags)
    T_max = LIQUID_CAPS.get(b.name, b.T_max)
    if phase == "gas":
        T_max = _check_gas(b, sum(elements.values()), low, high, T_max, flags)
        ds = float(s_of(high, 1000.0) - s_of(low, 1000.0))
        if abs(ds) > 1e-3:
            flags.append("entropy step at 1000 K removed")
    if not 0 < b.T_min < T_max:
        raise Reject("temperature limits")
    pieces = [
        Piece(max(lo, b.T_min), min(hi, T_max), a)
        for lo, hi, a in ((0.0, 1000.0, low), (1000.0, 9e9, high))
        if max(lo, b.T_min) < min(hi, T_max)
    ]
    if len(pieces) == 2 and np.array_equal(low, high):
        pieces = [Piece(b.T_min, T_max, low)]
    if len(pieces) == 2:
        T = pieces[1].low
        dh = float(h_of(pieces[0].a, T) - h_of(pieces[1].a, T))
        ds = float(s_of(pieces[0].a, T) - s_of(pieces[1].a, T))
        pieces[1] = pieces[1].shifted(dh, ds)
    grid = np.linspace(b.T_min, T_max, 400)
    if min(float(cp_of(p.a, t)) for p in pieces for t in grid if p.low <= t <= p.high) <= 0:
        raise Reject("cp not above zero")
    draft = Draft(
        origin="burcat",
        rid=f"{b.index}.{b.sub}",
        label=re.sub(r"\s+", " ", b.name),
        elements=elements,
        charge=charge,
        phase=phase,
        pieces=pieces,
        cas=_cas(b, flags),
        source="burcat",
        reference=_reference(b),
        flags=flags,
        quality=b.quality,
        year=_year(b.date),
        compiler=b.source,
        is_reference="REF ELEM" in name,
    )
    if b.quality == "D":
        flags.append("quality mark D")
    u, _ = stated_in_text((b.h298_text, b.notes, b.text, b.reference), draft.h298)
    if np.isfinite(u):
        draft.u, draft.u_kind = u, "stated"
    draft.synonyms = [re.sub(r"\s+", " ", b.text.split("SIGMA")[0]).strip(" ?|")[:120]]
    return draft


def _elements(b: Block, flags: list[str]) -> tuple[dict[str, float], int]:
    """Element counts that agree with the stated molar mass, and the charge."""
    counts: dict[str, float] = {}
    for symbol, n in b.counts:
        if symbol == "L":  # aluminium, its first letter lost
            symbol = "AL"
            flags.append("element L read as Al")
        proper = "e" if symbol == "E" else symbol[:1] + symbol[1:].lower()
        if proper not in _MASS:
            raise Reject(f"element {symbol!r} unknown")
        counts[proper] = counts.get(proper, 0) + int(n)
    if b.name.upper().startswith("ELECTRON"):
        return {}, -1
    tolerance = 0.01 + 3e-4 * b.mass + (0.05 if "Ge" in counts else 0)
    if not counts:
        first = (b.text.replace("??", "").split() or [""])[0].rstrip(",;")
        parsed = parse_formula(first)
        if not parsed or abs(_mass(dict(parsed[0])) - b.mass) > tolerance:
            raise Reject("no elements given")
        counts = dict(parsed[0])
        flags.append("elements read from the formula")
    elif abs(_mass(counts) - b.mass) > tolerance:
        fits = [
            c
            for by in itertools.product((1, 10, 100), repeat=len(counts))
            if all(n % d == 0 for n, d in zip(counts.values(), by, strict=True))
            and abs(
                _mass(c := {e: n // d for (e, n), d in zip(counts.items(), by, strict=True)})
                - b.mass
            )
            <= tolerance
        ]
        if len(fits) != 1:
            raise Reject("elements disagree with the molar mass")
        counts = fits[0]
        flags.append("element counts divided to meet the molar mass")
    charge = -int(counts.pop("e", 0))
    return {e: float(n) for e, n in counts.items()}, charge


def _mass(counts: dict[str, float]) -> float:
    return sum(_MASS[e] * n for e, n in counts.items())


def _enthalpy(
    b: Block, phase: str, low: np.ndarray, high: np.ndarray, flags: list[str]
) -> tuple[np.ndarray, np.ndarray]:
    """Coefficients with the enthalpy constant that the block's own statements support."""
    stated = (b.h298_R or 0.0) * R_1986 / R
    if b.name.startswith("NiO"):
        shift = np.array([0, 0, 0, 0, 0, NIO_H298 / R - stated, 0])
        flags.append("enthalpy taken from the text of the block")
        return low + shift, high + shift
    difference = float(h_of(low if b.low else high, T0)) - stated
    if phase == "gas" and abs(difference) * R > 100:
        if b.name in H_FROM_FIELD:
            flags.append("enthalpy taken from the stated value")
            shift = np.array([0, 0, 0, 0, 0, -difference, 0])
            return low + shift, high + shift
        flags.append("stated enthalpy differs from the polynomial's, which is used")
    elements_at_zero = b.name.startswith(("H2O(s)", "Br2(cr)", "Hg(cr)"))
    apart = b.T_min <= 300 and stated and abs(difference) * R > 1000
    if phase != "gas" and apart and not elements_at_zero:
        raise Reject("enthalpy of the polynomial differs from the stated one")
    return low, high


def _check_gas(
    b: Block, atoms: float, low: np.ndarray, high: np.ndarray, T_max: float, flags: list[str]
) -> float:
    """Bounds on cp of a gas; returns the highest temperature that may be used."""
    if b.T_min > 300:
        raise Reject("gas record starts above 300 K")
    classical = 3 * atoms - 2
    grid = np.linspace(b.T_min, T_max, 400)
    cp = np.where(grid <= 1000, cp_of(low, grid), cp_of(high, grid))
    cp298 = float(cp_of(low, T0))
    if b.T_min < 1000 < T_max:
        step = abs(float(cp_of(high, 1000.0) - cp_of(low, 1000.0)))
        if step > 0.03 * max(cp298, 1.0):
            raise Reject("cp steps by more than 3 % at 1000 K")
        if step > 0.01:
            flags.append("cp steps at 1000 K")
    if cp.min() < 2.2:
        raise Reject("cp/R below 2.2")
    if atoms >= 4 and cp.max() > 1.3 * classical:
        raise Reject("cp above 1.3 times the classical limit")
    if atoms >= 3 and T_max >= 3000 and cp[-1] < 0.6 * classical:
        t = np.arange(1000.0, T_max, 50.0)
        c = np.asarray(cp_of(high, t))
        top = float(t[c.argmax()])
        if top < 1500 or c.max() <= 0.75 * classical:
            raise Reject("cp falls below 0.6 times the classical limit")
        flags.append("range ends where cp has its maximum")
        return top
    return T_max


def _cas(b: Block, flags: list[str]) -> str:
    fixed = CAS_BY_NAME.get(b.name) or CAS_TYPOS.get(b.cas)
    if fixed:
        flags.append("CAS number repaired")
        return fixed
    if cas_ok(b.cas):
        return b.cas
    good = [c for c in re.split(r"[ ?]+", b.cas) if cas_ok(c)]
    return good[0] if len(good) == 1 else ""


def _reference(b: Block) -> str:
    who = _COMPILERS.get(b.source, b.source)
    paper = re.sub(r"[\s|]+", " ", b.reference)[:90].strip()
    return " ".join(x for x in (f"[{who}]" if who else "", paper, b.date) if x)


def _year(date: str) -> int:
    if "/A" in date:
        return 2005
    found = re.search(r"(\d\d)[A-Z]?$", date.strip())
    if not found:
        return 0
    two = int(found.group(1))
    return two + (1900 if two > 20 else 2000)
