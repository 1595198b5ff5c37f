"""From a case as typed to an end state: units, streams, candidates, the fixed pair.

`prepare` reads a case and gathers every fault in it, each with the path of its field;
`settle_case` hands the result to the solver. The window, the command line and the sheet all
read the same `CaseAnswer`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Literal

import species_db
from solver.endstate import EndState
from solver.errors import InputError, NotProven, SettleError
from solver.fed import Fed, as_fed
from solver.fixed import PAIRS, Fixed
from solver.gas_model import GasModel
from solver.project import units
from solver.project.candidates import choose
from solver.project.case_names import CaseNames
from solver.project.gas import among, is_written, read_gas
from solver.project.held import check_fixed, read_fixed
from solver.project.model import Case
from solver.project.restrictions import (
    check_approaches,
    read_reactions,
    read_restrictions,
)
from solver.project.reworded import in_terms_of_case
from solver.project.streams import Basis, ReadStream, read_stream
from solver.project.wording import typeset
from solver.reactions import Reaction, ReactionsView, reactions_at
from solver.restrictions import Restriction
from solver.settle import settle

if TYPE_CHECKING:
    from species_db import Library, Species


class CaseFaults(InputError):
    """One or more faults in a case; field, value and allowed are those of the first.

    Attributes
    ----------
    faults : tuple of InputError
        Each with the path of its field, such as ``streams[0].amounts[2].species``.
    """

    def __init__(self, faults: Sequence[InputError]) -> None:
        first = faults[0]
        super().__init__(str(first), first.field, first.value, first.allowed)
        self.faults = tuple(faults)

    def __reduce__(self) -> tuple[type, tuple[object, ...]]:
        return type(self), (self.faults,)


@dataclass(frozen=True, slots=True)
class FedTotals:
    """What goes in, before anything has reacted; extensive values are a batch's or per second.

    T in K and p in Pa where all streams agree, else None; V in m3, H and U in J, S in J/K,
    mass in kg, amount in mol (on a flow basis m3/s, W, W/K, kg/s, mol/s).
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

    `feed` maps species to mol (mol/s on a flow basis), summed over the streams. `heat` is what
    is added, J or W. `gas` is the gas model with the engineer's own k_ij. `restrictions` are those
    of the solver, `restriction_fields` their paths in the case; `reactions` is the engineer's own
    set, empty where one is to be chosen. `messages` are remarks that do not stop the answer.
    """

    feed: Mapping[Species, float]
    candidates: tuple[Species, ...]
    fixed: Fixed
    fed: FedTotals
    basis: Basis
    gas: GasModel
    heat: float = 0.0
    messages: tuple[str, ...] = ()
    restrictions: tuple[Restriction, ...] = ()
    restriction_fields: tuple[str, ...] = ()
    reactions: tuple[Reaction, ...] = ()


@dataclass(frozen=True, slots=True)
class CaseAnswer:
    """An end state with what the engineer wants beside it.

    `heat` is H_end - H_fed at fixed p and U_end - U_fed at fixed V: what crosses the wall, in J
    on a batch basis and in W on a flow basis, positive when taken up. `heat_is` says whether that
    is heat: with S held as fed no heat flows, and the figure is the reversible work put in.
    """

    end: EndState
    fed: FedTotals
    heat: float
    basis: Basis
    prepared: Prepared
    messages: tuple[str, ...] = ()

    @property
    def heat_is(self) -> Literal["heat", "work", "heat and work"]:
        """What `heat` is: heat; with S held work, or both where S is not that of the feed."""
        fixed = self.end.fixed
        if PAIRS[fixed.pair].variables[0] != "S":
            return "heat"
        as_fed = math.isclose(fixed.S, self.fed.S, rel_tol=1e-9)
        return "work" if as_fed else "heat and work"


def prepare(case: Case, library: Library | None = None) -> Prepared:
    """Read a case.

    Parameters
    ----------
    case
        As typed.
    library
        The built-in one if not given.

    Raises
    ------
    CaseFaults
        With every fault found.
    NotProven
        The phases of a stream as it enters were not found.
    """
    library = species_db.load() if library is None else library
    faults: list[InputError] = []
    streams = _streams(case, library, faults)
    feed: dict[Species, float] = {}
    for stream in streams:
        for sp, n in stream.feed.items():
            feed[sp] = feed.get(sp, 0.0) + n
    if not faults and not feed:
        faults.append(
            InputError(
                "Nothing is fed: all amounts are zero; give at least one above zero.",
                "streams[0].amounts",
                0.0,
                "an amount above zero",
            )
        )
    charge = sum(sp.charge * n for sp, n in feed.items())
    if abs(charge) > 1e-9 * sum(feed.values()):
        ions = ", ".join(sp.key for sp in feed if sp.charge)
        faults.append(
            InputError(
                f"The feed carries a net electric charge ({ions}); feed ions only together with "
                "those of the other sign.",
                "streams",
                charge,
                "no net charge",
            )
        )
    # Candidates are looked at even beside other faults: their own texts may be wrong too.
    candidates, more = choose(case.candidates, tuple(feed), library)
    if faults:
        more = [fault for fault in more if "[" in fault.field]
    faults += more
    basis = streams[0].basis if not faults else None
    names = CaseNames(candidates, library)
    gas = read_gas(case, names, faults)
    restrictions, fields = read_restrictions(case, names, feed, basis, faults)
    reactions = read_reactions(case, names, faults)
    if faults or basis is None:
        check_fixed(case, faults)
        raise CaseFaults(faults)
    live = [stream for stream in streams if stream.feed]
    fed = _totals(live, gas)
    fixed, heat, notes = read_fixed(case, fed, basis, faults)
    if fixed is not None:
        check_approaches(restrictions, fields, fixed, faults)
    if faults or fixed is None:
        raise CaseFaults(faults)
    messages = [m for stream in streams for m in stream.messages]
    messages += [m for stream in live for m in _feed_out_of_range(stream)]
    if gas.is_ideal and any(is_written(typed) for typed in case.interactions):
        notes.append("The gas is ideal: the k_ij of the case are not used.")
    return Prepared(
        MappingProxyType(feed),
        candidates,
        fixed,
        fed,
        basis,
        gas,
        heat,
        (*messages, *notes, *names.remarks),
        tuple(restrictions),
        tuple(fields),
        reactions,
    )


def settle_case(case: Case, library: Library | None = None) -> CaseAnswer:
    """Settle a case.

    Raises
    ------
    CaseFaults
        The case as typed cannot be read.
    SettleError
        Whatever the solver has to say: no end state, or none that could be proven.
    """
    return settle_prepared(prepare(case, library))


def settle_prepared(prepared: Prepared) -> CaseAnswer:
    """Settle what `prepare` made; the slow half, free of texts."""
    fixed = prepared.fixed
    try:
        end = settle(
            prepared.candidates,
            dict(prepared.feed.items()),
            fixed,
            gas=prepared.gas,
            restrictions=prepared.restrictions,
        )
    except SettleError as error:
        raise in_terms_of_case(prepared, error) from None
    fed = prepared.fed
    at_volume = PAIRS[fixed.pair].holds_volume
    heat = end.U - fed.U if at_volume else end.H - fed.H
    messages = (*prepared.messages, *_end_out_of_range(end), *_fed_as_pure(prepared, end))
    return CaseAnswer(end, fed, heat, prepared.basis, prepared, messages)


def reactions_of(answer: CaseAnswer) -> ReactionsView:
    """The reactions behind an answer: the engineer's own set, or a readable one.

    Extents are in mol, on a flow basis in mol/s. Not part of settling, because it takes longer
    than a keystroke should.

    Raises
    ------
    InputError
        The end state was computed with a gas model that reactions are not made for.
    """
    prepared = answer.prepared
    feed: dict[Species | str, float] = dict(prepared.feed.items())
    return reactions_at(answer.end, feed, prepared.reactions or None)


def _streams(case: Case, library: Library, faults: list[InputError]) -> list[ReadStream]:
    if not case.streams:
        faults.append(
            InputError(
                "No stream goes in; add one with at least one species.",
                "streams",
                (),
                "one or more streams",
            )
        )
    read = [
        read_stream(stream, library, f"streams[{i}]", faults)
        for i, stream in enumerate(case.streams)
    ]
    streams = [stream for stream in read if stream is not None]
    for i, stream in enumerate(read):
        if stream is not None and stream.basis != streams[0].basis:
            words = {"batch": "an amount", "flow": "a flow"}
            faults.append(
                InputError(
                    f"The stream {stream.name!r} is {words[stream.basis]}, the stream "
                    f"{streams[0].name!r} {words[streams[0].basis]}; "
                    "write all of them per time, or none.",
                    f"streams[{i}].amounts",
                    stream.basis,
                    streams[0].basis,
                )
            )
    return streams


def _totals(streams: Sequence[ReadStream], gas: GasModel) -> FedTotals:
    """Sums over the streams, each at its own temperature and pressure."""
    states = [_fed(stream, gas) for stream in streams]
    return FedTotals(
        T=_common([stream.T for stream in streams]),
        p=_common([stream.p for stream in streams]),
        V=sum(state.V for state in states),
        H=sum(state.H for state in states),
        U=sum(state.U for state in states),
        S=sum(state.S for state in states),
        mass=sum(n * sp.molar_mass for stream in streams for sp, n in stream.feed.items()),
        amount=sum(n for stream in streams for n in stream.feed.values()),
    )


def _fed(stream: ReadStream, gas: GasModel) -> Fed:
    try:
        return as_fed(stream.feed, stream.T, stream.p, gas=among(gas, stream.feed))
    except SettleError as error:
        text, allowed = typeset(f"Stream {stream.name!r}: {error}"), typeset(error.allowed)
        if isinstance(error, InputError):
            fault = InputError(text, "streams", error.value, allowed)
            raise CaseFaults([fault]) from None
        raise NotProven(text, "streams", error.value, allowed) from None


def _common(values: Sequence[float]) -> float | None:
    """The value on which all agree but for the rounding of a change of unit."""
    same = all(math.isclose(value, values[0], rel_tol=1e-12) for value in values)
    return values[0] if same else None


def _feed_out_of_range(stream: ReadStream) -> list[str]:
    beyond = [sp for sp in stream.feed if not sp.T_min <= stream.T <= sp.T_max]
    return [_beyond(f"Stream {stream.name!r}", beyond, stream.T)] if beyond else []


def _end_out_of_range(end: EndState) -> list[str]:
    by_key = {sp.key: sp for sp in end.species}
    beyond = [by_key[key] for key in end.outside_range]
    return [_beyond("End state", beyond, end.T)] if beyond else []


def _fed_as_pure(prepared: Prepared, end: EndState) -> list[str]:
    """Liquids that are fed by their own record and end up in that of the equation of state."""
    fed = [sp.key for sp in prepared.feed if sp.key in end.left_out]
    if not fed:
        return []
    listed = " and ".join(fed)
    return [
        f"{listed} {'is' if len(fed) == 1 else 'are'} fed by the record of the pure liquid and "
        f"end{'s' if len(fed) == 1 else ''} up in the fluid of the equation of state; what the two "
        "differ by in enthalpy and volume counts in the heat and in T."
    ]


def _beyond(where: str, species: Sequence[Species], T: float) -> str:
    """One line for all species of a stream or end state whose data do not reach so far."""

    def kelvin(value: float) -> str:
        return units.typed_number(round(value, 2))

    ranges = ", ".join(f"{sp.key} ({kelvin(sp.T_min)} to {kelvin(sp.T_max)} K)" for sp in species)
    return (
        f"{where}: {kelvin(T)} K lies outside the data of {ranges}; beyond its data a heat "
        "capacity is held constant."
    )
