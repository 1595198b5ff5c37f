"""Streams as typed, turned into moles with a temperature and a pressure.

Amounts of one stream are either absolute (mol, kg, Nm3, m3; for a batch or per time) or shares of
its total, in mol % or mass %. Flows are carried per second.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, Literal

from solver.errors import InputError
from solver.fixed import P_HIGHEST, P_LOWEST, T_HIGHEST, T_LOWEST
from solver.project import units
from solver.project.candidates import unknown_species
from solver.project.model import Amount, Quantity, Stream
from solver.project.unit_table import R
from species_db import UnknownSpecies

if TYPE_CHECKING:
    from species_db import Library, Species

Basis = Literal["batch", "flow"]

SHARES_OFF: Final = 0.005
"""How far shares may miss 100 % (rounded analyses) and still be scaled; beyond it is a fault."""


@dataclass(frozen=True, slots=True)
class ReadStream:
    """A stream in SI: T in K, p in Pa, feed in mol or mol/s (species with none left out)."""

    name: str
    T: float
    p: float
    feed: dict[Species, float]
    basis: Basis
    messages: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class _Row:
    field: str
    species: Species
    kind: str
    value: float
    typed: Amount


def read_stream(
    stream: Stream, library: Library, field: str, faults: list[InputError]
) -> ReadStream | None:
    """Read one stream; faults are added to the list, and then there is no result."""
    before = len(faults)
    T = read_state(stream.T, "temperature", f"{field}.T", faults)
    p = read_state(stream.p, "pressure", f"{field}.p", faults)
    rows = _rows(stream, library, field, faults)
    if len(faults) > before or T is None or p is None:
        return None
    if not rows:
        faults.append(
            InputError(
                f"The stream {stream.name!r} is empty; write at least one species with an amount.",
                f"{field}.amounts",
                (),
                "one or more amounts",
            )
        )
        return None
    bases = {_basis(row.kind) for row in rows} - {None}
    shares = [row for row in rows if _basis(row.kind) is None]
    if shares and len(shares) < len(rows):
        faults.append(
            InputError(
                f"The stream {stream.name!r} mixes shares in % with amounts; "
                "write all rows as shares of a total, or none.",
                shares[0].field + ".unit",
                shares[0].typed.unit,
                "one way of counting in a stream",
            )
        )
        return None
    if len(bases) > 1:
        flow = next(row for row in rows if _basis(row.kind) == "flow")
        faults.append(
            InputError(
                f"The stream {stream.name!r} mixes flows with amounts of a batch; write all rows "
                "per time, or none.",
                flow.field + ".unit",
                flow.typed.unit,
                "one basis in a stream",
            )
        )
        return None
    try:
        if shares:
            feed, basis, messages = _from_shares(stream, rows, T, p, field)
        else:
            feed = _sum(rows, [_moles(row, T, p) for row in rows])
            basis = "flow" if "flow" in bases else "batch"
            messages = ()
    except InputError as fault:
        faults.append(fault)
        return None
    if not feed:
        messages = (*messages, f"Stream {stream.name!r}: all amounts are zero.")
    return ReadStream(stream.name, T, p, feed, basis, messages)


def read_state(quantity: Quantity, kind: str, field: str, faults: list[InputError]) -> float | None:
    """T or p in SI within what the solver accepts, else None and a fault."""
    low, high = (T_LOWEST, T_HIGHEST) if kind == "temperature" else (P_LOWEST, P_HIGHEST)
    try:
        si = units.to_si(quantity, kind, field)
    except InputError as fault:
        faults.append(fault)
        return None
    if low <= si <= high:
        return si
    span = " to ".join(
        units.quantity_text(units.from_si(end, quantity.unit, kind), quantity.unit)
        for end in (low, high)
    )
    typed = f"{units.typed_number(quantity.value)} {units.unit_text(quantity.unit)}"
    faults.append(
        InputError(f"A {kind} of {typed} is out of range; write {span}.", field, typed, span)
    )
    return None


def _rows(stream: Stream, library: Library, field: str, faults: list[InputError]) -> list[_Row]:
    rows = []
    for i, amount in enumerate(stream.amounts):
        where = f"{field}.amounts[{i}]"
        text = amount.species.strip()
        number = amount.value.strip() if isinstance(amount.value, str) else amount.value
        if not text and number == "":
            continue
        species = None
        if not text:
            faults.append(
                InputError(
                    "This amount has no species; write a key, a name or a formula.",
                    f"{where}.species",
                    "",
                    "a key, a name or a formula",
                )
            )
        else:
            try:
                species = library[text]
            except UnknownSpecies as error:
                faults.append(unknown_species(error, f"{where}.species"))
        value, kind = _number(amount, text, where, faults)
        if species is not None and value is not None and kind is not None:
            rows.append(_Row(where, species, kind, value, amount))
    return rows


def _number(
    amount: Amount, text: str, where: str, faults: list[InputError]
) -> tuple[float | None, str | None]:
    """The SI value of a row and the kind of its unit, or faults."""
    kind = value = None
    try:
        kind = units.unit_kind(amount.unit, "feed", f"{where}.unit")
    except InputError as fault:
        faults.append(fault)
    try:
        number = (
            units.parse_number(amount.value, f"{where}.value")
            if isinstance(amount.value, str) and amount.value.strip()
            else amount.value
        )
    except InputError as fault:
        faults.append(fault)
        return None, kind
    if isinstance(number, str):
        faults.append(
            InputError(
                f"How much {text} is not said; write an amount, 0 or more.",
                f"{where}.value",
                "",
                "0 or more",
            )
        )
    elif number < 0:
        faults.append(
            InputError(
                f"The amount of {text} is {units.typed_number(number)} {amount.unit}; "
                "it cannot be negative. What leaves is not a feed: take it off the stream.",
                f"{where}.value",
                number,
                "0 or more",
            )
        )
    elif kind is not None:
        # Zero is allowed here, for volumes too.
        value = number * units.find(amount.unit, kind).factor
    return value, kind


def _basis(kind: str) -> Basis | None:
    if kind.endswith("_share"):
        return None
    return "flow" if kind.endswith("_flow") else "batch"


def _moles(row: _Row, T: float, p: float) -> float:
    """mol (or mol/s) of a row that says an absolute amount."""
    what = row.kind.removesuffix("_flow")
    if what == "amount":
        return row.value
    if what == "mass":
        return row.value / row.species.molar_mass
    if what == "normal_volume":
        _need_gas(row.species, f"{row.field}.unit", row.typed.unit)
        return row.value
    if row.species.phase == "gas":
        return row.value * p / (R * T)
    volume = row.species.molar_volume
    if volume is None:
        raise InputError(
            f"The library holds no density of {row.species.key}; give its amount in kg or mol.",
            f"{row.field}.unit",
            row.typed.unit,
            "an amount in kg or mol",
        )
    return row.value / volume


def _need_gas(species: Species, field: str, unit: str) -> None:
    if species.phase != "gas":
        raise InputError(
            f"{units.unit_text(unit)} counts gases; {species.key} is a {species.phase}. "
            "Give it in kg or mol.",
            field,
            unit,
            "an amount in kg or mol",
        )


def _sum(rows: Sequence[_Row], moles: Sequence[float]) -> dict[Species, float]:
    """Rows of one species add up; what is zero is left out."""
    feed: dict[Species, float] = {}
    for row, n in zip(rows, moles, strict=True):
        if n > 0:
            feed[row.species] = feed.get(row.species, 0.0) + n
    return feed


def _from_shares(
    stream: Stream, rows: Sequence[_Row], T: float, p: float, field: str
) -> tuple[dict[Species, float], Basis, tuple[str, ...]]:
    """Moles of a stream whose rows are shares of its total."""
    kinds = {row.kind for row in rows}
    if len(kinds) > 1:
        odd = next(row for row in rows if row.kind != rows[0].kind)
        raise InputError(
            f"The stream {stream.name!r} mixes mol % with mass %; write one of them throughout.",
            f"{odd.field}.unit",
            odd.typed.unit,
            rows[0].typed.unit,
        )
    if stream.total is None:
        raise InputError(
            f"The stream {stream.name!r} is given in {rows[0].typed.unit}, but its total is not; "
            "write the total, such as 100 kmol/h or 5 kg.",
            f"{field}.total",
            None,
            "an amount or a flow",
        )
    whole = sum(row.value for row in rows)
    messages: tuple[str, ...] = ()
    if abs(whole - 1) > SHARES_OFF:
        raise InputError(
            f"The shares of the stream {stream.name!r} add up to "
            f"{units.number_text(100 * whole)} %, not to 100 %; correct one of them.",
            f"{field}.amounts",
            100 * whole,
            "100 %",
        )
    if abs(whole - 1) > 1e-9:
        messages = (
            f"Stream {stream.name!r}: the shares add up to {units.number_text(100 * whole, 6)} % "
            "and were scaled to 100 %.",
        )
    kind = units.unit_kind(stream.total.unit, "total", f"{field}.total")
    total = _total(stream.total, kind, f"{field}.total")
    by_mass = rows[0].kind == "mass_share"
    # Moles in one mole (or one kilogram) of the mixture, and the mass that goes with them.
    one = [row.value / whole / (row.species.molar_mass if by_mass else 1.0) for row in rows]
    mass = sum(n * row.species.molar_mass for n, row in zip(one, rows, strict=True))
    what = kind.removesuffix("_flow")
    if what == "mass":
        scale = total / mass
    else:
        if what != "amount":
            for row in rows:
                if row.value > 0:
                    _need_gas(row.species, f"{field}.total", stream.total.unit)
        moles = total * p / (R * T) if what == "volume" else total
        scale = moles / sum(one)
    basis: Basis = "flow" if kind.endswith("_flow") else "batch"
    return _sum(rows, [n * scale for n in one]), basis, messages


def _total(total: Quantity, kind: str, field: str) -> float:
    value = total.value
    if isinstance(value, str):
        value = units.parse_number(value, field) if value.strip() else -1.0
    if value < 0:
        raise InputError(
            f"The total is {total.value or 'missing'} {total.unit}; write a positive one.",
            field,
            total.value,
            "0 or more",
        )
    return value * units.find(total.unit, kind).factor
