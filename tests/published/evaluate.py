"""Work out what one row of a table of published values asks for.

`reactions.csv` needs the library alone: an equilibrium constant from g(T). `mixtures.csv` is
settled, and so is `real_gases.csv`, with the gas model that its rows name. What is held is
written as an engineer would say it:

| held | means |
| --- | --- |
| `T=1000 K; p=1 atm` | temperature and pressure |
| `adiabatic from T=298 K; p=1 atm` | enthalpy as fed, pressure |
| `sealed from T=298 K; p=1 bar` | energy and volume as fed |
| `sealed, worst mixture, from ...` | the same, at the fuel share that gives the highest pressure |
| `T where X leaves; p=1 atm` | the temperature above which X is absent |
| `T where X appears; p=1 atm` | the temperature above which X is present |
| `T where K = 1: REACTION; p=...` | the temperature at which the constant passes one |
| `transition N of X` | a transition inside the record of X |
| `isentropic from T=300 K; p=100 bar; to=10 bar` | entropy as fed, last pressure |
| `isenthalpic from T=300 K; p=100 bar; to=10 bar` | enthalpy as fed, last pressure |
| `T where liquid leaves; p=1 atm` | the temperature above which no fluid liquid is present |
| `...; gas=srk` | any of these with that gas model, which has its published k_ij |
| `...; gas=srk, k_ij=0` | the same with every k_ij put to zero |
"""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import NamedTuple

from scipy.optimize import brentq, minimize_scalar

import solver
import species_db
from solver.gas.fluid import make_fluid
from species_db import Species

HERE = Path(__file__).parent
PRESSURE = {"bar": 1e5, "atm": 101325.0, "kPa": 1e3, "mmHg": 133.322387415}


class Row(NamedTuple):
    """One published value."""

    table: str
    line: int
    cells: dict[str, str]

    @property
    def name(self) -> str:
        cells = self.cells
        if self.table == "reactions":
            return f"{cells['reaction']} at {cells['T']}: {cells['quantity']}"
        return f"{cells['feed']} | {cells['held']} | {cells['quantity']}"

    @property
    def value(self) -> float:
        return float(self.cells["value"])


class Deviation(NamedTuple):
    """How far an own figure is from a published one, in units of the tolerance."""

    row: Row
    own: float
    used: float
    """Deviation over tolerance: the value agrees up to 1."""


def rows(table: str) -> list[Row]:
    """The rows of one table."""
    with (HERE / f"{table}.csv").open(newline="", encoding="utf-8") as file:
        return [Row(table, n, cells) for n, cells in enumerate(csv.DictReader(file), start=2)]


def ammonia() -> list[Row]:
    """The rows of ammonia at pressure, one for each gas model."""
    return [row for row in rows("real_gases") if row.cells["quantity"] == "x NH3"]


def deviation(row: Row) -> Deviation:
    """Compare one row; a lower bound counts as agreeing when it is passed."""
    own = EVALUATORS[row.table](row.cells)
    tolerance = row.cells["tolerance"]
    if tolerance == "at least":
        return Deviation(row, own, 0.0 if own >= row.value else math.inf)
    width = (
        float(tolerance[:-1]) / 100 * abs(row.value)
        if tolerance.endswith("%")
        else float(tolerance)
    )
    return Deviation(row, own, math.inf if math.isnan(own) else abs(own - row.value) / width)


# -- reading -------------------------------------------------------------------------------------


@cache
def library() -> species_db.Library:
    return species_db.load()


def kelvin(text: str) -> float:
    number, unit = text.split()
    return {"K": float(number), "degC": float(number) + 273.15}[unit]


def pascal(text: str) -> float:
    number, unit = text.split()
    return float(number) * PRESSURE[unit]


def at(held: str, symbol: str) -> str:
    found = re.search(rf"\b{symbol}=([^;]+)", held)
    assert found, f"{held!r} does not say {symbol}"
    return found.group(1).strip()


def amounts(text: str) -> dict[Species, float]:
    words = text.split()
    return {library()[key]: float(n) for key, n in zip(words[::2], words[1::2], strict=True)}


def reaction(text: str) -> dict[Species, float]:
    """Stoichiometric numbers, products positive; refuses an unbalanced one."""
    numbers: dict[Species, float] = {}
    for side, sign in zip(text.split(" = "), (-1, 1), strict=True):
        for term in side.split(" + "):
            *number, key = term.split()
            species = library()[key]
            numbers[species] = numbers.get(species, 0) + sign * float(number[0] if number else 1)
    elements = {e for species in numbers for e in species.elements}
    for element in elements:
        total = sum(nu * s.elements.get(element, 0) for s, nu in numbers.items())
        assert abs(total) < 1e-12, f"{text}: {element} is not balanced"
    return numbers


def ln_K(numbers: dict[Species, float], T: float) -> float:
    """ln K at the standard pressure of 1 bar, from the library alone."""
    return -sum(nu * species.g(T) for species, nu in numbers.items()) / (species_db.R * T)


# -- reactions.csv -------------------------------------------------------------------------------


def of_reaction(cells: dict[str, str]) -> float:
    numbers = reaction(cells["reaction"])
    ln = ln_K(numbers, kelvin(cells["T"]))
    kind, _, reference = cells["quantity"].partition(" (")
    gas = sum(nu for species, nu in numbers.items() if species.phase == "gas")
    if reference == "1 atm)":
        ln -= gas * math.log(PRESSURE["atm"] / 1e5)
    else:
        assert reference == "1 bar)" or gas == 0
    return {"ln K": ln, "log10 K": ln / math.log(10), "K": math.exp(ln)}[kind]


# -- mixtures.csv --------------------------------------------------------------------------------


def of_mixture(cells: dict[str, str]) -> float:
    held = cells["held"]
    species = [library()[key] for key in cells["species"].split()]
    if held.startswith("transition"):
        _, number, _, key = held.split()
        index = int(number) - (int(number) > 0)
        found = library()[key].transitions
        return in_unit(found[index].T, cells["unit"]) if found else math.nan
    if held.startswith("T where K"):
        numbers = reaction(held.partition(": ")[2].partition(";")[0])
        gas = sum(nu for s, nu in numbers.items() if s.phase == "gas")
        shift = gas * math.log(pascal(at(held, "p")) / 1e5)
        T = brentq(lambda T: ln_K(numbers, T) - shift, 300.0, 3000.0)
        return in_unit(T, cells["unit"])
    if held.startswith("T where"):
        return in_unit(onset(species, amounts(cells["feed"]), held), cells["unit"])
    if held.startswith("sealed, worst"):
        return worst_mixture(species, cells)
    feed = amounts(cells["feed"])
    return read_off(settle(species, feed, held), feed, cells["quantity"], cells["unit"])


def gas_model(species: list[Species], held: str) -> solver.GasModel:
    """The gas model that a row names, ideal where it names none."""
    if "gas=" not in held:
        return solver.GasModel()
    key, _, without = at(held, "gas").partition(", ")
    if not without:
        return solver.GasModel(key)
    assert without == "k_ij=0"
    pairs = make_fluid([s for s in species if s.phase == "gas"], key).k
    return solver.GasModel(key, tuple((pair.a, pair.b, 0.0) for pair in pairs))


def settle(
    species: list[Species], feed: dict[Species, float], held: str
) -> tuple[solver.EndState, float]:
    """The end state and the pressure of the feed, Pa."""
    T, p = kelvin(at(held, "T")), pascal(at(held, "p"))
    gas = gas_model(species, held)
    if held.startswith("T="):
        return solver.settle(species, feed, solver.Fixed("T,p", T=T, p=p), gas=gas), p
    fed = solver.as_fed(feed, T=T, p=p, gas=gas)
    if held.startswith("sealed"):
        fixed = solver.Fixed("U,V", U=fed.U, V=fed.V)
    elif held.startswith("isentropic"):
        fixed = solver.Fixed("S,p", S=fed.S, p=pascal(at(held, "to")))
    elif held.startswith("isenthalpic"):
        fixed = solver.Fixed("H,p", H=fed.H, p=pascal(at(held, "to")))
    else:
        fixed = solver.Fixed("H,p", H=fed.H, p=p)
    return solver.settle(species, feed, fixed, gas=gas), p


def onset(species: list[Species], feed: dict[Species, float], held: str) -> float:
    """Bisect for the temperature at which a species leaves or appears, K."""
    p = pascal(at(held, "p"))
    _, _, key, verb = held.partition(";")[0].split()
    n_feed = sum(feed.values())
    gas = gas_model(species, held)

    def present(T: float) -> bool:
        end = solver.settle(species, feed, solver.Fixed("T,p", T=T, p=p), gas=gas)
        if key == "liquid":
            return key in end.fluids
        return end.amounts[key] > 1e-12 * n_feed

    low, high = 210.0, 2400.0
    below = verb.startswith("leaves")
    assert present(low) is below
    assert present(high) is not below
    while high - low > 1e-4:
        middle = (low + high) / 2
        if present(middle) is below:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def worst_mixture(species: list[Species], cells: dict[str, str]) -> float:
    fuel, _, air = cells["feed"].partition(" in ")
    oxidant = amounts(air)

    def feed_at(share: float) -> dict[Species, float]:
        feed = {s: n * (1 - share) for s, n in oxidant.items()}
        return {library()[fuel]: share, **feed}

    def pressure(share: float) -> float:
        return settle(species, feed_at(share), cells["held"])[0].p

    # what burns completely takes half an O2 less for each O it brings along
    made_of = library()[fuel].elements
    needed = made_of.get("C", 0) + made_of.get("H", 0) / 4 - made_of.get("O", 0) / 2
    complete = oxidant[library()["O2"]] / (oxidant[library()["O2"]] + needed)
    best = minimize_scalar(
        lambda share: -pressure(share),
        bounds=(0.5 * complete, min(2 * complete, 0.6)),
        method="bounded",
        options={"xatol": 1e-5},
    )
    if cells["quantity"] == "x fuel":
        return 100 * float(best.x)
    feed = feed_at(float(best.x))
    return read_off(settle(species, feed, cells["held"]), feed, cells["quantity"], cells["unit"])


def read_off(
    settled: tuple[solver.EndState, float], feed: dict[Species, float], quantity: str, unit: str
) -> float:
    """The asked quantity of an end state, in the published unit."""
    end, p_fed = settled
    kind, *keys = quantity.split()
    match kind:
        case "x":
            return in_unit(end.fraction(keys[0]), unit)
        case "n":
            return in_unit(end.amounts[keys[0]], unit)
        case "converted":
            return in_unit(1 - end.amounts[keys[0]] / feed[library()[keys[0]]], unit)
        case "ratio":
            return end.amounts[keys[0]] / end.amounts[keys[2]]
        case "T":
            return in_unit(end.T, unit)
        case "Z":
            return end.p * end.V / (sum(end.amounts.values()) * species_db.R * end.T)
        case "phi" | "residual":
            n = sum(end.amounts.values())
            ideal = solver.as_fed(feed, T=end.T, p=end.p)
            if kind == "residual":
                assert keys == ["H"]
                return (end.H - ideal.H) / n
            return math.exp((end.G - ideal.G) / (n * species_db.R * end.T))
        case "p" if keys[:1] == ["/"]:
            return end.p / p_fed
        case "p" if unit == "bar(g)":
            return (end.p - p_fed) / 1e5
        case "p":
            return in_unit(end.p * sum(end.fraction(key) for key in keys), unit)
    raise ValueError(f"no such quantity: {quantity}")


def in_unit(value: float, unit: str) -> float:
    """From SI to the unit in which a value was published."""
    if unit in PRESSURE:
        return value / PRESSURE[unit]
    convert: dict[str, Callable[[float], float]] = {
        "1": lambda x: x,
        "J/mol": lambda x: x,
        "K": lambda x: x,
        "%": lambda x: 100 * x,
        "degC": lambda x: x - 273.15,
        "degF": lambda x: x * 1.8 - 459.67,
        "log10 bar": lambda x: math.log10(x / 1e5),
    }
    return convert[unit](value)


EVALUATORS: dict[str, Callable[[dict[str, str]], float]] = {
    "reactions": of_reaction,
    "mixtures": of_mixture,
    "real_gases": of_mixture,
}
