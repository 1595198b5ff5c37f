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

from solver.core.cases import Feed
from solver.core.mixture import P0, Mixture, R
from solver.restrictions import Cost

Array = NDArray[np.float64]

ELEMENT_LIMIT = 1e-12
TRACE_LIMIT = 1e-9
ENERGY_LIMIT = 1e-10
GAP_LIMIT = 1e-9
VOLUME_LIMIT = 1e-9
_LEAST = 1e-300  # mol

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
    restrictions : tuple of Cost
        What was held back, and what each costs in free energy.
    stationarity : float or None
        With an equation of state: the largest |ln(y phi p/p0) + g - a.lambda| of any species in
        any fluid phase.
    tangent_distance : float or None
        The least tangent-plane distance that any trial phase came to, over RT.
    starts : int
        Trial phases tried; 0 where the bound is rigorous without any.
    """

    element_residual: float
    trace_residual: float
    energy_residual: float
    gap: float
    absent: Mapping[str, float]
    model: str = MODEL
    restrictions: tuple[Cost, ...] = ()
    stationarity: float | None = None
    tangent_distance: float | None = None
    starts: int = 0

    @property
    def rigorous(self) -> bool:
        """Whether the gap bounds every mixture of the candidates, known or not."""
        return self.starts == 0

    @property
    def holds(self) -> bool:
        """Whether every figure is within its limit."""
        return (
            self.element_residual <= ELEMENT_LIMIT
            and self.trace_residual <= TRACE_LIMIT
            and self.energy_residual <= ENERGY_LIMIT
            and -GAP_LIMIT <= self.gap <= GAP_LIMIT
        )


def element_residuals(mixture: Mixture, n: Array, feed: Feed) -> tuple[Array, Array]:
    """Worst element residual over the largest total, and over each element's own total.

    Parameters
    ----------
    n : ndarray, shape (cases, species)
    feed : Feed

    Returns
    -------
    two ndarray, shape (cases,)
    """
    size = feed.amounts @ np.abs(feed.vectors)
    error = np.abs(n @ mixture.A - feed.totals)
    largest = size.max(axis=1)
    own = error / np.where(size > 0.0, size, largest[:, None])
    return error.max(axis=1) / largest, own.max(axis=1)


def volume_residual(mixture: Mixture, n: Array, T: Array, p: Array, V: Array) -> Array:
    """|N R T/p + sum n v - V| / V (cases,): whether amounts, T, p and the volume held agree.

    Without gas and pressure the condensed phases need not fill the vessel, but must fit.
    """
    N = n[:, mixture.is_gas].sum(axis=1)
    over = n @ mixture.volume - V
    with np.errstate(divide="ignore", invalid="ignore"):
        over += np.where(N > 0.0, N * R * T / p, 0.0)
    return np.asarray(np.where((N > 0.0) | (p > 0.0), np.abs(over), np.maximum(over, 0.0)) / V)


def optimality_gap(
    mixture: Mixture,
    n: Array,
    b: Array,
    potentials: Array,
    g: Array,
    T: Array,
    p: Array,
    V: Array | None,
) -> tuple[Array, Array]:
    """Rigorous gaps over n R T, and ln activity of every candidate.

    Parameters
    ----------
    mixture : Mixture
    n : ndarray, shape (cases, species)
        Amounts, mol.
    b : ndarray, shape (cases, rows)
        Element totals.
    potentials : ndarray, shape (cases, rows)
        Element potentials over RT.
    g : ndarray, shape (cases, species)
        g/RT at 1 bar.
    T, p : ndarray, shape (cases,)
        K, Pa; p may be zero in a held volume in which nothing evaporates.
    V : ndarray, shape (cases,), or None
        The volume held, m3, or None where p is held. The bound on the Helmholtz energy is
        then b.lambda - pi V/RT for any pressure pi that the gas does not exceed.

    Returns
    -------
    gap : ndarray, shape (cases,)
    force : ndarray, shape (cases, species)
    """
    is_gas, columns, cases = mixture.is_gas, mixture.gas_columns, len(T)
    force = potentials @ mixture.A.T
    force -= g
    if not is_gas.all():
        force -= mixture.volume * ((p - P0) / (R * T))[:, None]
    atoms = mixture.A @ mixture.atoms
    with np.errstate(divide="ignore"):
        log_p = np.log(p / P0)
    log_sum = np.full(cases, -np.inf)
    if is_gas.any():
        top = force[:, columns].max(axis=1)
        shares = force[:, columns] - top[:, None]
        log_sum = top + np.log(np.exp(shares, out=shares).sum(axis=1))
    # move the potentials down until every condition holds: the bound is then rigorous
    shift = np.zeros(cases)
    if not is_gas.all():
        shift = np.maximum(shift, (force[:, ~is_gas] / atoms[~is_gas]).max(axis=1))
    vessel = np.zeros(cases)
    if V is not None:
        # pi may be as large as the gas asks for, at a cost of (pi - p) V
        vessel = np.maximum(P0 * np.exp(log_sum) - p, 0.0) * V / (R * T)
    elif is_gas.any():
        shift = np.maximum(shift, (log_sum - log_p) / min(float(atoms[is_gas].min()), 1.0))
    force[:, columns] -= np.where(np.isfinite(log_p), log_p, 0.0)[:, None]
    gas = n[:, columns]
    N = np.maximum(gas.sum(axis=1, keepdims=True), _LEAST)
    shares = np.maximum(gas, _LEAST)  # what is not there has a logarithm of no account
    shares /= N
    excess = -force
    excess[:, columns] += np.log(shares, out=shares)
    gap = np.einsum("ij,ij->i", n, excess) + ((n @ mixture.A - b) * potentials).sum(axis=1)
    gap += shift * (b @ mixture.atoms) + vessel
    return gap / n.sum(axis=1), force
