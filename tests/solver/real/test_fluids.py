"""Pure fluids expanded, throttled and heated, beside the reference equations of `CoolProp`.

The bounds were set before the comparison (common practice, no source): isentropic end
temperature of nitrogen 1 %, of throttled gases 1.5 %; a sealed vessel of carbon dioxide 1.5 % of T
and 6 % of p; one of boiling water 2 % of T and 10 % of p. What lies outside is listed with its
reason. Reference equations, as the package names them: N2 Span 2000, CH4 Setzmann 1991,
CO2 Span 1996, H2O Wagner 2002.
"""

from __future__ import annotations

import CoolProp
import numpy as np
import pytest
from CoolProp.CoolProp import AbstractState

import solver
from tests.solver.mixtures import library

NAMES = {"N2": "Nitrogen", "CH4": "Methane", "CO2": "CarbonDioxide", "H2O": "Water"}
both = pytest.mark.parametrize("gas", ["srk", "pr"])


def reference(key: str) -> AbstractState:
    return AbstractState("HEOS", NAMES[key])


def settle(key: str, gas: str, pair: str, **held: float) -> solver.EndState:
    species = library()[key]
    return solver.settle([species], {species: 1.0}, solver.Fixed(pair, **held), gas=gas)


@both
@pytest.mark.parametrize("p", [5.0e6, 2.0e6, 1.0e6])
def test_nitrogen_expanded_without_loss(gas: str, p: float):
    """From 300 K and 100 bar; at 10 bar it is still a gas, near 152 K."""
    peer = reference("N2")
    peer.update(CoolProp.PT_INPUTS, 1.0e7, 300.0)
    peer.update(CoolProp.PSmolar_INPUTS, p, peer.smolar())
    fed = solver.as_fed({library()["N2"]: 1.0}, T=300.0, p=1.0e7, gas=gas)
    end = settle("N2", gas, "S,p", S=fed.S, p=p)
    assert set(end.fluids) == {"gas"}
    assert pytest.approx(peer.T(), rel=0.01) == end.T
    # the work, too: it is what an expander is built for
    work = fed.H - end.H
    peer.update(CoolProp.PT_INPUTS, 1.0e7, 300.0)
    h = peer.hmolar()
    peer.update(CoolProp.PSmolar_INPUTS, p, peer.smolar())
    assert work == pytest.approx(h - peer.hmolar(), rel=0.05)


THROTTLED = [
    ("N2", 300.0, 2.0e7, 1.0e5),
    ("N2", 250.0, 1.0e7, 1.0e6),
    ("CO2", 400.0, 1.0e7, 1.0e6),
    ("CO2", 330.0, 5.0e6, 5.0e5),
    ("CH4", 320.0, 1.5e7, 1.0e6),
    ("CH4", 280.0, 6.0e6, 5.0e5),
]


@both
@pytest.mark.parametrize(("key", "T", "p", "to"), THROTTLED)
def test_throttled(gas: str, key: str, T: float, p: float, to: float):
    peer = reference(key)
    peer.update(CoolProp.PT_INPUTS, p, T)
    peer.update(CoolProp.HmolarP_INPUTS, peer.hmolar(), to)
    fed = solver.as_fed({library()[key]: 1.0}, T=T, p=p, gas=gas)
    end = settle(key, gas, "H,p", H=fed.H, p=to)
    assert end.T < T
    assert pytest.approx(peer.T(), rel=0.015) == end.T


# substance, start, volume of a mole, heat: from the sealed state at the start
VESSELS = [
    ("CO2", 290.0, 4.0e-4, 3.0e3),  # gas
    ("CO2", 260.0, 2.0e-4, 4.0e3),  # with liquid that stays
    ("CO2", 260.0, 2.0e-4, 1.6e4),  # with liquid that boils off
    ("H2O", 400.0, 2.0e-4, 6.0e3),
    ("H2O", 450.0, 5.0e-4, 1.0e4),
    ("H2O", 450.0, 2.0e-3, 6.0e4),  # all boils
]
BOUNDS = {"CO2": (0.015, 0.06), "H2O": (0.02, 0.10)}
# model, substance, heat: reason and deviation of T and p
COLD_CV = "cubic equations lack the high heat capacity of a gas near its critical point"
OFF_SEALED = {
    ("srk", "CO2", 3.0e3): f"{COLD_CV}: T +1.9 %, p +4.0 %",
    ("pr", "CO2", 3.0e3): f"{COLD_CV}: T +2.2 %, p +2.0 %",
    ("srk", "CO2", 1.6e4): f"{COLD_CV}: T +1.1 %, p +6.6 %",
    ("pr", "CO2", 1.6e4): f"{COLD_CV}: T +1.7 %, p +3.4 %",
    ("srk", "H2O", 6.0e3): "the vapour pressure of water is low at 410 K: T -1.3 %, p -12.9 %",
}


@both
@pytest.mark.parametrize(("key", "T", "V", "heat"), VESSELS)
def test_sealed_vessel_heated(gas: str, key: str, T: float, V: float, heat: float, request):
    if (gas, key, heat) in OFF_SEALED:
        request.applymarker(pytest.mark.xfail(strict=True, reason=OFF_SEALED[gas, key, heat]))
    peer = reference(key)
    peer.update(CoolProp.DmolarT_INPUTS, 1.0 / V, T)
    peer.update(CoolProp.DmolarUmolar_INPUTS, 1.0 / V, peer.umolar() + heat)
    start = settle(key, gas, "T,V", T=T, V=V)
    end = settle(key, gas, "U,V", U=start.U + heat, V=V)
    assert end.U - start.U == pytest.approx(heat, rel=1e-8)
    two_phases = 0.0 < peer.Q() < 1.0
    assert (set(end.fluids) == {"gas", "liquid"}) is two_phases
    bound_T, bound_p = BOUNDS[key]
    off = np.array([end.T / peer.T() - 1.0, end.p / peer.p() - 1.0])
    assert (np.abs(off) <= [bound_T, bound_p]).all(), off
