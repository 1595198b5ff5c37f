"""Numbers, units and formulas as text for people.

Four significant digits by default, powers of ten typeset (1.23 × 10⁻⁵), no padding. The full
value is the caller's to show elsewhere.
"""

from __future__ import annotations

import math
import re
from typing import Final

SIGNIFICANT: Final = 4
MINUS: Final = "\u2212"
_UP: Final = str.maketrans("0123456789-+", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺")
_DOWN: Final = str.maketrans("0123456789.", "₀₁₂₃₄₅₆₇₈₉.")
_SHOWN: Final = {
    "degC": "°C",
    "degF": "°F",
    "degR": "°R",
    "m3": "m³",
    "ft3": "ft³",
    "Nm3": "Nm³",
    "Sm3": "Sm³",
}


def number_text(value: float, digits: int = SIGNIFICANT) -> str:
    """A number with `digits` significant figures.

    Plain notation from 10⁻³ up to 10⁶ (with every digit before the point), a typeset power of
    ten beyond. Zero is "0".
    """
    if math.isnan(value):
        return "–"
    if math.isinf(value):
        return "∞" if value > 0 else MINUS + "∞"
    if value == 0:
        return "0"
    mantissa, _, power = f"{abs(value):.{digits - 1}e}".partition("e")
    exponent = int(power)
    sign = MINUS if value < 0 else ""
    if -3 <= exponent < 6:
        return sign + f"{abs(value):.{max(digits - 1 - exponent, 0)}f}"
    return f"{sign}{mantissa} × 10{str(exponent).translate(_UP)}"


def typed_number(value: float | str) -> str:
    """A number as a person would have typed it: every digit that matters, no padding."""
    if isinstance(value, str):
        return value
    text = f"{value:.15g}"
    if "e" in text:
        mantissa, _, power = text.partition("e")
        return f"{mantissa}e{int(power)}"
    return text


def unit_text(unit: str) -> str:
    """A unit as printed: °C for degC, m³ for m3."""
    return "/".join(_SHOWN.get(part, part) for part in unit.split("/"))


def quantity_text(value: float, unit: str, digits: int = SIGNIFICANT) -> str:
    """Number and unit, as "1.234 × 10⁻⁵ bar"."""
    return f"{number_text(value, digits)} {unit_text(unit)}".rstrip()


def one_line(text: str) -> str:
    """A text as one line a terminal can be given: no line breaks, no control characters."""
    return " ".join("".join(c if c.isprintable() else " " for c in text).split())


_BARE_POWER = re.compile(r"(?<![\w.])(-?)(\d+(?:\.\d+)?)e([+-]?\d+)(?![\w.]*\w)")


def typeset(text: str) -> str:
    """A sentence of the solver as people read it: powers of ten and minus signs typeset.

    ``(-1.5e-09)`` becomes (−1.5 × 10⁻⁹), ``T - 8 K`` T − 8 K, ``m3`` m³.
    """
    text = _BARE_POWER.sub(
        lambda m: f"{MINUS if m[1] else ''}{m[2]} × 10{str(int(m[3])).translate(_UP)}", text
    )
    text = re.sub(r"(?<=\s)-(?=\s)|(?<=[\s(])-(?=\d)", MINUS, text)
    return re.sub(r"(?<=[\d⁰¹²³⁴⁵⁶⁷⁸⁹] )m3\b", "m³", text)


_FORMULA = re.compile(r"(?<=[A-Za-z)\]])(\d+(?:\.\d+)?)")


def formula_text(key: str) -> str:
    """A species key with its counts as subscripts: H2O(l) gives H₂O(l).

    A suffix that names a form (``C4H10(isobutane)``, ``C2H6O(1-propanol)``) stays as it is.
    """
    head, form, tail = _split_form(key)
    return _FORMULA.sub(lambda m: m.group(1).translate(_DOWN), head) + form + tail


def _split_form(key: str) -> tuple[str, str, str]:
    """Split a key into formula, trailing form in brackets, and nothing or a charge."""
    if not key.endswith(")"):
        return key, "", ""
    depth = 0
    for i in range(len(key) - 1, -1, -1):
        depth += {")": 1, "(": -1}.get(key[i], 0)
        if depth == 0:
            # What begins with a capital may be part of the formula, as in Mg(OH) or Al(Cl).
            if i and not re.fullmatch(r"\((?:[A-Z][a-z]?\d*)+\)", key[i:]):
                return key[:i], key[i:], ""
            break
    return key, "", ""
