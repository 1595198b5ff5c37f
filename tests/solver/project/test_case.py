"""From a case as typed to an end state."""

import pickle

import pytest

import species_db
from solver.errors import InputError, NoEndState
from solver.project.case import CaseFaults, prepare, settle_case
from solver.project.model import Amount, Candidates, Case, FixedPair, Quantity, Stream

LIB = species_db.load()
R = 8.314462618


def q(text):
    value, _, unit = text.partition(" ")
    return Quantity(value=float(value), unit=unit)


def stream(*rows, T="25 degC", p="1 bar", total=None, name="feed"):
    amounts = tuple(Amount(species=key, value=value, unit=unit) for key, value, unit in rows)
    return Stream(name=name, T=q(T), p=q(p), amounts=amounts, total=q(total) if total else None)


def case(*streams, pair="T,p", heat=None, candidates=None, **values):
    fixed = FixedPair(
        pair=pair,
        values={name: q(text) for name, text in values.items()},
        heat=q(heat) if heat else None,
    )
    return Case(streams=streams, fixed=fixed, candidates=candidates or Candidates())


def moles(prepared):
    return {sp.key: n for sp, n in prepared.feed.items()}


def test_ways_of_saying_the_same_batch():
    mole = {"CH4": 30.0, "O2": 70.0}
    mass = {key: n * LIB[key].molar_mass for key, n in mole.items()}
    whole = sum(mass.values())
    ways = [
        stream(*((key, n, "mol") for key, n in mole.items())),
        stream(*((key, m, "kg") for key, m in mass.items())),
        stream(("CH4", 30, "mol %"), ("O2", 70, "mol %"), total="100 mol"),
        stream(("CH4", 30, "mol %"), ("O2", 70, "mol %"), total=f"{whole!r} kg"),
        stream(
            *((key, 100 * m / whole, "mass %") for key, m in mass.items()), total=f"{whole!r} kg"
        ),
        stream(*((key, 100 * m / whole, "mass %") for key, m in mass.items()), total="0.1 kmol"),
        stream(("CH4", 30e3, "mmol"), ("methane", 0, "kg"), ("oxygen", 0.07, "kmol")),
        stream(("CH4", 10, "mol"), ("CH4", 20, "mol"), ("O2", 70, "mol")),
    ]
    for way in ways:
        prepared = prepare(case(way, T="900 K"))
        assert prepared.basis == "batch"
        assert moles(prepared) == pytest.approx(mole, rel=1e-12)


def test_flows_are_carried_per_second():
    # 1 kmol/h = 1/3.6 mol/s; a normal cubic metre holds 44.615 mol (22.414 L/mol, CODATA)
    prepared = prepare(
        case(
            stream(("CH4", 3.6, "kmol/h"), ("N2", 360, "Nm3/h"), ("H2O(l)", 64.8, "kg/h")),
            T="900 K",
        )
    )
    assert prepared.basis == "flow"
    assert moles(prepared) == pytest.approx(
        {"CH4": 1.0, "N2": 4.4615033, "H2O(l)": 0.018 / LIB["H2O"].molar_mass}, rel=1e-7
    )


def test_a_vessel_is_filled_by_its_volume():
    filling = stream(("H2", 10, "mol %"), ("N2", 90, "mol %"), p="2 bar", total="20 L")
    prepared = prepare(case(filling, pair="U,V"))
    assert sum(prepared.feed.values()) == pytest.approx(2e5 * 0.02 / (R * 298.15), rel=1e-9)
    assert prepared.fixed.V == pytest.approx(0.02, rel=1e-9)
    gas = prepare(case(stream(("N2", 1, "m3"), T="0 degC", p="1 atm"), T="900 K"))
    assert sum(gas.feed.values()) == pytest.approx(44.615033, rel=1e-7)


def test_shares_of_a_rounded_analysis_are_scaled_and_said_so():
    prepared = prepare(
        case(
            stream(
                ("N2", 78.1, "mol %"), ("O2", 20.95, "mol %"), ("Ar", 0.9, "mol %"), total="100 mol"
            ),
            T="900 K",
        )
    )
    assert sum(prepared.feed.values()) == pytest.approx(100.0)
    assert any("99.95" in message for message in prepared.messages)


def test_an_empty_row_counts_as_not_written():
    rows = (("CH4", 1.0, "mol"), ("", "", "mol"), ("O2", "2,5", "mol"))
    assert moles(prepare(case(stream(*rows), T="900 K"))) == {"CH4": 1.0, "O2": 2.5}


def test_enthalpy_as_fed_is_the_sum_of_the_streams_at_their_own_temperatures():
    fuel = stream(("CH4", 1, "mol"), T="400 K", p="3 bar", name="fuel")
    air = stream(("O2", 3, "mol"), ("N2", 11, "mol"), T="700 K", p="2 bar", name="air")
    prepared = prepare(case(fuel, air, pair="H,p", p="1 bar", heat="-50 kJ"))
    H = LIB["CH4"].h(400.0) + 3 * LIB["O2"].h(700.0) + 11 * LIB["N2"].h(700.0)
    assert prepared.fed.H == pytest.approx(H, rel=1e-12)
    assert prepared.fixed.H == pytest.approx(H - 50e3, rel=1e-12)
    V = R * 400 / 3e5 + 14 * R * 700 / 2e5
    assert prepared.fed.V == pytest.approx(V, rel=1e-9)
    assert prepared.fed.U == pytest.approx(H - R * (400 + 14 * 700), rel=1e-9)
    assert prepared.fed.T is None
    assert prepared.fed.p is None


def test_the_heat_of_an_adiabatic_case_is_nothing_and_a_loss_is_what_was_lost():
    feed = stream(("H2", 2, "mol"), ("O2", 1.2, "mol"), ("N2", 5, "mol"))
    adiabatic = settle_case(case(feed, pair="H,p"))
    assert adiabatic.heat == pytest.approx(0.0, abs=1e-6 * 1e6)
    lossy = settle_case(case(feed, pair="H,p", heat="-100 kJ"))
    assert lossy.heat == pytest.approx(-1e5, rel=1e-9)
    assert lossy.end.T < adiabatic.end.T
    sealed = settle_case(case(feed, pair="U,V", heat="-100 kJ"))
    assert sealed.heat == pytest.approx(-1e5, rel=1e-9)
    assert sealed.end.V == pytest.approx(sealed.fed.V, rel=1e-9)
    assert sealed.end.T > lossy.end.T, "no work is done against the surroundings"


def test_with_entropy_held_the_figure_is_work():
    """Nitrogen expanded reversibly: T2 = T1 (p2/p1)^(R/cp), work = H2 - H1."""
    hot = case(stream(("N2", 1, "mol"), T="600 K", p="8 bar"), pair="S,p", p="1 bar")
    answer = settle_case(hot)
    assert answer.heat_is == "work"
    mean_cp = (LIB["N2"].h(600.0) - LIB["N2"].h(answer.end.T)) / (600.0 - answer.end.T)
    assert answer.end.T == pytest.approx(600.0 * (1 / 8) ** (R / mean_cp), rel=2e-3)
    assert answer.heat == pytest.approx(LIB["N2"].h(answer.end.T) - LIB["N2"].h(600.0), rel=1e-6)
    assert settle_case(case(stream(("N2", 1, "mol")), T="900 K")).heat_is == "heat"


def test_heat_of_reaction_comes_out_as_heat():
    """Burning 1 mol H2 at 298.15 K to steam gives off 241.8 kJ (ATcT 1.112: 241.83)."""
    gases = Candidates(rule="listed", added=("H2", "O2", "H2O"))
    answer = settle_case(
        case(stream(("H2", 1, "mol"), ("O2", 0.5, "mol")), T="298.15 K", candidates=gases)
    )
    assert answer.heat == pytest.approx(-241.83e3, abs=100.0)
    flow = settle_case(
        case(stream(("H2", 3.6, "kmol/h"), ("O2", 1.8, "kmol/h")), T="298.15 K", candidates=gases)
    )
    assert flow.basis == "flow"
    assert flow.heat == pytest.approx(answer.heat, rel=1e-9)


def test_pressure_and_temperature_of_the_streams_are_held_where_none_is_written():
    prepared = prepare(case(stream(("CH4", 1, "mol"), T="500 degC", p="4 barg")))
    assert prepared.fixed.T == 773.15
    assert prepared.fixed.p == 501325.0
    same = prepare(
        case(
            stream(("CH4", 1, "mol"), p="24 bar"),
            stream(("O2", 1, "mol"), p="2.4 MPa", T="298.15 K", name="second"),
        )
    )
    assert same.fixed.p == pytest.approx(24e5)


def test_values_of_another_pair_are_kept_but_not_used():
    both = case(stream(("CH4", 1, "mol")), T="900 K", p="2 bar", V="7 m3", H="1 MJ", heat="5 kJ")
    prepared = prepare(both)
    assert (prepared.fixed.T, prepared.fixed.p) == (900.0, 2e5)
    assert any("Heat is not used" in message for message in prepared.messages)


def test_a_temperature_outside_the_data_is_answered_and_the_species_named():
    hot = settle_case(
        case(stream(("CaCO3(s)", 1, "mol"), ("CO2", 5, "mol"), p="100 bar"), T="1300 degC")
    )
    end = hot.end
    assert end.outside_range
    for key in end.outside_range:
        assert any(key in message and "End state" in message for message in hot.messages)
    cold = prepare(case(stream(("CO2", 1, "mol"), T="-100 degC"), T="900 K"))
    assert any("CO2" in message and "173.15 K" in message for message in cold.messages)


def test_a_stream_of_nothing_beside_others_is_remarked():
    prepared = prepare(
        case(stream(("CH4", 1, "mol")), stream(("SO2", 0, "mol"), name="off"), T="900 K")
    )
    assert moles(prepared) == {"CH4": 1.0}
    assert any("'off'" in message for message in prepared.messages)
    assert not any("S" in sp.elements for sp in prepared.candidates)


def faults(wrong):
    with pytest.raises(CaseFaults) as caught:
        prepare(wrong)
    for fault in caught.value.faults:
        assert isinstance(fault, InputError)
        assert "\n" not in str(fault)
        assert fault.field
    return {fault.field: str(fault) for fault in caught.value.faults}


GOOD = ("CH4", 1.0, "mol")


@pytest.mark.parametrize(
    ("wrong", "field", "text"),
    [
        (case(T="900 K"), "streams", "No stream"),
        (case(stream(), T="900 K"), "streams[0].amounts", "is empty"),
        (case(stream(("CH4", 0, "mol")), T="900 K"), "streams[0].amounts", "all amounts are zero"),
        (case(stream(("CH4", -1, "mol")), T="900 K"), "streams[0].amounts[0].value", "negative"),
        (case(stream(("CH4", "abc", "mol"))), "streams[0].amounts[0].value", "'abc'"),
        (case(stream(("CH4", "", "mol"))), "streams[0].amounts[0].value", "not said"),
        (case(stream(("", 5.0, "mol"))), "streams[0].amounts[0].species", "no species"),
        (case(stream(("methanl", 1, "mol"))), "streams[0].amounts[0].species", "CH3OH"),
        (case(stream(("CH4", 1, "mool"))), "streams[0].amounts[0].unit", "mol"),
        (case(stream(("CH4", 1, "bar"))), "streams[0].amounts[0].unit", "pressure"),
        (case(stream(GOOD, T="0 K")), "streams[0].T", "absolute zero"),
        (case(stream(GOOD, T="-400 degC")), "streams[0].T", "absolute zero"),
        (case(stream(GOOD, T="1e9 K")), "streams[0].T", "out of range"),
        (case(stream(GOOD, p="0 bar")), "streams[0].p", "vacuum"),
        (case(stream(GOOD, p="-3 barg")), "streams[0].p", "vacuum"),
        (case(stream(GOOD), T="-1 K"), "fixed.T", "absolute zero"),
        (case(stream(GOOD), T="1e9 K"), "fixed.T", "out of range"),
        (case(stream(GOOD), T="5 bar"), "fixed.T", "pressure"),
        (case(stream(GOOD), p="0 Pa"), "fixed.p", "vacuum"),
        (case(stream(GOOD), pair="U,V", V="-1 L"), "fixed.V", "zero"),
        (case(stream(GOOD), pair="H,p", heat="5 MW"), "fixed.heat", "kJ"),
        (case(stream(("CH4", 1, "mol/s")), pair="H,p", heat="5 kJ"), "fixed.heat", "kW"),
        (case(stream(GOOD), pair="H,p", H="5 K"), "fixed.H", "temperature"),
        (case(stream(("CH4", 1, "mol/s")), pair="U,V"), "fixed.pair", "batch"),
        (
            case(stream(GOOD), stream(("O2", 1, "mol/s"), name="air")),
            "streams[1].amounts",
            "per time, or none",
        ),
        (case(stream(GOOD, ("O2", 1, "kg/h"))), "streams[0].amounts[1].unit", "flows"),
        (case(stream(GOOD, ("O2", 50, "mol %"))), "streams[0].amounts[1].unit", "shares"),
        (case(stream(("O2", 100, "mol %"))), "streams[0].total", "total"),
        (case(stream(("O2", 90, "mol %"), total="1 mol")), "streams[0].amounts", "90.00 %"),
        (case(stream(("O2", 100, "mol %"), total="-1 mol")), "streams[0].total", "positive"),
        (case(stream(("O2", 100, "mol %"), total="1 K")), "streams[0].total", "temperature"),
        (
            case(stream(("O2", 50, "mol %"), ("N2", 50, "mass %"), total="1 mol")),
            "streams[0].amounts[1].unit",
            "mol % with mass %",
        ),
        (case(stream(("H2O(l)", 5, "Nm3"))), "streams[0].amounts[0].unit", "liquid"),
        (
            case(stream(("C(gr)", 100, "mol %"), total="5 Nm3/h")),
            "streams[0].total",
            "solid",
        ),
        (
            case(stream(GOOD), stream(("O2", 1, "mol"), T="400 K", name="air")),
            "fixed.T",
            "differ in temperature",
        ),
        (
            case(stream(GOOD), candidates=Candidates(elements=("H",))),
            "candidates.elements",
            "No candidate holds C",
        ),
        (case(stream(("H+", 1, "mol"))), "streams", "net electric charge"),
        (case(stream(GOOD), candidates=Candidates(added=("xyz",))), "candidates.added[0]", "xyz"),
    ],
)
def test_bad_input_is_named_at_its_field(wrong, field, text):
    found = faults(wrong)
    assert field in found, found
    assert text in found[field]


def test_all_faults_of_a_case_come_together():
    found = faults(
        case(
            stream(("CH4", -1, "mol"), ("xyzzy", 1, "mol"), T="0 K"),
            stream(("O2", 1, "furlong"), p="-1 bar", name="air"),
            T="-5 K",
            candidates=Candidates(excluded=("qqq",)),
        )
    )
    assert set(found) == {
        "streams[0].amounts[0].value",
        "streams[0].amounts[1].species",
        "streams[0].T",
        "streams[1].amounts[0].unit",
        "streams[1].p",
        "fixed.T",
        "candidates.excluded[0]",
    }


def test_faults_survive_the_way_between_processes():
    with pytest.raises(CaseFaults) as caught:
        prepare(case(stream(("CH4", -1, "mol"), T="0 K")))
    again = pickle.loads(pickle.dumps(caught.value))
    assert [str(f) for f in again.faults] == [str(f) for f in caught.value.faults]
    assert again.field == caught.value.field


def test_an_energy_that_no_temperature_can_match_is_said_with_the_heat():
    feed = stream(("N2", 1, "mol"))
    with pytest.raises(NoEndState, match="Taking away 1000 kJ") as caught:
        settle_case(case(feed, pair="H,p", heat="-1000 kJ"))
    assert caught.value.field == "fixed.heat"
    with pytest.raises(NoEndState, match="add less heat") as caught:
        settle_case(case(feed, pair="U,V", heat="1e9 kJ"))
    assert caught.value.field == "fixed.heat"
    with pytest.raises(NoEndState) as caught:
        settle_case(case(feed, pair="H,p", H="1e9 kJ"))
    assert caught.value.field == "fixed.H"


def test_candidates_that_cannot_take_up_the_feed_are_the_fault():
    listed = Candidates(rule="listed", added=("CO2", "H2O"))
    with pytest.raises(InputError) as caught:
        settle_case(case(stream(("CH4", 1, "mol"), ("O2", 1, "mol")), candidates=listed))
    assert caught.value.field == "candidates"
