"""Restrictions and reactions as typed, turned into those of the solver.

Each fault carries the path of its field, such as ``restrictions[1].conversion``. Restrictions
that contradict each other, the feed or the candidates are laid at the later one.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np

from solver import restrictions as solver_side
from solver.errors import InputError
from solver.fixed import PAIRS, T_LOWEST, Fixed
from solver.posed import pose
from solver.project import units
from solver.project.case_names import CaseNames
from solver.project.model import (
    Case,
)
from solver.project.restriction_kinds import read_one
from solver.project.streams import Basis
from solver.project.wording import typeset
from solver.reactions import Reaction, check_independent

if TYPE_CHECKING:
    from species_db import Species


def read_restrictions(
    case: Case,
    names: CaseNames,
    feed: Mapping[Species, float],
    basis: Basis | None,
    faults: list[InputError],
) -> tuple[list[solver_side.Restriction], list[str]]:
    """The restrictions of a case and their paths; those with a fault are left out.

    Parameters
    ----------
    case
        As typed.
    names
        The names of its species; has the candidates.
    feed
        mol (or mol/s) of each species.
    basis
        Of the feed; None while the streams or candidates cannot be read, and then only what can
        be judged without them is.
    faults
        Gets what is wrong.
    """
    read: list[solver_side.Restriction] = []
    fields: list[str] = []
    for place, typed in enumerate(case.restrictions):
        field = f"restrictions[{place}]"
        before = len(faults)
        found = read_one(typed, names, feed, basis, field, faults)
        if found is not None and len(faults) == before:
            read.append(found)
            fields.append(field)
    if basis is None or faults:
        return read, fields
    return _consistent(read, fields, feed, names.candidates, faults)


def read_reactions(case: Case, names: CaseNames, faults: list[InputError]) -> tuple[Reaction, ...]:
    """The engineer's own reaction set, checked for balance and independence."""
    reactions: list[Reaction] = []
    places: list[int] = []
    before = len(faults)
    for place, text in enumerate(case.reactions):
        if not text.strip():
            continue
        try:
            reactions.append(Reaction.parse(text, names, field=f"reactions[{place}]"))
            places.append(place)
        except InputError as fault:
            faults.append(fault)
    if len(faults) == before:
        try:
            check_independent(reactions, places=places)
        except InputError as fault:
            faults.append(fault)
    return tuple(reactions) if len(faults) == before else ()


def check_approaches(
    restrictions: Sequence[solver_side.Restriction],
    fields: Sequence[str],
    fixed: Fixed,
    faults: list[InputError],
) -> None:
    """Where T is held, T + dT must be a temperature that there can be."""
    if "T" not in PAIRS[fixed.pair].variables:
        return
    for restriction, field in zip(restrictions, fields, strict=True):
        if isinstance(restriction, solver_side.HeldApproach):
            T = fixed.T + restriction.dT
            if T < T_LOWEST:
                faults.append(
                    InputError(
                        f"K of {restriction.reaction.text} would be taken at "
                        f"{units.quantity_text(T, 'K')}; hold it less far from T.",
                        f"{field}.dT",
                        restriction.dT,
                        f"T + dT of {T_LOWEST:g} K or more",
                    )
                )


def _consistent(
    read: Sequence[solver_side.Restriction],
    fields: Sequence[str],
    feed: Mapping[Species, float],
    candidates: Sequence[Species],
    faults: list[InputError],
) -> tuple[list[solver_side.Restriction], list[str]]:
    """Those that go with each other, taken in their order; a fault for each that does not."""
    fed, amounts = list(feed), np.array([list(feed.values())])
    kept: list[solver_side.Restriction] = []
    kept_fields: list[str] = []
    for restriction, field in zip(read, fields, strict=True):
        try:
            _check_follows(restriction, kept)
            pose(candidates, fed, amounts, (*kept, restriction))
        except InputError as fault:
            allowed = typeset(fault.allowed)
            faults.append(InputError(typeset(str(fault)), field, fault.value, allowed))
        else:
            kept.append(restriction)
            kept_fields.append(field)
    return kept, kept_fields


def _check_follows(
    restriction: solver_side.Restriction, kept: Sequence[solver_side.Restriction]
) -> None:
    """Refuse to hold a reaction that follows from those held already."""
    if not isinstance(restriction, solver_side.HeldApproach):
        return
    held = [r.reaction for r in kept if isinstance(r, solver_side.HeldApproach)]
    try:
        check_independent([*held, restriction.reaction])
    except InputError:
        text = restriction.reaction.text
        others = " and ".join(reaction.text for reaction in held)
        raise InputError(
            f"{text} is held, but it follows from what is held already ({others}); keep one.",
            "",
            text,
            "reactions of which none follows from the others",
        ) from None
