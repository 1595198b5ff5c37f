"""An answer as rows of figures for the eye: units picked, shares taken, nothing settled here."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from solver.project.model import Case, Quantity
from solver.project.units import UnitError, canonical, from_si

_ABSOLUTE = {"barg": "bar", "mbarg": "mbar", "kPag": "kPa", "MPag": "MPa", "psig": "psi"}


@dataclass(frozen=True, slots=True)
class Units:
    """The units an answer is shown in."""

    T: str = "degC"
    p: str = "bar"
    amount: str = "mol"
    mass: str = "kg"
    flow: bool = False

    def amount_of(self, si: float) -> float:
        """mol or mol/s in the unit shown."""
        return from_si(si, self.amount, "amount_flow" if self.flow else "amount")

    def mass_of(self, si: float) -> float:
        """kg or kg/s in the unit shown."""
        return from_si(si, self.mass, "mass_flow" if self.flow else "mass")


def something_fed(case: Case) -> bool:
    """Whether anything at all is typed into a stream."""
    return any(a.species.strip() or a.value != "" for s in case.streams for a in s.amounts)


def units_for(case: Case, answer: Any) -> Units:
    """Units like those that were typed; pressures absolute."""
    held = case.fixed.values
    T = _typed([held.get("T"), *(s.T for s in case.streams)], "temperature", "degC")
    p = _typed([held.get("p"), *(s.p for s in case.streams)], "pressure", "bar")
    flow = answer is not None and answer.basis == "flow"
    total = sum(answer.end.amounts.values()) if answer is not None else 0.0
    if flow:
        return Units(T, _ABSOLUTE.get(p, p), "kmol/h", "kg/h", True)
    large = total >= 1e4
    return Units(T, _ABSOLUTE.get(p, p), "kmol" if large else "mol", "kg", False)


def _typed(quantities: list[Quantity | None], kind: str, default: str) -> str:
    for quantity in quantities:
        if quantity is None or isinstance(quantity.value, str):
            continue
        try:
            return canonical(quantity.unit, kind)
        except UnitError:
            continue
    return default


def scaled(si: float, steps: tuple[tuple[float, str], ...]) -> tuple[float, str]:
    """`si` in the largest of the units whose factor it reaches; steps from small to large."""
    size = abs(si)
    # Nothing is said in the unit of the middle: 0 kJ, 0 kW.
    chosen = steps[0] if size else steps[min(1, len(steps) - 1)]
    for factor, unit in steps:
        if size >= factor * 0.9995:
            chosen = (factor, unit)
    return si / chosen[0], chosen[1]


ENERGY = ((1.0, "J"), (1e3, "kJ"), (1e6, "MJ"), (1e9, "GJ"))
POWER = ((1.0, "W"), (1e3, "kW"), (1e6, "MW"), (1e9, "GW"))
ENTROPY = ((1.0, "J/K"), (1e3, "kJ/K"), (1e6, "MJ/K"))
ENTROPY_FLOW = ((1.0, "W/K"), (1e3, "kW/K"), (1e6, "MW/K"))
VOLUME = ((1e-6, "mL"), (1e-3, "L"), (1.0, "m3"))
VOLUME_FLOW = ((1.0 / 3600, "m3/h"), (1.0, "m3/s"))


def energy(si: float, flow: bool) -> tuple[float, str]:
    """J or W, scaled."""
    return scaled(si, POWER if flow else ENERGY)


def entropy(si: float, flow: bool) -> tuple[float, str]:
    """J/K or W/K, scaled."""
    return scaled(si, ENTROPY_FLOW if flow else ENTROPY)


def volume(si: float, flow: bool) -> tuple[float, str]:
    """m3, or m3/s shown per hour up to a hundred thousand."""
    if flow:
        return (si * 3600, "m3/h") if abs(si) * 3600 < 1e6 else (si, "m3/s")
    return scaled(si, VOLUME)


@dataclass(frozen=True, slots=True)
class SpeciesRow:
    """One species in one phase; shares are of the fluid, or of the whole for condensed ones."""

    key: str
    name: str
    phase: str
    amount: float
    share: float
    mass_share: float
    outside: bool


@dataclass(frozen=True, slots=True)
class FluidRows:
    """A gas or a liquid of the equation of state: its share of all moles, and what is in it."""

    name: str
    share: float
    rows: tuple[SpeciesRow, ...]


@dataclass(frozen=True, slots=True)
class PhaseRow:
    """One phase at the end: mol and kg (per second on a flow basis) and shares of the whole."""

    name: str
    amount: float
    share: float
    mass: float
    mass_share: float


def composition(end: Any) -> tuple[list[FluidRows], list[SpeciesRow]]:
    """Fluid phases and condensed rows, the most abundant first; absent condensed ones left out."""
    total, mass = _totals(end.species, end.amounts)
    by_key = {sp.key: sp for sp in end.species}
    outside = set(end.outside_range)

    def row(sp: Any, n: float, of: float, of_mass: float) -> SpeciesRow:
        return SpeciesRow(
            sp.key,
            sp.name,
            sp.phase,
            n,
            n / of if of else 0.0,
            n * sp.molar_mass / of_mass if of_mass else 0.0,
            sp.key in outside,
        )

    by_amount = lambda r: (-r.amount, r.key)  # noqa: E731
    fluids, others = [], []
    for name, held in end.phases.items():
        if name in by_key:
            others.append(row(by_key[name], held[name], total, mass))
            continue
        members = [by_key[key] for key in held]
        own, own_mass = _totals(members, held)
        rows = sorted((row(sp, held[sp.key], own, own_mass) for sp in members), key=by_amount)
        fluids.append(FluidRows(name, own / total, tuple(rows)))
    return fluids, sorted(others, key=by_amount)


def phases(end: Any) -> list[PhaseRow]:
    """The phases that are present."""
    total, mass = _totals(end.species, end.amounts)
    by_key = {sp.key: sp for sp in end.species}
    rows = []
    for name, held in end.phases.items():
        amount, kilograms = _totals([by_key[key] for key in held], held)
        rows.append(PhaseRow(name, amount, amount / total, kilograms, kilograms / mass))
    return rows


def _totals(species: Any, amounts: Any) -> tuple[float, float]:
    pairs = [(amounts[sp.key], sp.molar_mass) for sp in species]
    return sum(n for n, _ in pairs), sum(n * m for n, m in pairs)


def stream_shares(stream: Any) -> tuple[float | None, ...]:
    """Mole fraction of each row's species within its stream; () while it cannot be read."""
    import species_db
    from solver.project.streams import read_stream

    library = species_db.load()
    read = read_stream(stream, library, "", [])
    if read is None or not read.feed:
        return ()
    total = sum(read.feed.values())
    out: list[float | None] = []
    for amount in stream.amounts:
        text = amount.species.strip()
        out.append(read.feed.get(library[text], 0.0) / total if text else None)
    return tuple(out)
