"""What the solver says about its own arguments, said about the fields of a case."""

from __future__ import annotations

from typing import TYPE_CHECKING

from solver.errors import InputError, NoEndState, NotProven, SettleError
from solver.fixed import PAIRS, T_HIGHEST, T_LOWEST
from solver.project import units
from solver.project.wording import typeset
from solver.settle import settle

if TYPE_CHECKING:
    from solver.project.case import Prepared
    from solver.restrictions import Restriction

_PLACES = {"species": "candidates", "feed": "streams"}


def in_terms_of_case(prepared: Prepared, error: SettleError) -> SettleError:
    """The same error with the path of its field in the case, and its numbers typeset."""
    if isinstance(error, NoEndState):
        return _out_of_reach(prepared, error)
    text, allowed = typeset(str(error)), typeset(error.allowed)
    if not isinstance(error, InputError):
        return NotProven(text, error.field, error.value, allowed)
    place = _PLACES.get(error.field.partition("[")[0], error.field)
    if error.field == "species" and prepared.restrictions:
        place = _restriction_at_fault(prepared) or place
    return InputError(text, place, error.value, allowed)


def _out_of_reach(prepared: Prepared, error: NoEndState) -> NoEndState:
    """No temperature has the energy or entropy held: say so in terms of the case."""
    flow = prepared.basis == "flow"
    variable = PAIRS[prepared.fixed.pair].variables[0]
    words = {"H": "enthalpy", "U": "internal energy", "S": "entropy"}
    if variable not in words:
        return error
    word = words[variable]
    unit = "kW" if flow else "kJ"
    heat = prepared.heat
    if heat:
        size = units.quantity_text(abs(heat) / 1e3, unit)
        if heat < 0:
            text = (
                f"Taking away {size} leaves less {word} than any end state above {T_LOWEST:g} K "
                "has; take away less heat."
            )
        else:
            text = (
                f"Adding {size} gives more {word} than any end state below {T_HIGHEST:g} K has; "
                "add less heat."
            )
        return NoEndState(text, "fixed.heat", heat, typeset(error.allowed))
    if variable == "S":
        unit += "/K"
    value = getattr(prepared.fixed, variable)
    size = units.quantity_text(value / 1e3, unit)
    if f"above {T_LOWEST:g}" in str(error):
        text = f"No end state above {T_LOWEST:g} K has so little {word} ({size}); raise {variable}."
    else:
        text = f"No end state below {T_HIGHEST:g} K has so much {word} ({size}); lower {variable}."
    return NoEndState(text, f"fixed.{variable}", value, typeset(error.allowed))


def _restriction_at_fault(prepared: Prepared) -> str | None:
    """The last restriction without which the case settles; all of them where it takes more."""
    every = prepared.restrictions
    for i in reversed(range(len(every))):
        if _settles(prepared, every[:i] + every[i + 1 :]):
            return prepared.restriction_fields[i]
    return "restrictions" if len(every) > 1 and _settles(prepared, ()) else None


def _settles(prepared: Prepared, restrictions: tuple[Restriction, ...]) -> bool:
    try:
        settle(
            prepared.candidates,
            dict(prepared.feed.items()),
            prepared.fixed,
            gas=prepared.gas,
            restrictions=restrictions,
        )
    except SettleError:
        return False
    return True
