"""The ideal answer beside a real one: what the equation of state is worth in this case."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from solver.endstate import EndState
from solver.restrictions import Restriction
from solver.settle import settle

if TYPE_CHECKING:
    from species_db import Species

MAIN = 8
"""Species that are compared: those with the largest amounts in either answer."""


@dataclass(frozen=True)
class Beside:
    """A real and an ideal end state of the same feed and the same fixed values.

    Attributes
    ----------
    real, ideal : EndState
    main : tuple of str
        Keys of the species compared, the most abundant first. A pure liquid that the
        equation of state replaces is counted with the species that stands for it.
    """

    real: EndState
    ideal: EndState
    main: tuple[str, ...]

    def shares(self, key: str) -> tuple[float, float]:
        """Share of a species in all moles, real and ideal."""
        liquids = [k for k, gas in self.real.left_out.items() if gas == key]
        ideal = self.ideal.amounts[key] + sum(self.ideal.amounts[k] for k in liquids)
        return (
            self.real.amounts[key] / sum(self.real.amounts.values()),
            ideal / sum(self.ideal.amounts.values()),
        )


def beside_ideal(
    end: EndState,
    feed: Mapping[Species | str, float],
    restrictions: Sequence[Restriction] = (),
) -> Beside:
    """Settle the same case with ideal gases.

    Parameters
    ----------
    end : EndState
        With any gas model.
    feed : mapping of Species or str to float
        What it was computed from, mol.
    restrictions : sequence of Restriction
        Under which it was computed.

    Raises
    ------
    SettleError
        The ideal mixture has no end state at these fixed values.
    """
    ideal = settle(end.species, feed, end.fixed, restrictions=restrictions)
    counted = {sp.key: 0.0 for sp in end.species if sp.key not in end.left_out}
    for state in (end, ideal):
        total = sum(state.amounts.values())
        for key, amount in state.amounts.items():
            name = end.left_out.get(key, key)
            counted[name] = max(counted[name], amount / total)
    ranked = sorted((key for key in counted if counted[key] > 0.0), key=lambda k: -counted[k])
    return Beside(end, ideal, tuple(ranked[:MAIN]))
