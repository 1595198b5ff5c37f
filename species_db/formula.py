"""Formula text to element counts: the forgiving half of look-up."""

import re
from functools import lru_cache

from species_db.elements import ATOMIC_MASS

_TOKEN = re.compile(r"([A-Z][a-z]?)|(\()|(\))|(\d+(?:\.\d+)?)")
_CHARGE = re.compile(r"(\d*[+-]|[+-]\d+|[+]+|[-]+)$")
_STATE = re.compile(r"\((g|gas|l|liq|liquid|s|sol|solid|c|cr)\)$", re.IGNORECASE)
_ADDUCT = re.compile(r"[·*]|\.(?=[A-Z])|(?<!\.\d)\.(?=\d+(?:\.\d+)?H2O)")
"""A dot before a unit of its own: ``CaO.SiO2``, ``CaSO4.2H2O``, but not the one in ``Fe0.947O``."""
_PHASE = {"g": "gas", "l": "liquid", "s": "solid", "c": "solid"}

Composition = tuple[tuple[str, float], ...]


def split_state(text: str) -> tuple[str, str | None]:
    """Split a trailing state of aggregation off a formula: ``"H2O(l)" -> ("H2O", "liquid")``."""
    found = _STATE.search(text)
    if not found:
        return text, None
    return text[: found.start()], _PHASE[found.group(1)[0].lower()]


@lru_cache(maxsize=4096)
def parse_formula(text: str) -> tuple[Composition, int] | None:
    """Read a chemical formula.

    Parameters
    ----------
    text : str
        For example ``"Ca(OH)2"``, ``"CaSO4.2H2O"``, ``"Fe0.947O"``, ``"NH4+"``. Case matters:
        ``"CO"`` is not ``"Co"``.

    Returns
    -------
    tuple of (composition, charge) or None
        The composition is a tuple of (symbol, count) sorted by symbol. None if the text is no
        formula.
    """
    text = text.strip()
    charge = 0
    found = _CHARGE.search(text)
    if found and text != found.group():
        sign = found.group()
        digits = re.sub(r"[+-]", "", sign)
        if digits and not sign.startswith(("+", "-")):  # "SO4-2" is a charge, "H3+" counts atoms
            sign, digits = sign[-1], ""
        size = int(digits) if digits else sign.count(sign[-1])
        charge = size if "+" in sign else -size
        text = text[: found.end() - len(sign)]
    total: dict[str, float] = {}
    for part in _ADDUCT.split(text):
        lead = re.match(r"\d+(?:\.\d+)?", part)
        factor = float(lead.group()) if lead else 1.0
        counts = _counts(part[lead.end() :] if lead else part)
        if counts is None:
            return None
        for symbol, count in counts.items():
            total[symbol] = total.get(symbol, 0.0) + factor * count
    if not total:
        return None
    return tuple(sorted(total.items())), charge


def _counts(text: str) -> dict[str, float] | None:
    """Element counts of one formula part without a leading factor, or None."""
    stack: list[dict[str, float]] = [{}]
    last: dict[str, float] | None = None
    at = 0
    for token in _TOKEN.finditer(text):
        if token.start() != at:
            return None
        at = token.end()
        symbol, opened, closed, number = token.groups()
        if number and last is None:
            return None
        if last is not None:
            factor = float(number) if number else 1.0
            for name, count in last.items():
                stack[-1][name] = stack[-1].get(name, 0.0) + factor * count
            last = None
        if symbol:
            if symbol not in ATOMIC_MASS:
                return None
            last = {symbol: 1.0}
        elif opened:
            stack.append({})
        elif closed:
            if len(stack) == 1:
                return None
            last = stack.pop()
    if at != len(text) or len(stack) != 1:
        return None
    for name, count in (last or {}).items():
        stack[0][name] = stack[0].get(name, 0.0) + count
    return stack[0] or None
