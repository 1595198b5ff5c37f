"""Phase changes at one temperature, and vessels with liquid in them."""

import time

import numpy as np
import pytest

import solver
import species_db
from solver import Fixed, InputError

LIB = species_db.load()
R = 8.314462618


def species(*keys):
    return [LIB[key] for key in keys]


WATER = species("H2O", "H2O(l)", "H2O(s)")


def heated(candidates, feed, T_low, T_high, share, p=1e5):
    """The end state a share of the way in H between two temperatures, one on either side."""
    low, high = (solver.settle(candidates, feed, Fixed("T,p", T=T, p=p)) for T in (T_low, T_high))
    return solver.settle(candidates, feed, Fixed("H,p", H=low.H + share * (high.H - low.H), p=p))


@pytest.mark.parametrize(("p", "T", "spread"), [(1e5, 372.8, 0.6), (1e6, 453.0, 4.0)])
def test_water_boils(p, T, spread):
    """Boiling points 372.76 and 453.03 K, IAPWS-95; ideal steam shifts them up (values T03)."""
    end = heated(WATER, {"H2O(l)": 1.0}, T - 20.0, T + 20.0, 0.5, p)
    assert abs(end.T - T) < spread
    assert end.amounts["H2O"] > 0.1
    assert end.amounts["H2O(l)"] > 0.1
    # liquid and vapour have one Gibbs energy at the pressure of the plateau
    liquid = LIB["H2O(l)"]
    g_liquid = liquid.g(end.T) + liquid.molar_volume * (p - 1e5)
    assert LIB["H2O"].g(end.T) + R * end.T * np.log(p / 1e5) == pytest.approx(g_liquid, abs=1e-6)


def test_split_moves_with_the_heat_added():
    shares = [heated(WATER, {"H2O(l)": 1.0}, 360.0, 390.0, s) for s in (0.3, 0.5, 0.7)]
    assert len({round(end.T, 9) for end in shares}) == 1
    vapour = [end.amounts["H2O"] for end in shares]
    assert vapour[0] < vapour[1] < vapour[2]
    slope = np.diff(vapour) / np.diff([end.H for end in shares])
    assert slope[0] == pytest.approx(slope[1], rel=1e-9)


def test_ice_melts_at_its_melting_point():
    """273.15 K at 1 atm; common knowledge, ITS-90 takes the triple point at 273.16 K."""
    end = heated(WATER, {"H2O(s)": 1.0}, 265.0, 280.0, 0.5)
    assert abs(end.T - 273.15) < 0.05
    assert end.amounts["H2O(s)"] > 0.0
    assert end.amounts["H2O(l)"] > 0.0
    assert end.amounts["H2O"] == 0.0


@pytest.mark.parametrize("transition", LIB["Fe(s)"].transitions, ids=lambda t: f"{t.T:.0f} K")
def test_iron_takes_up_its_latent_heat_at_the_transition(transition):
    iron, T = species("Fe(s)", "Fe(l)", "Fe"), transition.T
    end = heated(iron, {"Fe(s)": 1.0}, T - 5.0, T + 5.0, 0.5)
    below, above = LIB["Fe(s)"].h(T - 1e-6), LIB["Fe(s)"].h(T)
    if above - below > 100.0:  # a jump, not merely a kink (the Curie point)
        assert end.T == pytest.approx(T, abs=1e-8)
        assert below < end.H < above


def test_iron_melts():
    """1809 to 1811 K in published tables (JANAF 4th ed. 1809; ITS-90 secondary point 1811)."""
    end = heated(species("Fe(s)", "Fe(l)", "Fe"), {"Fe(s)": 1.0}, 1790.0, 1830.0, 0.5)
    assert 1808.0 < end.T < 1812.0
    assert end.amounts["Fe(s)"] > 0.0
    assert end.amounts["Fe(l)"] > 0.0


CHALK = species("CaCO3(s)", "CaO(s)", "CO2")


@pytest.mark.parametrize("share", [0.2, 0.8])
def test_chalk_decomposes_under_its_own_gas(share):
    end = heated(CHALK, {"CaCO3(s)": 1.0}, 1100.0, 1200.0, share)
    calcite, lime, gas = CHALK
    change = lime.g(end.T) + gas.g(end.T) - calcite.g(end.T)
    assert abs(change) < 1e-5 * R * end.T
    assert end.phase_amounts.keys() >= {"gas", lime.key, calcite.key}


def test_chalk_in_a_vessel_has_its_own_pressure():
    fed = solver.as_fed({CHALK[0]: 1.0}, 1000.0, 1e5)
    end = solver.settle(CHALK, {CHALK[0]: 1.0}, Fixed("U,V", U=fed.U + 60e3, V=0.02))
    calcite, lime, gas = CHALK
    room = (lime.molar_volume - calcite.molar_volume) * (end.p - 1e5)
    change = lime.g(end.T) + gas.g(end.T) - calcite.g(end.T) + room
    assert R * end.T * np.log(end.p / 1e5) == pytest.approx(-change, abs=1e-4)


def test_steam_condenses_in_air_without_a_plateau():
    air = species("N2", "O2", "H2O", "H2O(l)")
    feed = {"N2": 3.0, "O2": 0.8, "H2O": 0.5}
    T = np.linspace(300.0, 340.0, 9)
    ends = solver.settle_many(air, feed, "T,p", T, 1e5)
    back = solver.settle_many(air, feed, "H,p", ends.H, 1e5)
    np.testing.assert_allclose(back.T, T, rtol=1e-9)
    wet = ends.amounts[:, 3] > 0.0
    assert wet[0]
    assert not wet[-1]


def test_no_gas_at_all():
    solids = species("Fe(s)", "Fe2O3(s)", "Fe3O4(s)", "FeO(s)")
    end = solver.settle(solids, {"Fe(s)": 1.0, "Fe2O3(s)": 1.0}, Fixed("T,p", T=900.0, p=1e5))
    assert "gas" not in end.phase_amounts
    assert len(end.phase_amounts) <= 2  # phase rule: no more than independent elements


def vessel(share_of_liquid, T=400.0):
    """Water at T that fills the given share of the vessel once settled, with some nitrogen."""
    candidates = species("H2O", "H2O(l)", "N2")
    v = LIB["H2O(l)"].molar_volume
    return candidates, {"H2O(l)": share_of_liquid / v * 1e-3, "N2": 1e-5}, Fixed("T,V", T=T, V=1e-3)


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.99, 0.9999])
def test_condensed_phases_take_their_room(share):
    candidates, feed, fixed = vessel(share)
    end = solver.settle(candidates, feed, fixed)
    liquid = end.amounts["H2O(l)"] * LIB["H2O(l)"].molar_volume
    gas = end.amounts["H2O"] + end.amounts["N2"]
    assert end.p * (end.V - liquid) == pytest.approx(gas * R * end.T, rel=1e-9)
    # the pressure raises what evaporates (Poynting): ln(p_w/p_sat) = v (p - p_sat)/RT
    g = LIB["H2O(l)"].g(end.T) + LIB["H2O(l)"].molar_volume * (end.p - 1e5)
    p_water = 1e5 * np.exp((g - LIB["H2O"].g(end.T)) / (R * end.T))
    assert end.fraction("H2O") * end.p == pytest.approx(p_water, rel=1e-9)


def test_vessel_smaller_than_its_liquid_is_refused():
    candidates, feed, fixed = vessel(1.2)
    with pytest.raises(InputError, match="smaller than the liquids") as caught:
        solver.settle(candidates, feed, fixed)
    assert caught.value.field == "fixed.V"
    assert caught.value.value == 1e-3


@pytest.mark.parametrize("share", [0.9, 0.5])
def test_vessel_smaller_than_its_solid_is_refused_though_gases_are_candidates(share):
    """All iron as FeO leaves no oxygen for a gas; the vessel holds less than the solid."""
    oxides = species("FeO(s)", "Fe2O3(s)", "Fe3O4(s)", "O2")
    V = share * LIB["FeO(s)"].molar_volume
    with pytest.raises(InputError, match="smaller than the liquids"):
        solver.settle(oxides, {"FeO(s)": 1.0}, Fixed("T,V", T=900.0, V=V))


@pytest.mark.parametrize("pair", ["U,V", "S,V"])
@pytest.mark.parametrize(
    ("solid", "liquid", "gas", "T", "V"),
    [
        ("H2O(s)", "H2O(l)", "N2", 273.0, 1e-4),
        ("S(s)", "S(l)", "Ar", 388.0, 1e-4),
        ("Fe(s)", "Fe(l)", "Ar", 1809.0, 1e-2),
    ],
)
def test_melting_in_a_vessel_beside_a_gas(pair, solid, liquid, gas, T, V):
    """Both forms at one Gibbs energy each under the pressure of the gas, which they change."""
    candidates, feed = species(solid, liquid, gas), {solid: 2.0, gas: 0.05}
    variable = pair[0]
    low, high = (
        getattr(solver.settle(candidates, feed, Fixed("T,V", T=T + d, V=V)), variable)
        for d in (-3.0, 3.0)
    )
    begin = time.process_time()
    melting = [
        solver.settle(candidates, feed, Fixed(pair, **{variable: low + s * (high - low)}, V=V))
        for s in (0.4, 0.6)
    ]
    assert time.process_time() - begin < 1.0  # of two, a few hundredths each
    for end in melting:
        assert end.amounts[solid] > 0.0
        assert end.amounts[liquid] > 0.0
        v = [LIB[key].molar_volume for key in (solid, liquid)]
        room = V - end.amounts[solid] * v[0] - end.amounts[liquid] * v[1]
        assert end.p == pytest.approx(0.05 * R * end.T / room, rel=1e-12)
        g = [
            LIB[key].g(end.T) + volume * (end.p - 1e5)
            for key, volume in zip((solid, liquid), v, strict=True)
        ]
        assert g[0] - g[1] == pytest.approx(0.0, abs=1e-10 * R * end.T)
    # the pressure moves the melting point: dT/dp = T dv/dh (Clapeyron)
    first, second = melting
    T = first.T
    slope = T * (v[1] - v[0]) / (LIB[liquid].h(T) - LIB[solid].h(T) + (v[1] - v[0]) * first.p)
    assert second.T - first.T == pytest.approx(slope * (second.p - first.p), rel=1e-2)


def test_liquid_in_a_sealed_vessel_comes_back_from_its_energy():
    candidates, feed, _ = vessel(0.6)
    for T in (300.0, 350.0, 450.0):
        at = solver.settle(candidates, feed, Fixed("T,V", T=T, V=1e-3))
        for pair, values in (("U,V", {"U": at.U}), ("S,V", {"S": at.S})):
            end = solver.settle(candidates, feed, Fixed(pair, V=1e-3, **values))
            assert end.T == pytest.approx(T, rel=1e-9)


def test_pressure_on_a_solid_counts_in_its_gibbs_energy():
    """Graphite and diamond: pressure favours the denser form, dG/dp = V."""
    forms = species("C(gr)", "C(diamond)")
    low, high = (
        solver.settle(forms, {"C(gr)": 1.0}, Fixed("T,p", T=298.15, p=p)) for p in (1e5, 5e9)
    )
    assert low.amounts["C(gr)"] == 1.0
    assert high.amounts["C(diamond)"] == 1.0
