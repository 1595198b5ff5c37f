"""Look-up by key, formula, name, synonym; lists; near misses; the user's own species."""

import pickle

import numpy as np
import pytest

import species_db
from species_db import Segment, Species, UnknownSpecies, molar_mass, parse_formula


@pytest.mark.parametrize(
    ("text", "key"),
    [
        ("CO2", "CO2"), ("H2O", "H2O"), ("HOH", "H2O"), ("H2O(g)", "H2O"), ("H2O(l)", "H2O(l)"),
        ("H2O(s)", "H2O(s)"), ("C(gr)", "C(gr)"), ("C(s)", "C(gr)"), ("graphite", "C(gr)"),
        ("carbon", "C(gr)"), ("C2H6O", "C2H5OH"), ("ethanol", "C2H5OH"), ("ETHANOL", "C2H5OH"),
        ("C2H2", "C2H2"), ("acetylene", "C2H2"), ("HCN", "HCN"), ("CHN", "HCN"),
        ("C3H6", "C3H6"), ("propylene", "C3H6"), ("C4H10", "C4H10"),
        ("C4H10(butane)", "C4H10"), ("C4H10(isobutane)", "C4H10(isobutane)"), ("O3", "O3"),
        ("N2O", "N2O"), ("HNO3", "HNO3"), ("CH3OH", "CH3OH"), ("CH4O", "CH3OH"), ("NH3", "NH3"),
        ("SiO2(s)", "SiO2(quartz)"), ("quartz", "SiO2(quartz)"),
        ("SiO2(cristobalite)", "SiO2(cristobalite)"), ("CaCO3(s)", "CaCO3(calcite)"),
        ("limestone", "CaCO3(calcite)"), ("TiO2(s)", "TiO2(rutile)"), ("FeS2(s)", "FeS2(pyrite)"),
        ("Fe0.947O(s)", "Fe0.947O(s)"), ("Fe0.947O", "Fe0.947O(s)"), ("FeO0.947", "Fe0.947O(s)"),
        ("wustite", "Fe0.947O(s)"), ("CaSO4.2H2O", "CaSO4.2H2O(s)"), ("gypsum", "CaSO4.2H2O(s)"),
        ("Ca(OH)2(s)", "Ca(OH)2(s)"), ("CaO2H2(s)", "Ca(OH)2(s)"), ("iron", "Fe(s)"),
        ("mercury", "Hg(l)"), ("sodium chloride", "NaCl(s)"), ("NaCl", "NaCl"),
        ("sulphur dioxide", "SO2"), ("aluminium oxide", "Al2O3(s)"), ("P(red)", "P(red)"),
        ("P(s)", "P(white)"), ("urea", "CO(NH2)2(s)"), ("CH4N2O(s)", "CO(NH2)2(s)"),
        ("water(l)", "H2O(l)"), ("NH4+", "NH4+"), ("e-", "e-"), ("CO", "CO"), (" CO2 ", "CO2"),
    ],
)  # fmt: skip
def test_resolves(lib, text, key):
    assert lib[text].key == key
    assert text in lib


def test_case_matters_in_formulas(lib):
    assert lib["CO"].elements == {"C": 1, "O": 1}
    assert lib["Co"].elements == {"Co": 1}
    assert "co2x" not in lib


@pytest.mark.parametrize("text", ["metane", "CO3", "Fe2O4(s)", "C2H4O", "", "??", "H2O(x)"])
def test_unknown_text_is_a_key_error_with_close_matches(lib, text):
    with pytest.raises(KeyError) as caught:
        lib[text]
    error = caught.value
    assert isinstance(error, UnknownSpecies)
    assert error.text == text
    for key in error.near:
        assert key in lib
        assert key in str(error)
    assert pickle.loads(pickle.dumps(error)).near == error.near


def test_near_misses_name_the_likely_one(lib):
    for text, key in (("metane", "CH4"), ("carbon dioxyde", "CO2"), ("CO3", "CO")):
        with pytest.raises(UnknownSpecies) as caught:
            lib[text]
        assert key in caught.value.near, text


def test_a_formula_of_several_isomers_lists_them(lib):
    with pytest.raises(UnknownSpecies, match="isomers") as caught:
        lib["C2H4O"]
    assert {"C2H4O(acetaldehyde)", "C2H4O(ethylene oxide)"} <= set(caught.value.near)


def test_made_of(lib):
    found = lib.made_of({"C", "H", "O", "N"})
    keys = [s.key for s in found]
    assert len(keys) == len(set(keys))
    wanted = "CO2 CO H2O H2 O2 N2 NO NO2 NH3 CH4 HCN C2H2 C2H4 OH H O CH3OH C(gr) H2O(l)".split()
    assert set(wanted) <= set(keys)
    assert all(set(s.elements) <= {"C", "H", "O", "N"} and not s.charge for s in found)
    gases = lib.made_of({"C", "H", "O", "N"}, phases=("gas",))
    assert gases == [s for s in found if s.phase == "gas"]
    ions = lib.made_of({"N", "O"}, phases=("gas",), ions=True)
    assert {"NO+", "e-"} <= {s.key for s in ions}
    assert [s.key for s in lib.made_of({"He"})] == ["He"]
    with pytest.raises(ValueError, match="phase"):
        lib.made_of({"O"}, phases=("plasma",))


def test_find_ranks_the_likely_first(lib):
    assert lib.find("methan")[0].key == "CH4"
    assert lib.find("CO2")[0].key == "CO2"
    assert lib.find("steam")[0].key.startswith("H2O")
    assert "C4H10(isobutane)" in [s.key for s in lib.find("isobut")]
    assert lib.find("") == []
    assert len(lib.find("a", limit=7)) == 7


def test_mapping(lib):
    assert len(lib) == len(list(lib)) == len({*lib})
    assert all(lib[key].key == key for key in lib)
    assert species_db.load() is lib


def test_users_own_species_lie_over_the_built_in_ones(lib):
    coal = Species(
        "Coal(s)", "plant coal", {"C": 1, "H": 0.8, "O": 0.1}, 0, "solid",
        (Segment(298.0, 1500.0, (1.6, 0.0, 0.0, 0.0, 0.0, -5000.0, -5.0)),),
        molar_mass({"C": 1, "H": 0.8, "O": 0.1}),
    )  # fmt: skip
    own = lib.with_species([coal])
    assert own["Coal(s)"] is coal
    assert own["plant coal"] is coal
    assert coal in own.made_of({"C", "H", "O"})
    assert "Coal(s)" not in lib
    assert len(own) == len(lib) + 1
    assert own["CO2"] == lib["CO2"]
    changed = Species(
        "CO2", "my carbon dioxide", {"C": 1, "O": 2}, 0, "gas", lib["CO"].segments,
        lib["CO2"].molar_mass,
    )  # fmt: skip
    over = lib.with_species([changed])
    assert over["CO2"] is changed
    assert len(over) == len(lib)


def test_records_are_frozen_hashable_and_picklable(lib):
    sp = lib["CO2"]
    again = pickle.loads(pickle.dumps(sp))
    assert again == sp
    assert hash(again) == hash(sp)
    assert {sp: 1.0}[again] == 1.0
    with pytest.raises(AttributeError):
        sp.key = "CO"
    with pytest.raises(TypeError):
        sp.elements["C"] = 2


def test_shapes_and_extrapolation(lib):
    sp = lib["CO2"]
    T = np.array([[150.0, 300.0, 1000.0], [2000.0, 6000.0, 9000.0]])
    for f in (sp.cp, sp.h, sp.s, sp.g):
        assert isinstance(f(500.0), float)
        assert f(T).shape == T.shape
        assert f(T)[0, 2] == f(1000.0)
    top = sp.T_max
    assert sp.cp(top + 2000.0) == sp.cp(top)
    assert sp.h(top + 2000.0) == pytest.approx(sp.h(top) + 2000.0 * sp.cp(top))
    assert sp.s(2 * top) == pytest.approx(sp.s(top) + sp.cp(top) * np.log(2.0))
    assert np.allclose(sp.g(T), sp.h(T) - T * sp.s(T))


@pytest.mark.parametrize(
    ("text", "counts", "charge"),
    [
        ("Ca(OH)2", {"Ca": 1, "O": 2, "H": 2}, 0),
        ("CaSO4.2H2O", {"Ca": 1, "S": 1, "O": 6, "H": 4}, 0),
        ("CaSO4.0.5H2O", {"Ca": 1, "S": 1, "O": 4.5, "H": 1}, 0),
        ("Fe0.947O", {"Fe": 0.947, "O": 1}, 0),
        ("CaO.SiO2", {"Ca": 1, "Si": 1, "O": 3}, 0), ("NH4+", {"N": 1, "H": 4}, 1),
        ("SO4-2", {"S": 1, "O": 4}, -2), ("Co", {"Co": 1}, 0), ("CO", {"C": 1, "O": 1}, 0),
    ],
)  # fmt: skip
def test_formulas(text, counts, charge):
    parsed = parse_formula(text)
    assert parsed is not None
    assert dict(parsed[0]) == pytest.approx(counts)
    assert parsed[1] == charge


@pytest.mark.parametrize("text", ["", "Xx", "co2", "H2O)", "(H2O", "2", "H2 O", "C++x"])
def test_no_formulas(text):
    assert parse_formula(text) is None


@pytest.mark.parametrize(
    ("name", "key"),
    [("ice", "H2O(s)"), ("silica", "SiO2(quartz)"), ("Rust", "Fe2O3(s)"), ("steam", "H2O")],
)
def test_trade_name_means_one_form(name: str, key: str):
    lib = species_db.load()
    assert lib[name].key == key
    assert lib.find(name)[0].key == key
