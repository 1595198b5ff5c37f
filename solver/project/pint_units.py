"""Units that the table does not hold, looked up in pint, which is loaded on the first of them."""

from __future__ import annotations

import math
import re
from functools import cache
from typing import TYPE_CHECKING, Any, Final

from solver.project.unit_table import KINDS, UNIONS, Unit

if TYPE_CHECKING:
    import pint

_PINT_UNIT: Final = {
    "temperature_difference": "delta_degC",
    "volume": "m**3",
    "volume_flow": "m**3/s",
    "normal_volume": None,
    "normal_volume_flow": None,
    "amount_share": None,
    "mass_share": None,
    "share": None,
    "temperature": None,
}


_NAMED: Final = r"[A-Za-zµμ°]+(?:_[A-Za-z]+)?(?:\^-?\d|\*\*-?\d|\d)?"


@cache
def _registry() -> pint.UnitRegistry[Any]:
    import pint

    return pint.UnitRegistry(autoconvert_offset_to_baseunit=False)


@cache
def unit_from_pint(unit: str, kind: str) -> Unit | str:
    """The unit as pint knows it, or in words why it is none of this kind."""
    import pint

    # Only products and quotients of named units with one-digit powers: pint evaluates the text,
    # and a tower of powers would keep it busy for ever.
    if len(unit) > 40 or not re.fullmatch(rf"\s*\(?{_NAMED}([\s*·/]+\(?{_NAMED}\)?)*\s*", unit):
        return "is not known"
    registry = _registry()
    try:
        parsed = registry.parse_units(
            re.sub(r"(?<=[A-Za-z])(?=\d)", "**", unit.strip()).replace("·", "*")
        )
    except Exception:  # pint's parser raises its own errors and Python's (tokenizer, zero division)
        return "is not known"
    for one in UNIONS.get(kind, (kind,)):
        target = _PINT_UNIT.get(one, KINDS[one].si)
        if target is None:
            continue
        try:
            # A ratio keeps powers, offsets and logarithms out: those are no plain factors.
            factor = float(registry.Quantity(1.0, parsed).to(target).magnitude)
            twice = float(registry.Quantity(2.0, parsed).to(target).magnitude)
        except (pint.PintError, TypeError, ValueError, ArithmeticError):
            continue
        if math.isfinite(factor) and factor > 0 and math.isclose(twice, 2 * factor):
            return Unit(unit.strip(), one, factor)
    return "is of another kind"
