"""Impossible problems are refused with the field, the value and the way out."""

import pickle

import pytest

import solver
import species_db
from solver import Fixed, InputError, NoEndState

LIB = species_db.load()
WATER = [LIB["H2O"], LIB["H2O(l)"]]
ROOM = Fixed("T,p", T=300.0, p=1e5)


@pytest.mark.parametrize(
    ("make", "field", "said"),
    [
        (lambda: solver.settle([], {}, ROOM), "species", "no candidates"),
        (lambda: solver.settle(WATER, {}, ROOM), "feed", "empty"),
        (lambda: solver.settle(WATER, {"H2O": 0.0}, ROOM), "feed", "empty"),
        (lambda: solver.settle(WATER, {"H2O": -1.0}, ROOM), "feed[H2O]", "-1"),
        (lambda: solver.settle(WATER, {"H2O": float("nan")}, ROOM), "feed[H2O]", "nan"),
        (lambda: solver.settle(WATER, {"H2O": "much"}, ROOM), "feed[H2O]", "much"),
        (lambda: solver.settle(WATER, {"H2O": 1e300}, ROOM), "feed[H2O]", "1e+30"),
        (lambda: solver.settle(WATER, {"CO2": 1.0}, ROOM), "feed[CO2]", "not the key"),
        (lambda: solver.settle([*WATER, WATER[0]], {"H2O": 1.0}, ROOM), "species", "twice"),
        (lambda: solver.settle(WATER, {LIB["SO2"]: 1.0}, ROOM), "species", "No candidate holds S"),
        (
            lambda: solver.settle([LIB["CO2"], LIB["O2"]], {LIB["CO"]: 1.0}, ROOM),
            "species",
            "in their proportion",
        ),
        (lambda: solver.settle(WATER, {"H2O": 1.0}, ROOM, gas="thick"), "gas", "thick"),
        (lambda: Fixed("p,T", T=1.0, p=1.0), "fixed.pair", "T,p"),
        (lambda: Fixed("T,p", T=300.0), "fixed.p", "needs a value of p"),
        (lambda: Fixed("T,p", T=300.0, p=1e5, V=1.0), "fixed.V", "no variable"),
        (lambda: Fixed("T,p", T=-5.0, p=1e5), "fixed.T", "150 to 20000 K"),
        (lambda: Fixed("T,p", T=300.0, p=0.0), "fixed.p", "out of range"),
        (lambda: Fixed("U,V", U=0.0, V=-1.0), "fixed.V", "out of range"),
        (lambda: Fixed("H,p", H=float("inf"), p=1e5), "fixed.H", "finite"),
        (lambda: solver.as_fed({}, 300.0, 1e5), "feed", "empty"),
        (lambda: solver.as_fed({"H2O": 1.0}, 300.0, 1e5), "feed[H2O]", "Species"),
        (
            lambda: solver.settle_many(WATER, {"H2O": [1.0, 2.0]}, "T,p", [300.0] * 3, 1e5),
            "feeds[H2O]",
            "2 values where others have 3",
        ),
        (lambda: solver.settle_many(WATER, {"H2O": 1.0}, "T,x", 300.0, 1e5), "pair", "T,x"),
    ],
)
def test_refused(make, field, said):
    with pytest.raises(InputError) as caught:
        make()
    assert caught.value.field == field
    assert said in str(caught.value)
    assert caught.value.allowed


@pytest.mark.parametrize(("H", "said"), [(-1e9, "so little enthalpy"), (1e9, "so much enthalpy")])
def test_energy_that_no_temperature_has(H, said):
    with pytest.raises(NoEndState, match=said) as caught:
        solver.settle(WATER, {"H2O": 1.0}, Fixed("H,p", H=H, p=1e5))
    assert caught.value.field == "fixed.H"
    assert caught.value.value == H


def test_errors_survive_pickling():
    error = InputError("text", "feed[CO2]", -1.0, "0 or more mol")
    copy = pickle.loads(pickle.dumps(error))
    assert (str(copy), copy.field, copy.value, copy.allowed) == (
        "text",
        "feed[CO2]",
        -1.0,
        "0 or more mol",
    )


def test_a_faulty_case_harms_no_other():
    T = [300.0, float("nan"), 320.0, -5.0, 340.0]
    feed = {"H2O": [1.0, 1.0, -1.0, 1.0, 1.0]}
    ends = solver.settle_many(WATER, feed, "T,p", T, 1e5)
    assert ends.settled.tolist() == [True, False, False, False, True]
    assert sorted(ends.why) == [1, 2, 3]
    assert "-1.0" in ends.why[2]
    frame = ends.frame()
    assert frame.loc[[1, 2, 3], ["T", "H2O", "G"]].isna().all().all()
    one = solver.settle(WATER, {"H2O": 1.0}, Fixed("T,p", T=340.0, p=1e5))
    assert frame.loc[4, "G"] == pytest.approx(one.G, rel=1e-14)


def test_species_outside_its_data_range_is_named():
    hot = solver.settle([LIB["H2O"]], {"H2O": 1.0}, Fixed("T,p", T=8000.0, p=1e5))
    assert hot.outside_range == ("H2O",)
    assert solver.settle(WATER, {"H2O": 1.0}, Fixed("T,p", T=800.0, p=1e5)).outside_range == ()


def test_feed_may_use_any_name_of_a_candidate():
    by_name = solver.settle(WATER, {"steam": 1.0} if "steam" in LIB else {"H2O": 1.0}, ROOM)
    assert by_name.amounts["H2O(l)"] == pytest.approx(1.0)


def test_a_liquid_above_its_critical_point_is_cautioned():
    """A closed bomb of methane and oxygen in which the record of water goes on to 2000 K."""
    lib = species_db.load()
    keys = "CH4 O2 N2 CO CO2 H2 H2O OH H O NO H2O(l)".split()
    species = [lib[key] for key in keys]
    feed = {lib["CH4"]: 1.0, lib["O2"]: 1.2, lib["N2"]: 1.0}
    fed = solver.as_fed(feed, T=300.0, p=2e7)
    held = solver.Fixed("U,V", U=fed.U, V=fed.V)
    end = solver.settle(species, feed, held)
    assert end.amounts["H2O(l)"] > 0.0
    assert "647" in end.cautions[0]
    assert "H2O(l)" in end.cautions[0]
    dry = solver.settle(species[:-1], feed, held)
    assert dry.cautions == ()
    assert dry.T > end.T + 300.0
