"""Residual properties of a fluid phase: what the equation of state adds to the ideal gas.

Everything follows from F = G_res / RT of the moments M = n @ q. With ' for T d/dT at fixed p and n:

    ln phi = q grad F                     H_res / RT = -F' = -grad F . (n @ qT)
    p V_res / RT = grad F . (n @ qp)      cp_res / R = -(F' + F'')

"Residual" is against the ideal gas of the same T, p and amounts. A species that is not modelled
has phi = 1 and adds nothing. Shapes: T, p (cases,) in K and Pa, n (cases, S) in mol.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.gas.fluid import Fluid, Moments
from solver.gas.residual import Residual
from species_db.species import R

Array = NDArray[np.float64]


@dataclass(frozen=True)
class ResidualProperties:
    """Residual properties of each case, arrays (cases,), for the amounts given.

    G, H, U in J, S and cp in J/K, V_res in m3; V in m3 is the volume itself and
    Z = p V / (n R T) the compressibility factor of the whole phase.
    """

    G: Array
    H: Array
    S: Array
    U: Array
    cp: Array
    V_res: Array
    V: Array
    Z: Array


def ln_phi(fluid: Fluid, T: Array, p: Array, n: Array, root: str = "least") -> Array:
    """Logarithm of the fugacity coefficients, (cases, S)."""
    moments, _, at = _evaluated(fluid, T, p, n, root)
    return _each(moments.q, at.grad)


def dlnphi_dT(fluid: Fluid, T: Array, p: Array, n: Array, root: str = "least") -> Array:
    """Change of ln phi with T at fixed p and n, (cases, S), 1/K."""
    moments, _, at = _evaluated(fluid, T, p, n, root)
    moved = np.einsum("cij,cj->ci", at.hess, _sum(n, moments.qT))
    return (_each(moments.qT, at.grad) + _each(moments.q, moved)) / T[:, None]


def dlnphi_dp(fluid: Fluid, T: Array, p: Array, n: Array, root: str = "least") -> Array:
    """Change of ln phi with p at fixed T and n, (cases, S), 1/Pa."""
    moments, _, at = _evaluated(fluid, T, p, n, root)
    moved = np.einsum("cij,cj->ci", at.hess, _sum(n, moments.qp))
    return (_each(moments.qp, at.grad) + _each(moments.q, moved)) / p[:, None]


def dlnphi_dn(fluid: Fluid, T: Array, p: Array, n: Array, root: str = "least") -> Array:
    """Change of ln phi_i with n_j at fixed T, p, symmetric (cases, S, S), 1/mol."""
    moments, _, at = _evaluated(fluid, T, p, n, root)
    return np.asarray(moments.q @ at.hess @ moments.q.transpose(0, 2, 1))


def residual_properties(
    fluid: Fluid, T: Array, p: Array, n: Array, root: str = "least"
) -> ResidualProperties:
    """All residual properties of the phase at once."""
    moments, M, at = _evaluated(fluid, T, p, n, root)
    M_T, M_TT = _sum(n, moments.qT), _sum(n, moments.qTT)
    F_T = _dot(at.grad, M_T)
    F_TT = _dot(at.grad, M_TT) + np.einsum("ci,cij,cj->c", M_T, at.hess, M_T)
    volume_ideal = R * T / p
    G, H = R * T * at.F, -R * T * F_T
    V_res = volume_ideal * _dot(at.grad, _sum(n, moments.qp))
    total = n.sum(axis=1)
    # from Z itself: in a liquid V is a small rest of the ideal volume
    amount = total - M[:, 0] + M[:, 0] * at.Z
    return ResidualProperties(
        G=G,
        H=H,
        S=(H - G) / T,
        U=H - p * V_res,
        cp=-R * (F_T + F_TT),
        V_res=V_res,
        V=volume_ideal * amount,
        Z=amount / np.where(total > 0.0, total, 1.0),
    )


def _evaluated(
    fluid: Fluid, T: Array, p: Array, n: Array, root: str
) -> tuple[Moments, Array, Residual]:
    moments = fluid.at(T, p)
    M = _sum(n, moments.q)
    return moments, M, fluid.residual(M, root)


def _sum(n: Array, q: Array) -> Array:
    return np.asarray(np.einsum("cs,csm->cm", n, q))


def _each(q: Array, grad: Array) -> Array:
    return np.asarray(np.einsum("csm,cm->cs", q, grad))


def _dot(first: Array, second: Array) -> Array:
    return np.asarray(np.einsum("cm,cm->c", first, second))
