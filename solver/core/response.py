"""How the minimum answers to a change of temperature: equilibrium heat capacities."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from solver.core.minimise import Minimum
from solver.core.mixture import Mixture

Array = NDArray[np.float64]


def amounts_by_log_T(
    mixture: Mixture, minimum: Minimum, h: Array, holds_pressure: bool
) -> Array | None:
    """dn/d(ln T) of every species (species,), the set of phases kept.

    Implicit differentiation of the balances at fixed p or fixed V. None where the response
    is not defined (a balance without a species in it).

    Parameters
    ----------
    h : ndarray, shape (species,)
        h/RT.
    """
    basis, gas = minimum.basis, minimum.gas
    members = list(basis.members)
    active = set(minimum.present.active)
    dn = np.zeros(len(minimum.n))
    n = minimum.n[gas]
    if not gas.size or not n.any():
        return dn
    reactions = basis.reactions[gas]
    rows = [k for k, m in enumerate(members) if m not in active and reactions[:, k].any()]
    part = reactions[:, rows]
    heat = h[gas] - reactions @ h[members]  # of forming each species from the components
    m = len(rows)
    if not holds_pressure:
        heat = heat - 1.0
    unknowns = m + 1 if holds_pressure else m
    effect = np.ones((gas.size, unknowns))
    effect[:, :m] = part
    if unknowns:
        J = effect.T @ (n[:, None] * effect)
        if holds_pressure:
            J[m, m] -= n.sum()
        scale = 1.0 / np.sqrt(np.maximum((effect**2).T @ n, 1e-300))
        J = J * scale[:, None] * scale
        right = -(effect.T @ (n * heat)) * scale
        try:
            x = np.linalg.solve(J, right) * scale
        except np.linalg.LinAlgError:
            return None
        if not np.all(np.isfinite(x)):
            return None
        dn_gas = n * (effect @ x + heat)
    else:
        dn_gas = n * heat
    dn[gas] = dn_gas
    for k, member in enumerate(members):
        if member in active:
            dn[member] = -float(reactions[:, k] @ dn_gas)
    return dn
