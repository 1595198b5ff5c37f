"""The pairs that can be held, and how each variable is asked for.

The list itself is the solver's (`solver.fixed.PAIRS`); here is only what a field needs to know.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Variable:
    """How one variable is named and typed."""

    symbol: str
    words: str
    kind: str
    batch_unit: str
    flow_unit: str
    hint: str


VARIABLES = {
    v.symbol: v
    for v in (
        Variable("T", "temperature", "temperature", "degC", "degC", "850 °C, 1123 K"),
        Variable("p", "pressure", "pressure", "bar", "bar", "24 barg, 1 atm, 5 MPa"),
        Variable("V", "volume", "vessel", "m3", "m3/h", "20 L, 0.5 m³"),
        Variable("H", "enthalpy", "heat", "kJ", "kW", "−250 kJ, elements at 25 °C as datum"),
        Variable("U", "internal energy", "heat", "kJ", "kW", "−250 kJ, elements as datum"),
        Variable("S", "entropy", "disorder", "kJ/K", "kW/K", "1.2 kJ/K"),
    )
}

ENERGY = ("H", "U")


@dataclass(frozen=True, slots=True)
class PairChoice:
    """One entry of the pair menu."""

    name: str
    variables: tuple[str, ...]
    words: str


def choices() -> list[PairChoice]:
    """The pairs the solver has, in its order."""
    from solver.fixed import PAIRS

    return [
        PairChoice(p.name, p.variables, p.wording[:1].upper() + p.wording[1:])
        for p in PAIRS.values()
    ]
