"""What every record must satisfy, and by how much it does.

``check(species)`` lists the faults of one record, `check_library` those of all and of records
taken together. The tests run it over the whole library; a user's own species can be run through it
too. Limits are for a well-formed record, not for its truth: how far two sources differ is no fault.
"""

import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from species_db.elements import ATOMIC_MASS, molar_mass
from species_db.species import T_STANDARD, R, Species

JOIN = 1e-6
"""Largest step of h/RT and s/R at a join without a transition, and of g/RT at any join."""
CP_STEP_GAS = 0.03
"""Largest relative step of cp of a gas at a join."""
REFERENCE_H = 1e-3
"""Largest h298 of an element in its reference state, J/mol."""
RANGE = (200.0, 6000.0)
"""Every record must give finite values over this range, K, beyond its own too."""
H298 = (-2.0e7, 8.0e6)
S298 = (0.0, 2500.0)
CP_ATOM = (0.7, 8.0)
"""Bounds on cp/R of a condensed record per atom."""

REFERENCE_STATES = (
    "H2", "N2", "O2", "F2", "Cl2", "He", "Ne", "Ar", "Kr", "Xe", "C(gr)", "S(s)", "I2(s)",
    "Br2(l)", "Hg(l)", "P(white)", "Al(s)", "B(s)", "Ba(s)", "Be(s)", "Bi(s)", "Ca(s)", "Cd(s)",
    "Co(s)", "Cr(s)", "Cs(s)", "Cu(s)", "Fe(s)", "Ag(s)", "Au(s)", "K(s)", "Li(s)", "Mg(s)",
    "Mn(s)", "Mo(s)", "Na(s)", "Nb(s)", "Ni(s)", "Pb(s)", "Pd(s)", "Pt(s)", "Rb(s)", "Sb(s)",
    "Si(s)", "Sn(s)", "Sr(s)", "Ta(s)", "Ti(s)", "V(s)", "W(s)", "Zn(s)", "Zr(s)", "Hf(s)",
)  # fmt: skip
"""Keys of elements in the reference state of the enthalpies of formation."""


@dataclass(frozen=True, slots=True)
class Fault:
    """A condition that a record does not meet."""

    key: str
    what: str
    value: float

    def __str__(self) -> str:
        return f"{self.key}: {self.what} ({self.value:.4g})"


@dataclass(frozen=True, slots=True)
class Join:
    """Steps at the join of two segments: dh/RT, ds/R, dg/RT, dcp/cp."""

    T: float
    h: float
    s: float
    g: float
    cp: float


def joins(species: Species) -> list[Join]:
    """Steps at each join of a record, upper minus lower segment."""
    out = []
    for lower, upper in zip(species.segments, species.segments[1:], strict=False):
        T = upper.T_low
        low, up = _values(lower.a, T), _values(upper.a, T)
        dh, ds = (up[1] - low[1]) / T, up[2] - low[2]
        out.append(Join(T, dh, ds, dh - ds, up[0] / low[0] - 1))
    return out


def _values(a: tuple[float, ...], T: float) -> tuple[float, float, float]:
    cp = a[0] + T * (a[1] + T * (a[2] + T * (a[3] + T * a[4])))
    h = T * (a[0] + T * (a[1] / 2 + T * (a[2] / 3 + T * (a[3] / 4 + T * a[4] / 5)))) + a[5]
    s = a[0] * math.log(T) + T * (a[1] + T * (a[2] / 2 + T * (a[3] / 3 + T * a[4] / 4))) + a[6]
    return cp, h, s


def check(species: Species) -> list[Fault]:
    """Faults of one record: mass, cp, joins, transitions, range, bounds."""
    faults: list[Fault] = []

    def must(ok: bool, what: str, value: float) -> None:
        if not ok:
            faults.append(Fault(species.key, what, float(value)))

    unknown = [e for e in species.elements if e not in ATOMIC_MASS]
    must(not unknown, f"unknown elements {unknown}", len(unknown))
    must(all(n > 0 for n in species.elements.values()), "element counts above zero", 0)
    if not unknown:
        mass = molar_mass(species.elements, species.charge)
        must(abs(species.molar_mass - mass) < 1e-9, "molar mass of the elements", mass)
        must(mass > 0, "molar mass above zero", mass)
    grid = np.linspace(species.T_min, species.T_max, 240)
    lowest = float(np.min(species.cp(grid)))
    must(lowest > 0, "cp above zero over the range", lowest / R)
    if species.phase != "gas" and not unknown:
        atoms = sum(species.elements.values())
        cp298 = species.cp(max(T_STANDARD, species.T_min)) / R / atoms
        must(CP_ATOM[0] < cp298 < CP_ATOM[1], "cp/R an atom of a condensed record", cp298)
    heats = {t.T: t.latent_heat for t in species.transitions}
    for join in joins(species):
        must(abs(join.g) < JOIN, f"g continuous at {join.T:g} K", join.g)
        if join.T in heats:
            stated = heats[join.T] / (R * join.T)
            must(abs(join.h - stated) < JOIN * 10, f"latent heat at {join.T:g} K", join.h - stated)
        else:
            must(abs(join.h) < JOIN, f"h continuous at {join.T:g} K", join.h)
            must(abs(join.s) < JOIN, f"s continuous at {join.T:g} K", join.s)
        if species.phase == "gas":
            must(abs(join.cp) < CP_STEP_GAS, f"cp continuous at {join.T:g} K", join.cp)
    must(
        all(h > 0 for h in heats.values()),
        "latent heats above zero",
        min(heats.values(), default=1),
    )
    wide = np.linspace(*RANGE, 120)
    finite = all(
        np.all(np.isfinite(f(wide))) for f in (species.cp, species.h, species.s, species.g)
    )
    must(finite, "finite from 200 to 6000 K", 0)
    h298 = species.h(T_STANDARD)
    s298 = species.s(max(T_STANDARD, species.T_min))
    must(H298[0] < h298 < H298[1], "h298 within bounds", h298)
    must(S298[0] < s298 < S298[1], "s298 above zero and within bounds", s298)
    u = species.h298_uncertainty
    must(u is None or 0 <= u < 1e6, "uncertainty within bounds", u or 0)
    must(bool(species.source and species.reference), "source and reference named", 0)
    return faults


def check_library(library: Iterable[Species]) -> list[Fault]:
    """Faults of all records, and of the reference states."""
    faults: list[Fault] = []
    for species in library:
        faults += check(species)
        if species.key in REFERENCE_STATES:
            h = species.h(T_STANDARD)
            if abs(h) > REFERENCE_H:
                faults.append(Fault(species.key, "h298 of a reference state zero", h))
    return faults
