"""A fluid of given species: the moments through which an equation of state sees a mixture.

Van der Waals one-fluid mixing, b = sum y_i b_i and a = sum y_i y_j sqrt(a_i a_j) (1 - k_ij), needs
no more of the amounts n than a few sums M = n @ q, with B_i = b_i p / RT and
A_i = a_i(T) p / (RT)^2:

    q_i = (1, B_i, sqrt(A_i), sqrt(A_i) U_i1, sqrt(A_i) U_i2, ...)
    A M_0^2 = M_2^2 - sum_r lambda_r M_r^2,

where lambda_r and U_r are the eigenvalues and eigenvectors of the matrix k. A species that is not
modelled has a row of zeros: it is ideal in the mixture.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError
from solver.gas.constants import critical_constants
from solver.gas.equation import EQUATIONS, Equation
from solver.gas.interactions import Pair, pairs_in_use
from solver.gas.residual import Residual, residual_of
from species_db.species import R

if TYPE_CHECKING:
    from species_db import Species

Array = NDArray[np.float64]
NO_WEIGHT = 1e-14


@dataclass(frozen=True)
class Moments:
    """What each mole of each species adds to each moment, at given T and p.

    q (cases, S, m); qT = T dq/dT, qTT = (T d/dT)^2 q, qp = p dq/dp, of the same shape.
    """

    q: Array
    qT: Array
    qTT: Array
    qp: Array


@dataclass(frozen=True, eq=False)
class Fluid:
    """S gas species under one equation of state; made by `make_fluid`.

    Attributes
    ----------
    equation : Equation
    species : tuple of Species, S of them
    Tc, pc, acentric : arrays (S,), K and Pa, nan where unknown
    critical_known : bool array (S,), whether the record has all three
    modelled : bool array (S,), whether the equation of state describes the species
    b : array (S,), m3/mol, zero where not modelled
    k : pairs in use, with their source
    weights : array (count - 2,), of the squares of the moments from the third on in A M_0^2
    mix : array (S, count - 2), what sqrt(A_i) is multiplied by in those moments
    """

    equation: Equation
    species: tuple[Species, ...]
    Tc: Array
    pc: Array
    acentric: Array
    critical_known: NDArray[np.bool_]
    modelled: NDArray[np.bool_]
    b: Array
    k: tuple[Pair, ...]
    weights: Array
    mix: Array

    @property
    def count(self) -> int:
        """Number m of moments."""
        return 2 + self.weights.size

    @property
    def not_modelled(self) -> tuple[str, ...]:
        """Keys of the species taken as ideal in the mixture."""
        return tuple(
            sp.key for sp, real in zip(self.species, self.modelled, strict=True) if not real
        )

    @cached_property
    def assumed(self) -> tuple[tuple[str, str], ...]:
        """Pairs of modelled species without a known k_ij: it is taken as zero."""
        known = {frozenset((pair.a, pair.b)) for pair in self.k}
        keys = [sp.key for sp, real in zip(self.species, self.modelled, strict=True) if real]
        return tuple(pair for pair in combinations(keys, 2) if frozenset(pair) not in known)

    def at(self, T: Array, p: Array) -> Moments:
        """Moments per mole at T in K and p in Pa, arrays (cases,)."""
        eq, real = self.equation, np.flatnonzero(self.modelled)
        Tc, pc = self.Tc[real], self.pc[real]
        alpha, alpha_T, alpha_TT = eq.root_alpha(T[:, None], Tc, eq.m(self.acentric[real]))
        # sqrt(A) = sqrt(omega_a p / pc) Tc / T sqrt(alpha): the front falls as 1/T
        front = (np.sqrt(p) / T)[:, None] * (np.sqrt(eq.omega_a / pc) * Tc)
        covolume = (p / T)[:, None] * (eq.omega_b * Tc / pc)
        count = self.count
        mix = np.zeros((real.size, count))
        mix[:, 2:] = self.mix[real]
        power = np.full(count, 0.5)
        power[:2] = 0.0, 1.0

        def spread(part: Array, of_amount: float, of_covolume: float) -> Array:
            """Rows of the modelled species, the others zero."""
            rows = np.repeat(front * part, count, axis=1)
            rows *= mix.ravel()
            rows = rows.reshape(T.size, real.size, count)
            rows[:, :, 0] = of_amount
            rows[:, :, 1] = of_covolume * covolume
            out = np.zeros((T.size, self.modelled.size, count))
            out[:, real] = rows
            return out

        q = spread(alpha, 1.0, 1.0)
        return Moments(
            q=q,
            qT=spread(alpha_T - alpha, 0.0, -1.0),
            qTT=spread(alpha_TT - 2.0 * alpha_T + alpha, 0.0, 1.0),
            qp=q * power,
        )

    def residual(self, M: Array, root: str = "least") -> Residual:
        """G_res / RT at moments M (cases, count), with first and second derivatives.

        root: "least" (lesser Gibbs energy), "vapour" (largest Z) or "liquid" (smallest Z > B).
        """
        return residual_of(M, self.weights, self.equation, root)


def make_fluid(
    species: Sequence[Species],
    equation_key: str,
    interactions: Iterable[tuple[str, str, float]] = (),
) -> Fluid:
    """The fluid of these gas species, in their order.

    Parameters
    ----------
    species : gas species
    equation_key : "srk" or "pr"
    interactions : (key, key, k_ij), over the published table

    Raises
    ------
    InputError
        For an unknown equation, absurd critical constants of the user's own, a pair that cannot be.
    """
    if equation_key not in EQUATIONS:
        raise InputError(
            f"gas model {equation_key!r} is no cubic equation of state; choose "
            + " or ".join(f"{key} ({eq.name})" for key, eq in EQUATIONS.items()),
            field="gas",
            value=equation_key,
            allowed=", ".join(EQUATIONS),
        )
    equation = EQUATIONS[equation_key]
    constants = critical_constants(species)
    real = constants.modelled
    keys = [sp.key for sp, is_real in zip(species, real, strict=True) if is_real]
    pairs = pairs_in_use(keys, equation_key, interactions)
    weights, mix = _attraction([sp.key for sp in species], pairs)
    mix[~real] = 0.0
    covolume = np.where(real, equation.omega_b * R * constants.Tc / constants.pc, 0.0)
    arrays = (constants.Tc, constants.pc, constants.acentric, constants.known, real)
    for array in (*arrays, covolume, weights, mix):
        array.flags.writeable = False
    return Fluid(
        equation=equation,
        species=tuple(species),
        Tc=constants.Tc,
        pc=constants.pc,
        acentric=constants.acentric,
        critical_known=constants.known,
        modelled=real,
        b=covolume,
        k=pairs,
        weights=weights,
        mix=mix,
    )


def _attraction(keys: Sequence[str], pairs: Sequence[Pair]) -> tuple[Array, Array]:
    """Weights of the squares in A M_0^2 and the factors of sqrt(A_i), from the pairs' k."""
    index = {key: i for i, key in enumerate(keys)}
    used = sorted({index[key] for pair in pairs if pair.k for key in (pair.a, pair.b)})
    place = {i: row for row, i in enumerate(used)}
    k = np.zeros((len(used), len(used)))
    for pair in pairs:
        if pair.k:
            i, j = place[index[pair.a]], place[index[pair.b]]
            k[i, j] = k[j, i] = pair.k
    values, vectors = np.linalg.eigh(k)
    kept = np.abs(values) >= NO_WEIGHT
    mix = np.zeros((len(keys), 1 + int(kept.sum())))
    mix[:, 0] = 1.0
    if used:
        mix[used, 1:] = vectors[:, kept]
    return np.concatenate([[1.0], -values[kept]]), mix
