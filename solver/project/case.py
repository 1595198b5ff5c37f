"""From a case as typed to an end state: units, streams, candidates, the fixed pair.

`prepare` reads a case and gathers every fault in it, each with the path of its field;
`settle_case` hands the result to the solver. The window, the command line and the sheet all
read the same `CaseAnswer`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from solver.errors import InputError
from solver.project.model import Case

if TYPE_CHECKING:
    from solver import EndState, Fixed
    from species_db import Library, Species

Basis = Literal["batch", "flow"]


class CaseFaults(InputError):
    """One or more faults in a case; field, value and allowed are those of the first.

    Attributes
    ----------
    faults : tuple of InputError
        Each with the path of its field, such as ``streams[0].amounts[2].species``.
    """

    def __init__(self, faults: tuple[InputError, ...]) -> None:
        first = faults[0]
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        super().__init__(f"{first}{more}", first.field, first.value, first.allowed)
        self.faults = faults

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (self.faults,)


@dataclass(frozen=True, slots=True)
class Fed:
    """What goes in, before anything has reacted; extensive values are a batch's or per second.

    T in K and p in Pa where all streams agree, else None; V in m3, H and U in J, S in J/K,
    mass in kg, amount in mol (per second on a flow basis).
    """

    T: float | None
    p: float | None
    V: float
    H: float
    U: float
    S: float
    mass: float
    amount: float


@dataclass(frozen=True, slots=True)
class Prepared:
    """A case in the solver's words.

    `feed` maps species to mol (mol/s on a flow basis), summed over the streams. `messages` are
    remarks that do not stop the answer.
    """

    feed: Mapping[Species, float]
    candidates: tuple[Species, ...]
    fixed: Fixed
    fed: Fed
    basis: Basis
    messages: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class CaseAnswer:
    """An end state with what the engineer wants beside it.

    `heat` is what crosses the wall: H_end - H_fed at fixed p, U_end - U_fed at fixed V;
    J on a batch basis, W on a flow basis, positive when taken up.
    """

    end: EndState
    fed: Fed
    heat: float
    basis: Basis
    prepared: Prepared
    messages: tuple[str, ...] = ()


def prepare(case: Case, library: Library | None = None) -> Prepared:
    """Read a case; raises `CaseFaults` with every fault found."""
    raise NotImplementedError


def settle_case(case: Case, library: Library | None = None) -> CaseAnswer:
    """Settle a case."""
    raise NotImplementedError
