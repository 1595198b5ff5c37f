"""A chunk of real cases for `settle_many`, held to the proof of a single one."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.fixed import Pair
from solver.gas_model import GasModel
from solver.posed import Posed
from solver.real.answer import figures, judged, real_mixture
from solver.real.problem import SLOTS
from solver.real.search import find_states
from solver.results import Results
from solver.settle import explained

Array = NDArray[np.float64]
Indices = NDArray[np.intp]


def settle_real_chunk(
    posed: Posed,
    pair: Pair,
    first: Array,
    second: Array,
    features: Array,
    scale: Array,
    gas: GasModel,
    out: Results,
    rows: Indices,
    why: dict[int, str],
) -> None:
    """Settle the cases of one candidate list and put them among the results.

    Parameters
    ----------
    first, second : ndarray, shape (cases,)
        The pair's values in the scale of the feed.
    scale : ndarray, shape (cases,)
        What the feed was multiplied by.
    rows : ndarray of int
        Where the cases stand in `out`.
    """
    real = real_mixture(posed, gas)
    found = find_states(real, posed.feed, pair, first, second, features)
    for i, error in found.why.items():
        size = float(scale[i])
        values = (
            float(first[i]) / (size if pair.searched else 1.0),
            float(second[i]) / (size if pair.holds_volume else 1.0),
        )
        why[int(rows[i])] = str(explained(posed.mixture, pair, values, error, size))
    state = judged(real, posed.feed, pair, first, second, found)
    ok = state.holds
    for k in np.flatnonzero(~ok):
        why[int(rows[state.which[k]])] = (
            "An end state was found but its proof is not within the limits "
            f"({figures(state, int(k))})."
        )
    some = state.which[ok]
    good = rows[some]
    out.settled[good] = True
    own = {"T": state.cases.T[ok], "p": state.cases.p[ok], "gap": state.proof.gap[ok]}
    own |= {"element_residual": state.elements[ok], "energy_residual": state.energy[ok]}
    own |= {name: array[some] / scale[some] for name, array in found.totals.items()}
    for name, array in own.items():
        out.values[name][good] = array
    out.put_amounts(good, posed, state.n[ok] / scale[some][:, None])
    for slot in range(1, len(SLOTS)):
        amounts = state.fluids[ok, slot] / scale[some][:, None]
        if amounts.any():
            out.put_liquid(SLOTS[slot], good, posed, amounts)
