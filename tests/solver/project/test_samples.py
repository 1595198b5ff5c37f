"""Every sample opens, settles and proves its answer; what its note claims is so."""

from pathlib import Path

import pytest

from solver.project import file
from solver.project.case import settle_case

FOLDER = Path(__file__).parents[3] / "samples"
SAMPLES = sorted(FOLDER.glob("*.thalweg"))
CASES = [
    pytest.param(path.stem, i, id=f"{path.stem}-{i}")
    for path in SAMPLES
    for i in range(len(file.read(path).cases))
]
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
    """
    found = answer(name, i)
    end = found.end

    def h(sp):
        v = 0.0 if sp.phase == "gas" else sp.molar_volume or 0.0
        return sp.h(end.T) + v * (end.p - 1e5)

    H = sum(end.amounts[sp.key] * h(sp) for sp in end.species)
    size = sum(abs(end.amounts[sp.key] * h(sp)) for sp in end.species)
    if end.fixed.pair == "U,V":
        assert H - end.p * end.V == pytest.approx(found.fed.U + found.heat, abs=1e-9 * size)
    else:
        assert H - found.heat == pytest.approx(found.fed.H, abs=1e-9 * size)


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
