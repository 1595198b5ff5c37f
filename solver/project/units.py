"""The one place where units meet numbers: text of the edges in, SI inside, text out.

Common units come from an exact table (`solver.project.unit_table`); others are looked up in
pint, which is loaded on the first such unit. Temperature and temperature difference, absolute
pressure and pressure difference, are different kinds.
"""

from __future__ import annotations

import math
import re
from difflib import get_close_matches
from functools import cache
from typing import Final

from solver.errors import InputError
from solver.project.model import Quantity
from solver.project.pint_units import unit_from_pint
from solver.project.unit_table import ATMOSPHERE, KINDS, NORMAL_MOLES, TABLE, UNIONS, Unit
from solver.project.wording import (
    formula_text,
    number_text,
    quantity_text,
    typed_number,
    unit_text,
)

__all__ = [
    "ATMOSPHERE",
    "NORMAL_MOLES",
    "UnitError",
    "formula_text",
    "from_si",
    "is_share",
    "number_text",
    "parse_number",
    "parse_quantity",
    "quantity_text",
    "si_unit",
    "to_si",
    "typed_number",
    "unit_kind",
    "unit_text",
    "units_of",
]


class UnitError(InputError):
    """A text that is no quantity of the kind asked for; the text says what would be."""


def parse_quantity(
    text: str, kind: str, default_unit: str | None = None, field: str = ""
) -> Quantity:
    """Read "25 degC", "5 barg" or "1,5 MW" as a quantity of `kind`.

    Parameters
    ----------
    text
        What was typed. A missing unit means `default_unit`, or the kind's own default.
    kind
        A kind of `unit_table.KINDS` or a union of `unit_table.UNIONS`.
    field
        Path of the field, carried by the error.

    Raises
    ------
    UnitError
        When it is no number, has an unknown unit or one of another kind, or lies at or below
        absolute zero or vacuum.
    """
    match = _NUMBER.match(text.strip())
    if match is None or text.strip()[match.end() :].lstrip()[:1].isdigit():
        raise UnitError(
            f"{text.strip()!r} is not a number with a unit; write for example "
            f"{_example(kind, default_unit)}."
            if text.strip()
            else f"Nothing is written; write for example {_example(kind, default_unit)}.",
            field=field,
            value=text,
            allowed=f"a number and a unit of {_words(kind)}",
        )
    value = parse_number(match.group(0), field)
    rest = text.strip()[match.end() :].strip()
    unit = canonical(rest, kind, field) if rest else (default_unit or default_unit_of(kind))
    quantity = Quantity(value=value, unit=unit)
    to_si(quantity, kind, field)
    return quantity


_DIGITS = r"\d[\d.,\u00a0\u2009\u202f']*(?: \d{3}(?!\d))*(?:[.,]\d*)?"
_NUMBER = re.compile(
    rf"[+\-\u2212]?\s*(?:{_DIGITS}|[.,]\d+)"
    r"(?:\s*[eE][+\-\u2212]?\d+|\s*[×x*·]\s*10(?:\^?[+\-\u2212]?\d+|[⁺⁻]?[⁰¹²³⁴⁵⁶⁷⁸⁹]+))?"
)
_SUPERSCRIPT: Final = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")


def parse_number(text: str, field: str = "") -> float:
    """Read a number with decimal point or comma, digit groups, or a power of ten.

    "1,5" is 1.5, "1 200" and "1,200,000" are grouped, "2 × 10⁻⁵" is 2e-5. "1,200" could be
    either and is refused.
    """
    plain = text.strip().replace("\u2212", "-")
    plain = re.sub(r"[\u00a0\u2009\u202f' ]+", " ", plain)
    plain = re.sub(r"\s*[×x*·]\s*10\^?", "e", plain).translate(_SUPERSCRIPT)
    mantissa, e, power = re.sub(r"\s+(?=[eE])", "", plain).lower().partition("e")
    sign = "-" if mantissa.startswith("-") else ""
    body = mantissa.lstrip("+-").strip()

    def refuse(reason: str) -> UnitError:
        return UnitError(
            f"{text.strip()!r} {reason}",
            field=field,
            value=text,
            allowed="a finite number such as 1200, 1.5 or 1.5e-3",
        )

    if " " in body:
        if not re.fullmatch(r"\d{1,3}( \d{3})+([.,]\d*)?", body):
            raise refuse("is not a number; digits are grouped by threes, as in 1 200.")
        body = body.replace(" ", "")
    commas, points = body.count(","), body.count(".")
    if commas and points:
        last = max(body.rfind(","), body.rfind("."))
        body = re.sub(r"[.,]", "", body[:last]) + "." + body[last + 1 :]
    elif commas == 1:
        if re.fullmatch(r"[1-9]\d{0,2},\d{3}", body):
            whole = body.replace(",", "")
            raise refuse(
                f"could be {whole} or {body.replace(',', '.')}; write one of these, "
                "with a point for the decimals."
            )
        body = body.replace(",", ".")
    elif commas > 1 or points > 1:
        if not re.fullmatch(r"\d{1,3}([.,]\d{3})+", body):
            raise refuse("is not a number.")
        body = re.sub(r"[.,]", "", body)
    try:
        value = float(f"{sign}{body}{e}{power}")
    except ValueError:
        raise refuse("is not a number.") from None
    if not math.isfinite(value):
        raise refuse("is too large for a number.")
    return value


def to_si(quantity: Quantity, kind: str, field: str = "") -> float:
    """Convert to the SI value of `kind` (gauge pressures become absolute).

    Raises
    ------
    UnitError
        For an unknown unit, a value that is no number, or one outside what the kind allows.
    """
    value = quantity.value
    if isinstance(value, str):
        value = parse_number(value, field) if value.strip() else _nothing(kind, field)
    unit = find(quantity.unit, kind, field)
    si = value * unit.factor + unit.offset
    if KINDS[unit.kind].positive and si <= 0.0:
        floor = from_si(0.0, unit.name, unit.kind)
        what = KINDS[unit.kind].words
        zero = {"temperature": "absolute zero", "pressure": "vacuum"}.get(unit.kind, "zero")
        raise UnitError(
            f"A {what} of {quantity_text(value, unit.name, 6)} is not above {zero}"
            + (f" ({quantity_text(floor, unit.name, 6)})." if floor else "."),
            field=field,
            value=quantity.value,
            allowed=f"above {quantity_text(floor, unit.name, 6)}",
        )
    return si


def from_si(value: float, unit: str, kind: str) -> float:
    """Express an SI value of `kind` in `unit`."""
    found = find(unit, kind)
    return (value - found.offset) / found.factor


def si_unit(kind: str) -> str:
    """The SI unit of a kind, as text."""
    return KINDS[kind].si


def default_unit_of(kind: str) -> str:
    """The unit of an empty field of this kind."""
    return KINDS[UNIONS.get(kind, (kind,))[0]].default


def units_of(kind: str) -> tuple[str, ...]:
    """The tabled units of a kind, or of each kind of a union, for menus and completion."""
    return tuple(dict.fromkeys(u.name for u in TABLE if u.kind in UNIONS.get(kind, (kind,))))


def unit_kind(unit: str, kind: str, field: str = "") -> str:
    """Which kind of a union a unit belongs to: "kg/h" in "feed" is "mass_flow"."""
    return find(unit, kind, field).kind


def canonical(unit: str, kind: str, field: str = "") -> str:
    """The table's spelling of a unit ("°C" gives "degC"); pint's units stay as typed."""
    return find(unit, kind, field).name


def is_share(unit: str) -> bool:
    """Whether a unit says a share of a stream's total."""
    return any(unit in (u.name, *u.also) for u in TABLE if u.kind.endswith("_share"))


@cache
def _spellings(kind: str) -> dict[str, Unit]:
    table: dict[str, Unit] = {}
    for unit in TABLE:
        if unit.kind in UNIONS.get(kind, (kind,)):
            for spelling in (unit.name, *unit.also):
                table.setdefault(_squeeze(spelling), unit)
    return table


def _squeeze(unit: str) -> str:
    return re.sub(r"\s+", "", unit).replace("³", "3").replace("^3", "3").replace("**3", "3")


def find(unit: str, kind: str, field: str = "") -> Unit:
    """The unit of a spelling, from the table or from pint.

    Raises
    ------
    UnitError
        Naming units that are near, when it is unknown or of another kind.
    """
    known = _spellings(kind)
    squeezed = _squeeze(unit)
    if squeezed in known:
        return known[squeezed]
    other = next((u for u in TABLE if squeezed in map(_squeeze, (u.name, *u.also))), None)
    if other is None:
        found = unit_from_pint(unit, kind)
        if isinstance(found, Unit):
            return found
        why = found
    else:
        why = f"is a unit of {KINDS[other.kind].words}"
    # Of another kind on purpose: what is spelled alike would only mislead.
    near = _near(squeezed, kind) if other is None or squeezed == "%" else _usual(kind)
    raise UnitError(
        f"The unit {unit.strip()!r} {why}; {_words(kind)} is written in "
        + ", ".join(near[:-1])
        + (" or " if len(near) > 1 else "")
        + f"{near[-1]}.",
        field=field,
        value=unit,
        allowed=", ".join(units_of(kind)),
    )


def _near(squeezed: str, kind: str) -> list[str]:
    """Units of a kind most like a wrong one, else the usual ones."""
    known = _spellings(kind)
    folded = {spelling.lower(): u.name for spelling, u in known.items()}
    close = [s for s in folded if squeezed == "%" and s.endswith("%") and len(s) > 1]
    close += get_close_matches(squeezed.lower(), folded, n=4, cutoff=0.5)
    names = list(dict.fromkeys(folded[c] for c in close))
    return names[:5] or _usual(kind)


def _usual(kind: str) -> list[str]:
    """Up to five units of a kind, one of each kind of a union first."""
    usual = [KINDS[k].default for k in UNIONS.get(kind, (kind,))]
    return list(dict.fromkeys([*usual, *units_of(kind)]))[:5]


def _words(kind: str) -> str:
    return {
        "feed": "an amount, a flow or a share",
        "total": "an amount or a flow",
        "part": "a share or an amount",
        "heat": "heat or heat flow",
        "vessel": "a volume",
        "disorder": "an entropy",
    }.get(kind) or ("an " if KINDS[kind].words[0] in "aeiou" else "a ") + KINDS[kind].words


def _example(kind: str, default_unit: str | None) -> str:
    number = 25 if kind.startswith("temperature") else 1.5
    return f"{number} {unit_text(default_unit or default_unit_of(kind))}"


def _nothing(kind: str, field: str) -> float:
    raise UnitError(
        f"Nothing is written; write for example {_example(kind, None)}.",
        field=field,
        value="",
        allowed=f"a number and a unit of {_words(kind)}",
    )
