"""Extents of a reaction set from the change of amounts."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.reactions.independence import reaction_count
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

CLOSED = 1e-9
"""Share of all moles up to which a change may stay unexplained."""


@dataclass(frozen=True)
class Extents:
    """How far each reaction has gone.

    Attributes
    ----------
    values : tuple of float
        mol; of one reaction as it is written.
    unexplained : mapping of Species to float
        Change of amounts less what the reactions make of it, mol, where it is not rounding.
    residual : float
        The largest of these over all moles.
    missing : int
        How many more independent reactions the species allow.
    """

    values: tuple[float, ...]
    unexplained: Mapping[Species, float]
    residual: float
    missing: int

    @property
    def closed(self) -> bool:
        """Whether the set explains the whole change of amounts."""
        return self.residual <= CLOSED


def extents_of(
    reactions: Sequence[Reaction],
    feed: Mapping[Species, float],
    amounts: Mapping[Species, float],
    species: Sequence[Species] | None = None,
) -> Extents:
    """Extents that take the feed to the amounts, by least squares where they cannot quite.

    Parameters
    ----------
    reactions : sequence of Reaction
        Independent.
    feed, amounts : mapping of Species to float
        mol.
    species : sequence of Species, optional
        What `missing` counts over; all species of feed, amounts and reactions if left out.
    """
    listed = list(dict.fromkeys([*feed, *amounts, *(sp for r in reactions for sp in r.species)]))
    at = {sp: i for i, sp in enumerate(listed)}
    N = np.zeros((len(listed), len(reactions)))
    for j, reaction in enumerate(reactions):
        for sp, nu in reaction.terms:
            N[at[sp], j] = float(nu)
    change = np.array([amounts.get(sp, 0.0) - feed.get(sp, 0.0) for sp in listed])
    total = float(max(sum(amounts.values()), sum(feed.values()), 1e-300))
    values = np.zeros(len(reactions))
    if reactions:
        values = np.linalg.lstsq(N, change, rcond=None)[0]
        values += np.linalg.lstsq(N, change - N @ values, rcond=None)[0]  # to the last digits
        values[np.abs(values) < 1e-15 * total] = 0.0
    rest = change - N @ values
    counted = list(species) if species is not None else listed
    return Extents(
        values=tuple(float(x) for x in values),
        unexplained={
            sp: float(r) for sp, r in zip(listed, rest, strict=True) if abs(r) > 1e-13 * total
        },
        residual=float(np.abs(rest).max(initial=0.0)) / total,
        missing=reaction_count(counted) - len(reactions),
    )
