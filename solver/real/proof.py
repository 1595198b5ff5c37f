"""The figures that let a reviewer trust a real end state.

Only amounts, potentials, the species' own g and the equation of state enter, and the least
distance that the tangent-plane test came to at the same potentials. For every species in
every fluid phase ln(y phi p/p0) + g must equal a.lambda: that is the stationarity. The Gibbs
energy of the state then lies over b.lambda by the gap. It is the least only if no phase of any
composition lies below the tangent plane, which the starts of the test look for and cannot
exclude: no better state found, no rigorous bound.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.real.problem import ROOTS, RealCases
from solver.real.stability import STARTS

Array = NDArray[np.float64]

STATIONARITY_LIMIT = 1e-9
_FAINT = 1e-280


@dataclass(frozen=True)
class RealProof:
    """Arrays (cases,).

    Attributes
    ----------
    stationarity : ndarray
        Largest |ln(y phi p/p0) + g - a.lambda| over the species of all fluid phases, weighted
        by nothing: traces count like the rest.
    distance : ndarray
        Least tangent-plane distance found, in RT.
    gap : ndarray
        (G - b.lambda, lowered by what the test found) / (n R T).
    force : ndarray, shape (cases, species)
        ln activity of every species at the potentials.
    """

    stationarity: Array
    distance: Array
    gap: Array
    force: Array
    starts: int = STARTS


def prove(
    cases: RealCases, fluids: Array, n: Array, potentials: Array, distance: Array
) -> RealProof:
    """Judge states by their amounts and potentials.

    Parameters
    ----------
    fluids : ndarray, shape (cases, slots, gas species)
    n : ndarray, shape (cases, species)
    potentials : ndarray, shape (cases, rows)
    distance : ndarray, shape (cases,)
        What the tangent-plane test came to at these potentials.
    """
    mixture, gas = cases.mixture, cases.gas
    force = potentials @ mixture.A.T - cases.ideal.c
    d = force[:, gas]
    stationarity = np.zeros(len(cases))
    excess = -np.where(mixture.is_gas, 0.0, n * force).sum(axis=1)
    for slot, root in enumerate(ROOTS):
        amounts = fluids[:, slot]
        if not amounts.any():
            continue
        N = amounts.sum(axis=1, keepdims=True)
        residual = cases.fluid.residual(cases.moments(amounts), root)
        log_phi = cases.log_phi(residual.grad[:, None])[:, 0]
        with np.errstate(divide="ignore", invalid="ignore"):
            off = np.where(amounts > 0.0, np.log(amounts / N) + log_phi - d, 0.0)
        seen = amounts > _FAINT
        stationarity = np.maximum(stationarity, np.abs(np.where(seen, off, 0.0)).max(axis=1))
        excess += (amounts * off).sum(axis=1)
    atoms = mixture.A @ mixture.atoms
    shift = np.zeros(len(cases))
    condensed = cases.real.condensed
    if condensed.size:
        shift = np.maximum(shift, (force[:, condensed] / atoms[condensed]).max(axis=1))
    if gas.size:
        least = min(float(atoms[gas].min()), 1.0)
        shift = np.maximum(shift, -distance / least)
    b = cases.feed.totals
    gap = excess + ((n @ mixture.A - b) * potentials).sum(axis=1) + shift * (b @ mixture.atoms)
    return RealProof(stationarity, distance, gap / n.sum(axis=1), force)
