"""The fixed pair as typed, in SI: written values, or those of the feed, and the heat."""

from __future__ import annotations

from typing import TYPE_CHECKING, cast

from solver.errors import InputError
from solver.fixed import PAIRS, Fixed
from solver.project import units
from solver.project.model import Case, Quantity, Variable
from solver.project.streams import Basis, read_state

if TYPE_CHECKING:
    from solver.project.case import FedTotals

_KIND = {
    "T": "temperature",
    "p": "pressure",
    "V": "vessel",
    "H": "heat",
    "U": "heat",
    "S": "disorder",
}


def read_fixed(
    case: Case, fed: FedTotals, basis: Basis, faults: list[InputError]
) -> tuple[Fixed | None, float, list[str]]:
    """The pair with its values in SI, the heat, and remarks."""
    pair = PAIRS[case.fixed.pair]
    notes: list[str] = []
    if pair.holds_volume and basis == "flow":
        faults.append(
            InputError(
                f"The pair {pair.name} holds a volume, so the feed must be a batch; write the "
                "amounts in mol or kg instead of a flow, or choose a pair with p.",
                "fixed.pair",
                pair.name,
                ", ".join(name for name, other in PAIRS.items() if not other.holds_volume),
            )
        )
        return None, 0.0, notes
    heat = 0.0
    if case.fixed.heat is not None and _written(case.fixed.heat):
        if {"H", "U"} & set(pair.variables):
            heat = _extensive(case.fixed.heat, "heat", "fixed.heat", basis, faults) or 0.0
        elif case.fixed.heat.value != 0:
            notes.append(
                f"Heat is not used: with {pair.name} held, the heat is part of the answer."
            )
    values: dict[str, float] = {}
    for name in _variables(case):
        field = f"fixed.{name}"
        typed = case.fixed.values.get(name)
        if typed is None:
            value = getattr(fed, name)
            if value is None:
                faults.append(_no_common(name, field))
        elif name in ("T", "p"):
            value = read_state(typed, _KIND[name], field, faults)
        else:
            value = _extensive(typed, _KIND[name], field, basis, faults)
        if value is not None:
            values[name] = value + (heat if name in ("H", "U") else 0.0)
    if faults:
        return None, heat, notes
    try:
        return Fixed(pair.name, **values), heat, notes
    except InputError as fault:
        faults.append(fault)
        return None, heat, notes


def check_fixed(case: Case, faults: list[InputError]) -> None:
    """Faults of the fixed values that can be seen without knowing the feed."""
    for name in _variables(case):
        typed = case.fixed.values.get(name)
        if typed is not None and name in ("T", "p"):
            read_state(typed, _KIND[name], f"fixed.{name}", faults)
        elif typed is not None:
            _extensive(typed, _KIND[name], f"fixed.{name}", None, faults)
    heat = case.fixed.heat
    if heat is not None and _written(heat) and {"H", "U"} & set(_variables(case)):
        _extensive(heat, "heat", "fixed.heat", None, faults)


def _written(quantity: Quantity) -> bool:
    return not isinstance(quantity.value, str) or bool(quantity.value.strip())


def _no_common(name: str, field: str) -> InputError:
    word = {"T": "temperature", "p": "pressure"}[name]
    return InputError(
        f"The streams differ in {word}, so the {word} held cannot be taken from them; write it.",
        field,
        None,
        f"a {word}",
    )


def _variables(case: Case) -> tuple[Variable, Variable]:
    first, second = PAIRS[case.fixed.pair].variables
    return cast(Variable, first), cast(Variable, second)


def _extensive(
    quantity: Quantity, kind: str, field: str, basis: Basis | None, faults: list[InputError]
) -> float | None:
    """A batch's energy, volume or entropy, or that of a flow per second."""
    try:
        si = units.to_si(quantity, kind, field)
        found = units.unit_kind(quantity.unit, kind, field)
    except InputError as fault:
        faults.append(fault)
        return None
    per_time = found in ("power", "entropy_flow", "volume_flow")
    if basis is not None and per_time != (basis == "flow"):
        example = {
            ("heat", "flow"): "kW",
            ("heat", "batch"): "kJ",
            ("disorder", "flow"): "kW/K",
            ("disorder", "batch"): "kJ/K",
            ("vessel", "flow"): "m3/h",
            ("vessel", "batch"): "m3",
        }[kind, basis]
        feed = "a flow" if basis == "flow" else "a batch"
        faults.append(
            InputError(
                f"The feed is {feed}, but {units.typed_number(quantity.value)} {quantity.unit} "
                f"is not per {'time' if basis == 'flow' else 'batch'}; write it in {example}.",
                field,
                quantity.unit,
                example,
            )
        )
        return None
    return si
