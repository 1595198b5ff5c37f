"""What each restriction costs in free energy while the others hold.

The others are part of the problem: without one restriction the mixture would go to the least of

    F = G + RT sum shift_i n_i + RT sum (n ln n/(n + n') + n' ln n'/(n + n')),

A in place of G where the volume is held. The second term is what reactions held at an approach
add, the last one keeps an inert part n' of a gas apart from the rest n of it, as the minimiser
does; both of the restrictions that stay. The cost is how much higher in F the state lies than
that least: never below zero, for the state with all restrictions is one of those allowed without
one. Beside whole inert species, held conversions and groups, F is G or A itself.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import R
from solver.errors import SettleError
from solver.fixed import PAIRS, Fixed
from solver.posed import Posed, pose
from solver.restrictions import Cost, Restriction

if TYPE_CHECKING:
    from solver.endstate import EndState
    from species_db import Species

Array = NDArray[np.float64]


def costs(
    species: Sequence[Species],
    fed: Sequence[Species],
    amounts: Array,
    end: EndState,
    restrictions: tuple[Restriction, ...],
    settled: Callable[[Fixed, tuple[Restriction, ...]], EndState],
) -> tuple[Cost, ...]:
    """The cost of each restriction at the T and p, or T and V, of an end state.

    Parameters
    ----------
    fed, amounts : sequence of Species, and ndarray, shape (fed species,)
        The feed, mol.
    settled : callable
        The end state at a fixed pair with some restrictions.
    """
    holds_volume = PAIRS[end.fixed.pair].holds_volume
    fixed = Fixed("T,V", T=end.T, V=end.V) if holds_volume else Fixed("T,p", T=end.T, p=end.p)
    out = []
    for restriction in restrictions:
        rest = tuple(r for r in restrictions if r is not restriction)
        try:
            free = settled(fixed, rest)
            posed = pose(species, fed, amounts[None, :], rest)
            energy = _free_energy(posed, end, holds_volume) - _free_energy(
                posed, free, holds_volume
            )
        except SettleError:
            energy = float("nan")
        out.append(Cost(str(restriction), energy))
    return tuple(out)


def _free_energy(posed: Posed, state: EndState, holds_volume: bool) -> float:
    """F of a state, J, with the restrictions of a posed problem in it."""
    mixture, RT = posed.mixture, R * state.T
    n = np.array([state.amounts[sp.key] for sp in mixture.species])
    added = 0.0
    for first, second in mixture.twins:
        whole = n[first]
        row = mixture.rows[f"inert {mixture.species[second].key}"]
        n[second] = min(float(posed.feed.totals[0, row]), whole)
        n[first] = whole - n[second]
        if mixture.is_gas[first]:
            added += sum(x * np.log(x / whole) for x in (n[first], n[second]) if x > 0.0)
    if mixture.shifts:
        added += float(n @ mixture.shifted(np.array([state.T]))[0])
    free = state.U - state.T * state.S if holds_volume else state.G
    return float(free + RT * added)
