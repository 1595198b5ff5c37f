"""Every sample opens, settles and proves its answer; what its note claims is so."""

from pathlib import Path

import numpy as np
import pytest

from solver.fixed import PAIRS
from solver.gas.fluid import make_fluid
from solver.gas.properties import ln_phi, residual_properties
from solver.project import file
from solver.project.beside import settle_beside
from solver.project.case import reactions_of, settle_case

FOLDER = Path(__file__).parents[3] / "samples"
SAMPLES = sorted(FOLDER.glob("*.thalweg"))
CASES = [
    pytest.param(path.stem, i, id=f"{path.stem}-{i}")
    for path in SAMPLES
    for i in range(len(file.read(path).cases))
]
R = 8.314462618
_settled = {}


def answer(name, i=0):
    if (name, i) not in _settled:
        case = file.read(FOLDER / f"{name}.thalweg").cases[i]
        _settled[name, i] = settle_case(case)
    return _settled[name, i]


def test_there_are_samples_and_each_says_what_it_shows():
    assert len(SAMPLES) >= 6
    listed = (FOLDER / "README.md").read_text("utf-8")
    for path in SAMPLES:
        project = file.read(path)
        assert "invented" in project.notes
        assert "Shows:" in project.notes
        assert f"`{path.stem}`" in listed
        assert path.read_text("utf-8") == file.text_of(project), "saved as the program saves"


@pytest.mark.parametrize(("name", "i"), CASES)
def test_a_sample_settles_with_its_proof(name, i):
    found = answer(name, i)
    end, proof = found.end, found.end.proof
    assert proof.element_residual <= 1e-12
    assert proof.energy_residual <= 1e-10
    assert abs(proof.gap) <= 1e-9
    assert min(end.amounts.values()) >= 0
    assert all(activity <= 1 for activity in proof.absent.values())


@pytest.mark.parametrize(("name", "i"), CASES)
def test_every_atom_fed_is_in_the_end_state(name, i):
    """Counted here from the formulas, apart from the solver's own closure."""
    found = answer(name, i)
    balance: dict[str, float] = {}
    fed: dict[str, float] = {}
    for sp, n in found.prepared.feed.items():
        for element, count in sp.elements.items():
            balance[element] = balance.get(element, 0.0) + n * count
            fed[element] = fed.get(element, 0.0) + n * count
    for sp in found.end.species:
        for element, count in sp.elements.items():
            if found.end.amounts[sp.key]:
                balance[element] -= found.end.amounts[sp.key] * count
    for element, left in balance.items():
        assert abs(left) <= 1e-9 * fed[element], element


@pytest.mark.parametrize(("name", "i"), CASES)
def test_energy_closes_over_the_end_state(name, i):
    """H of the end state, summed here from the records, is H of the feed plus the heat.

    A condensed species of constant molar volume v adds v (p - 1 bar) to its enthalpy; U = H - p V.
    A fluid of an equation of state adds its residual enthalpy.
    """
    found = answer(name, i)
    end = found.end

    def h(sp):
        v = 0.0 if sp.phase == "gas" else sp.molar_volume or 0.0
        return sp.h(end.T) + v * (end.p - 1e5)

    H = sum(end.amounts[sp.key] * h(sp) for sp in end.species)
    H += sum(residual(found, phase).H[0] for phase in end.fluids)
    size = sum(abs(end.amounts[sp.key] * h(sp)) for sp in end.species)
    if PAIRS[end.fixed.pair].holds_volume:
        assert H - end.p * end.V == pytest.approx(found.fed.U + found.heat, abs=1e-9 * size)
    else:
        assert H - found.heat == pytest.approx(found.fed.H, abs=1e-9 * size)


def fluid_of(found):
    gas = found.prepared.gas
    species = [sp for sp in found.end.species if sp.phase == "gas"]
    return make_fluid(species, gas.key, gas.interactions)


def amounts_in(found, phase):
    held = found.end.fluids[phase]
    return np.array([[held[sp.key] for sp in fluid_of(found).species]])


def residual(found, phase):
    T, p = np.array([found.end.T]), np.array([found.end.p])
    return residual_properties(fluid_of(found), T, p, amounts_in(found, phase))


def test_the_reformer_takes_heat_and_stays_clear_of_carbon():
    found = answer("reformer-outlet")
    assert found.heat > 20e6
    assert 0.4 < found.end.fraction("H2") < 0.55
    assert found.end.proof.absent["C(gr)"] < 0.5


def test_the_sealed_flame_keeps_its_volume_and_its_pressure_ratio_hardly_depends_on_the_start():
    one, two = answer("sealed-deflagration", 0), answer("sealed-deflagration", 1)
    for found in (one, two):
        assert found.end.V == pytest.approx(0.036, rel=1e-9)
        assert found.end.p / found.fed.p == pytest.approx(9.6, abs=0.3)
    assert two.end.T > one.end.T, "pressure holds dissociation back"


def test_the_wall_loss_cools_the_burner():
    hot, cooler = answer("off-gas-burner", 0), answer("off-gas-burner", 1)
    assert hot.heat == pytest.approx(0.0, abs=1.0)
    assert cooler.heat == pytest.approx(-240e3, rel=1e-9)
    assert cooler.end.T < hot.end.T


def test_graphite_forms_at_the_cold_wall_and_not_at_the_hot_inlet():
    hot, cold = answer("carbon-in-cooler", 0).end, answer("carbon-in-cooler", 1).end
    assert hot.amounts["C(gr)"] == 0
    assert hot.proof.absent["C(gr)"] < 1
    assert cold.amounts["C(gr)"] > 0


def test_the_converter_turns_more_over_when_held_cool():
    def conversion(found):
        so3, so2 = found.end.amounts["SO3"], found.end.amounts["SO2"]
        return so3 / (so3 + so2)

    adiabatic, cool = answer("converter-first-bed", 0), answer("converter-first-bed", 1)
    assert conversion(adiabatic) < conversion(cool)
    assert conversion(cool) > 0.95
    assert adiabatic.basis == "flow"


def test_lime_forms_in_the_burning_zone_alone():
    cool, hot = answer("lime-kiln", 0).end, answer("lime-kiln", 1).end
    stone = {key for key in hot.amounts if key.startswith("CaCO3")}
    assert sum(cool.amounts[key] for key in stone) > cool.amounts["CaO(s)"]
    assert sum(hot.amounts[key] for key in stone) == 0
    assert hot.amounts["CaO(s)"] > 0
    assert hot.amounts["MgO(s)"] > 0


def test_iron_comes_free_where_gas_is_in_plenty():
    plenty, short = answer("iron-shaft", 0).end, answer("iron-shaft", 1).end
    assert plenty.amounts["Fe(s)"] > 0
    assert plenty.amounts["Fe2O3(s)"] == 0
    assert short.amounts["Fe0.947O(s)"] > 0


def test_sulfur_condenses():
    found = answer("sulfur-furnace", 1).end
    assert found.amounts["S(l)"] > 0
    assert found.amounts["S8"] > found.amounts["S2"]
    hot = answer("sulfur-furnace", 0).end
    assert hot.amounts["S2"] > hot.amounts["S8"]


def test_sulfur_dioxide_with_oxygen_is_never_a_sealed_batch():
    for path in SAMPLES:
        for case in file.read(path).cases:
            fed = {amount.species for stream in case.streams for amount in stream.amounts}
            if {"SO2", "O2"} <= fed:
                assert "V" not in case.fixed.pair
                assert answer(path.stem).basis == "flow"


def by_key(found):
    return {sp.key: sp for sp in found.end.species}


def test_the_approach_held_is_the_one_found_in_the_outlet_gas():
    """Q of the outlet, from the mole fractions, is K at T - dT; methane slips more each time."""
    slip, heat, cost = [], [], []
    for i, dT in enumerate((0.0, 6.0, 38.0)):
        found = answer("aged-reformer", i)
        end, species = found.end, by_key(found)
        p = end.p / 1e5
        ln_q = sum(
            nu * np.log(end.fraction(key) * p)
            for key, nu in (("CH4", -1), ("H2O", -1), ("CO", 1), ("H2", 3))
        )
        T = end.T - dT
        dg = species["CO"].g(T) + 3 * species["H2"].g(T) - species["CH4"].g(T) - species["H2O"].g(T)
        assert ln_q == pytest.approx(-dg / (R * T), abs=1e-9)
        approaches = {f.reaction.text: f.approach.approach for f in reactions_of(found).figures}
        assert approaches["CH4 + H2O = CO + 3 H2"] == pytest.approx(dT, abs=1e-6)
        assert approaches["CO + H2O = CO2 + H2"] == pytest.approx(0.0, abs=1e-6)
        slip.append(end.amounts["CH4"])
        heat.append(found.heat)
        cost.append(end.proof.restrictions[-1].energy if dT else 0.0)
        assert end.amounts["N2"] == pytest.approx(0.021 * 290e3 / 3600, rel=1e-12)
        assert end.amounts["NH3"] == 0.0
    assert slip == sorted(slip)
    assert heat == sorted(heat, reverse=True)
    assert cost[0] < cost[1] < cost[2]


def test_what_slips_past_the_flame_cools_it():
    whole, slipping, both = (answer("slipping-burner", i) for i in range(3))
    for found in (slipping, both):
        inert = 0.07 * found.prepared.feed[by_key(found)["CH4"]]
        assert found.end.amounts["CH4"] == pytest.approx(inert, rel=1e-9)
        assert found.end.proof.restrictions[0].energy > 0
    assert slipping.end.T < whole.end.T - 50
    o2 = 240 / 3600 / by_key(both)["O2"].molar_mass
    assert both.end.amounts["O2"] > o2
    assert both.end.amounts["CO"] > slipping.end.amounts["CO"], "less oxygen is at hand"


def test_the_turbine_keeps_its_entropy_and_reaction_adds_work():
    live, frozen = answer("hot-gas-turbine", 0), answer("hot-gas-turbine", 1)
    for found in (live, frozen):
        end, species = found.end, by_key(found)
        S = sum(
            n * (species[key].s(end.T) - R * np.log(end.fraction(key) * end.p / 1e5))
            for key, n in end.amounts.items()
            if n > 0
        )
        assert pytest.approx(found.fed.S, rel=1e-9) == S
        assert found.heat_is == "work"
        assert found.heat < 0
    for sp, n in frozen.prepared.feed.items():
        # Hydrogen and steam are not held themselves: they can still shed traces of radicals.
        free = sp.key in ("H2", "H2O")
        assert frozen.end.amounts[sp.key] == pytest.approx(n, rel=1e-9 if free else 1e-12)
    assert -live.heat > -frozen.heat
    assert live.end.T > frozen.end.T


def test_heat_on_the_plateau_goes_into_the_reaction_alone():
    half, most, past = (answer("kiln-charge", i) for i in range(3))
    species, T = by_key(half), half.end.T
    assert most.end.T == pytest.approx(T, rel=1e-9)
    assert past.end.T > T + 100
    assert past.end.amounts["CaCO3(calcite)"] == 0

    def of(prop):
        lime, gas, stone = (species[key] for key in ("CaO(s)", "CO2", "CaCO3(calcite)"))
        return getattr(lime, prop)(T) + getattr(gas, prop)(T) - getattr(stone, prop)(T)

    assert of("g") / (R * T) == pytest.approx(0.0, abs=1e-9), "p(CO2) is 1 bar"
    more = most.end.amounts["CaO(s)"] - half.end.amounts["CaO(s)"]
    assert more == pytest.approx(400e6 / of("h"), rel=1e-9)


def test_liquid_and_vapour_of_the_cylinder_are_at_equilibrium_in_its_volume():
    pressures = []
    for i in range(3):
        found = answer("warm-cylinder", i)
        end, species = found.end, by_key(found)
        liquid, T, p = species["N2O4(l)"], end.T, end.p
        gas = sum(n for key, n in end.amounts.items() if key != "N2O4(l)")
        volume = gas * R * T / p + end.amounts["N2O4(l)"] * liquid.molar_volume
        assert volume == pytest.approx(0.020, rel=1e-9)

        def mu(key, end=end, species=species, T=T, p=p):
            return species[key].g(T) + R * T * np.log(end.fraction(key) * p / 1e5)

        pressed = liquid.g(T) + liquid.molar_volume * (p - 1e5)
        assert mu("N2O4") == pytest.approx(pressed, abs=1e-5)
        assert 2 * mu("NO2") == pytest.approx(pressed, abs=1e-5)
        assert end.amounts["N2"] == pytest.approx(
            sum(n for sp, n in found.prepared.feed.items() if sp.key == "N2"), rel=1e-12
        )
        pressures.append(p)
    assert pressures[2] / pressures[0] > 4 * answer("warm-cylinder", 2).end.T / 278.15


def test_the_water_of_the_tank_takes_the_flame_down():
    flame, settled = answer("vent-tank", 0), answer("vent-tank", 1)
    end, species = settled.end, by_key(settled)
    assert flame.end.T > 2000
    assert end.T < 373
    assert end.p < flame.end.p / 3
    assert end.amounts["H2O(l)"] > 0
    pressed = species["H2O(l)"].g(end.T) + species["H2O(l)"].molar_volume * (end.p - 1e5)
    steam = species["H2O"].g(end.T) + R * end.T * np.log(end.fraction("H2O") * end.p / 1e5)
    assert steam == pytest.approx(pressed, abs=1e-5)


def beside(name, i):
    case = file.read(FOLDER / f"{name}.thalweg").cases[i]
    return settle_beside(case, answer(name, i))


def test_the_ammonia_converter_gives_more_than_an_ideal_gas_would():
    found, both = answer("ammonia-loop", 0), beside("ammonia-loop", 0)
    real, ideal, of = both.shares("NH3")
    assert of == "gas"
    assert 0.014 < real - ideal < 0.017
    end, species, fluid = found.end, by_key(found), fluid_of(found)
    phi = ln_phi(fluid, np.array([end.T]), np.array([end.p]), amounts_in(found, "gas"))[0]
    at = {sp.key: k for k, sp in enumerate(fluid.species)}
    numbers = (("N2", -1), ("H2", -3), ("NH3", 2))
    ln_q = sum(
        nu * (np.log(end.fraction(key, "gas") * end.p / 1e5) + phi[at[key]]) for key, nu in numbers
    )
    dg = sum(nu * species[key].g(end.T) for key, nu in numbers)
    assert ln_q == pytest.approx(-dg / (R * end.T), abs=1e-9)


@pytest.mark.parametrize(
    ("name", "i"), [("ammonia-loop", 1), ("wet-syngas-cooler", 0), ("wet-syngas-cooler", 1)]
)
def test_what_condenses_has_the_same_fugacity_in_gas_and_liquid(name, i):
    found = answer(name, i)
    end, fluid = found.end, fluid_of(found)
    T, p = np.array([end.T]), np.array([end.p])
    ln_f = []
    for phase in ("gas", "liquid"):
        n = amounts_in(found, phase)
        ln_f.append(np.log(n / n.sum())[0] + ln_phi(fluid, T, p, n)[0])
    assert ln_f[0] == pytest.approx(ln_f[1], abs=1e-8)
    assert found.heat < 0
    for sp, n in found.prepared.feed.items():
        assert end.amounts[sp.key] == pytest.approx(n, rel=1e-9), "cooled, not reacted"


def test_the_chiller_takes_most_of_the_ammonia_out_and_an_ideal_gas_none():
    found, both = answer("ammonia-loop", 1), beside("ammonia-loop", 1)
    end = found.end
    assert end.fluids["liquid"]["NH3"] > 0.75 * end.amounts["NH3"]
    assert 0.01 < 1.0 - end.fraction("NH3", "liquid") < 0.05, "gases are dissolved"
    assert list(both.ideal.end.phases) == ["gas"]
    assert any("hydrogen bonds" in sentence for sentence in end.cautions)


def test_water_condenses_once_and_the_models_part_at_the_dew_point():
    warm, cold = (beside("wet-syngas-cooler", i) for i in range(2))
    for both in (warm, cold):
        end = both.real.end
        assert end.left_out == {"H2O(l)": "H2O"}
        assert end.amounts["H2O(l)"] == 0.0
        assert end.fraction("H2O", "liquid") > 0.998
        assert both.ideal.end.amounts["H2O(l)"] > 0.0

    def condensed(both):
        return (
            both.real.end.fluids["liquid"]["H2O"],
            both.ideal.end.amounts["H2O(l)"],
        )

    real, ideal = condensed(warm)
    assert real < 0.5 * ideal
    real, ideal = condensed(cold)
    assert real == pytest.approx(ideal, rel=2e-3)
