"""Restrictions and reaction sets as typed: what reaches the solver, and what is refused where."""

import json
import math

import pytest

import species_db
from solver.errors import InputError, NoEndState
from solver.project import file
from solver.project.case import CaseFaults, prepare, reactions_of, settle_case
from solver.project.model import (
    Amount,
    Candidates,
    Case,
    FixedPair,
    HeldApproach,
    HeldConversion,
    InertPart,
    Project,
    Quantity,
    SeparateGroup,
    Stream,
)
from solver.restrictions import FixedConversion, Inert, NoExchange

LIB = species_db.load()
R = 8.314462618
REFORMING = "CH4 + H2O = CO + 3 H2"
SHIFT = "CO + H2O = CO2 + H2"


def q(text):
    value, _, unit = text.partition(" ")
    return Quantity(value=float(value), unit=unit)


def case(*restrictions, reactions=(), unit="mol", pair="T,p", extra=(), candidates=None, **values):
    rows = (("CH4", 1.0), ("H2O", 3.0), ("N2", 0.5), *extra)
    stream = Stream(
        name="feed",
        T=q("400 degC"),
        p=q("20 bar"),
        amounts=tuple(Amount(species=key, value=n, unit=unit) for key, n in rows),
    )
    held = {name: q(text) for name, text in ({"T": "1100 K"} | values).items()}
    return Case(
        streams=(stream,),
        fixed=FixedPair(pair=pair, values=held),
        restrictions=restrictions,
        reactions=reactions,
        candidates=candidates or Candidates(),
    )


def faults(wrong):
    with pytest.raises(CaseFaults) as caught:
        prepare(wrong)
    for fault in caught.value.faults:
        assert isinstance(fault, InputError)
        assert "\n" not in str(fault)
        assert "e-0" not in str(fault)
    return {fault.field: str(fault) for fault in caught.value.faults}


def test_a_case_without_restrictions_is_as_it_was():
    old = json.loads(file.text_of(Project(cases=(case(),))))
    for name in ("restrictions", "reactions"):
        assert old["cases"][0].pop(name) == []
    assert file.parse(json.dumps(old).encode()) == Project(cases=(case(),))


def test_every_kind_is_saved_and_read_back(tmp_path):
    every = case(
        InertPart(species="N2"),
        InertPart(species="CH4", part=q("4 %")),
        HeldConversion(species="H2O", conversion=q("30 %")),
        HeldApproach(reaction=REFORMING, dT=q("-10 K"), key="CH4"),
        SeparateGroup(species=("N2", "NH3")),
        InertPart(),
        HeldApproach(dT=Quantity(value="ten", unit="K")),
        reactions=(SHIFT, "half of it"),
    )
    path = tmp_path / "plant.thalweg"
    file.write(Project(cases=(every,)), path)
    assert file.read(path).cases[0] == every


@pytest.mark.parametrize(
    ("wrong", "place", "text"),
    [
        ({"kind": "nert"}, "cases[0].restrictions[0].kind", "'nert'"),
        ({"species": "N2"}, "cases[0].restrictions[0]", "does not say its kind"),
        ({"kind": "inert", "species": 5}, "cases[0].restrictions[0].species", "must be a text"),
        ({"kind": "approach", "dT": {"value": 1}}, "cases[0].restrictions[0].dT.unit", "missing"),
        ({"kind": "inert", "dT": 1}, "cases[0].restrictions[0].dT", "not a field"),
        (7, "cases[0].restrictions[0]", "group of fields"),
    ],
)
def test_a_broken_restriction_in_a_file_is_named_at_its_place(wrong, place, text):
    document = json.loads(file.text_of(Project(cases=(case(),))))
    document["cases"][0]["restrictions"] = [wrong]
    with pytest.raises(file.ProjectFileError, match=text) as caught:
        file.parse(json.dumps(document).encode())
    assert caught.value.field == place


def test_each_kind_reaches_the_solver_in_its_words():
    prepared = prepare(
        case(
            InertPart(),
            InertPart(species="nitrogen", part=Quantity(value="", unit="%")),
            HeldConversion(species="methane", conversion=q("80 %")),
            HeldApproach(reaction=SHIFT, dT=q("18 degF")),
            HeldConversion(),
            SeparateGroup(species=("", "Ar")),
            extra=(("Ar", 0.1),),
        )
    )
    inert, conversion, approach, group = prepared.restrictions
    assert inert == Inert("N2")
    assert conversion == FixedConversion("CH4", 0.8)
    assert approach.reaction.text == SHIFT
    assert approach.dT == pytest.approx(10.0)
    assert group == NoExchange({"Ar"})
    assert prepared.restriction_fields == tuple(f"restrictions[{i}]" for i in (1, 2, 3, 5))


@pytest.mark.parametrize(
    ("unit", "part", "share"),
    [
        ("mol", "25 %", 0.25),
        ("mol", "0.25 mol", 0.25),
        ("mol", "4.0106 g", 0.25),
        ("kmol/h", "250 mol/h", 0.25),
        ("kmol/h", "5.60349 Nm3/h", 0.25),
        ("mol", "0 mol", 0.0),
        ("mol", "1 mol", 1.0),
    ],
)
def test_an_inert_part_may_be_written_as_a_share_or_an_amount(unit, part, share):
    prepared = prepare(case(InertPart(species="CH4", part=q(part)), unit=unit))
    (inert,) = prepared.restrictions
    assert inert.share == pytest.approx(share, rel=1e-4)


def test_conversion_is_that_of_the_feed_and_costs_gibbs_energy():
    answer = settle_case(case(HeldConversion(species="CH4", conversion=q("30 %"))))
    assert answer.end.amounts["CH4"] == pytest.approx(0.7, rel=1e-12)
    (cost,) = answer.end.proof.restrictions
    free = settle_case(case())
    assert cost.energy == pytest.approx(answer.end.G - free.end.G, rel=1e-9)
    assert cost.energy > 0
    assert free.end.proof.restrictions == ()


def test_an_inert_species_neither_goes_nor_forms():
    answer = settle_case(case(InertPart(species="CH4"), InertPart(species="N2")))
    assert answer.end.amounts["CH4"] == pytest.approx(1.0, rel=1e-14)
    assert answer.end.amounts["N2"] == pytest.approx(0.5, rel=1e-14)
    assert answer.end.amounts["NH3"] == 0.0


def test_a_group_that_does_not_exchange_keeps_its_atoms():
    answer = settle_case(case(SeparateGroup(species=("CH4", "C2H6")), extra=(("CO2", 1.0),)))
    carbon = sum(LIB[key].elements["C"] * answer.end.amounts[key] for key in ("CH4", "C2H6"))
    assert carbon == pytest.approx(1.0, rel=1e-12)


def test_restrictions_hold_with_energy_and_volume_pairs():
    for pair in ("H,p", "U,V", "T,V", "S,p", "S,V"):
        held = case(HeldConversion(species="CH4", conversion=q("10 %")), pair=pair, V="0.02 m3")
        end = settle_case(held).end
        assert end.amounts["CH4"] == pytest.approx(0.9, rel=1e-9), pair


@pytest.mark.parametrize(
    ("wrong", "field", "text"),
    [
        (InertPart(species="unobtainium"), "restrictions[0].species", "not in the library"),
        (InertPart(part=q("5 %")), "restrictions[0].species", "no species"),
        (InertPart(species="CO"), "restrictions[0]", "not fed"),
        (InertPart(species="Ar"), "restrictions[0]", "no candidate"),
        (InertPart(species="CH4", part=q("120 %")), "restrictions[0].part", "0 to 100 %"),
        (InertPart(species="CH4", part=q("-1 mol")), "restrictions[0].part", "negative"),
        (InertPart(species="CH4", part=q("2 mol")), "restrictions[0].part", "only 1.000 mol"),
        (InertPart(species="CH4", part=q("2 mol/s")), "restrictions[0].part", "not per batch"),
        (InertPart(species="CH4", part=q("2 bar")), "restrictions[0].part", "%, mol, kg"),
        (HeldConversion(species="CH4"), "restrictions[0].conversion", "not said"),
        (
            HeldConversion(species="CH4", conversion=q("101 %")),
            "restrictions[0].conversion",
            "101 %",
        ),
        (HeldConversion(species="CO", conversion=q("1 %")), "restrictions[0]", "not fed"),
        (HeldApproach(reaction=REFORMING), "restrictions[0].dT", "not said"),
        (HeldApproach(dT=q("5 K")), "restrictions[0].reaction", "not said"),
        (
            HeldApproach(reaction="CH4 = CO", dT=q("5 K")),
            "restrictions[0].reaction",
            "does not balance",
        ),
        (HeldApproach(reaction=REFORMING, dT=q("2000 K")), "restrictions[0].dT", "1000 K"),
        (HeldApproach(reaction=REFORMING, dT=q("-990 K")), "restrictions[0].dT", "110.0 K"),
        (HeldApproach(reaction=REFORMING, dT=q("5 bar")), "restrictions[0].dT", "pressure"),
        (
            HeldApproach(reaction=REFORMING, dT=q("5 K"), key="N2"),
            "restrictions[0].key",
            "name one of CH4",
        ),
        (
            HeldApproach(reaction="2 CH3OH = C2H6O(ether) + H2O", dT=q("5 K")),
            "restrictions[0].reaction",
            "names",
        ),
        (SeparateGroup(species=("CH4", "?")), "restrictions[0].species[1]", "not in the library"),
        (SeparateGroup(species=("Ar",)), "restrictions[0]", "no candidate"),
    ],
)
def test_a_wrong_restriction_is_named_at_its_field(wrong, field, text):
    found = faults(case(wrong))
    assert set(found) == {field}
    assert text in found[field]


def test_what_contradicts_is_laid_at_the_later_one():
    found = faults(
        case(
            InertPart(species="N2"),
            HeldConversion(species="N2", conversion=q("5 %")),
            SeparateGroup(species=("C2H6", "C2H4")),
            SeparateGroup(species=("C2H4", "C2H2")),
            HeldApproach(reaction=SHIFT, dT=q("5 K")),
            HeldApproach(reaction="CO2 + H2 = CO + H2O", dT=q("-5 K")),
        )
    )
    assert set(found) == {"restrictions[1]", "restrictions[3]", "restrictions[5]"}
    assert "twice" in found["restrictions[1]"]
    assert "two groups" in found["restrictions[3]"]
    assert "keep one" in found["restrictions[5]"]


def test_faults_of_restrictions_come_with_those_of_the_streams():
    wrong = case(
        HeldConversion(species="CH4", conversion=q("-5 %")),
        InertPart(species="CH4", part=q("9 kg")),
        reactions=(SHIFT, "x"),
        extra=(("Ar", -1.0),),
        T="0 K",
    )
    assert set(faults(wrong)) == {
        "streams[0].amounts[3].value",
        "restrictions[0].conversion",
        "reactions[1]",
        "fixed.T",
    }


def test_a_conversion_that_nothing_can_take_up_is_its_own_fault():
    only = Candidates(rule="listed", added=("CH4", "H2O", "N2", "H2", "O2"))
    with pytest.raises(InputError) as caught:
        settle_case(case(HeldConversion(species="CH4", conversion=q("50 %")), candidates=only))
    assert caught.value.field == "restrictions[0]"
    no_oxygen = Candidates(rule="listed", added=("CH4", "H2O", "N2", "H2", "CO", "CO2"))
    full = HeldConversion(species="H2O", conversion=q("100 %"))
    with pytest.raises(InputError) as caught:
        settle_case(
            case(InertPart(species="N2"), full, InertPart(species="CH4"), candidates=no_oxygen)
        )
    assert caught.value.field == "restrictions[1]"


def test_the_engineers_own_reactions_are_used_and_checked():
    """Without ammonia and but for traces the two explain all that happens to methane."""
    own = (" ", "CH4 + 2 H2O = CO2 + 4 H2", SHIFT)
    answer = settle_case(case(InertPart(species="N2"), reactions=own))
    view = reactions_of(answer)
    assert [f.reaction.text for f in view.figures] == ["CH4 + 2 H2O = CO2 + 4 H2", SHIFT]
    assert view.figures[0].extent == pytest.approx(1.0 - answer.end.amounts["CH4"], abs=1e-4)
    found = faults(case(reactions=("CH4 = CO", SHIFT, "CO2 + H2 = CO + H2O")))
    assert set(found) == {"reactions[0]"}
    found = faults(case(reactions=(SHIFT, "CO2 + H2 = CO + H2O")))
    assert set(found) == {"reactions[1]"}
    assert "follows from the others" in found["reactions[1]"]


def test_a_set_is_chosen_where_none_is_written():
    answer = settle_case(case(unit="kmol/h"))
    view = reactions_of(answer)
    assert view.complete
    assert view.figures[0].reaction.text == REFORMING
    for figures in view.figures:
        assert figures.q_over_k == pytest.approx(1.0, abs=1e-9)
        assert figures.dg == pytest.approx(-R * answer.end.T * figures.ln_k, rel=1e-9)


def test_a_bare_formula_means_the_form_that_is_a_candidate():
    listed = Candidates(rule="listed", added=("CH4", "H2", "C(gr)", "H2O", "N2"))
    prepared = prepare(case(reactions=("CH4 = C + 2 H2",), candidates=listed))
    assert prepared.reactions[0].text == "CH4 = C(gr) + 2 H2"
    assert prepared.messages == ()
    both = prepare(case(reactions=("CH4 = C + 2 H2",)))
    assert both.reactions[0].text == "CH4 = C + 2 H2"
    assert any("for the solid write C(gr)" in message for message in both.messages)
    assert not any("H2O" in message for message in both.messages)


def test_no_end_state_is_said_in_numbers_as_people_write_them():
    with pytest.raises(NoEndState, match=r"so little enthalpy \(−9\.000 × 10⁷ kJ\)") as caught:
        settle_case(case(pair="H,p", H="-9e10 J"))
    assert caught.value.field == "fixed.H"
    with pytest.raises(NoEndState, match=r"so much entropy \(5000 kJ/K\)"):
        settle_case(case(pair="S,p", S="5 MJ/K"))


def test_a_cost_is_nothing_where_a_restriction_does_not_bind():
    free = settle_case(case())
    reached = 100 * (1 - free.end.amounts["CH4"])
    same = settle_case(case(HeldConversion(species="CH4", conversion=q(f"{reached!r} %"))))
    (cost,) = same.end.proof.restrictions
    assert not math.isnan(cost.energy)
    assert abs(cost.energy) < 1e-9 * abs(free.end.G)
