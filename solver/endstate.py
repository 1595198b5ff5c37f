"""The end state: what the mixture is after it has settled."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from solver.fixed import Fixed
from solver.proof import Proof

if TYPE_CHECKING:
    from species_db import Species

PRESENT = 1e-6
"""Share of all moles from which a species outside its data range is named."""


@dataclass(frozen=True)
class EndState:
    """Where a mixture ends up; SI.

    Attributes
    ----------
    T, p, V : float
        K, Pa, m3.
    H, U, S, G : float
        J, J, J/K, J; enthalpies of formation included.
    amounts : mapping of str to float
        mol of every candidate by key, none negative.
    species : tuple of Species
        The candidates, in the order given.
    fixed : Fixed
        What was held.
    gas : str
        The gas model.
    proof : Proof
    outside_range : tuple of str
        Species present whose data do not reach to this temperature.
    """

    T: float
    p: float
    V: float
    H: float
    U: float
    S: float
    G: float
    amounts: Mapping[str, float]
    species: tuple[Species, ...]
    fixed: Fixed
    gas: str
    proof: Proof
    outside_range: tuple[str, ...] = ()

    @property
    def phase_amounts(self) -> dict[str, float]:
        """mol in the gas, then in each condensed species that is present."""
        out: dict[str, float] = {}
        gas = [self.amounts[sp.key] for sp in self.species if sp.phase == "gas"]
        if sum(gas) > 0.0:
            out["gas"] = sum(gas)
        for sp in self.species:
            if sp.phase != "gas" and self.amounts[sp.key] > 0.0:
                out[sp.key] = self.amounts[sp.key]
        return out

    def fraction(self, key: str) -> float:
        """Mole fraction of a candidate within its phase.

        A condensed species is its own phase: 1 where it is present, else 0.
        """
        amount = self.amounts[key]
        species = next(sp for sp in self.species if sp.key == key)
        if species.phase != "gas":
            return 1.0 if amount > 0.0 else 0.0
        total = self.phase_amounts.get("gas", 0.0)
        return amount / total if total > 0.0 else 0.0
