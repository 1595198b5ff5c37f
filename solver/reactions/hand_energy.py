"""Energy along the path of one reaction: the end temperature, and the balance term by term."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import P0, R
from solver.errors import NoEndState
from solver.fixed import PAIRS, T_HIGHEST, T_LOWEST, Fixed
from solver.reactions.path import Path, Place
from solver.reactions.root import bracketed_root

Array = NDArray[np.float64]

_JUMP = 1e-9  # of n R T: an energy open by more than this at the last digit of T is a plateau


@dataclass(frozen=True, slots=True)
class Term:
    """One step of the energy balance: what, value, unit, and how it is worked out."""

    label: str
    value: float
    unit: str
    how: str


@dataclass(frozen=True)
class Account:
    """The energy balance.

    Attributes
    ----------
    variable : str
        'H' or 'U'.
    terms : tuple of Term
        In the order they are worked out.
    available : float
        Energy above that of the feed at T0, J: heat added and what the feed brings along.
    reaction : float
        Taken up by the reaction at T0, J.
    heating : float
        Taken up by heating the end mixture from T0 to T, J.
    pressing : float
        Taken up by condensed species at the end pressure, J; only at a held pressure.
    residual : float
        available - reaction - heating - pressing, J; rounding.
    """

    variable: str
    terms: tuple[Term, ...]
    available: float
    reaction: float
    heating: float
    pressing: float
    residual: float


@dataclass(frozen=True)
class State:
    """An end state on the path.

    Attributes
    ----------
    T, volume : float
        K, m3.
    place : Place
    content : ndarray, shape (species,)
        h (or u) of the end mixture times amounts, J; on a plateau the mean of both sides.
    plateau : bool
    """

    T: float
    volume: float
    place: Place
    content: Array
    plateau: bool


def molar_energy(path: Path, T: float) -> Array:
    """h (pressure held) or u (volume held) of each species, J/mol, shape (species,).

    The internal energy of a gas is h - R T, that of a condensed species h - v (1 bar).
    """
    h = np.array([sp.h(T) for sp in path.species])
    if path.V is None:
        return h
    out: Array = h - np.where(path.is_gas, R * T, P0 * path.volume)
    return out


def energy_of(path: Path, place: Place, T: float) -> float:
    """H (pressure held) or U (volume held) of a point on the path, J."""
    return float(place.amounts @ molar_energy(path, T)) + _pressing(path, place)


def _pressing(path: Path, place: Place) -> float:
    """v (p - 1 bar) of the condensed species, part of H, J."""
    return float(place.amounts @ path.volume) * (path.p - P0) if path.p is not None else 0.0


def find_state(path: Path, fixed: Fixed) -> State:
    """The end state for the pair held.

    Raises
    ------
    NoEndState
        No temperature has the energy held.
    """
    variable = PAIRS[fixed.pair].searched
    if variable is None:
        T = fixed.values[0]
        place = path.equilibrium(T)
        return _state(path, T, place, place.amounts * molar_energy(path, T), False)
    held = fixed.values[0]

    def off(T: float) -> float:
        return energy_of(path, path.equilibrium(T), T) - held

    ends = off(T_LOWEST), off(T_HIGHEST)
    if ends[0] > 0.0 or ends[1] < 0.0:
        side, limit = ("above", T_LOWEST) if ends[0] > 0.0 else ("below", T_HIGHEST)
        change = "raise" if ends[0] > 0.0 else "lower"
        raise NoEndState(
            f"No temperature {side} {limit:g} K has {variable} = {held:.6g} J with this reaction; "
            f"{change} {variable}.",
            f"fixed.{variable}",
            held,
            f"{variable} of the mixture between {T_LOWEST:g} and {T_HIGHEST:g} K",
        )
    T = bracketed_root(off, T_LOWEST, T_HIGHEST, *ends)
    place = path.equilibrium(T)
    open_ = abs(energy_of(path, place, T) - held)
    if open_ <= _JUMP * R * T * float(place.amounts.sum()):
        return _state(path, T, place, place.amounts * molar_energy(path, T), False)
    return _plateau(path, T, held)


def _plateau(path: Path, T: float, held: float) -> State:
    """The split of both sides of a jump at T that closes the energy."""
    step = 4.0 * 2.220446049250313e-16 * T
    low, high = math.inf, -math.inf
    while not low <= held <= high:  # the rounding of ln K blurs the place of the jump a little
        below, above = T - step, T + step
        a, b = path.equilibrium(below), path.equilibrium(above)
        low, high = energy_of(path, a, below), energy_of(path, b, above)
        step *= 2.0
    share = (held - low) / (high - low)
    amounts = (1.0 - share) * a.amounts + share * b.amounts
    extent = (1.0 - share) * a.extent + share * b.extent
    content = (1.0 - share) * a.amounts * molar_energy(path, below)
    content = content + share * b.amounts * molar_energy(path, above)
    place = Place(extent, amounts, path.at(extent, T).off)
    return _state(path, T, place, content, True)


def _state(path: Path, T: float, place: Place, content: Array, plateau: bool) -> State:
    if path.V is not None:
        volume = path.V
    else:
        assert path.p is not None
        gas = float(place.amounts[path.is_gas].sum())
        volume = gas * R * T / path.p + float(place.amounts @ path.volume)
    return State(T, volume, place, content, plateau)


def account_of(path: Path, state: State, fixed: Fixed, T0: float) -> Account:
    """The energy balance of an end state, taken apart at T0 (K)."""
    X = "H" if path.V is None else "U"
    n = state.place.amounts
    at_T0 = molar_energy(path, T0)
    fed = float(path.start @ at_T0)
    heats = state.content - n * at_T0
    heating, pressing = float(heats.sum()), _pressing(path, state.place)
    dh = path.reaction.dh(T0)
    change = float(path.nu @ at_T0)
    reaction = state.place.extent * change
    held = PAIRS[fixed.pair].searched is not None
    available = fixed.values[0] - fed if held else reaction + heating + pressing
    terms = []
    if held:
        terms.append(Term(f"{X} held", fixed.values[0], "J", "given"))
    terms.append(Term(f"{X} of the feed at T0", fed, "J", f"sum of n {X.lower()}({T0:g} K) as fed"))
    if held:
        terms.append(
            Term("energy to be placed", available, "J", f"{X} held - {X} of the feed at T0")
        )
    terms.append(
        Term("reaction enthalpy at T0", dh, "J/mol", "sum of stoichiometric numbers times h(T0)")
    )
    if X == "U":
        terms += _internal(path, T0, dh, change)
    extent = state.place.extent
    terms.append(
        Term("taken up by the reaction", reaction, "J", f"{extent:.6g} mol x {change:.6g} J/mol")
    )
    for sp, amount, heat in zip(path.species, n, heats, strict=True):
        if amount > 0.0:
            how = f"{amount:.6g} mol x {heat / amount:.6g} J/mol"
            terms.append(Term(f"heating {sp.key} from T0 to T", float(heat), "J", how))
    if pressing:
        terms.append(
            Term("condensed volume under pressure", pressing, "J", "sum of n v (p - 1 bar)")
        )
    total = reaction + heating + pressing
    label = "sum of the above" if held else "heat to add to the feed at T0"
    terms.append(
        Term(label, total, "J", "reaction + heating" + (" + pressure" if pressing else ""))
    )
    terms += _gas_law(path, state)
    return Account(
        variable=X,
        terms=tuple(terms),
        available=available,
        reaction=reaction,
        heating=heating,
        pressing=pressing,
        residual=available - total,
    )


def _internal(path: Path, T0: float, dh: float, change: float) -> list[Term]:
    numbers = path.reaction.gas_change
    out = [
        Term(
            "R T0 times the gas numbers",
            R * T0 * numbers,
            "J/mol",
            f"{R:.6f} x {T0:g} x {numbers:g}",
        )
    ]
    how = "reaction enthalpy - R T0 times the gas numbers"
    solid = P0 * float(path.nu @ path.volume)
    if solid:
        out.append(
            Term("1 bar times the condensed volumes", solid, "J/mol", "sum of numbers times v")
        )
        how += " - 1 bar times the condensed volumes"
    out.append(Term("reaction internal energy at T0", change, "J/mol", how))
    assert math.isclose(change, dh - R * T0 * numbers - solid, rel_tol=1e-9, abs_tol=1e-3)
    return out


def _gas_law(path: Path, state: State) -> list[Term]:
    gas = float(state.place.amounts[path.is_gas].sum())
    if gas <= 0.0:
        return []
    solid = float(state.place.amounts @ path.volume)
    if path.V is None:
        how = f"n R T/p, n = {gas:.6g} mol" + (" + condensed volumes" if solid else "")
        return [Term("end volume", state.volume, "m3", how)]
    p = path.pressure(state.place.amounts, state.T)
    room = "V less the condensed volumes" if solid else "V"
    return [Term("end pressure", p, "Pa", f"n R T/({room}), n = {gas:.6g} mol")]
