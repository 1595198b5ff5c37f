"""The lists of species that may be present at the end."""

import pytest

import species_db
from solver.project.candidates import SHORT_RULE, choose, is_organic, short_list
from solver.project.model import Candidates

LIB = species_db.load()


def _choose(fed, **wish):
    species, faults = choose(Candidates(**wish), [LIB[key] for key in fed], LIB)
    return [sp.key for sp in species], faults


@pytest.mark.parametrize(
    ("fed", "there", "not_there"),
    [
        # a fuel in air: the products of burning and of too little air, radicals, the fuel itself
        (
            ("C3H8", "O2", "N2"),
            "C3H8 CO CO2 H2 H2O H2O(l) OH H O NO NO2 N2O NH3 HCN CH4 C2H2 C2H4 C(gr)",
            "C6H6 C4H10 C(diamond) NH4NO3(s)",
        ),
        (("H2S", "O2"), "S2 S3 S4 S5 S6 S7 S8 SO SO2 SO3 S(l) S(s) H2S H2SO4 H2SO4(l)", "SF6"),
        (
            ("Fe2O3(s)", "CO"),
            "Fe(s) Fe(l) Fe3O4(s) Fe2O3(s) Fe0.947O(s) Fe3C(s) FeCO3(s)",
            "FeO(s)",
        ),
        (("CaCO3(s)", "H2O"), "CaO(s) CaCO3(s) Ca(OH)2(s) CO2", "CaSO4(s)"),
        (("NaCl(s)", "H2O", "SO2"), "NaCl NaCl(s) NaCl(l) Na2SO4(s) HCl NaOH(l) Cl2", "KCl"),
        (("CCl4", "CH4", "F2"), "CF4 CCl4 HF HCl C2F4", "SiF4"),
        (("NaHCO3(s)",), "NaHCO3(s) Na2CO3(s)", "NaC2H3O2(s)"),
    ],
)
def test_the_short_list_holds_what_an_engineer_expects(fed, there, not_there):
    keys, faults = _choose(fed)
    assert not faults
    known = {LIB.resolve(key) for key in there.split()}
    assert known <= set(keys), known - set(keys)
    unwanted = {LIB.resolve(key) for key in not_there.split() if key in LIB}
    assert not unwanted & set(keys)


def test_the_short_list_is_short_and_all_is_all():
    fed = ("CH4", "O2", "N2")
    short, _ = _choose(fed)
    everything, _ = _choose(fed, rule="all")
    assert 40 < len(short) < 130
    assert set(short) < set(everything)
    assert len(everything) > 500
    assert len(set(short)) == len(short)


def test_the_rule_is_one_text_that_can_be_shown():
    assert "\n" not in SHORT_RULE
    assert SHORT_RULE.endswith(".")


@pytest.mark.parametrize(
    ("key", "organic"),
    [
        ("C(gr)", False),
        ("CaCO3(s)", False),
        ("SiC(s)", False),
        ("NH4HCO3(s)", False),
        ("KCN(s)", False),
        ("Ni(CO)4(l)", False),
        ("CS2(l)", False),
        ("Fe3C(s)", False),
        ("H2O(l)", False),
        ("C2H5OH(l)", True),
        ("CO(NH2)2(s)", True),
        ("HCOONa(s)", True),
        ("CHCl3(l)", True),
        ("C60(s)", True),
    ],
)
def test_what_counts_as_organic(key, organic):
    assert is_organic(LIB[key]) is organic


def test_of_isomers_only_the_most_stable_stays():
    same = [
        sp
        for sp in LIB.made_of({"C", "H", "O"}, ("gas",))
        if dict(sp.elements) == {"C": 2, "H": 6, "O": 1}
    ]
    assert len(same) > 1, "ethanol and dimethyl ether"
    kept = short_list(same)
    assert [sp.key for sp in kept] == [LIB.resolve("ethanol")]


def test_of_solid_forms_those_stay_that_are_stable_somewhere():
    solids = short_list(LIB.made_of({"Si", "O"}, ("solid",)))
    silica = [sp for sp in solids if dict(sp.elements) == {"Si": 1, "O": 2}]
    cold, hot = 400.0, 1900.0
    everything = [
        sp for sp in LIB.made_of({"Si", "O"}, ("solid",)) if dict(sp.elements) == {"Si": 1, "O": 2}
    ]
    for T in (cold, hot):
        reach = [sp for sp in everything if sp.T_min <= T <= sp.T_max]
        assert min(reach, key=lambda sp: sp.g(T)) in silica


def test_additions_and_exclusions_by_key_name_or_formula():
    keys, faults = _choose(("CH4", "O2"), added=("benzene", "CO2"), excluded=("C(gr)", "methane"))
    assert not faults
    assert "C6H6" in keys
    assert keys.count("CO2") == 1
    assert "C(gr)" not in keys
    assert "CH4" not in keys, "an exclusion wins over a species that is fed"


def test_a_listed_species_of_elements_that_are_not_fed_is_left_out():
    keys, faults = _choose(("CH4", "O2"), added=("SO2",))
    assert not faults
    assert "SO2" not in keys


def test_listed_means_the_species_added_and_no_other():
    keys, faults = _choose(("SO2", "O2", "N2"), rule="listed", added=("SO3", "SO2", "O2", "N2"))
    assert not faults
    assert sorted(keys) == ["N2", "O2", "SO2", "SO3"]


def test_phases_can_be_left_out():
    keys, _ = _choose(("CH4", "O2"), phases=("gas",))
    assert {LIB[key].phase for key in keys} == {"gas"}


@pytest.mark.parametrize(
    ("fed", "wish", "field", "way_out"),
    [
        (("H2S", "O2"), {"elements": ("H", "O")}, "candidates.elements", "add S to the elements"),
        (("CO2", "Ar"), {"rule": "listed", "added": ("CO2",)}, "candidates.added", "with Ar"),
        (("CO2", "Ar"), {"excluded": ("Ar",)}, "candidates.excluded", "take back an exclusion"),
    ],
)
def test_a_fed_element_that_no_candidate_holds_is_named(fed, wish, field, way_out):
    _, faults = _choose(fed, **wish)
    assert [fault.field for fault in faults] == [field]
    assert way_out in str(faults[0])
    assert "in " in str(faults[0])


def test_names_that_nothing_answers_to_are_named_with_near_ones():
    _, faults = _choose(
        ("CH4",), added=("CO2", "methanl"), excluded=("zzzzzz",), elements=("C", "Q")
    )
    assert {fault.field for fault in faults} == {
        "candidates.added[1]",
        "candidates.excluded[0]",
        "candidates.elements[1]",
    }
    near = next(fault for fault in faults if fault.field == "candidates.added[1]")
    assert "CH3OH" in str(near)
