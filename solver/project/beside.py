"""Ideal beside real: the same case as typed, settled once more with an ideal gas."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from solver.beside import MAIN, Beside
from solver.project.case import CaseAnswer, settle_case
from solver.project.model import Case

if TYPE_CHECKING:
    from species_db import Library


@dataclass(frozen=True, slots=True)
class CaseBeside:
    """The real answer of a case, the ideal one, and the species worth comparing.

    Extensive values are those of a batch or per second. `main` are keys, the most abundant
    first; a pure liquid that the equation of state replaces is counted with its gas species.
    """

    real: CaseAnswer
    ideal: CaseAnswer
    main: tuple[str, ...]

    def shares(self, key: str) -> tuple[float, float, Literal["gas", "all"]]:
        """Mole fraction of a species, real and ideal, and what it is a fraction of.

        That is the gas where both answers have one and the species is one of it, else all moles.
        """
        both = (self.real.end, self.ideal.end)
        phase = next(sp.phase for sp in self.real.end.species if sp.key == key)
        if phase == "gas" and all("gas" in end.phase_amounts for end in both):
            return both[0].fraction(key, "gas"), both[1].fraction(key, "gas"), "gas"
        return *Beside(*both, self.main).shares(key), "all"

    @property
    def held_differs(self) -> bool:
        """Whether a value held as fed is another for the ideal feed."""
        return self.real.end.fixed.values != self.ideal.end.fixed.values

    def gas_shares(self) -> tuple[float, float]:
        """Share of the gas in all moles, real and ideal."""
        real, ideal = (
            found.end.phase_amounts.get("gas", 0.0) / sum(found.end.amounts.values())
            for found in (self.real, self.ideal)
        )
        return real, ideal


def settle_beside(case: Case, answer: CaseAnswer, library: Library | None = None) -> CaseBeside:
    """Settle a case as typed with an ideal gas, the state of its feed ideal too.

    Values held "as fed" are therefore those of the ideal feed: an ideal vessel has another volume
    and an ideal burner another enthalpy. Not part of settling, because it takes as long again.

    Parameters
    ----------
    case
        As typed.
    answer
        What `settle_case` made of it.
    library
        The built-in one if not given.

    Raises
    ------
    SettleError
        The ideal case has no end state, or none that could be proven.
    """
    ideal = settle_case(case.model_copy(update={"gas": "ideal", "interactions": ()}), library)
    most: dict[str, float] = {}
    for end in (answer.end, ideal.end):
        total = sum(end.amounts.values())
        for key, amount in end.amounts.items():
            name = answer.end.left_out.get(key, key)
            most[name] = max(most.get(name, 0.0), amount / total)
    ranked = sorted((key for key, share in most.items() if share > 0), key=lambda k: -most[k])
    return CaseBeside(answer, ideal, tuple(ranked[:MAIN]))
