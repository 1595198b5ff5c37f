"""Whether a set of reactions is independent, and how many reactions a species list has."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from fractions import Fraction
from typing import TYPE_CHECKING

from solver.errors import InputError
from solver.reactions.balance import composition, null_vectors, number_text, rank
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species


def reaction_count(species: Sequence[Species]) -> int:
    """Number of independent reactions: species less the rank of their formula matrix."""
    return len(species) - rank([composition(sp) for sp in species])


def parse_set(
    texts: Iterable[str],
    species: Mapping[str, Species] | Iterable[Species],
    *,
    field: str = "reactions",
) -> tuple[Reaction, ...]:
    """Read a set of reactions and check its balance and independence.

    Parameters
    ----------
    texts : iterable of str
        One reaction each, as `Reaction.parse` reads it; empty ones are passed over.
    species : mapping of str to Species, or iterable of Species
        A library, or the species that may be named.
    field : str
        What an error calls the input; the place in the list is added.

    Raises
    ------
    InputError
        A reaction cannot be read, does not balance, or follows from the others.
    """
    known = species if isinstance(species, Mapping) else list(species)
    reactions, places = [], []
    for place, text in enumerate(texts):
        if text.strip():
            reactions.append(Reaction.parse(text, known, field=f"{field}[{place}]"))
            places.append(place)
    check_independent(reactions, field=field, places=places)
    return tuple(reactions)


def check_independent(
    reactions: Sequence[Reaction], *, field: str = "reactions", places: Sequence[int] = ()
) -> None:
    """Refuse a set in which a reaction follows from the others, and say how it does.

    Parameters
    ----------
    reactions : sequence of Reaction
    field : str
        What an error calls the input.
    places : sequence of int, optional
        Places of the reactions in the user's list, counted from 0.
    """
    vectors = [{sp.key: nu for sp, nu in reaction.terms} for reaction in reactions]
    ties = null_vectors(vectors)
    if not ties:
        return
    tie = ties[0]
    last = max(i for i, share in enumerate(tie) if share)
    where = list(places) or list(range(len(reactions)))
    parts = [
        (-share / tie[last], where[i] + 1) for i, share in enumerate(tie) if share and i != last
    ]
    raise InputError(
        f"Reaction {where[last] + 1} ({reactions[last].text}) follows from the others: "
        f"it is {_sum_text(parts)}; leave one of them out.",
        f"{field}[{where[last]}]",
        reactions[last].text,
        "reactions of which none follows from the others",
    )


def _sum_text(parts: Sequence[tuple[Fraction, int]]) -> str:
    out = ""
    for share, number in sorted(parts, key=lambda part: part[0] < 0):
        sign = " - " if share < 0 else " + "
        if not out:
            sign = "minus " if share < 0 else ""
        size = abs(share)
        times = "" if size == 1 else f"{number_text(size)} times "
        out += f"{sign}{times}reaction {number}"
    return out
