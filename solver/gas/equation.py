"""The two cubic equations of state, as numbers: p = RT/(v - b) - a / ((v + d1 b)(v + d2 b))."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from math import sqrt
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
FADES_BELOW = 0.1  # value of the bracket of alpha below which the attraction fades out


@dataclass(frozen=True)
class Equation:
    """One cubic equation of state with its rule for the attraction.

    Attributes
    ----------
    key, name : str
        Short key ("srk", "pr") and the usual name.
    omega_a, omega_b : float
        a_c = omega_a (R Tc)^2 / pc and b = omega_b R Tc / pc, from (dp/dv) = (d2p/dv2) = 0 at
        the critical point.
    d1, d2 : float
        The two shifts of the attraction term, d1 > d2.
    m_powers : tuple of float
        Coefficients of m as a polynomial of the acentric factor, constant term first.
    source : str
        Where the equation was published.
    """

    key: str
    name: str
    omega_a: float
    omega_b: float
    d1: float
    d2: float
    m_powers: tuple[float, float, float]
    source: str

    def m(self, acentric: Array) -> Array:
        """Slope of sqrt(alpha) against 1 - sqrt(T/Tc) for acentric factors of any shape."""
        constant, linear, square = self.m_powers
        return constant + acentric * (linear + acentric * square)

    def root_alpha(self, T: Array, Tc: Array, m: Array) -> tuple[Array, Array, Array]:
        """Square root of alpha(T), its T d/dT and (T d/dT)^2; T, Tc in K, shapes broadcast.

        Beyond T = Tc (1 + 1/m)^2 the published bracket 1 + m (1 - sqrt(T/Tc)) turns negative and
        its square would grow again: a hot gas would attract more the hotter it is. The attraction
        stays gone instead. It must not stop at a corner: the cross terms go as the bracket itself,
        and the enthalpy of a mixture would jump where one component reaches zero (nitrogen at
        1031 K). So the last of the bracket, below `FADES_BELOW`, fades as an exponential with the
        same value and slope.
        """
        fall = m * np.sqrt(T / Tc)
        bracket = 1.0 + m - fall
        first = -0.5 * fall
        fades = bracket < FADES_BELOW
        if not np.any(fades):
            return bracket, first, 0.5 * first
        decay = np.exp(np.minimum(bracket / FADES_BELOW - 1.0, 0.0))
        return (
            np.where(fades, FADES_BELOW * decay, bracket),
            decay * first,
            decay * (0.5 * first + np.where(fades, first**2 / FADES_BELOW, 0.0)),
        )


def _srk() -> Equation:
    root = 2.0 ** (1.0 / 3.0) - 1.0
    return Equation(
        key="srk",
        name="Soave-Redlich-Kwong",
        omega_a=1.0 / (9.0 * root),
        omega_b=root / 3.0,
        d1=1.0,
        d2=0.0,
        m_powers=(0.480, 1.574, -0.176),
        source="Soave, Chem. Eng. Sci. 27 (1972) 1197",
    )


def _pr() -> Equation:
    # b / v at the critical point, the real root of 64 y^3 + 6 y^2 + 12 y - 1 = 0 written out
    x = (-1.0 + (6.0 * sqrt(2.0) + 8.0) ** (1 / 3) - (6.0 * sqrt(2.0) - 8.0) ** (1 / 3)) / 3.0
    return Equation(
        key="pr",
        name="Peng-Robinson",
        omega_a=8.0 * (5.0 * x + 1.0) / (49.0 - 37.0 * x),
        omega_b=x / (x + 3.0),
        d1=1.0 + sqrt(2.0),
        d2=1.0 - sqrt(2.0),
        m_powers=(0.37464, 1.54226, -0.26992),
        source="Peng and Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59",
    )


EQUATIONS: Mapping[str, Equation] = MappingProxyType({"srk": _srk(), "pr": _pr()})
