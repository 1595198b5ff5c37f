"""What is held back: typed, refused at its field, undone, saved, and its cost in the proof."""

import pytest
from PySide6.QtCore import Qt

from gui import restriction_edits as edits
from solver.project.file import read, write
from solver.project.model import HeldApproach, HeldConversion, InertPart, SeparateGroup

from .cases import burner, project, q
from .conftest import settled
from .test_window import press, retype


@pytest.fixture
def section(window):
    return window.held_fixed.restrictions


def pick(line, name):
    line.kind.setCurrentIndex(line.kind.findData(name))
    line.kind.activated.emit(line.kind.currentIndex())


def test_a_species_is_held_inert_and_let_go(window, section, qtbot):
    free = window.session.answer.value.end.amounts["CO"]
    assert not section.isVisible()
    press(window, "add_restriction")
    line = section.lines[0]
    settled(qtbot, window)
    assert window.session.answer.state == "settled"  # an empty line counts as not written
    retype(qtbot, line.about, "CH4")
    settled(qtbot, window)
    end = window.session.answer.value.end
    assert end.amounts["CH4"] == 1.0
    assert end.amounts["CO"] < free
    qtbot.mouseClick(line.remove, Qt.MouseButton.LeftButton)
    settled(qtbot, window)
    assert window.session.case.restrictions == ()
    assert window.session.answer.value.end.amounts["CO"] == free
    press(window, "undo")
    assert window.session.case.restrictions[0].species == "CH4"


def test_a_conversion_is_held_and_its_cost_stands_in_the_proof(window, section, qtbot):
    press(window, "add_restriction")
    line = section.lines[0]
    pick(line, "conversion")
    retype(qtbot, line.about, "CH4")
    retype(qtbot, line.value, "60")
    settled(qtbot, window)
    end = window.session.answer.value.end
    assert end.amounts["CH4"] == pytest.approx(0.4, abs=1e-12)
    press(window, "tab_proof")
    table = window.ends_up.proof.held_back.model
    assert table.index(0, 0).data() == "conversion of CH₄ held at 60 %"
    cost = end.proof.restrictions[0].energy
    assert cost > 0
    assert float(table.index(0, 1).data()) == pytest.approx(cost / 1e3, rel=1e-3)
    assert "Gibbs" in window.ends_up.proof.held_back.note.text()
    window.ends_up.copy()


def test_a_reaction_stays_away_from_equilibrium(window, section, qtbot):
    press(window, "add_restriction")
    line = section.lines[0]
    pick(line, "approach")
    retype(qtbot, line.about, "CO + H2O = CO2 + H2")
    settled(qtbot, window)
    assert "approach is not said" in line.sentence.text()
    assert line.value.property("faulty") == "true"
    retype(qtbot, line.value, "-30")
    settled(qtbot, window)
    assert window.session.answer.state == "settled"
    held = window.session.case.restrictions[0]
    assert held == HeldApproach(reaction="CO + H2O = CO2 + H2", dT=q(-30.0, "K"))


def test_groups_that_do_not_exchange(window, section, qtbot):
    press(window, "add_restriction")
    line = section.lines[0]
    pick(line, "no exchange")
    assert not any(field.isVisible() for field in line.values.values())
    retype(qtbot, line.about, "N2, ")
    assert line.about.text() == "N2, "  # as typed, while it means the same
    settled(qtbot, window)
    assert window.session.case.restrictions[0] == SeparateGroup(species=("N2",))
    assert window.session.answer.value.end.amounts["NO"] == 0.0


@pytest.mark.parametrize(
    ("kind", "about", "value", "says", "at_value"),
    [
        ("inert", "Xy", "", "not in the library", False),
        ("inert", "CO", "", "not fed", False),
        ("inert", "CH4", "-3 mol", "cannot be negative", True),
        ("inert", "CH4", "3 mol", "only 1.000 mol are fed", True),
        ("conversion", "CH4", "", "conversion is not said", True),
        ("conversion", "CH4", "140 %", "0 to 100 %", True),
        ("conversion", "CH4", "most", "not a number", True),
        ("approach", "CH4 + H2O = CO", "5", "does not balance", False),
        ("no exchange", "N2, Zz", None, "Zz", False),
    ],
)
def test_a_fault_stands_at_its_field(window, section, qtbot, kind, about, value, says, at_value):
    press(window, "add_restriction")
    line = section.lines[0]
    pick(line, kind)
    retype(qtbot, line.about, about)
    if value:
        retype(qtbot, line.value, value)
    settled(qtbot, window)
    assert says in line.sentence.text()
    assert (line.about.property("faulty") == "true") is not at_value
    if at_value:
        assert line.value.property("faulty") == "true"
    assert line.about.text() == about
    press(window, "undo")
    press(window, "undo")
    press(window, "undo")
    settled(qtbot, window)


def test_another_kind_keeps_what_it_is_about():
    inert = InertPart(species="CH4", part=q(30.0, "%"))
    conversion = edits.turned(inert, "conversion")
    assert conversion == HeldConversion(species="CH4")
    assert edits.turned(conversion, "no exchange") == SeparateGroup(species=("CH4",))
    assert edits.turned(inert, "inert") is inert


def test_restrictions_are_saved_and_shown_again(make_window, qtbot, tmp_path):
    case = burner(
        restrictions=(
            InertPart(species="N2"),
            HeldConversion(species="CH4", conversion=q(90.0, "%")),
            HeldApproach(reaction="CO + H2O = CO2 + H2", dT=q("warm", ""), key="CO"),
        )
    )
    path = tmp_path / "held.thalweg"
    write(project(case), path)
    window = make_window(path=path)
    lines = window.held_fixed.restrictions.lines
    assert [line.kind.currentData() for line in lines] == ["inert", "conversion", "approach"]
    assert lines[1].value.text() == "90 %"
    assert lines[2].value.text() == "warm"
    assert "warm" in lines[2].sentence.text()
    retype(qtbot, lines[2].value, "15 K")
    settled(qtbot, window)
    assert window.session.answer.state == "settled"
    write(window.session.project, path)
    assert read(path).cases[0].restrictions[2].key == "CO"  # not shown, not lost


def test_the_line_is_held_back_as_the_case_is(make_window, qtbot):
    window = make_window(project(burner(restrictions=(InertPart(species="CH4"),))))
    line = window.what_if._line
    share = line.shares[:, line.keys.index("CH4")]
    amounts = window.session.answer.value.end.amounts
    assert share.min() > 0.9 * amounts["CH4"] / sum(amounts.values())


def test_the_species_that_carries_the_shift_is_chosen(window, section, qtbot):
    press(window, "add_restriction")
    line = section.lines[0]
    assert not line.carrier.isVisible()
    pick(line, "approach")
    retype(qtbot, line.about, "CO + H2O = CO2 + H2")
    retype(qtbot, line.value, "-300")
    settled(qtbot, window)
    menu = line.carrier.menu
    assert line.carrier.isVisible()
    assert [menu.itemText(i) for i in range(menu.count())] == [
        "automatic",
        *("CO", "H₂O", "CO₂", "H₂"),
    ]
    assert menu.currentText() == "automatic"
    automatic = dict(window.session.answer.value.end.amounts)
    menu.setCurrentIndex(menu.findData("CO2"))
    menu.activated.emit(menu.currentIndex())
    assert window.session.case.restrictions[0].key == "CO2"
    settled(qtbot, window)
    assert window.session.answer.value.prepared.restrictions[0].key == "CO2"
    assert window.session.answer.value.end.amounts != automatic
    press(window, "undo")
    settled(qtbot, window)
    assert menu.currentText() == "automatic"
    assert dict(window.session.answer.value.end.amounts) == automatic


def test_a_carrier_that_is_no_species_of_the_reaction_is_marked(make_window):
    held = HeldApproach(reaction="CO + H2O = CO2 + H2", dT=q(-10.0, "K"), key="CH4")
    window = make_window(project(burner(restrictions=(held,))))
    line = window.held_fixed.restrictions.lines[0]
    assert line.carrier.menu.property("faulty") == "true"
    assert line.carrier.menu.currentData() == "CH4"
    assert "CH4 is no species of" in line.sentence.text()
    assert line.about.property("faulty") != "true"
