"""How minima answer to a change of temperature: equilibrium heat capacities."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis
from solver.core.mixture import Mixture

Array = NDArray[np.float64]


def by_log_T(
    mixture: Mixture,
    basis: Basis,
    active: Sequence[int],
    n: Array,
    h: Array,
    holds_pressure: bool,
) -> tuple[Array, Array, Array]:
    """Derivatives by ln T at a set of phases that is kept.

    Implicit differentiation of the balances at fixed p or fixed V; what condensed phases
    take of a held volume is left out, which slows a search but changes no answer.

    Parameters
    ----------
    n, h : ndarray, shape (cases, species)
        Amounts of minima, mol, and h/RT.

    Returns
    -------
    dn : ndarray, shape (cases, species)
    dlog_a : ndarray, shape (cases, components)
    dnu : ndarray, shape (cases,)
    """
    gas, members = mixture.gas, list(basis.members)
    taken = set(active)
    count = len(n)
    dn, dlog_a, dnu = np.zeros(n.shape), np.zeros((count, len(members))), np.zeros(count)
    if not gas.size:
        return dn, dlog_a, dnu
    reactions = basis.reactions[gas]
    rows = [k for k, m in enumerate(members) if m not in taken and reactions[:, k].any()]
    m = len(rows)
    amounts = n[:, gas]
    heat = h[:, gas] - h[:, members] @ reactions.T  # of forming each from the components
    if not holds_pressure:
        heat = heat - 1.0
    unknowns = m + 1 if holds_pressure else m
    effect = np.ones((gas.size, unknowns))
    effect[:, :m] = reactions[:, rows]
    change = heat
    if unknowns:
        pairs = (effect[:, :, None] * effect[:, None, :]).reshape(gas.size, -1)
        J = (amounts @ pairs).reshape(count, unknowns, unknowns)
        diagonal = np.einsum("ikk->ik", J).copy()
        if holds_pressure:
            J[:, m, m] -= amounts.sum(axis=1)
        scale = 1.0 / np.sqrt(np.maximum(diagonal, 1e-300))
        J = J * scale[:, :, None] * scale[:, None, :]
        J[:, range(unknowns), range(unknowns)] += 1e-13
        right = -((amounts * heat) @ effect) * scale
        try:
            x = np.linalg.solve(J, right[:, :, None])[:, :, 0] * scale
        except np.linalg.LinAlgError:
            return dn, dlog_a, dnu
        change = x @ effect.T + heat
        dlog_a[:, rows] = x[:, :m]
        if holds_pressure:
            dnu = x[:, m]
    dn[:, gas] = amounts * change
    for k, member in enumerate(members):
        if member in taken:
            dn[:, member] = -(dn[:, gas] @ reactions[:, k])
    return dn, dlog_a, dnu
