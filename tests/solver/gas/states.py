"""Fluids and states for the tests of the cubic equations of state. Invented; no stored answers."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache

import numpy as np
from numpy.typing import NDArray

import species_db
from solver.gas.fluid import Fluid, make_fluid

Array = NDArray[np.float64]

MIXED = ("N2", "H2", "NH3", "CH4", "H2O", "OH", "CO2")
PAIRS = (("H2O", "CO2", 0.12), ("N2", "H2", 0.05), ("CH4", "H2", -0.08))


@cache
def library() -> species_db.Library:
    return species_db.load()


def fluid_of(
    keys: tuple[str, ...], equation: str, pairs: tuple[tuple[str, str, float], ...] = ()
) -> Fluid:
    return make_fluid([library()[key] for key in keys], equation, pairs)


def without_table(fluid: Fluid, equation: str) -> Fluid:
    """The same species with every published interaction put to zero."""
    zero = tuple((pair.a, pair.b, 0.0) for pair in fluid.k)
    return make_fluid(fluid.species, equation, zero)


@cache
def random_states(cases: int = 60) -> tuple[Array, Array, Array]:
    """T, p and amounts of `MIXED` from thin gas to dense liquid."""
    rng = np.random.default_rng(20)
    T = rng.uniform(180.0, 1800.0, cases)
    p = 10.0 ** rng.uniform(3.0, 8.0, cases)
    T[::4] = rng.uniform(180.0, 350.0, T[::4].size)
    n = rng.dirichlet(np.full(len(MIXED), 0.6), cases) * 10.0 ** rng.uniform(-3, 3, (cases, 1))
    return T, p, n


def slope(of: Callable[[Array], Array], x: Array, step: float = 1e-3) -> Array:
    """x d/dx of a function of x (cases,), by differences of the fourth order in ln x."""
    near = (of(x * np.exp(step)) - of(x * np.exp(-step))) / (2.0 * step)
    far = (of(x * np.exp(2.0 * step)) - of(x * np.exp(-2.0 * step))) / (4.0 * step)
    return (4.0 * near - far) / 3.0
