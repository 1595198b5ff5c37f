"""The public door: compute the end state of one case."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from types import MappingProxyType
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

import species_db
from solver.core.cases import Feed
from solver.core.direct import seek_temperature
from solver.core.minimise import NotHeld, Unsettled, check_room
from solver.core.mixture import Held, Mixture, R
from solver.core.temperature import OutOfReach, Point, Search, point_at
from solver.core.vessel import TooSmall
from solver.costs import costs
from solver.endstate import PRESENT, EndState
from solver.errors import InputError, NoEndState, NotProven, SettleError
from solver.fed import LEAST, checked_amount
from solver.fixed import PAIRS, T_HIGHEST, T_LOWEST, Fixed, Pair
from solver.gas_model import GasModel, gas_model
from solver.posed import Posed, pose
from solver.proof import (
    MODEL,
    VOLUME_LIMIT,
    Proof,
    element_residuals,
    optimality_gap,
    volume_residual,
)
from solver.restrictions import Restriction
from solver.supercritical import above_critical

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

_WORDS = {"H": "enthalpy", "U": "internal energy", "S": "entropy"}


def settle(
    species: Sequence[Species],
    feed: Mapping[Species | str, float],
    fixed: Fixed,
    *,
    gas: str | GasModel = "ideal",
    restrictions: Sequence[Restriction] = (),
) -> EndState:
    """Compute where the feed ends up among the candidates.

    Parameters
    ----------
    species : sequence of Species
        The candidates: what may be present at the end.
    feed : mapping of Species or str to float
        mol; a string is the key of a candidate. Less than 1e-250 of the largest counts as
        nothing.
    fixed : Fixed
        The pair of state variables held.
    gas : str or GasModel
        Gas model: ``"ideal"``, ``"srk"`` (Soave-Redlich-Kwong) or ``"pr"`` (Peng-Robinson); a
        `GasModel` brings interaction parameters of your own.
    restrictions : sequence of Restriction
        What keeps the mixture short of full equilibrium.

    Returns
    -------
    EndState
        Its proof is within the limits in `solver.proof`.

    Raises
    ------
    InputError
        A field is wrong; `field`, `value` and `allowed` say which and how.
    NoEndState
        No temperature in the allowed range has the energy or entropy held.
    NotProven
        A state was found whose proof fails; it is not returned.
    """
    held_back = tuple(restrictions)
    model = gas_model(gas)
    end = _settled(species, feed, fixed, model, held_back)
    if not held_back:
        return end
    fed, amounts = _checked_feed(species, feed)

    def settled(at: Fixed, rest: tuple[Restriction, ...]) -> EndState:
        return _settled(species, feed, at, model, rest)

    prices = costs(species, fed, amounts, end, held_back, settled)
    return replace(end, proof=replace(end.proof, restrictions=prices))


def _settled(
    species: Sequence[Species],
    feed: Mapping[Species | str, float],
    fixed: Fixed,
    gas: GasModel,
    restrictions: tuple[Restriction, ...],
) -> EndState:
    """The end state, without what its restrictions cost."""
    fed, amounts = _checked_feed(species, feed)
    posed = pose(species, fed, amounts[None, :], restrictions)
    mixture = posed.mixture
    # the minimiser works on totals near one; a power of two changes no digit
    scale = 2.0 ** -round(float(np.log2(np.abs(posed.feed.totals).max())))
    scaled = Feed(posed.feed.amounts * scale, posed.feed.vectors)
    try:
        if not gas.is_ideal and mixture.gas.size:
            from solver.real.answer import settle_real  # an ideal gas does without

            return settle_real(posed, species, fixed, gas, scale, scaled)
        point = _find(mixture, scaled, fixed, scale)
        if PAIRS[fixed.pair].holds_volume:
            V = fixed.values[1] * scale
            check_room(mixture, scaled, point.T, point.n, point.p, V)
    except LOST as error:
        raise explained(mixture, PAIRS[fixed.pair], fixed.values, error, scale) from None
    return _end_state(posed, species, scaled, point, fixed, gas, scale)


def _checked_feed(
    species: Sequence[Species], feed: Mapping[Species | str, float]
) -> tuple[list[Species], Array]:
    by_key = check_species(species)
    gathered: dict[Species, float] = {}
    for item, amount in feed.items():
        sp = candidate_of(item, by_key)
        number = checked_amount(sp.key, amount)
        if number > 0.0:
            gathered[sp] = gathered.get(sp, 0.0) + number
    if not gathered:
        raise InputError(
            "The feed is empty; give at least one amount above zero.", "feed", 0.0, "above 0 mol"
        )
    least = LEAST * max(gathered.values())
    counted = {sp: amount for sp, amount in gathered.items() if amount > least}
    return list(counted), np.array(list(counted.values()))


def check_species(species: Sequence[Species]) -> dict[str, Species]:
    """The candidates by key; refuses an empty list and a species listed twice."""
    if not species:
        raise InputError(
            "There are no candidates; choose at least one species that may be present.",
            "species",
            (),
            "one or more species",
        )
    by_key = {sp.key: sp for sp in species}
    if len(by_key) < len(species):
        keys = [sp.key for sp in species]
        twice = next(key for key in keys if keys.count(key) > 1)
        raise InputError(
            f"The candidate {twice} is listed twice; remove one.", "species", twice, "each once"
        )
    return by_key


def candidate_of(item: Species | str, by_key: Mapping[str, Species]) -> Species:
    """The species that an entry of a feed names."""
    if not isinstance(item, str):
        return item
    key = _resolved(item, by_key)
    if key not in by_key:
        raise InputError(
            f"The feed holds {item}, which is not the key of a candidate; "
            "add it to the candidates or give the Species itself.",
            f"feed[{item}]",
            item,
            "a candidate's key or a Species",
        )
    return by_key[key]


def _resolved(text: str, by_key: Mapping[str, Species]) -> str:
    """The key of the candidate that another name or spelling stands for, else the text."""
    if text not in by_key:
        try:
            key = species_db.load()[text].key
        except KeyError:
            return text
        return key if key in by_key else text
    return text


LOST = (NotHeld, OutOfReach, TooSmall, Unsettled, np.linalg.LinAlgError)
"""What the search raises when a case has no end state or none is found."""


def explained(
    mixture: Mixture, pair: Pair, values: tuple[float, float], error: Exception, scale: float
) -> SettleError:
    """What the search came upon, in words and with the field to change."""
    if isinstance(error, NotHeld):
        names = list(mixture.rows)
        open_rows = ", ".join(names[k] for k in error.rows)
        loosen = " or loosen the restrictions" if any(" " in name for name in names) else ""
        return InputError(
            "No mixture of the candidates has the elements of the feed in their proportion "
            f"(the balance of {open_rows} stays open); "
            f"add a candidate that can take up the rest{loosen}.",
            "species",
            open_rows,
            "candidates that can hold the feed",
        )
    if isinstance(error, TooSmall):
        needed = error.needed / scale
        return InputError(
            f"The vessel of {values[1]:.6g} m3 is smaller than {error.what} "
            f"({needed:.6g} m3); enlarge V or feed less.",
            "fixed.V",
            values[1],
            f"above {needed:.6g} m3",
        )
    if isinstance(error, OutOfReach):
        return _out_of_reach(pair, values[0], error)
    return NotProven(
        f"No end state could be proven for this case ({error}); "
        "leave out candidates that do not matter, or change the fixed values slightly.",
        "fixed",
        values,
    )


def _out_of_reach(pair: Pair, value: float, error: OutOfReach) -> NoEndState:
    variable = pair.variables[0]
    word = _WORDS[variable]
    if error.side == "below":
        text = (
            f"No end state above {T_LOWEST:g} K has so little {word} ({value:.6g}); "
            f"raise {variable} or take away less heat."
        )
        allowed = f"{variable} of the mixture at {T_LOWEST:g} K or more"
    else:
        text = (
            f"No end state below {T_HIGHEST:g} K has so much {word} ({value:.6g}); "
            f"lower {variable} or add less heat."
        )
        allowed = f"{variable} of the mixture at {T_HIGHEST:g} K or less"
    return NoEndState(text, f"fixed.{variable}", value, allowed)


def _find(mixture: Mixture, feed: Feed, fixed: Fixed, scale: float) -> Point:
    pair = PAIRS[fixed.pair]
    second = fixed.values[1]
    p = None if pair.holds_volume else second
    V = second * scale if pair.holds_volume else None
    if pair.searched is None:
        return point_at(mixture, feed, Held(fixed.values[0], p=p, V=V), None, None)
    search = Search(pair.searched, fixed.values[0] * scale, p, V, T_LOWEST, T_HIGHEST)
    return seek_temperature(mixture, feed, search)


def _end_state(
    posed: Posed,
    species: Sequence[Species],
    feed: Feed,
    point: Point,
    fixed: Fixed,
    gas: GasModel,
    scale: float,
) -> EndState:
    T, p, n, mixture = point.T, point.p, point.n, posed.mixture
    closures, traces = element_residuals(mixture, n[None, :], feed)
    closure, trace = float(closures[0]), float(traces[0])
    V = np.array([fixed.values[1] * scale]) if PAIRS[fixed.pair].holds_volume else None
    gaps, forces = optimality_gap(
        mixture,
        n[None, :],
        feed.totals,
        point.potentials[None, :],
        mixture.thermo.gibbs(np.array([T])) + mixture.shifted(np.array([T])),
        np.array([T]),
        np.array([p]),
        V,
    )
    gap, force = float(gaps[0]), forces[0]
    absent = {sp.key: 0.0 for sp in species if sp.phase != "gas"}
    for sp, amount, f in zip(mixture.species, n, force, strict=True):
        if sp.phase != "gas":
            if amount > 0.0:
                absent.pop(sp.key, None)
            elif sp.key in absent:
                absent[sp.key] = float(np.exp(min(f, 0.0)))
    proof = Proof(
        element_residual=closure,
        trace_residual=trace,
        energy_residual=_energy_residual(fixed, point, n, scale),
        gap=gap,
        absent=MappingProxyType(absent),
        model=_model(mixture, n),
    )
    fills = True
    if V is not None:
        off = volume_residual(mixture, n[None, :], np.array([T]), np.array([p]), V)
        fills = bool(off[0] <= VOLUME_LIMIT)
    if not proof.holds or not fills or n.min() < 0.0:
        raise NotProven(
            "An end state was found but its proof is not within the limits "
            f"(elements {closure:.1e}, trace elements {trace:.1e}, "
            f"energy {proof.energy_residual:.1e}, gap {gap:.1e}); it is not shown.",
            "fixed",
            fixed,
        )
    amounts = {sp.key: 0.0 for sp in species}
    for sp, amount in zip(mixture.species, n, strict=True):
        amounts[sp.key] += float(amount / scale)
    named = n > PRESENT * n.sum()
    thermo = mixture.thermo
    outside = named & ((thermo.T_min > T) | (thermo.T_max < T))
    present = [sp for sp, amount in zip(mixture.species, n, strict=True) if amount > 0.0]
    return EndState(
        T=T,
        p=p,
        V=point.value("V") / scale,
        H=point.value("H") / scale,
        U=point.value("U") / scale,
        S=point.value("S") / scale,
        G=point.value("G") / scale,
        amounts=MappingProxyType(amounts),
        species=tuple(species),
        fixed=fixed,
        gas=gas.key,
        model=gas,
        cautions=above_critical(present, species, T),
        proof=proof,
        outside_range=tuple(mixture.species[i].key for i in np.flatnonzero(outside)),
    )


def _model(mixture: Mixture, n: Array) -> str:
    """What was assumed, with the condensed species whose volume is an estimate."""
    named = [
        sp.key
        for sp, amount in zip(mixture.species, n, strict=True)
        if amount > 0.0 and "volume_estimated" in sp.flags
    ]
    return f"{MODEL} The molar volume of {', '.join(named)} is estimated." if named else MODEL


def _energy_residual(fixed: Fixed, point: Point, n: Array, scale: float) -> float:
    variable = PAIRS[fixed.pair].searched
    if variable is None:
        return 0.0
    unit = R * float(n.sum()) * (1.0 if variable == "S" else point.T)
    return abs(point.value(variable) - fixed.values[0] * scale) / unit
