"""The end state: what the mixture is after it has settled."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from solver.fixed import Fixed
from solver.proof import Proof

if TYPE_CHECKING:
    from species_db import Species

PRESENT = 1e-6
"""Share of all moles from which a species outside its data range is named."""


def _nothing() -> MappingProxyType[str, Any]:
    return MappingProxyType({})


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
    fluids : mapping of str to mapping of str to float
        With an equation of state: "gas", "liquid" and "second liquid", those that are present,
        each with the mol of every gas species in it; `amounts` holds their sums.
    left_out : mapping of str to str
        Pure liquids that the equation of state's own liquid stands for, to its species.
    taken_as_ideal : tuple of str
        Gas species that the equation of state does not hold.
    cautions : tuple of str
        Where the gas model is not good here.
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
    fluids: Mapping[str, Mapping[str, float]] = field(default_factory=_nothing)
    left_out: Mapping[str, str] = field(default_factory=_nothing)
    taken_as_ideal: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()

    @property
    def phases(self) -> dict[str, Mapping[str, float]]:
        """mol by species in each phase present: gas, fluid liquids, condensed species."""
        out: dict[str, Mapping[str, float]] = dict(self.fluids)
        if not out:
            gas = {sp.key: self.amounts[sp.key] for sp in self.species if sp.phase == "gas"}
            if sum(gas.values()) > 0.0:
                out["gas"] = gas
        for sp in self.species:
            if sp.phase != "gas" and self.amounts[sp.key] > 0.0:
                out[sp.key] = {sp.key: self.amounts[sp.key]}
        return out

    @property
    def phase_amounts(self) -> dict[str, float]:
        """mol in each phase that is present, in the order of `phases`."""
        return {name: sum(held.values()) for name, held in self.phases.items()}

    def fraction(self, key: str, phase: str | None = None) -> float:
        """Mole fraction of a candidate within its phase.

        Parameters
        ----------
        key : str
            A candidate.
        phase : str, optional
            One of `phases`. Without it the gas is meant, or where there is none the fluid
            liquid; a condensed species is its own phase: 1 where it is present, else 0.
        """
        amount = self.amounts[key]
        species = next(sp for sp in self.species if sp.key == key)
        if phase is None and species.phase != "gas":
            return 1.0 if amount > 0.0 else 0.0
        phases = self.phases
        if phase is None:
            phase = "gas" if "gas" in phases else next(iter(self.fluids), "gas")
        held = phases.get(phase, {})
        total = sum(held.values())
        return held.get(key, 0.0) / total if total > 0.0 else 0.0
