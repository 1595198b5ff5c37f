"""One restriction as typed, turned into that of the solver; one function for each kind."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

from solver import restrictions as solver_side
from solver.errors import InputError
from solver.project import units
from solver.project.candidates import unknown_species
from solver.project.case_names import CaseNames
from solver.project.model import (
    HeldApproach,
    HeldConversion,
    InertPart,
    Quantity,
    Restriction,
    SeparateGroup,
)
from solver.project.streams import Basis
from solver.reactions import Reaction
from species_db import UnknownSpecies

if TYPE_CHECKING:
    from species_db import Species

LARGEST_APPROACH = 1000.0
"""K, either way."""


def read_one(
    typed: Restriction,
    names: CaseNames,
    feed: Mapping[Species, float],
    basis: Basis | None,
    field: str,
    faults: list[InputError],
) -> solver_side.Restriction | None:
    """The solver's restriction, or None where nothing is written or something is wrong.

    Parameters
    ----------
    typed
        As it stands in the case.
    names
        The names of the case's species.
    feed
        mol (or mol/s) of each species.
    basis
        Of the feed; None while that cannot be read: what depends on it is then passed over.
    field
        Path of the restriction.
    faults
        Gets what is wrong.
    """
    match typed:
        case InertPart():
            return _inert(typed, names, feed, basis, field, faults)
        case HeldConversion():
            return _conversion(typed, names, field, faults)
        case HeldApproach():
            return _approach(typed, names, field, faults)
        case SeparateGroup():
            return _group(typed, names, field, faults)


def _inert(
    typed: InertPart,
    names: CaseNames,
    feed: Mapping[Species, float],
    basis: Basis | None,
    field: str,
    faults: list[InputError],
) -> solver_side.Restriction | None:
    part = typed.part if typed.part is not None and _written(typed.part) else None
    if not typed.species.strip() and part is None:
        return None
    sp = _species(typed.species, names, f"{field}.species", faults)
    if part is None:
        return None if sp is None else solver_side.Inert(sp.key)
    value = _number(part, "part", f"{field}.part", faults)
    if value is None:
        return None
    kind = units.unit_kind(part.unit, "part", f"{field}.part")
    if kind == "share":
        good = _check_share(value, part, "inert share", f"{field}.part", faults)
        return solver_side.Inert(sp.key, share=value) if good and sp is not None else None
    if value < 0:
        faults.append(
            InputError(
                f"The inert part is {_typed(part)}; it cannot be negative.",
                f"{field}.part",
                part.value,
                "0 or more",
            )
        )
        return None
    if sp is None or basis is None:
        return None
    return _amount(sp, value, kind, part, feed, basis, f"{field}.part", faults)


def _amount(
    sp: Species,
    value: float,
    kind: str,
    part: Quantity,
    feed: Mapping[Species, float],
    basis: Basis,
    field: str,
    faults: list[InputError],
) -> solver_side.Restriction | None:
    """An inert amount as a share of what is fed: the same words for a batch and for a flow."""
    by_mass = kind.startswith("mass")
    fed = feed.get(sp, 0.0) * (sp.molar_mass if by_mass else 1.0)
    if kind.endswith("_flow") != (basis == "flow"):
        feed_is, way, example = {
            "flow": ("a flow", "per time", "kmol/h"),
            "batch": ("a batch", "per batch", "mol"),
        }[basis]
        text = (
            f"The feed is {feed_is}, but the inert part of {_typed(part)} is not {way}; "
            f"write it in % or in {example}."
        )
        allowed = f"% or {example}"
    elif kind.startswith("normal_volume") and sp.phase != "gas":
        text = (
            f"{units.unit_text(part.unit)} counts gases; {sp.key} is a {sp.phase}. "
            "Give its inert part in %, kg or mol."
        )
        allowed = "%, or an amount in kg or mol"
    elif fed > 0.0 and value > fed * (1.0 + 1e-9):
        there = units.quantity_text(fed / units.find(part.unit, kind).factor, part.unit)
        text = f"{_typed(part)} of {sp.key} are to be inert, but only {there} are fed."
        allowed = f"0 to {there}"
    else:
        # What is not fed is refused by the solver, whatever the share.
        return solver_side.Inert(sp.key, share=min(value / fed, 1.0) if fed > 0.0 else None)
    faults.append(InputError(text, field, _typed(part), allowed))
    return None


def _conversion(
    typed: HeldConversion, names: CaseNames, field: str, faults: list[InputError]
) -> solver_side.Restriction | None:
    if not typed.species.strip() and not _written(typed.conversion):
        return None
    sp = _species(typed.species, names, f"{field}.species", faults)
    where = f"{field}.conversion"
    if not _written(typed.conversion):
        faults.append(
            InputError("The conversion is not said; write 0 to 100 %.", where, "", "0 to 100 %")
        )
        return None
    value = _number(typed.conversion, "share", where, faults)
    if value is None or not _check_share(value, typed.conversion, "conversion", where, faults):
        return None
    return None if sp is None else solver_side.FixedConversion(sp.key, value)


def _approach(
    typed: HeldApproach, names: CaseNames, field: str, faults: list[InputError]
) -> solver_side.Restriction | None:
    where = f"{field}.dT"
    dT = None
    if not typed.reaction.strip() and not _written(typed.dT):
        return None
    if not _written(typed.dT):
        faults.append(
            InputError(
                "The temperature approach is not said; write for example -10 K (K is taken at "
                "T - 10 K).",
                where,
                "",
                "a temperature difference",
            )
        )
    else:
        dT = _number(typed.dT, "temperature_difference", where, faults)
        if dT is not None and abs(dT) > LARGEST_APPROACH:
            most = units.quantity_text(
                units.from_si(LARGEST_APPROACH, typed.dT.unit, "temperature_difference"),
                typed.dT.unit,
            )
            faults.append(
                InputError(
                    f"A temperature approach of {_typed(typed.dT)} is out of range; write at most "
                    f"{most} either way.",
                    where,
                    typed.dT.value,
                    f"up to {most} either way",
                )
            )
            dT = None
    reaction = None
    if not typed.reaction.strip():
        faults.append(
            InputError(
                "Which reaction is held is not said; write one such as CH4 + H2O = CO + 3 H2.",
                f"{field}.reaction",
                "",
                "a reaction",
            )
        )
    else:
        try:
            reaction = Reaction.parse(typed.reaction, names, field=f"{field}.reaction")
        except InputError as fault:
            faults.append(fault)
    key = None
    if typed.key.strip():
        sp = _species(typed.key, names, f"{field}.key", faults)
        if sp is not None and reaction is not None and sp not in reaction.species:
            listed = ", ".join(member.key for member in reaction.species)
            faults.append(
                InputError(
                    f"{sp.key} is no species of {reaction.text}; name one of {listed}, or none.",
                    f"{field}.key",
                    typed.key,
                    listed,
                )
            )
        key = None if sp is None else sp.key
    return None if reaction is None or dT is None else solver_side.HeldApproach(reaction, dT, key)


def _group(
    typed: SeparateGroup, names: CaseNames, field: str, faults: list[InputError]
) -> solver_side.Restriction | None:
    found = [
        _species(text, names, f"{field}.species[{i}]", faults)
        for i, text in enumerate(typed.species)
        if text.strip()
    ]
    keys = [sp.key for sp in found if sp is not None]
    return solver_side.NoExchange(keys) if keys else None


def _species(text: str, names: CaseNames, field: str, faults: list[InputError]) -> Species | None:
    if not text.strip():
        faults.append(
            InputError(
                "This restriction names no species; write a key, a name or a formula.",
                field,
                "",
                "a key, a name or a formula",
            )
        )
        return None
    try:
        return names[text.strip()]
    except UnknownSpecies as error:
        faults.append(unknown_species(error, field))
        return None


def _number(quantity: Quantity, kind: str, field: str, faults: list[InputError]) -> float | None:
    try:
        return units.to_si(quantity, kind, field)
    except InputError as fault:
        faults.append(fault)
        return None


def _check_share(
    value: float, typed: Quantity, what: str, field: str, faults: list[InputError]
) -> bool:
    if 0.0 <= value <= 1.0:
        return True
    article = "An" if what[0] in "aeiou" else "A"
    faults.append(
        InputError(
            f"{article} {what} of {_typed(typed)} is out of range; write 0 to 100 %.",
            field,
            typed.value,
            "0 to 100 %",
        )
    )
    return False


def _written(quantity: Quantity) -> bool:
    return not isinstance(quantity.value, str) or bool(quantity.value.strip())


def _typed(quantity: Quantity) -> str:
    return f"{units.typed_number(quantity.value)} {units.unit_text(quantity.unit)}"
