"""Restrictions as they are typed: their kinds, and edits of a case as pure functions."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from gui.document import replaced
from solver.project.model import (
    Case,
    HeldApproach,
    HeldConversion,
    InertPart,
    Quantity,
    SeparateGroup,
)


@dataclass(frozen=True, slots=True)
class Kind:
    """How one kind is named and typed; `value` is the field of its value, "" for none."""

    name: str
    words: str
    about: str
    hint: str
    single: bool
    value: str = ""
    measure: str = ""
    unit: str = ""
    empty: str = ""
    value_hint: str = ""


KINDS = {
    k.name: k
    for k in (
        Kind(
            "inert",
            "inert",
            "species",
            "A fed species, or the part of it, that takes no part in any reaction",
            True,
            "part",
            "part",
            "%",
            "all of it",
            "The part that is inert: 30 %, 2 kmol/h; empty for all of it",
        ),
        Kind(
            "conversion",
            "conversion",
            "species",
            "A fed species of which a given share reacts, no more and no less",
            True,
            "conversion",
            "share",
            "%",
            "60 %",
            "The share of what is fed that reacts, 0 to 100 %",
        ),
        Kind(
            "approach",
            "approach",
            "CH4 + H2O = CO + 3 H2",
            "A reaction that stays away from equilibrium: its K is taken at T + this value",
            False,
            "dT",
            "temperature_difference",
            "K",
            "−10 K",
            "K is taken at T + this value: negative for an endothermic reaction that falls short, "
            "such as reforming, positive for an exothermic one",
        ),
        Kind(
            "no exchange",
            "no exchange",
            "N2, NH3",
            "Species, parted by commas, that exchange no element with the others",
            False,
        ),
    )
}
_CLASSES: dict[str, Any] = {
    "inert": InertPart,
    "conversion": HeldConversion,
    "approach": HeldApproach,
    "no exchange": SeparateGroup,
}


def added(case: Case) -> Case:
    """The case with one more, empty restriction."""
    return replaced(case, restrictions=(*case.restrictions, InertPart()))


def removed(case: Case, index: int) -> Case:
    """The case without one restriction."""
    kept = tuple(r for i, r in enumerate(case.restrictions) if i != index)
    return replaced(case, restrictions=kept)


def put(case: Case, index: int, restriction: Any) -> Case:
    """The case with another restriction in one place."""
    restrictions = list(case.restrictions)
    restrictions[index] = restriction
    return replaced(case, restrictions=tuple(restrictions))


def turned(restriction: Any, name: str) -> Any:
    """A restriction of another kind that keeps what it is about."""
    if restriction.kind == name:
        return restriction
    return with_about(_CLASSES[name](), about_text(restriction))


def about_text(restriction: Any) -> str:
    """The species or the reaction, as a line."""
    if restriction.kind == "approach":
        return str(restriction.reaction)
    if restriction.kind == "no exchange":
        return ", ".join(restriction.species)
    return str(restriction.species)


def read_about(name: str, text: str) -> str | tuple[str, ...]:
    """What a line says: one text, or the species of a group."""
    if name != "no exchange":
        return text.strip()
    return tuple(part.strip() for part in text.split(",") if part.strip())


def with_about(restriction: Any, text: str) -> Any:
    """The restriction about another species or reaction."""
    about = read_about(restriction.kind, text)
    name = "reaction" if restriction.kind == "approach" else "species"
    return replaced(restriction, **{name: about})


def with_key(restriction: Any, key: str) -> Any:
    """A held reaction whose shift is carried by `key`; "": the choice is left to the solver."""
    return replaced(restriction, key=key)


def carriers(reaction: str, candidates: Any) -> tuple[str, ...]:
    """Keys of the species of a reaction, any of which may carry its shift; () while unreadable."""
    import species_db
    from solver.errors import InputError
    from solver.project.case_names import CaseNames
    from solver.reactions import Reaction

    if not reaction.strip():
        return ()
    try:
        names = CaseNames(candidates, species_db.load())
        return tuple(sp.key for sp in Reaction.parse(reaction, names).species)
    except InputError:
        return ()


def with_value(restriction: Any, quantity: Quantity | None) -> Any:
    """The restriction with another value; None: nothing is said."""
    kind = KINDS[restriction.kind]
    if not kind.value:
        return restriction
    if quantity is None and kind.name != "inert":
        quantity = Quantity(value="", unit=kind.unit)
    return replaced(restriction, **{kind.value: quantity})
