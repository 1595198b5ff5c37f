"""Which species matter at an end state, and the readable reaction set among them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from solver.reactions.choose import readable_set
from solver.reactions.extents import extents_of
from solver.reactions.reaction import T_STANDARD, Reaction

if TYPE_CHECKING:
    from species_db import Species

MATTERS = 1e-6
"""Share of all moles from which a species counts among those that matter."""
MATTERS_TO_ELEMENT = 1e-3
"""Share of an element's atoms from which a species matters, however little there is."""

USED_UP = 1e-3
"""What is left of a fed species that counts as used up."""


def species_that_matter(
    amounts: Mapping[Species, float], feed: Mapping[Species, float], share: float = MATTERS
) -> tuple[Species, ...]:
    """Species that are fed, or hold enough of all moles or of one element's atoms."""
    total = sum(amounts.values())
    atoms: dict[str, float] = {}
    for sp, n in amounts.items():
        for element, count in sp.elements.items():
            atoms[element] = atoms.get(element, 0.0) + n * count

    def matters(sp: Species, n: float) -> bool:
        if feed.get(sp, 0.0) > 0.0:
            return True
        if n <= 0.0:
            return False
        return n >= share * total or any(
            n * count >= MATTERS_TO_ELEMENT * atoms[element]
            for element, count in sp.elements.items()
        )

    return tuple(sp for sp, n in amounts.items() if matters(sp, n))


def shares_of(
    amounts: Mapping[Species, float], fed: Mapping[Species, float]
) -> dict[Species, float]:
    """Shares at the end; what is used up counts with a hundredth of its share in the feed.

    So each species that is used up appears once, where it is used up, and not elsewhere; one
    that cannot be present at all (no candidate) even more so.
    """
    total = sum(amounts.values()) or 1.0
    total_fed = sum(fed.values()) or 1.0

    def share(sp: Species, n: float) -> float:
        gone = sp.phase == "gas" and n == 0.0
        return max(n / total, (1e-9 if gone else 0.01) * fed.get(sp, 0.0) / total_fed)

    return {sp: share(sp, n) for sp, n in amounts.items()}


def chosen_set(
    species: Sequence[Species], fed: Mapping[Species, float], amounts: Mapping[Species, float]
) -> tuple[Reaction, ...]:
    """A readable set, the main reaction first, each turned the way it has gone.

    One that has hardly gone is written so that it takes up heat.
    """
    used_up = {sp for sp, n in fed.items() if amounts[sp] < USED_UP * n}
    reactions = readable_set(species, shares_of(amounts, fed), used_up)
    extents = extents_of(reactions, fed, amounts, species).values
    total = sum(amounts.values())
    out = []
    changed = [
        abs(extent) * max(abs(float(nu)) for _, nu in reaction.terms)
        for reaction, extent in zip(reactions, extents, strict=True)
    ]
    for i in sorted(range(len(changed)), key=lambda i: -changed[i]):
        reaction, extent = reactions[i], extents[i]
        if abs(extent) <= 1e-14 * total:
            turn = reaction.dh(T_STANDARD) < 0.0
        else:
            turn = extent < 0.0
        out.append(_left_first(reaction.reversed if turn else reaction))
    return tuple(out)


def _left_first(reaction: Reaction) -> Reaction:
    return Reaction(tuple(sorted(reaction.terms, key=lambda term: term[1] > 0)))
