"""Reactions as text: reading what an engineer writes, and writing what an engineer reads."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from fractions import Fraction
from typing import TYPE_CHECKING

from solver.errors import InputError
from solver.reactions.balance import CHARGE, balanced, composition, number_text, surplus

if TYPE_CHECKING:
    from species_db import Species

EXAMPLE = "a reaction such as CO + H2O = CO2 + H2"
_ARROW = re.compile(r"<=+>|<-+>|=+>|-+>|=+|[⇌⇄⇋⇆↔→⟶⟷]")
_NUMBER = r"(?:\d+\s*/\s*\d+|\d+(?:\.\d*)?(?:[eE][+-]?\d{1,2})?|\.\d+|\d+,\d+(?=\s))"
_TERM = re.compile(rf"^({_NUMBER})\s*(?:[*·×]\s*)?(?=[A-Za-z(]|\s)\s*(.+)$")
_VULGAR = {"½": "1/2", "⅓": "1/3", "⅔": "2/3", "¼": "1/4", "¾": "3/4", "⅕": "1/5", "⅛": "1/8"}
_RAISED = str.maketrans("₀₁₂₃₄₅₆₇₈₉⁺⁻−", "0123456789+--")
_LOWERED = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_ADDUCT = re.compile(r"(?<!\.\d)\.(?=\d+(?:\.\d+)?H2O|[A-Z])")
_LEAD = re.compile(r"(^|·)(\d+(?:\.\d+)?)")


def read_numbers(
    text: str, species: Mapping[str, Species] | Iterable[Species], field: str
) -> dict[Species, Fraction]:
    """Stoichiometric numbers (products positive) of a reaction written as text.

    Parameters
    ----------
    text : str
        Two sides with ``=``, ``->``, ``<=>`` or an arrow between them; numbers whole, decimal
        or as fractions.
    species : mapping of str to Species, or iterable of Species
        A library, or the species that may be named.
    field : str
        What to call the input in an error.

    Raises
    ------
    InputError
        No reaction, an unknown species, a number that is none, or no balance.
    """
    clean = text.translate(_RAISED)
    for glyph, meant in _VULGAR.items():
        clean = clean.replace(glyph, f" {meant} ")
    sides = _ARROW.split(clean)
    if len(sides) != 2:
        fault = "no sign between its two sides" if len(sides) < 2 else "more than two sides"
        raise InputError(
            f"The reaction {text!r} has {fault}; write {EXAMPLE}.", field, text, EXAMPLE
        )
    find = _Finder(species)
    numbers: dict[Species, Fraction] = {}
    for sign, side in zip((-1, 1), sides, strict=True):
        for term in _terms(side):
            sp, nu = _read_term(term, text, find, field)
            numbers[sp] = numbers.get(sp, Fraction(0)) + sign * nu
    named = list(numbers)
    numbers = {sp: nu for sp, nu in numbers.items() if nu}
    if not numbers:
        raise InputError(
            f"In the reaction {text!r} everything cancels; write {EXAMPLE}.", field, text, EXAMPLE
        )
    check_balance(numbers, field, text, named)
    return numbers


def check_balance(
    numbers: Mapping[Species, Fraction], field: str, text: str, named: Iterable[Species] = ()
) -> None:
    """Refuse stoichiometric numbers that do not keep every element and the charge."""
    off = surplus(numbers)
    if not off:
        return
    parts = []
    for name, value in off.items():
        side = "right" if value > 0 else "left"
        what = "units of charge" if name == CHARGE else name
        parts.append(f"{number_text(abs(value))} {what} too many on the {side}")
    repaired = balanced(list(named) or list(numbers))
    allowed = write(repaired) if repaired else "the same atoms and charge on both sides"
    hint = f"; it balances as {allowed}" if repaired else ""
    raise InputError(
        f"The reaction {text} does not balance: {' and '.join(parts)}{hint}.", field, text, allowed
    )


def _terms(side: str) -> list[str]:
    """Split a side at the plus signs that are neither a charge nor inside brackets."""
    terms, depth, start = [], 0, 0
    for at, sign in enumerate(side):
        depth += (sign in "([") - (sign in ")]")
        if sign != "+" or depth > 0:
            continue
        after = side[at + 1 :].lstrip()
        attached = at > 0 and not side[at - 1].isspace()
        if attached and (not after or after.startswith("+")):
            continue  # a charge, as in H3O+
        terms.append(side[start:at])
        start = at + 1
    return [*terms, side[start:]]


def _read_term(term: str, text: str, find: _Finder, field: str) -> tuple[Species, Fraction]:
    term = term.strip()
    if not term:
        raise InputError(
            f"The reaction {text!r} has an empty place where a species should be; write {EXAMPLE}.",
            field,
            text,
            EXAMPLE,
        )
    number, name = Fraction(1), term
    found = _TERM.match(term)
    if found:
        name = found[2].strip()
        try:
            number = Fraction(found[1].replace(" ", "").replace(",", "."))
        except (ValueError, ZeroDivisionError):
            number = Fraction(0)
    if number == 0 or re.match(r"\d+(\.\d+)?\s*[A-Z]", name) or name.startswith("-"):
        raise InputError(
            f"In the reaction {text!r} the number before a species in {term!r} is not one; "
            "give a number above zero such as 2, 0.5 or 1/2.",
            field,
            term,
            "a number above zero",
        )
    return find(name, text, field), number


class _Finder:
    """Looks a species up by what an engineer may call it."""

    def __init__(self, species: Mapping[str, Species] | Iterable[Species]) -> None:
        self._of_case = not isinstance(species, Mapping)
        self._known = species if isinstance(species, Mapping) else _by_any_name(species)

    def __call__(self, name: str, text: str, field: str) -> Species:
        try:
            if self._of_case and name not in self._known:
                return self._known[name.casefold()]
            return self._known[name]
        except KeyError as error:
            near = tuple(getattr(error, "near", ()))
        where = "the library"
        if self._of_case:
            where = "this case"
            near = tuple(dict.fromkeys(sp.key for sp in self._known.values()))[:12]
        hint = f"; near: {', '.join(near)}" if near else ""
        raise InputError(
            f"The reaction {text!r} names {name!r}, which is no species of {where}{hint}.",
            field,
            name,
            ", ".join(near) or f"a species of {where}",
        )


def _by_any_name(species: Iterable[Species]) -> dict[str, Species]:
    listed = list(species)
    names: dict[str, Species] = {}
    for sp in listed:
        for name in (sp.name, *sp.synonyms):
            names.setdefault(name.casefold(), sp)
    # a key outweighs a name, and a bare formula means the only species that has it
    for sp in listed:
        bare = re.sub(r"\([^()]*\)$", "", sp.key)
        if sum(composition(other) == composition(sp) for other in listed) == 1:
            names[bare] = sp
    return names | {sp.key: sp for sp in listed}


def write(numbers: Mapping[Species, Fraction], subscripts: bool = False) -> str:
    """A reaction as text, ``CH4 + H2O = CO + 3 H2``, in the order of the mapping."""
    values = [abs(nu) for nu in numbers.values()]
    decimals = any(v.denominator > 12 and (10**9) % v.denominator == 0 for v in values)

    def side(sign: int) -> str:
        terms = []
        for sp, nu in numbers.items():
            if nu * sign > 0:
                number = number_text(abs(nu), decimals)
                name = subscripted(sp.key) if subscripts else sp.key
                terms.append(name if number == "1" else f"{number} {name}")
        return " + ".join(terms)

    return f"{side(-1)} = {side(1)}"


def subscripted(key: str) -> str:
    """A species key with its atom counts lowered and its charge raised: ``CO₂``, ``H₃O⁺``.

    What stands in brackets at the end (state, isomer) stays as it is.
    """
    found = re.search(r"\((?:[^()]|\([^()]*\))*\)$", key)
    formula, suffix = (key[: found.start()], found.group()) if found else (key, "")
    charge = re.search(r"(?<=[A-Za-z0-9)])[+-]+\d*$", formula)
    raised = ""
    if charge:
        formula = formula[: charge.start()]
        raised = charge.group().translate(str.maketrans("+-0123456789", "⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    formula = _ADDUCT.sub("·", formula)
    lead: list[str] = []

    def keep(match: re.Match[str]) -> str:
        lead.append(match[2])
        return f"{match[1]}\0"

    formula = _LEAD.sub(keep, formula).translate(_LOWERED)
    for number in lead:
        formula = formula.replace("\0", number, 1)
    return formula + raised + suffix
