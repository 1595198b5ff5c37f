"""The figures that let a reviewer trust an end state, computed apart from the minimiser.

Only amounts, element potentials and the species' own g enter. Any potentials lambda that
satisfy ln sum_gas exp(a_i.lambda - g_i) <= ln(p/p0) and a_c.lambda <= g_c bound the Gibbs
energy of every mixture of the candidates from below by b.lambda (weak duality of the convex
problem), so the distance of G from that bound limits how much better any state could be.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.mixture import P0, Mixture, R

Array = NDArray[np.float64]

ELEMENT_LIMIT = 1e-12
TRACE_LIMIT = 1e-9
ENERGY_LIMIT = 1e-10
GAP_LIMIT = 1e-9

MODEL = (
    "Ideal gas mixture; each condensed species a pure phase of constant molar volume v, "
    "which counts in V and as v (p - 1 bar) in its Gibbs energy."
)


@dataclass(frozen=True, slots=True)
class Proof:
    """Closure and optimality of one end state.

    Attributes
    ----------
    element_residual : float
        max |A n - b| / max |b|.
    trace_residual : float
        The worst residual of any element relative to its own amount.
    energy_residual : float
        |X - X fixed| / (n R T), for S over (n R); 0 for pairs with no energy or entropy.
    gap : float
        (G - lower bound) / (n R T): no mixture of the candidates lies lower than this.
    absent : mapping of str to float
        Activity of each condensed candidate that did not form.
    model : str
        What was assumed of gas and condensed phases.
    """

    element_residual: float
    trace_residual: float
    energy_residual: float
    gap: float
    absent: Mapping[str, float]
    model: str = MODEL

    @property
    def holds(self) -> bool:
        """Whether every figure is within its limit."""
        return (
            self.element_residual <= ELEMENT_LIMIT
            and self.trace_residual <= TRACE_LIMIT
            and self.energy_residual <= ENERGY_LIMIT
            and -GAP_LIMIT <= self.gap <= GAP_LIMIT
        )


def element_residuals(
    mixture: Mixture, n: Array, feed: Array, vectors: Array
) -> tuple[float, float]:
    """Worst element residual over the largest total, and over each element's own total."""
    b = feed @ vectors
    size = feed @ np.abs(vectors)
    error = np.abs(n @ mixture.A - b)
    largest = float(size.max())
    own = np.where(size > 0.0, error / np.where(size > 0.0, size, 1.0), error / largest)
    return float(error.max()) / largest, float(own.max())


def optimality_gap(
    mixture: Mixture,
    n: Array,
    b: Array,
    potentials: Array,
    g: Array,
    T: float,
    p: float,
    V: float | None,
) -> tuple[float, Array]:
    """Rigorous gap over n R T, and ln activity of every candidate.

    Parameters
    ----------
    mixture : Mixture
    n : ndarray, shape (species,)
        Amounts, mol.
    b : ndarray, shape (rows,)
        Element totals.
    potentials : ndarray, shape (rows,)
        Element potentials over RT.
    g : ndarray, shape (species,)
        g/RT at 1 bar.
    T, p : float
        K, Pa; p may be zero in a held volume in which nothing evaporates.
    V : float or None
        The volume held, m3, or None where p is held. The bound on the Helmholtz energy is
        then b.lambda - pi V/RT for any pressure pi that the gas does not exceed.
    """
    is_gas = mixture.is_gas
    force = mixture.A @ potentials - g - mixture.volume * ((p - P0) / (R * T))
    atoms = mixture.A @ mixture.atoms
    log_p = float(np.log(p / P0)) if p > 0.0 else -np.inf
    log_sum = -np.inf
    if is_gas.any():
        top = float(force[is_gas].max())
        log_sum = top + float(np.log(np.exp(force[is_gas] - top).sum()))
    # move the potentials down until every condition holds: the bound is then rigorous
    shift = 0.0
    if not is_gas.all():
        shift = max(shift, float((force[~is_gas] / atoms[~is_gas]).max()))
    vessel = 0.0
    if V is not None:
        # pi may be as large as the gas asks for, at a cost of (pi - p) V
        vessel = max(P0 * float(np.exp(log_sum)) - p, 0.0) * V / (R * T)
    elif is_gas.any():
        shift = max(shift, (log_sum - log_p) / min(float(atoms[is_gas].min()), 1.0))
    if log_p > -np.inf:
        force[is_gas] -= log_p
    gas = n[is_gas]
    N = float(gas.sum())
    some = gas > 0.0
    mixing = np.zeros(gas.size)
    mixing[some] = np.log(gas[some] / N)
    excess = -force
    excess[is_gas] += mixing
    gap = float(n @ excess) + float((n @ mixture.A - b) @ potentials)
    gap += shift * float(b @ mixture.atoms) + vessel
    return gap / float(n.sum()), force
