"""Pure gases against the reference equations of the property package `CoolProp`.

The bounds were set before the comparison (common practice, no source): density 3 %, fugacity
coefficient 2 % (3 % for hydrogen up to 300 bar), residual enthalpy 0.05 RT in the gas and 0.06 RT
in the vapour beside saturation; saturation pressure 2 % for carbon dioxide and propane, 3 % for
ammonia, 5 % for methanol, 6 % for water. What lies outside is listed with how far it is off, and is
expected to stay there: a change that moves it shows. Reference equations, as the package names
them: N2 Span 2000, O2 Schmidt 1985 and Stewart 1991, Ar Tegeler 1999, CO Lemmon 2006, CO2 Span
1996, CH4 Setzmann 1991, C2H4 Smukala 2000, C3H8 Lemmon 2009, NH3 Gao 2020, H2O Wagner 2002, H2
Leachman 2009, CH3OH de Reuck 1993.
"""

from __future__ import annotations

from functools import cache

import CoolProp
import numpy as np
import pytest
from CoolProp.CoolProp import AbstractState

from solver.gas.properties import ln_phi, residual_properties
from species_db.species import R
from tests.solver.gas.states import fluid_of

NAMES = {
    "N2": "Nitrogen", "O2": "Oxygen", "Ar": "Argon", "CO": "CarbonMonoxide",
    "CO2": "CarbonDioxide", "CH4": "Methane", "C2H4": "Ethylene", "C3H8": "Propane",
    "NH3": "Ammonia", "H2O": "Water", "H2": "Hydrogen", "CH3OH": "Methanol",
}  # fmt: skip
GASES = [name for name in NAMES if name not in ("H2", "CH3OH")]

# T/Tc and p/pc; the vapour at T/Tc and p/psat; hydrogen at K and Pa. States above the range of the
# reference equation are left out (CO 500 K, CH4 625 K, C2H4 450 K, C3H8 650 K, NH3 725 K).
GAS = [(a, b) for a in (1.3, 1.6, 2.0, 3.0, 5.0) for b in (0.05, 0.3, 1.0, 2.0)]
VAPOUR = [(a, b) for a in (0.75, 0.85, 0.95) for b in (0.1, 0.4, 0.8)]
HYDROGEN = [(T, p) for T in (200.0, 300.0, 500.0, 800.0) for p in (1e6, 5e6, 1.5e7, 3e7)]

BOUNDS = {
    "gas": {"density": 0.03, "phi": 0.02, "enthalpy": 0.05},
    "vapour": {"density": 0.03, "phi": 0.02, "enthalpy": 0.06},
    "hydrogen": {"density": 0.03, "phi": 0.03, "enthalpy": 0.05},
}

# (equation, region, quantity): gas and its largest deviation
OUTSIDE: dict[tuple[str, str, str], dict[str, float]] = {
    ("srk", "gas", "density"): {
        "CO2": -0.052,
        "C2H4": -0.037,
        "C3H8": -0.041,
        "NH3": -0.082,
        "H2O": -0.075,
    },
    ("srk", "gas", "phi"): {"CO2": 0.031, "C3H8": 0.021, "NH3": 0.043, "H2O": 0.044},
    ("srk", "gas", "enthalpy"): {"H2O": -0.051},
    ("srk", "vapour", "enthalpy"): {"CO2": 0.076, "C3H8": 0.063, "NH3": 0.267, "H2O": 0.273},
    ("srk", "vapour", "density"): {"NH3": -0.052, "H2O": -0.041},
    ("srk", "vapour", "phi"): {"NH3": 0.029},
    ("pr", "gas", "density"): {"N2": 0.03, "Ar": 0.032, "NH3": -0.036, "H2O": -0.03},
    ("pr", "gas", "phi"): {
        "N2": -0.045,
        "O2": -0.044,
        "Ar": -0.046,
        "CO": -0.04,
        "CO2": -0.02,
        "CH4": -0.044,
        "C2H4": -0.035,
        "C3H8": -0.029,
        "H2O": 0.023,
    },
    ("pr", "gas", "enthalpy"): {
        "N2": -0.062,
        "O2": -0.058,
        "Ar": -0.061,
        "CO": -0.071,
        "CO2": -0.07,
        "CH4": -0.06,
        "C2H4": -0.059,
        "C3H8": -0.064,
        "H2O": -0.096,
    },
    ("pr", "vapour", "density"): {"N2": 0.032, "Ar": 0.031, "CO": 0.034},
    ("pr", "vapour", "phi"): {
        "N2": -0.026,
        "O2": -0.025,
        "Ar": -0.026,
        "CO": -0.027,
        "CH4": -0.024,
        "C2H4": -0.022,
    },
    ("pr", "vapour", "enthalpy"): {"CO2": 0.067, "NH3": 0.245, "H2O": 0.252},
    ("pr", "hydrogen", "density"): {"H2": 0.067},
    ("pr", "hydrogen", "phi"): {"H2": -0.109},
    ("pr", "hydrogen", "enthalpy"): {"H2": -0.131},
}


@cache
def deviations(key: str, region: str, gas: str) -> dict[str, float]:
    """The largest deviation over the region, with its sign; enthalpy in RT, the others relative."""
    fluid = fluid_of((gas,), key)
    peer = AbstractState("HEOS", NAMES[gas])
    worst = dict.fromkeys(BOUNDS[region], 0.0)
    for a, b in {"gas": GAS, "vapour": VAPOUR, "hydrogen": HYDROGEN}[region]:
        T, p = a, b
        if region == "gas":
            T, p = a * fluid.Tc[0], b * fluid.pc[0]
        elif region == "vapour":
            T = a * fluid.Tc[0]
            peer.update(CoolProp.QT_INPUTS, 1.0, T)
            p = b * peer.p()
        if T > peer.Tmax():
            continue
        peer.update(CoolProp.PT_INPUTS, p, T)
        state = np.array([T]), np.array([p]), np.ones((1, 1))
        ours = residual_properties(fluid, *state, "vapour")
        found = {
            "density": 1.0 / (ours.V[0] * peer.rhomolar()) - 1.0,
            "phi": np.exp(ln_phi(fluid, *state, "vapour")[0, 0]) / peer.fugacity_coefficient(0) - 1,
            "enthalpy": (ours.H[0] - peer.hmolar_residual()) / (R * T),
        }
        for name, value in found.items():
            if abs(value) > abs(worst[name]):
                worst[name] = float(value)
    return worst


def rows() -> list:
    made = []
    for key in ("srk", "pr"):
        for region, gases in (("gas", GASES), ("vapour", GASES), ("hydrogen", ["H2"])):
            for gas in gases:
                for quantity in BOUNDS[region]:
                    off = OUTSIDE.get((key, region, quantity), {}).get(gas)
                    marks = []
                    if off is not None:
                        reason = f"{key} {quantity} of {gas} is off by {off:+.3f} at its worst here"
                        marks.append(pytest.mark.xfail(strict=True, reason=reason))
                    made.append(pytest.param(key, region, gas, quantity, marks=marks))
    return made


@pytest.mark.parametrize(("key", "region", "gas", "quantity"), rows())
def test_within_bounds(key: str, region: str, gas: str, quantity: str):
    assert abs(deviations(key, region, gas)[quantity]) <= BOUNDS[region][quantity]


@pytest.mark.parametrize(
    ("key", "region", "quantity", "gas", "off"),
    [(*where, gas, off) for where, found in OUTSIDE.items() for gas, off in found.items()],
)
def test_what_is_outside_is_off_as_reported(key, region, quantity, gas, off):
    assert deviations(key, region, gas)[quantity] == pytest.approx(off, abs=0.0006)


SATURATION = {"CO2": 0.02, "C3H8": 0.02, "NH3": 0.03, "CH3OH": 0.05, "H2O": 0.06}
HOT = (0.72, 0.8, 0.88, 0.95)


@cache
def saturation_pressure(key: str, gas: str, hot: float) -> tuple[float, float]:
    """psat of the equation of state and of the reference, Pa, at T = hot Tc."""
    fluid = fluid_of((gas,), key)
    T = np.array([hot * fluid.Tc[0]])
    peer = AbstractState("HEOS", NAMES[gas])
    peer.update(CoolProp.QT_INPUTS, 0.0, float(T[0]))
    one = np.ones((1, 1))
    p = np.array([peer.p()])
    for _ in range(50):
        vapour, liquid = (ln_phi(fluid, T, p, one, root)[0, 0] for root in ("vapour", "liquid"))
        volume_v, volume_l = (
            residual_properties(fluid, T, p, one, root).Z[0] for root in ("vapour", "liquid")
        )
        # d (g_vapour - g_liquid) / d ln p = Z_vapour - Z_liquid
        step = -(vapour - liquid) / (volume_v - volume_l)
        p = p * np.exp(step)
        if abs(step) < 1e-13:
            break
    assert volume_v > volume_l
    assert vapour == pytest.approx(liquid, abs=1e-12)
    return float(p[0]), peer.p()


@pytest.mark.parametrize("hot", HOT)
@pytest.mark.parametrize("gas", SATURATION)
@pytest.mark.parametrize("key", ["srk", "pr"])
def test_saturation_pressure(key: str, gas: str, hot: float):
    ours, theirs = saturation_pressure(key, gas, hot)
    assert abs(ours / theirs - 1.0) <= SATURATION[gas]
