"""Typed text to a quantity and back; text that is none is kept as it stands."""

from __future__ import annotations

import re

from solver.project.model import Quantity
from solver.project.units import UnitError, parse_number, parse_quantity
from solver.project.wording import typed_number, unit_text

_HEAD = re.compile(r"^([-+−\d.,\s'eE×^·]*[\d.,])\s*(.*)$")


def read_quantity(text: str, kind: str, default_unit: str) -> Quantity:
    """The quantity that `text` says, or one that keeps the text for the solver to refuse.

    A number with an unknown unit, or below absolute zero, keeps number and unit apart, so that
    the refusal can name the faulty half.
    """
    try:
        return parse_quantity(text, kind, default_unit)
    except UnitError:
        pass
    head = _HEAD.match(text.strip())
    if head:
        try:
            return Quantity(value=parse_number(head[1]), unit=head[2] or default_unit)
        except UnitError:
            pass
    return Quantity(value=text.strip(), unit="")


def show_quantity(quantity: Quantity | None) -> str:
    """A quantity as a field shows it."""
    if quantity is None:
        return ""
    if isinstance(quantity.value, str):
        return quantity.value
    return f"{typed_number(quantity.value)} {unit_text(quantity.unit)}".strip()
