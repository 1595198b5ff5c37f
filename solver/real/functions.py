"""State functions of real mixtures and how minima answer to T and p."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from solver.core.basis import Basis
from solver.core.mixture import P0, R
from solver.core.totals import Totals, totals
from solver.real.problem import ROOTS, RealCases
from solver.real.states import PhaseSet

Array = NDArray[np.float64]


def state_functions(cases: RealCases, fluids: Array, n: Array) -> Totals:
    """V, H, U, S, G of given amounts at T and p, computed from the amounts alone.

    Parameters
    ----------
    fluids : ndarray, shape (cases, slots, gas species)
        Amounts in each fluid phase, mol.
    n : ndarray, shape (cases, species)
        Amounts over all phases; the condensed ones are read from here.
    """
    ideal, mixture, T, p = cases.ideal, cases.mixture, cases.T, cases.p
    RT = R * T
    V, H, S = n @ mixture.volume, np.zeros(len(T)), np.zeros(len(T))
    for slot, root in enumerate(ROOTS):
        part = n.copy() if slot == 0 else np.zeros(n.shape)
        part[:, cases.gas] = fluids[:, slot]
        if slot and not part.any():
            continue
        state = totals(
            part, mixture.is_gas, mixture.volume, ideal.g, ideal.h, T, p, None, mixture.twins
        )
        H, S = H + state.H, S + state.S
        amounts = fluids[:, slot]
        residual = cases.fluid.residual(cases.moments(amounts), root)
        heat = -_times(residual.grad, amounts, cases.qT)
        # from Z itself: a liquid takes but a small part of the ideal volume
        V += RT / p * amounts.sum(axis=1) * residual.Z
        H += RT * heat
        S += R * (heat - residual.F)
    return Totals(V=V, H=H, U=H - p * V, S=S, G=H - T * S)


def _times(grad: Array, n: Array, q: Array) -> Array:
    return np.asarray((grad * (n[:, None, :] @ q)[:, 0]).sum(axis=1))


@dataclass(frozen=True)
class Response:
    """Derivatives of minima by ln T at fixed p, and by ln p at fixed T, phases kept.

    Attributes
    ----------
    H_T, V_T, H_p, V_p : ndarray, shape (cases,)
        J and m3.
    log_a, nu, theta : tuple of two ndarray
        Of the unknowns, by ln T and by ln p, as in `Minima`.
    """

    H_T: Array
    V_T: Array
    H_p: Array
    V_p: Array
    log_a: tuple[Array, Array]
    nu: tuple[Array, Array]
    theta: tuple[Array, Array]


def respond(cases: RealCases, chosen: PhaseSet, fluids: Array, n: Array) -> Response:
    """Implicit differentiation of the balances of cases that share their phases.

    Parameters
    ----------
    fluids : ndarray, shape (cases, fluids of the set, gas species)
    n : ndarray, shape (cases, species)
    """
    basis, q = cases.mixture.basis(chosen.members), cases.q
    a, rows = basis.reactions[cases.gas], chosen.rows
    count, r, m, F = len(cases), len(rows), q.shape[2], len(chosen.fluids)
    own = a[:, rows]
    powers = np.array([0.0, 1.0, *[0.5] * (m - 2)])  # of p in each moment
    unknowns = r + F * (1 + m)
    J, right = np.zeros((count, unknowns, unknowns)), np.zeros((count, unknowns, 2))
    direct = _direct(cases, basis)  # of ln n at fixed unknowns, but for theta
    residuals, explicit = [], []
    for f, slot in enumerate(chosen.fluids):
        amounts = fluids[:, f]
        N = amounts.sum(axis=1)
        residual = cases.fluid.residual((amounts[:, None, :] @ q)[:, 0], ROOTS[slot])
        residuals.append(residual)
        moved = np.stack([cases.qT, cases.qp], axis=-1)  # (cases, gases, moments, 2)
        e = direct - np.einsum("cgmx,cm->cgx", moved, residual.grad)
        explicit.append(e)
        at = r + F + f * m
        theta = slice(at, at + m)
        n_a = amounts[:, :, None] * own
        n_q = amounts[:, :, None] * q
        J[:, :r, :r] += own.T @ n_a
        J[:, :r, r + f] = n_a.sum(axis=1)
        J[:, :r, theta] = -(own.T @ n_q)
        J[:, r + f, :r] = n_a.sum(axis=1)
        J[:, r + f, theta] = -n_q.sum(axis=1)
        J[:, range(at, at + m), range(at, at + m)] = 1.0
        J[:, theta, :r] = -residual.hess @ (n_q.transpose(0, 2, 1) @ own)
        J[:, theta, theta] += residual.hess @ (n_q.transpose(0, 2, 1) @ q)
        right[:, :r] -= n_a.transpose(0, 2, 1) @ e
        right[:, r + f] = -(amounts[:, :, None] * e).sum(axis=1)
        change = n_q.transpose(0, 2, 1) @ e + np.einsum("cg,cgmx->cmx", amounts, moved)
        right[:, theta] = residual.hess @ change
        # balances and sizes over the size of the phase
        J[:, r + f] /= N[:, None]
        right[:, r + f] /= N[:, None]
    x = _solved(J, right, r)
    log_a = np.zeros((2, count, len(chosen.members)))
    log_a[:, :, rows] = x[:, :r].transpose(2, 0, 1)
    nu = x[:, r : r + F].transpose(2, 0, 1)
    theta_x = x[:, r + F :].transpose(2, 0, 1).reshape(2, count, F, m)
    RT, p = R * cases.T, cases.p
    dn = np.zeros((2, *n.shape))
    H_x, V_x = np.zeros((2, count)), np.zeros((2, count))
    for f in range(F):
        amounts, residual = fluids[:, f], residuals[f]
        for k, moved in enumerate((cases.qT, cases.qp)):
            change = log_a[k] @ a.T + nu[k][:, f, None] + explicit[f][:, :, k]
            change -= (q @ theta_x[k][:, f, :, None])[:, :, 0]
            d = amounts * change
            dn[k][:, cases.gas] += d
            heat = -_times(residual.grad, amounts, cases.qT)
            twice = cases.qTT if k == 0 else cases.qT * powers
            H_x[k] -= RT * (
                _times(theta_x[k][:, f], amounts, cases.qT)
                + _times(residual.grad, d, cases.qT)
                + _times(residual.grad, amounts, twice)
            )
            volume = amounts.sum(axis=1) + _times(residual.grad, amounts, cases.qp)
            V_x[k] += (
                RT
                / p
                * (
                    d.sum(axis=1)
                    + _times(theta_x[k][:, f], amounts, cases.qp)
                    + _times(residual.grad, d, cases.qp)
                    + _times(residual.grad, amounts, moved * powers)
                )
            )
            if k == 0:
                H_x[k] += RT * heat
                V_x[k] += RT / p * volume
            else:
                V_x[k] -= RT / p * volume
    taken = set(chosen.active)
    for k, member in enumerate(chosen.members):
        if member in taken:
            dn[:, :, member] = -(dn[:, :, cases.gas] @ a[:, k])
    h, cp, v = cases.ideal.h, cases.ideal.cp, cases.mixture.volume
    for k in range(2):
        H_x[k] += RT * (dn[k] * h).sum(axis=1) + (dn[k] @ v) * (p - P0)
        V_x[k] += dn[k] @ v
    H_x[0] += RT * (n * cp).sum(axis=1)
    H_x[1] += (n @ v) * p
    return Response(
        H_x[0],
        V_x[0],
        H_x[1],
        V_x[1],
        (log_a[0], log_a[1]),
        (nu[0], nu[1]),
        (theta_x[0], theta_x[1]),
    )


def _direct(cases: RealCases, basis: Basis) -> Array:
    """d(-kappa) by ln T and ln p, (cases, gas species, 2)."""
    members, gas = list(basis.members), cases.gas
    a, volume = basis.reactions[gas], cases.mixture.volume
    RT = R * cases.T
    heat = cases.ideal.h + volume * ((cases.p - P0) / RT)[:, None]  # -dc/d(ln T)
    rise = volume * (cases.p / RT)[:, None] + cases.mixture.is_gas  # dc/d(ln p)
    by_T = heat[:, gas] - heat[:, members] @ a.T
    by_p = -(rise[:, gas] - rise[:, members] @ a.T)
    return np.stack([by_T, by_p], axis=-1)


def _solved(J: Array, right: Array, r: int) -> Array:
    diagonal = np.ones(J.shape[:2])
    diagonal[:, :r] = np.sqrt(np.maximum(np.einsum("cii->ci", J[:, :r, :r]), 1e-300))
    J = J / diagonal[:, :, None] / diagonal[:, None, :]
    right = right / diagonal[:, :, None]
    try:
        x = np.linalg.solve(J + 1e-14 * np.eye(J.shape[1]), right)
    except np.linalg.LinAlgError:
        x = np.stack(
            [np.linalg.lstsq(one, b, rcond=1e-12)[0] for one, b in zip(J, right, strict=True)]
        )
    return np.asarray(x / diagonal[:, :, None])
