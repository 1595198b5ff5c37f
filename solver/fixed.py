"""The pairs of state variables an engineer can hold, as data."""

from __future__ import annotations

import math
from dataclasses import dataclass
from types import MappingProxyType

from solver.errors import InputError

T_LOWEST, T_HIGHEST = 150.0, 20_000.0  # K; no record means anything beyond
P_LOWEST, P_HIGHEST = 1.0e-7, 1.0e11  # Pa


@dataclass(frozen=True, slots=True)
class Pair:
    """One pair: its two variables in order, and how it is said."""

    name: str
    variables: tuple[str, str]
    wording: str
    holds_volume: bool

    @property
    def searched(self) -> str | None:
        """The variable that a search over T must meet; None where T itself is held."""
        return None if self.variables[0] == "T" else self.variables[0]


PAIRS: MappingProxyType[str, Pair] = MappingProxyType(
    {
        pair.name: pair
        for pair in (
            Pair("T,p", ("T", "p"), "temperature and pressure", False),
            Pair("H,p", ("H", "p"), "enthalpy and pressure", False),
            Pair("U,V", ("U", "V"), "internal energy and volume", True),
            Pair("T,V", ("T", "V"), "temperature and volume", True),
            Pair("S,p", ("S", "p"), "entropy and pressure", False),
            Pair("S,V", ("S", "V"), "entropy and volume", True),
        )
    }
)

_UNITS = {"T": "K", "p": "Pa", "V": "m3", "H": "J", "U": "J", "S": "J/K"}


@dataclass(frozen=True, init=False)
class Fixed:
    """The pair held and its two values, SI.

    ``Fixed("T,p", T=1100.0, p=1.0e5)``; any of the six pairs in `PAIRS`.

    Raises
    ------
    InputError
        The pair is unknown, a value is missing, superfluous, not finite or out of range.
    """

    pair: str
    values: tuple[float, float]

    def __init__(self, pair: str, /, **values: float) -> None:
        if pair not in PAIRS:
            raise InputError(
                f"The fixed pair {pair!r} is not known; choose one of {', '.join(PAIRS)}.",
                "fixed.pair",
                pair,
                ", ".join(PAIRS),
            )
        names = PAIRS[pair].variables
        for name in names:
            if name not in values:
                raise InputError(
                    f"The pair {pair} needs a value of {name} in {_UNITS[name]}.",
                    f"fixed.{name}",
                    None,
                    f"a number in {_UNITS[name]}",
                )
        for name in values:
            if name not in names:
                raise InputError(
                    f"{name} is no variable of the pair {pair}; give {names[0]} and {names[1]}.",
                    f"fixed.{name}",
                    values[name],
                    " and ".join(names),
                )
        checked = tuple(checked_value(name, values[name]) for name in names)
        object.__setattr__(self, "pair", pair)
        object.__setattr__(self, "values", checked)

    def __getattr__(self, name: str) -> float:
        if name in ("T", "p", "H", "U", "S", "V"):
            variables = PAIRS[self.pair].variables
            if name in variables:
                return self.values[variables.index(name)]
        raise AttributeError(name)


def checked_value(name: str, value: object) -> float:
    """A fixed value as a float, or an InputError that names the field and the range."""
    low, high = allowed_range(name)
    unit = _UNITS[name]
    try:
        number = float(value)  # type: ignore[arg-type]
    except (TypeError, ValueError):
        number = math.nan
    if not math.isfinite(number) or not low <= number <= high:
        allowed = (
            f"{low:g} to {high:g} {unit}" if math.isfinite(low) else f"a finite number in {unit}"
        )
        raise InputError(
            f"{name} = {value} {unit} is out of range; give {allowed}.",
            f"fixed.{name}",
            value,
            allowed,
        )
    return number


def allowed_range(name: str) -> tuple[float, float]:
    """Lowest and highest value accepted for a fixed variable, SI."""
    if name == "T":
        return T_LOWEST, T_HIGHEST
    if name == "p":
        return P_LOWEST, P_HIGHEST
    if name == "V":
        return 1e-30, 1e30
    return -math.inf, math.inf
