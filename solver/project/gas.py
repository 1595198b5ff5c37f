"""The gas model of a case: which one, the engineer's own k_ij, and those it uses besides."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import TYPE_CHECKING

from solver.errors import InputError
from solver.gas_model import GasModel
from solver.project import units
from solver.project.candidates import unknown_species
from solver.project.case_names import CaseNames
from solver.project.model import Case, Interaction
from species_db import UnknownSpecies

if TYPE_CHECKING:
    from solver.gas.interactions import Pair
    from species_db import Species

LARGEST_K = 1.0
"""Size of a k_ij past which the attraction of a pair changes its sign."""


def read_gas(case: Case, names: CaseNames, faults: list[InputError]) -> GasModel:
    """The gas model with the case's own k_ij; an ideal gas has none.

    Parameters
    ----------
    case
        As typed.
    names
        The names of its species; has the candidates.
    faults
        Gets what is wrong, each with the path of its field, such as ``interactions[1].k``.
    """
    if case.gas == "ideal" or not case.interactions:
        return GasModel(case.gas)
    modelled = modelled_keys(names.candidates)
    found: dict[frozenset[str], tuple[str, str, float]] = {}
    for place, typed in enumerate(case.interactions):
        field = f"interactions[{place}]"
        keys = [
            _species(text, names, modelled, f"{field}.{end}", faults)
            for end, text in (("a", typed.a), ("b", typed.b))
            if is_written(typed)
        ]
        if not keys:
            continue
        k = _number(typed, f"{field}.k", faults)
        a, b = keys
        if a is None or b is None:
            continue
        pair = frozenset((a, b))
        if a == b:
            faults.append(
                InputError(
                    f"{a} is paired with itself; a k_ij belongs to two different species.",
                    f"{field}.b",
                    typed.b,
                    "two different species",
                )
            )
        elif pair in found:
            faults.append(
                InputError(
                    f"The pair {a} and {b} is given twice; keep one of the two.",
                    f"{field}.a",
                    typed.a,
                    "each pair once",
                )
            )
        elif k is not None:
            found[pair] = (a, b, k)
    return GasModel(case.gas, tuple(found.values()))


def is_written(typed: Interaction) -> bool:
    """Whether anything stands in a row."""
    number = not isinstance(typed.k, str) or bool(typed.k.strip())
    return number or bool(typed.a.strip() or typed.b.strip())


def among(gas: GasModel, species: Iterable[Species]) -> GasModel:
    """The same model for a part of the species: pairs with any other left out."""
    keys = {sp.key for sp in species}
    kept = tuple(pair for pair in gas.interactions if keys >= {pair[0], pair[1]})
    return GasModel(gas.key, kept)


def modelled_keys(candidates: Iterable[Species]) -> frozenset[str]:
    """Keys of the gas candidates that an equation of state describes."""
    from solver.gas.constants import critical_constants

    gases = [sp for sp in candidates if sp.phase == "gas"]
    known = critical_constants(gases).modelled
    return frozenset(sp.key for sp, real in zip(gases, known, strict=True) if real)


def pairs_of(gas: GasModel, candidates: Iterable[Species]) -> tuple[Pair, ...]:
    """The k_ij in use among the candidates, in their order; every other is zero.

    Parameters
    ----------
    gas
        The model; with ``GasModel(key)`` the pairs are the published ones.
    candidates
        Species of any phase.
    """
    from solver.gas.interactions import pairs_in_use

    if gas.is_ideal:
        return ()
    listed = tuple(candidates)
    modelled = modelled_keys(listed)
    keys = [sp.key for sp in listed if sp.key in modelled]
    return pairs_in_use(keys, gas.key, gas.interactions)


def pairs_text(gas: GasModel, candidates: Iterable[Species]) -> str:
    """How many k_ij are in use, in words."""
    own = len(gas.interactions)
    published = len(pairs_of(gas, candidates)) - own
    parts = [f"{published} published k_ij"] if published > 0 else []
    parts += [f"{own} of your own"] if own else []
    if not parts:
        return "no k_ij is known for these pairs: all zero"
    return f"{' and '.join(parts)}, all others zero"


def _species(
    text: str,
    names: CaseNames,
    modelled: frozenset[str],
    field: str,
    faults: list[InputError],
) -> str | None:
    """The key of a species that may stand in a pair."""
    if not text.strip():
        faults.append(
            InputError(
                "This pair names one species only; write the key, name or formula of another gas.",
                field,
                "",
                "a key, a name or a formula",
            )
        )
        return None
    try:
        sp = names[text.strip()]
    except UnknownSpecies as error:
        faults.append(unknown_species(error, field))
        return None
    allowed = ", ".join(sorted(modelled)) or "no species of this case"
    if sp.phase != "gas":
        said = (
            f"{sp.key} is a {sp.phase} of its own; a k_ij belongs to gas species, which are in "
            "the liquid of the equation of state too. Write the gas."
        )
    elif sp.key not in {candidate.key for candidate in names.candidates}:
        said = f"{sp.key} is not among the candidates; let it form, or take the pair out."
    elif sp.key not in modelled:
        said = (
            f"{sp.key} has no usable critical constants and is taken as ideal in the mixture, so "
            "it has no k_ij; take the pair out."
        )
    else:
        return sp.key
    faults.append(InputError(said, field, text, allowed))
    return None


def _number(typed: Interaction, field: str, faults: list[InputError]) -> float | None:
    value = typed.k
    try:
        k = units.parse_number(value) if isinstance(value, str) else value
    except units.UnitError:
        text = f"{value!r} is not a number; write a k_ij such as 0.08."
        if not str(value).strip():
            text = "The k_ij of this pair is not said; write a number, 0 for none."
    else:
        if math.isfinite(k) and abs(k) <= LARGEST_K:
            return float(k)
        text = (
            f"A k_ij of {units.typed_number(k)} is out of range; write −1 to 1 (published values "
            "lie mostly between −0.2 and 0.6)."
        )
    faults.append(InputError(text, field, value, "-1 to 1"))
    return None
