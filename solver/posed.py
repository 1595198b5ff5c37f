"""A problem as the minimiser takes it: candidates, feed and restrictions as balances."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import CHARGE, formula_vector
from solver.core.cases import Feed
from solver.core.mixture import Mixture, Shift, charge_weight, make_mixture, mixture_of
from solver.errors import InputError
from solver.restrictions import (
    FixedConversion,
    HeldApproach,
    Inert,
    NoExchange,
    Restriction,
    check_together,
)

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Posed:
    """Arrays of a problem.

    Attributes
    ----------
    mixture : Mixture
        Its species may hold one candidate twice: the inert part of a feed stands by itself.
    feed : Feed
    place : ndarray, shape (species of the mixture,)
        Column of each among the candidates given.
    """

    mixture: Mixture
    feed: Feed
    place: NDArray[np.intp]


def pose(
    species: Sequence[Species],
    fed: Sequence[Species],
    amounts: Array,
    restrictions: tuple[Restriction, ...],
) -> Posed:
    """Turn candidates, feed (cases, fed species) and restrictions into balances.

    Raises
    ------
    InputError
        A restriction contradicts another, the feed or the candidates, or no candidate holds
        an element that is fed.
    """
    columns = {sp.key: k for k, sp in enumerate(species)}
    if not restrictions:
        mixture = mixture_of(species, fed)
        _check_elements(mixture, species, fed)
        vectors = np.array([formula_vector(sp, mixture.rows) for sp in fed])
        place = np.array([columns[sp.key] for sp in mixture.species], dtype=np.intp)
        return Posed(mixture, Feed(amounts, vectors), place)
    for case in amounts:
        by_key = {sp.key: float(amount) for sp, amount in zip(fed, case, strict=True)}
        check_together(restrictions, by_key, frozenset(columns))
    return _restricted(species, fed, amounts, restrictions, columns)


def _restricted(
    species: Sequence[Species],
    fed: Sequence[Species],
    amounts: Array,
    restrictions: tuple[Restriction, ...],
    columns: dict[str, int],
) -> Posed:
    inert = {r.species: r for r in restrictions if isinstance(r, Inert)}
    conversions = {r.species: r for r in restrictions if isinstance(r, FixedConversion)}
    group_of = {
        key: number
        for number, group in enumerate((r for r in restrictions if isinstance(r, NoExchange)), 1)
        for key in group.species
    }
    rows: dict[str, int] = {}

    def row(name: str) -> int:
        return rows.setdefault(name, len(rows))

    def elements(sp: Species) -> dict[str, float]:
        """Balances that a species enters by its formula."""
        group = group_of.get(sp.key, 0)
        out = {_name(element, group): float(n) for element, n in sp.elements.items()}
        if sp.charge:
            out[CHARGE] = float(sp.charge)
        return out

    fed_rows: list[dict[str, float]] = []
    fed_amounts: list[Array] = []
    for sp, amount in zip(fed, amounts.T, strict=True):
        own = elements(sp)
        limit = inert.get(sp.key)
        if limit is not None:
            part = amount if limit.whole else _inert_part(limit, amount)
            fed_rows.append({**own, f"inert {sp.key}": 1.0})
            fed_amounts.append(part)
            amount = amount - part
        if sp.key in conversions:
            own = {**own, f"conversion of {sp.key}": 1.0 - conversions[sp.key].conversion}
        if limit is None or not limit.whole:
            fed_rows.append(own)
            fed_amounts.append(amount)
    for entry in fed_rows:
        for name in entry:
            row(name)
    held: list[Species] = []
    held_rows: list[dict[str, float]] = []
    for sp in species:
        own = elements(sp)
        if sp.key in conversions:
            own[f"conversion of {sp.key}"] = 1.0
        limit = inert.get(sp.key)
        if limit is not None:
            held.append(sp)
            held_rows.append({**elements(sp), f"inert {sp.key}": 1.0})
        if CHARGE in own:
            row(CHARGE)
        if (limit is None or not limit.whole) and all(name in rows for name in own):
            held.append(sp)
            held_rows.append(own)
    A, vectors = _matrix(held_rows, rows), _matrix(fed_rows, rows)
    extra = ("inert ", "conversion of ")
    atoms = np.array([0.0 if name.startswith(extra) else 1.0 for name in rows])
    if CHARGE in rows:
        atoms[rows[CHARGE]] = charge_weight(held)
    approaches = [r for r in restrictions if isinstance(r, HeldApproach)]
    keys = [sp.key for sp in held]
    twins = tuple(
        (len(keys) - 1 - keys[::-1].index(key), keys.index(key))
        for key in inert
        if keys.count(key) == 2
    )
    mixture = make_mixture(held, rows, A, atoms, _shifts(approaches, held), twins)
    _check_elements(mixture, species, fed)
    place = np.array([columns[sp.key] for sp in held], dtype=np.intp)
    return Posed(mixture, Feed(np.column_stack(fed_amounts), vectors), place)


def _inert_part(limit: Inert, amount: Array) -> Array:
    if limit.amount is not None:
        return np.full(amount.shape, limit.amount)
    assert limit.share is not None
    return np.asarray(limit.share * amount)


def _name(element: str, group: int) -> str:
    return element if group == 0 else f"{element} in group {group}"


def _matrix(entries: list[dict[str, float]], rows: dict[str, int]) -> Array:
    out = np.zeros((len(entries), len(rows)))
    for k, entry in enumerate(entries):
        for name, value in entry.items():
            out[k, rows[name]] = value
    return out


def _shifts(approaches: list[HeldApproach], held: list[Species]) -> tuple[Shift, ...]:
    """One carrier for each held reaction, none of them in another held reaction."""
    index = {sp.key: k for k, sp in enumerate(held)}  # the reacting one stands last
    shifts: list[Shift] = []
    for r in approaches:
        numbers = {sp.key: float(nu) for sp, nu in r.reaction.numbers.items()}
        others = {sp.key for o in approaches if o is not r for sp in o.reaction.numbers}
        free = [key for key, nu in numbers.items() if key not in others]
        free.sort(key=lambda key: numbers[key] > 0.0)  # reactants first
        key = r.key if r.key is not None else (free[0] if free else None)
        if key is None or key not in numbers:
            raise InputError(
                f"No species can carry the approach of {r.reaction.text}: every one of it is in "
                "another held reaction too. Name a key species, or hold other reactions.",
                "restrictions.approach",
                r.key,
                "a species of the reaction",
            )
        vector = np.zeros(len(held))
        for name, nu in numbers.items():
            if name not in index:
                raise InputError(
                    f"{name} of the held reaction {r.reaction.text} cannot form from this feed.",
                    "restrictions.approach",
                    name,
                    "species whose elements are fed",
                )
            vector[index[name]] = nu
        shifts.append(Shift(vector, r.dT, index[key]))
    keys = [shift.key for shift in shifts]
    if shifts and abs(np.linalg.det(np.array([s.numbers for s in shifts])[:, keys])) < 1e-9:
        raise InputError(
            "The held reactions cannot be shifted apart by their key species; "
            "name other key species.",
            "restrictions.approach",
            [held[k].key for k in keys],
            "independent key species",
        )
    return tuple(shifts)


def _check_elements(mixture: Mixture, species: Sequence[Species], fed: Sequence[Species]) -> None:
    """Every element fed must occur in a candidate that holds nothing else than is fed."""
    missing = [
        name
        for name, k in mixture.rows.items()
        if name != CHARGE and not np.any(mixture.A[:, k] > 0.0)
    ]
    if not missing:
        return
    known = {element for sp in species for element in sp.elements}
    name = min(missing, key=lambda name: name.split(" ")[0] in known)  # the plainest first
    element = name.split(" ")[0]
    source = next((sp.key for sp in fed if element in sp.elements), "the feed")
    raise InputError(
        f"No candidate holds {name}, which the feed brings in as {source}; "
        f"add a species with {element} to the candidates, made of elements that are fed.",
        "species",
        element,
        f"a candidate with {name}",
    )
