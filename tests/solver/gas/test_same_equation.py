"""The same equations with the same constants as the property package `thermo` evaluates them."""

from __future__ import annotations

import numpy as np
import pytest
from thermo.eos_mix import PRMIX, SRKMIX

from solver.gas.equation import FADES_BELOW
from solver.gas.fluid import Fluid
from solver.gas.properties import ln_phi, residual_properties
from tests.solver.gas.states import fluid_of, without_table

PEER = {"srk": SRKMIX, "pr": PRMIX}
BOTH = pytest.mark.parametrize("key", ["srk", "pr"])
PURE = ("N2", "H2", "O2", "CO", "CO2", "CH4", "C2H4", "C3H8", "NH3", "H2O")
CLOSE = 1e-8


def against(fluid: Fluid, T: float, p: float, n: np.ndarray) -> set[str]:
    """Compares every root the peer has; which they were."""
    key = fluid.equation.key
    size = len(fluid.species)
    k = np.zeros((size, size))
    keys = [sp.key for sp in fluid.species]
    for pair in fluid.k:
        i, j = keys.index(pair.a), keys.index(pair.b)
        k[i, j] = k[j, i] = pair.k
    peer = PEER[key](
        T=T,
        P=p,
        zs=list(n / n.sum()),
        Tcs=list(fluid.Tc),
        Pcs=list(fluid.pc),
        omegas=list(fluid.acentric),
        kijs=k.tolist(),
    )
    slopes = fluid.equation.m(fluid.acentric)
    alpha = fluid.equation.root_alpha(np.array(T), fluid.Tc, slopes)[0]
    assert np.all(alpha > FADES_BELOW), "choose a state where alpha is as published"
    seen = {side for side in ("g", "l") if hasattr(peer, f"V_{side}")}
    roots = {"g": "vapour", "l": "liquid"}
    for side in seen:
        state = np.array([T]), np.array([p]), n[None, :] / n.sum()
        ours = residual_properties(fluid, *state, roots[side])
        theirs = {
            name: getattr(peer, f"{part}_{side}")
            for name, part in (("H", "H_dep"), ("S", "S_dep"), ("G", "G_dep"), ("U", "U_dep"),
                               ("cp", "Cp_dep"), ("V", "V"), ("Z", "Z"))
        }  # fmt: skip
        for name, value in theirs.items():
            assert getattr(ours, name)[0] == pytest.approx(value, rel=CLOSE), (name, side)
        np.testing.assert_allclose(
            ln_phi(fluid, *state, roots[side])[0],
            getattr(peer, f"lnphis_{side}"),
            rtol=CLOSE,
            atol=1e-12,
        )
    return seen


@BOTH
@pytest.mark.parametrize("name", PURE)
def test_pure_gas(key: str, name: str):
    fluid = fluid_of((name,), key)
    Tc, pc = fluid.Tc[0], fluid.pc[0]
    seen: set[str] = set()
    for hot in (0.7, 0.9, 0.999, 1.3, 2.5):
        for high in (1e-4, 0.05, 0.4, 1.0, 8.0):
            seen |= against(fluid, hot * Tc, high * pc, np.ones(1))
    assert seen == {"g", "l"}


SYNTHESIS = (("N2", "H2", "NH3", "CH4", "Ar"), (("N2", "NH3", 0.2193), ("N2", "H2", 0.0711)))
WET = (("H2O", "CO2", "CH4", "H2S"), (("H2O", "CO2", 0.0952), ("CO2", "CH4", 0.0978)))
ALCOHOL = (("CO", "CO2", "H2", "CH3OH", "H2O"), (("CH3OH", "H2O", -0.0778), ("H2", "CO2", -0.2)))


@BOTH
@pytest.mark.parametrize(("keys", "pairs"), [SYNTHESIS, WET, ALCOHOL], ids=lambda part: part[0][0])
def test_mixture(key: str, keys, pairs):
    fluid = fluid_of(keys, key, pairs)
    rng = np.random.default_rng(5)
    seen: set[str] = set()
    for T, p in (
        (260.0, 5e5),
        (260.0, 2e7),
        (400.0, 1e5),
        (400.0, 3e7),
        (750.0, 1e6),
        (750.0, 1e8),
    ):
        seen |= against(fluid, T, p, rng.dirichlet(np.ones(len(keys))))
    assert seen == {"g", "l"}


def test_published_table_can_be_put_to_zero():
    fluid = fluid_of(("N2", "H2", "NH3"), "pr")
    assert fluid.k
    none = without_table(fluid, "pr")
    assert none.count == 3
    against(none, 500.0, 2e7, np.array([1.0, 3.0, 1.0]))
