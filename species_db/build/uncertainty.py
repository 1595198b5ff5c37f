"""Standard uncertainty (k = 1) of the enthalpies of formation, J/mol.

Order: half of the 95 % figure of the Active Thermochemical Tables; the +/- text of the
polynomials as it stands (against the tables it behaves like one sigma: 70 % within u); the same
text where another source has the same value; a class default from the measured spread.
"""

import math
import re
from collections.abc import Iterable

from species_db.build.draft import Draft

DEFAULTS = {
    "organic": 3000.0,
    "trc": 4000.0,
    "janaf gas": 5000.0,
    "condensed": 4000.0,
    "doubtful": 20000.0,
}
DISPUTED = 15e3
"""Two sources further apart than this, J/mol, put a record on the doubtful list."""
KIND_ATCT, KIND_TEXT, KIND_SAME = "ATcT 95 % / 2", "stated, k = 1", "stated for the same value"
KIND_DEFAULT, KIND_EXACT = "class default", "reference state"

_NUM = r"([-+]?\s?\d+(?:[.,]\d+)?|[-+]?\.\d+)"
_PLUS_MINUS = re.compile(
    _NUM + r"\s*\.?\s*\+\s*/?\s*-+\s*(\d*[.,]?\d+(?:E-?\d+)?\.?)\s*(KJ|KCAL|CAL|J)?", re.IGNORECASE
)


def stated_in_text(texts: Iterable[str], h298: float) -> tuple[float, str]:
    """Uncertainty that a text states beside the very enthalpy h298 (J/mol); nan if none does."""
    for text in texts:
        for found in _PLUS_MINUS.finditer(text):
            try:
                value = float(found.group(1).replace(" ", "").replace(",", "."))
                u = float(found.group(2).rstrip(".").replace(",", "."))
            except ValueError:
                continue
            unit = (found.group(3) or "").upper()
            if not unit:
                later = re.search(r"(KJ|KCAL)", text[found.end() : found.end() + 12], re.IGNORECASE)
                unit = later.group(1).upper() if later else ""
            factors = {"KCAL": (4184.0,), "KJ": (1000.0,)}.get(unit, (1000.0, 4184.0))
            for factor in factors:
                if abs(value * factor - h298) < 20.0 + 0.0015 * abs(h298):
                    return u * factor, text
    return math.nan, ""


def assign(drafts: list[Draft], everything: list[Draft]) -> None:
    """Give every chosen record an uncertainty and its kind; `everything` holds the stated ones."""
    for d in drafts:
        both = d.second is not None and max(d.T_min, d.second.T_min) < 300.0
        apart = d.second.h298 - d.h298 if d.second and both else 0.0
        if abs(apart) > DISPUTED and d.u_kind != KIND_ATCT:
            d.flags.append(f"doubtful: second source differs by {apart / 1000:+.0f} kJ/mol")
    stated: dict[tuple[object, str], list[tuple[float, float]]] = {}
    for d in everything:
        if d.u_kind in ("stated", KIND_TEXT):
            stated.setdefault((d.identity, d.phase), []).append((d.h_as_read, d.u))
    for d in drafts:
        if d.is_reference or (not d.elements and d.charge == -1):
            d.u, d.u_kind = 0.0, KIND_EXACT
        elif d.u_kind == "stated":
            d.u_kind = KIND_TEXT
        elif not d.u_kind:
            same = [
                u for h, u in stated.get((d.identity, d.phase), []) if abs(h - d.h_as_read) < 300.0
            ]
            if same:
                d.u, d.u_kind = same[0], KIND_SAME
            else:
                d.u, d.u_kind = DEFAULTS[_class_of(d)], KIND_DEFAULT


def _class_of(d: Draft) -> str:
    if any(flag.startswith("doubtful") for flag in d.flags):
        return "doubtful"
    if d.phase != "gas":
        return "condensed"
    if d.origin == "trc":
        return "trc"
    return "organic" if d.origin == "burcat" and "C" in d.elements else "janaf gas"
