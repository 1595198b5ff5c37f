"""The public door for many cases: one batch with the guarantees of a single settling."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from solver.core.batch import minimise_many
from solver.core.batch_temperature import find_temperatures
from solver.core.cases import Cases, Feed
from solver.core.columns import rows_of
from solver.core.minimise import CRUSHING, check_room
from solver.core.mixture import Mixture, R
from solver.core.searches import Found, Searches
from solver.core.totals import totals
from solver.core.vessel import TooSmall
from solver.endstates import EndStates
from solver.errors import InputError, SettleError
from solver.fed import LEAST, MOST
from solver.fixed import PAIRS, T_HIGHEST, T_LOWEST, Pair, allowed_range, checked_value
from solver.gas_model import GasModel, gas_model
from solver.posed import Posed, pose
from solver.proof import (
    ELEMENT_LIMIT,
    ENERGY_LIMIT,
    GAP_LIMIT,
    TRACE_LIMIT,
    VOLUME_LIMIT,
    element_residuals,
    optimality_gap,
    volume_residual,
)
from solver.restrictions import Restriction
from solver.results import Results
from solver.settle import candidate_of, check_species, explained
from solver.threads import one_thread

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

_CHUNK_NUMBERS = 400_000  # cases x species worked on at once, so that memory stays bounded


def settle_many(
    species: Sequence[Species],
    feeds: Mapping[Species | str, ArrayLike],
    pair: str,
    X: ArrayLike,
    Y: ArrayLike,
    *,
    gas: str | GasModel = "ideal",
    restrictions: Sequence[Restriction] = (),
) -> EndStates:
    """Compute the end states of many cases over one list of candidates.

    Parameters
    ----------
    species : sequence of Species
        The candidates.
    feeds : mapping of Species or str to float or array_like, shape (cases,)
        mol; a string is the key of a candidate.
    pair : str
        The fixed pair, e.g. ``"T,p"``.
    X, Y : array_like, shape (cases,) or float
        The values of the pair's two variables, in its order, SI.
    gas : str or GasModel
        Gas model, as for `settle`.
    restrictions : sequence of Restriction
        What keeps the mixtures short of full equilibrium, the same for all cases.

    Returns
    -------
    EndStates
        Cases that could not be settled are marked and say why; they hold NaN.

    Raises
    ------
    InputError
        What concerns all cases is wrong: the pair, the candidates, the lengths of arrays.
    """
    model = gas_model(gas)
    check_species(species)
    if pair not in PAIRS:
        raise InputError(
            f"The fixed pair {pair!r} is not known; choose one of {', '.join(PAIRS)}.",
            "pair",
            pair,
            ", ".join(PAIRS),
        )
    fed, amounts, first, second = _aligned(species, feeds, X, Y)
    count = len(first)
    why: dict[int, str] = {}
    _mark_faults(PAIRS[pair], fed, amounts, first, second, why)
    out = Results(count, len(species))
    with one_thread():
        _settle_all(
            species, fed, amounts, PAIRS[pair], first, second, model, tuple(restrictions), out, why
        )
    return out.end_states(pair, tuple(sp.key for sp in species), why)


def _settle_all(
    species: Sequence[Species],
    fed: Sequence[Species],
    amounts: Array,
    pair: Pair,
    first: Array,
    second: Array,
    gas: GasModel,
    restrictions: tuple[Restriction, ...],
    out: Results,
    why: dict[int, str],
) -> None:
    count = len(first)
    good = np.array([i not in why for i in range(count)], dtype=bool)
    # cases that feed the same species share a mixture
    there = amounts > LEAST * amounts.max(axis=1, keepdims=True)
    alike = bool((there == there[0]).all())
    for presence in there[:1] if alike else np.unique(there[good], axis=0):
        same = good & (there == presence).all(axis=1)
        if not same.any():
            continue
        some = [sp for sp, fed_here in zip(fed, presence, strict=True) if fed_here]
        index = np.flatnonzero(same)
        try:
            posed = pose(species, some, amounts[index][:, presence], restrictions)
        except InputError as error:
            why.update({int(i): str(error) for i in index})
            continue
        size = max(_CHUNK_NUMBERS // max(len(species), 1), 50)
        for begin in range(0, len(index), size):
            part = np.arange(begin, min(begin + size, len(index)))
            rows = index[part]
            chunk = Posed(posed.mixture, posed.feed.of(part), posed.place)
            _settle_chunk(chunk, pair, first[rows], second[rows], gas, out, rows, why)


def _aligned(
    species: Sequence[Species], feeds: Mapping[Species | str, ArrayLike], X: ArrayLike, Y: ArrayLike
) -> tuple[list[Species], Array, Array, Array]:
    """Species fed, amounts (cases, fed species), and the two values, all of one length."""
    by_key = {sp.key: sp for sp in species}
    given: dict[str, ArrayLike] = {"X": X, "Y": Y}
    fed = [candidate_of(item, by_key) for item in feeds]
    given.update({f"feeds[{item}]": value for item, value in feeds.items()})
    arrays: dict[str, Array] = {}
    for name, value in given.items():
        try:
            arrays[name] = np.atleast_1d(np.asarray(value, dtype=float))
        except (TypeError, ValueError):
            raise InputError(
                f"{name} is not a number or an array of numbers.", name, value, "numbers"
            ) from None
        if arrays[name].ndim != 1:
            raise InputError(
                f"{name} has {arrays[name].ndim} dimensions; give one value a case.",
                name,
                value,
                "shape (cases,)",
            )
    count = max(len(array) for array in arrays.values())
    for name, array in arrays.items():
        if len(array) not in (1, count):
            raise InputError(
                f"{name} has {len(array)} values where others have {count}; "
                "give one value, or one a case.",
                name,
                len(array),
                f"1 or {count} values",
            )
    wide = {name: np.broadcast_to(array, (count,)) for name, array in arrays.items()}
    amounts = np.zeros((count, len({sp.key for sp in fed})))
    unique = list({sp.key: sp for sp in fed}.values())
    place = {sp.key: k for k, sp in enumerate(unique)}
    for sp, array in zip(fed, list(wide.values())[2:], strict=True):
        amounts[:, place[sp.key]] += array
    if not unique:
        raise InputError("The feed is empty; give at least one amount.", "feeds", {}, "above 0 mol")
    return unique, amounts, wide["X"], wide["Y"]


def _mark_faults(
    pair: Pair,
    fed: Sequence[Species],
    amounts: Array,
    first: Array,
    second: Array,
    why: dict[int, str],
) -> None:
    """Say of each case with impossible numbers what is wrong with it."""
    for variable, values in zip(pair.variables, (first, second), strict=True):
        low, high = allowed_range(variable)
        for i in np.flatnonzero(~((values >= low) & (values <= high) & np.isfinite(values))):
            try:
                checked_value(variable, values[i])
            except SettleError as error:
                why.setdefault(int(i), str(error))
    for i, k in zip(*np.nonzero(~((amounts >= 0.0) & (amounts <= MOST))), strict=True):
        why.setdefault(
            int(i),
            f"The amount of {fed[k].key} is {amounts[i, k]}; "
            f"give a number of moles from 0 to {MOST:.0e}.",
        )
    for i in np.flatnonzero(~(np.nan_to_num(amounts).sum(axis=1) > 0.0)):
        why.setdefault(int(i), "The feed is empty; give at least one amount above zero.")


def _settle_chunk(
    posed: Posed,
    pair: Pair,
    first: Array,
    second: Array,
    gas: GasModel,
    out: Results,
    rows: NDArray[np.intp],
    why: dict[int, str],
) -> None:
    mixture, feed = posed.mixture, posed.feed
    # the minimiser works on totals near one; a power of two changes no digit
    scale = 2.0 ** -np.round(np.log2(np.abs(feed.totals).max(axis=1)))
    feed = Feed(feed.amounts * scale[:, None], feed.vectors)
    p = None if pair.holds_volume else second
    V = second * scale if pair.holds_volume else None
    values = first if pair.searched is None else first * scale
    features = _features(feed, pair, values, p, V)
    if not gas.is_ideal and mixture.gas.size:
        from solver.real.batch import settle_real_chunk  # an ideal gas does without

        held = second if V is None else V
        chunk = Posed(mixture, feed, posed.place)
        settle_real_chunk(chunk, pair, values, held, features, scale, gas, out, rows, why)
        return
    if pair.searched is None:
        found = _at_temperature(mixture, feed, first, p, V, features)
    else:
        search = Searches(pair.searched, values, p, V, T_LOWEST, T_HIGHEST)
        found = find_temperatures(mixture, feed, search, features)
    if V is not None:
        _check_rooms(mixture, feed, found, V)
    for i, error in found.why.items():
        pair_values = (float(first[i]), float(second[i]))
        why[int(rows[i])] = str(explained(mixture, pair, pair_values, error, float(scale[i])))
    some = np.flatnonzero(found.found)
    rows, first, values, scale = rows[some], first[some], values[some], scale[some]
    all_or_some = rows_of(some, len(found.found))
    feed, T, p, n = feed.of(some), found.T[some], found.p[some], found.n[all_or_some]
    V = None if V is None else V[some]
    g = mixture.thermo.gibbs(T)
    if mixture.shifts:
        g = g + mixture.shifted(T)
    closure, trace = element_residuals(mixture, n, feed)
    gap, _ = optimality_gap(mixture, n, feed.totals, found.potentials[some], g, T, p, V)
    energy = np.zeros(len(some))
    if pair.searched is not None:
        unit = R * n.sum(axis=1) * (1.0 if pair.searched == "S" else T)
        energy = np.abs(found.functions[pair.searched][some] - values) / unit
    ok = (closure <= ELEMENT_LIMIT) & (trace <= TRACE_LIMIT) & (energy <= ENERGY_LIMIT)
    ok &= (np.abs(gap) <= GAP_LIMIT) & (n.min(axis=1) >= 0.0)
    if V is not None:
        ok &= volume_residual(mixture, n, T, p, V) <= VOLUME_LIMIT
    for k in np.flatnonzero(~ok):
        why[int(rows[k])] = (
            "An end state was found but its proof is not within the limits "
            f"(elements {closure[k]:.1e}, energy {energy[k]:.1e}, gap {gap[k]:.1e})."
        )
    good = rows[ok]
    out.settled[good] = True
    for name, array in (("T", T), ("p", p), ("energy_residual", energy), ("gap", gap)):
        out.values[name][good] = array[ok]
    out.values["element_residual"][good] = closure[ok]
    for name, function in found.functions.items():
        out.values[name][good] = function[some][ok] / scale[ok]
    kept = rows_of(np.flatnonzero(ok), len(ok))
    out.put_amounts(good, posed, n[kept] / scale[kept, None])


def _check_rooms(mixture: Mixture, feed: Feed, found: Found, V: Array) -> None:
    """Mark the vessels that are smaller than what must stay condensed in them."""
    for i in np.flatnonzero(found.found & (found.p > CRUSHING)):
        one = feed.of(np.array([i]))
        try:
            check_room(mixture, one, float(found.T[i]), found.n[i], float(found.p[i]), float(V[i]))
        except TooSmall as error:
            found.why[int(i)] = error
            found.found[i] = False


def _features(feed: Feed, pair: Pair, values: Array, p: Array | None, V: Array | None) -> Array:
    """Coordinates in which near cases have similar end states."""
    totals = feed.totals
    atoms = np.abs(totals).sum(axis=1, keepdims=True)
    share = totals / atoms
    size = atoms[:, 0]
    held = np.log(p) if p is not None else np.log(size / V)
    if pair.searched is None:
        first = 6.0 * np.log(values)
    else:  # a mole of atoms takes up about 20 J/K
        first = values / size / (20.0 if pair.searched == "S" else 5000.0)
    return np.column_stack([first, 0.3 * held, 6.0 * share])


def _at_temperature(
    mixture: Mixture, feed: Feed, T: Array, p: Array | None, V: Array | None, features: Array
) -> Found:
    """Cases whose temperature is held."""
    cases = Cases(mixture, feed, T, p, V)
    minima = minimise_many(cases, features)
    state = totals(
        minima.n, mixture.is_gas, mixture.volume, cases.g, cases.h, T, minima.p, V, mixture.twins
    )
    return Found(
        T=T,
        p=minima.p,
        n=minima.n,
        potentials=minima.potentials,
        functions={name: getattr(state, name) for name in ("V", "H", "U", "S", "G")},
        found=minima.found,
        why=minima.why,
    )
