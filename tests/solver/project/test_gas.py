"""The gas model of a case: read, refused, and set beside an ideal gas."""

import pytest

import species_db
from solver.errors import InputError
from solver.gas_model import GasModel
from solver.project import file
from solver.project.beside import settle_beside
from solver.project.case import CaseFaults, prepare, settle_case
from solver.project.gas import modelled_keys, pairs_of, pairs_text
from solver.project.model import (
    Amount,
    Candidates,
    Case,
    FixedPair,
    Interaction,
    Project,
    Quantity,
    Stream,
)
from solver.settle import settle

LIB = species_db.load()


def q(value, unit):
    return Quantity(value=value, unit=unit)


def case(gas="pr", *pairs, added=(), pair="T,p", **values):
    stream = Stream(
        name="gas",
        T=q(300, "K"),
        p=q(200, "bar"),
        amounts=(
            Amount(species="N2", value=1, unit="mol"),
            Amount(species="H2", value=3, unit="mol"),
        ),
    )
    return Case(
        streams=(stream,),
        fixed=FixedPair(pair=pair, values=values),
        candidates=Candidates(rule="listed", added=("N2", "H2", "NH3", *added)),
        gas=gas,
        interactions=tuple(Interaction(a=a, b=b, k=k) for a, b, k in pairs),
    )


def faults(*pairs, gas="srk", added=()):
    with pytest.raises(CaseFaults) as caught:
        prepare(case(gas, *pairs, added=added))
    return [(fault.field, str(fault)) for fault in caught.value.faults]


@pytest.mark.parametrize("gas", ["ideal", "srk", "pr"])
def test_the_model_of_the_case_reaches_feed_and_end(gas):
    found = settle_case(case(gas, T=q(700, "K"), p=q(200, "bar")))
    assert found.end.gas == gas
    assert found.prepared.gas == GasModel(gas)
    fed = sum(found.prepared.feed.values()) * 8.314462618 * 300 / 200e5
    assert (found.fed.V == pytest.approx(fed, rel=1e-12)) is (gas == "ideal")


def test_own_pairs_reach_the_solver():
    held = {"T": q(300, "K"), "p": q(200, "bar")}
    plain = settle_case(case("srk", **held))
    own = settle_case(case("srk", ("nitrogen", "H2", 0.2), ("NH3", "N2", "0,1"), **held))
    assert own.prepared.gas.interactions == (("N2", "H2", 0.2), ("NH3", "N2", 0.1))
    by_hand = settle(
        own.prepared.candidates,
        dict(own.prepared.feed),
        own.prepared.fixed,
        gas=GasModel("srk", (("N2", "H2", 0.2), ("N2", "NH3", 0.1))),
    )
    assert own.end.amounts == pytest.approx(by_hand.amounts)
    assert own.end.amounts["NH3"] != pytest.approx(plain.end.amounts["NH3"], rel=1e-6)
    assert own.fed.V != pytest.approx(plain.fed.V, rel=1e-6), "the pair is in the feed too"


def test_a_row_with_nothing_in_it_is_not_written():
    assert prepare(case("pr", ("", " ", ""))).gas == GasModel("pr")


def test_pairs_are_kept_and_not_used_while_the_gas_is_ideal():
    found = prepare(case("ideal", ("N2", "H2", 3.0), T=q(700, "K"), p=q(1, "bar")))
    assert found.gas == GasModel("ideal")
    assert any("k_ij of the case are not used" in text for text in found.messages)


@pytest.mark.parametrize(
    ("pair", "field", "says"),
    [
        (("N2", "Zz", 0.1), "b", "not in the library"),
        (("", "N2", 0.1), "a", "names one species only"),
        (("N2", "Ar", 0.1), "b", "not among the candidates"),
        (("N2", "N2", 0.1), "b", "itself"),
        (("N2", "H2", ""), "k", "not said"),
        (("N2", "H2", "much"), "k", "not a number"),
        (("N2", "H2", 1.5), "k", "out of range"),
        (("N2", "H2", "-1.2"), "k", "out of range"),
        (("N2", "H2O(l)", 0.1), "b", "is a liquid of its own"),
        (("N2", "NH2", 0.1), "b", "no usable critical constants"),
    ],
)
def test_a_pair_that_cannot_be_is_refused_at_its_field(pair, field, says):
    (found,) = faults(("NH3", "H2", 0.05), pair, added=("NH2",))
    assert found[0] == f"interactions[1].{field}"
    assert says in found[1]


def test_a_pair_given_twice_is_refused_at_the_later_one():
    (found,) = faults(("N2", "H2", 0.1), ("H2", "nitrogen", 0.1))
    assert found[0] == "interactions[1].a"
    assert "given twice" in found[1]


def test_every_fault_is_told_at_once():
    found = [field for field, _ in faults(("N2", "Zz", 2.0), ("N2", "N2", "x"))]
    assert sorted(found) == [f"interactions[{i}].{part}" for i in (0, 1) for part in "bk"]


def test_a_file_says_which_model_is_meant():
    document = file.text_of(Project(cases=(case("pr"),))).replace('"gas": "pr"', '"gas": "vdw"')
    with pytest.raises(file.ProjectFileError) as caught:
        file.parse(document.encode())
    assert caught.value.field == "cases[0].gas"
    assert "'ideal', 'srk' or 'pr'" in str(caught.value)


def test_a_file_without_the_pairs_opens():
    text = file.text_of(Project(cases=(case("ideal"),)))
    assert '"interactions": []' in text
    older = text.replace('      "interactions": [],\n', "")
    assert older != text
    assert file.parse(older.encode()).cases[0] == case("ideal")


def test_what_is_typed_survives_saving(tmp_path):
    typed = Project(cases=(case("srk", ("N2", "", "a lot"), ("nitrogen", "H2", 0.25)),))
    file.write(typed, tmp_path / "plant.thalweg")
    assert file.read(tmp_path / "plant.thalweg") == typed


def test_published_pairs_are_counted_and_ones_own_go_over_them():
    species = [LIB[key] for key in ("N2", "H2", "NH3", "NH2", "H2O(l)")]
    assert modelled_keys(species) == {"N2", "H2", "NH3"}
    published = pairs_of(GasModel("pr"), species)
    assert {frozenset((pair.a, pair.b)) for pair in published} == {
        frozenset(("N2", "H2")),
        frozenset(("N2", "NH3")),
    }
    own = GasModel("pr", (("H2", "N2", 0.3),))
    values = {frozenset((pair.a, pair.b)): pair.k for pair in pairs_of(own, species)}
    assert values[frozenset(("N2", "H2"))] == 0.3
    assert pairs_text(own, species) == "1 published k_ij and 1 of your own, all others zero"
    assert pairs_of(GasModel("ideal"), species) == ()


def test_the_ideal_case_beside_has_an_ideal_feed_too():
    """In a vessel filled to 200 bar the ideal feed takes another volume, which is then held."""
    typed = case("srk", pair="U,V")
    found = settle_case(typed)
    both = settle_beside(typed, found)
    assert both.real is found
    ideal = both.ideal
    assert ideal.end.gas == "ideal"
    assert ideal.end.V == pytest.approx(4 * 8.314462618 * 300 / 200e5, rel=1e-12)
    assert ideal.heat == pytest.approx(0.0, abs=1e-6)
    assert both.held_differs
    alone = settle_case(case("ideal", pair="U,V"))
    assert ideal.end.T == alone.end.T
    assert both.main[0] == "H2"
    assert both.gas_shares() == (1.0, 1.0)


def test_where_the_ideal_case_has_no_end_state_it_says_so():
    typed = case("srk", pair="T,p", T=q(300, "K"), p=q(1, "bar"))
    found = settle_case(typed)
    cold = typed.model_copy(update={"streams": ()})
    with pytest.raises(InputError, match="No stream"):
        settle_beside(cold, found)


def test_a_liquid_that_is_fed_as_such_is_remarked_on():
    stream = Stream(
        name="water",
        T=q(25, "degC"),
        p=q(1, "bar"),
        amounts=(
            Amount(species="H2O(l)", value=2, unit="mol"),
            Amount(species="N2", value=1, unit="mol"),
        ),
    )
    wet = Case(
        streams=(stream,),
        fixed=FixedPair(pair="T,p"),
        candidates=Candidates(rule="listed", added=("H2O", "H2O(l)", "N2")),
        gas="pr",
    )
    found = settle_case(wet)
    assert found.end.left_out == {"H2O(l)": "H2O"}
    assert any("record of the pure liquid" in text for text in found.messages)
    assert not settle_case(wet.model_copy(update={"gas": "ideal"})).messages
