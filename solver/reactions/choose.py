"""An independent reaction set that reads well: few species, small numbers, common substances.

Every reaction with no superfluous species consists of one species and some of the species of
a set of components. Those of many component sets are listed, each is given a cost, and the
cheapest independent ones are taken. Sets of independent reactions form a matroid, so that
taking the cheapest first gives the set of the least total cost among those listed.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from itertools import combinations
from math import comb, log10
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import balance_rows, choose_members, formula_vector
from solver.reactions.balance import balanced
from solver.reactions.reaction import Reaction

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]

_MOST_ENTRIES = 400_000  # component sets x components x species, listed at once
_LARGEST_POOL = 16
_SCALES = (1, 2, 3, 4, 5, 6, 8, 10, 12)
_PER_SPECIES, _PER_NUMBER, _BROKEN, _REMADE = 3.0, 0.5, 6.0, 8.0
_RARE = 0.4
"""Cost of a species for each power of ten that its share is below one."""


USUAL = frozenset(
    "H2 O2 N2 H2O H2O(l) CO CO2 CH4 C(gr) NH3 NO SO2 SO3 H2S HCl Cl2 S(l) Ar He".split()
)
_UNUSUAL = 1.5
"""Cost of a gas of up to three atoms that is not in the list above: radicals, mostly."""


def readable_set(
    species: Sequence[Species],
    shares: Mapping[Species, float],
    used_up: Collection[Species] = (),
) -> tuple[Reaction, ...]:
    """Independent reactions among the species, as many as there are (species less rank).

    Parameters
    ----------
    species : sequence of Species
    shares : mapping of Species to float
        How abundant each is, 0 to 1; common species are preferred.
    used_up : collection of Species
        Fed species that are all but gone; a reaction that makes one from another is avoided.

    Returns
    -------
    tuple of Reaction
        In whole numbers, the terms in the usual order; which side is left is arbitrary.
    """
    rows = balance_rows(species)
    if any(sp.charge for sp in species) and "charge" not in rows:
        rows["charge"] = len(rows)
    if not rows or len(species) < 2:
        return ()
    A = np.array([formula_vector(sp, rows) for sp in species])
    order = _by_commonness(species, shares)
    members = choose_members(A, order, len(rows))
    count = len(species) - len(members)
    if count == 0:
        return ()
    rare = np.array([_rarity(sp, shares.get(sp, 0.0)) for sp in species])
    gone = np.array([sp in used_up for sp in species])
    supports = _cheapest(_square(A, members), order, members, rare, gone)
    assert len(supports) == count
    reactions = []
    for support in supports:
        numbers = balanced(_in_order([species[i] for i in support]))
        assert numbers is not None, "a minimal set of dependent species has one reaction"
        reactions.append(Reaction(tuple(numbers.items())))
    return tuple(reactions)


def _square(A: Array, members: Sequence[int]) -> Array:
    """The formulas over as many rows as are independent, (rank, species)."""
    picked = choose_members(A[list(members)].T, range(A.shape[1]), len(members))
    return A[:, picked].T.copy()


def _by_commonness(species: Sequence[Species], shares: Mapping[Species, float]) -> list[int]:
    return sorted(
        range(len(species)),
        key=lambda i: (_rarity(species[i], shares.get(species[i], 0.0)), species[i].key),
    )


def _rarity(species: Species, share: float) -> float:
    """Cost of naming a species: its scarcity, and a little for each atom."""
    scarce = min(-log10(max(share, 1e-30)), 10.0)
    atoms = sum(species.elements.values())
    odd = species.phase == "gas" and atoms <= 3 and species.key not in USUAL
    return _RARE * scarce + 0.05 * atoms + _UNUSUAL * odd


def _pool_size(rank: int, species: int) -> int:
    """How many of the commonest species components are taken from."""
    size = rank
    while (
        size < min(species, _LARGEST_POOL)
        and comb(size + 1, rank) * rank * species <= _MOST_ENTRIES
    ):
        size += 1
    return size


def _cheapest(
    B: Array, order: Sequence[int], members: Sequence[int], rare: Array, gone: NDArray[np.bool_]
) -> list[tuple[int, ...]]:
    """Supports of the cheapest independent reactions; B is (rank, species)."""
    rank, total = B.shape
    chosen = set(members)
    fill = [i for i in order if i not in chosen]
    pool = [*members, *fill[: _pool_size(rank, total) - rank]]
    sets = np.array(list(combinations(pool, rank)))
    sets = sets[np.abs(np.linalg.det(B[:, sets].transpose(1, 0, 2))) > 1e-7]
    # how many of each component make up each species, (sets, rank, species)
    B_sets = B[:, sets].transpose(1, 0, 2)
    made: Array = np.linalg.solve(B_sets, np.broadcast_to(B, (len(sets), *B.shape))).astype(float)
    made[np.abs(made) < 1e-9] = 0.0
    cost = _costs(made, rare, gone, sets)
    cost[np.arange(len(sets))[:, None], sets] = np.inf  # a component is made of itself
    pooled = np.array(pool)
    cheap = np.argsort(cost[:, pooled], axis=None, kind="stable")
    taken: list[tuple[int, ...]] = []
    kept: list[Array] = []
    seen: set[frozenset[int]] = set()

    def take(s: int, j: int) -> None:
        support = frozenset(
            [j, *(int(m) for m, c in zip(sets[s], made[s, :, j], strict=True) if c)]
        )
        if support in seen:
            return
        seen.add(support)
        vector = np.zeros(total)
        vector[sets[s]] = made[s, :, j]
        vector[j] = -1.0
        vector /= np.linalg.norm(vector)
        for _ in range(2):
            for other in kept:
                vector = vector - (vector @ other) * other
        size = float(np.linalg.norm(vector))
        if size > 1e-7:
            kept.append(vector / size)
            taken.append(tuple(sorted(support)))

    for flat in cheap:
        if len(taken) == len(pool) - rank:
            break
        s, at = divmod(int(flat), len(pool))
        if np.isfinite(cost[s, pooled[at]]):
            take(s, int(pooled[at]))
    for j in (i for i in order if i not in set(pool)):
        take(int(np.argmin(cost[:, j])), j)
    return taken


def _costs(made: Array, rare: Array, gone: NDArray[np.bool_], sets: NDArray[np.intp]) -> Array:
    """Cost of every reaction listed, (sets, species)."""
    size = np.abs(made)
    used = size > 0.0
    scale = np.zeros(made.shape[::2])
    for factor in reversed(_SCALES):
        whole = (np.abs(size * factor - np.rint(size * factor)) < 1e-6).all(axis=1)
        scale[whole] = factor
    broken = scale == 0.0
    numbers = np.where(broken, 1.0, scale) * (1.0 + size.sum(axis=1))
    named = 1.0 + used.sum(axis=1)
    scarce = rare[None, :] + np.einsum("skj,sk->sj", used.astype(float), rare[sets])
    left_over = gone[sets][:, :, None]
    remade = ((made > 0.0) & left_over).any(axis=1)
    remade &= ((made < 0.0) & left_over).any(axis=1) | gone[None, :]
    cost = _PER_SPECIES * named + scarce + _PER_NUMBER * numbers
    out: Array = cost + _BROKEN * broken + _REMADE * remade
    return out


def _in_order(species: Sequence[Species]) -> list[Species]:
    """Condensed first, then carbon, other elements, hydrogen, oxygen; electrons last."""

    def key(sp: Species) -> tuple[int, int, str]:
        elements = set(sp.elements)
        if not elements:
            kind = 9
        elif "C" in elements:
            kind = 0 if "H" in elements else 1
        elif elements - {"H", "O"}:
            kind = 2
        elif elements == {"O"}:
            kind = 5
        else:
            kind = 4 if "O" not in elements else 3
        return (0 if sp.phase != "gas" else 1, kind, sp.key)

    return sorted(species, key=key)
