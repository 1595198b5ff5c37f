"""The view of reactions: the set, one's own, and one reaction by hand."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication

from gui import reaction_rows
from gui.parts.reactions_view import AMOUNTS, ENERGY, SET
from solver.project.case import reactions_of, settle_case
from solver.project.model import Amount, Candidates, Case, FixedPair, Project, Stream
from solver.reactions import hand_calculation

from .cases import burner, project, q
from .conftest import settled


def shifted(**changes):
    """Carbon monoxide and steam over a shift catalyst, one reaction and nothing else."""
    feed = Stream(
        name="feed",
        T=q(400, "degC"),
        p=q(1, "bar"),
        amounts=(
            Amount(species="CO", value=1.0, unit="mol"),
            Amount(species="H2O", value=2.0, unit="mol"),
            Amount(species="N2", value=1.0, unit="mol"),
        ),
    )
    case = Case(
        name="shift",
        streams=(feed,),
        fixed=FixedPair(pair="H,p"),
        candidates=Candidates(rule="listed", added=("CO", "H2O", "CO2", "H2", "N2")),
    )
    return case.model_copy(update=changes)


@pytest.fixture
def view(make_window):
    window = make_window(Project(cases=(shifted(),)))
    window.actions_by_name["tab_reactions"].trigger()
    return window.ends_up.reactions


def cells(model, row):
    return [model.index(row, c).data() for c in range(model.columnCount())]


def test_the_set_is_written_with_subscripts_and_balances_at_the_end(view):
    row = cells(view.set.model, 0)
    assert view.set.model.rowCount() == 1
    assert row[0] == "CO + H₂O = CO₂ + H₂"
    assert row[2] == row[3]  # K and Q
    assert row[4] == "1.000"
    assert row[9] == "0"
    # From the formation enthalpies of the library: -393.5 + 110.5 + 241.8 kJ/mol.
    assert float(row[5].replace("−", "-")) == pytest.approx(-41.2, abs=0.2)
    assert "approach" in view.line.text()


def test_by_hand_the_single_reaction_ends_where_the_case_ends(view):
    end = view._answer.end
    hand = hand_calculation(
        view._view.reactions[0], dict(view._answer.prepared.feed), view._answer.prepared.fixed
    )
    assert hand.T == pytest.approx(end.T, rel=1e-9)
    view.turn(AMOUNTS)
    shown = {view.amounts.model.index(r, 0).data(): cells(view.amounts.model, r) for r in range(6)}
    assert shown["CO"][1] == "−1"
    assert float(shown["CO₂"][4]) == pytest.approx(end.amounts["CO2"], rel=1e-3)
    assert shown["N₂"][3] == "0"
    offs = [t.off for t in hand.trials]
    assert offs == sorted(offs)
    assert offs[0] < 0 < offs[-1]
    assert "used up" in view.line.text()


def test_by_hand_the_energy_is_taken_apart_term_by_term(view):
    view.turn(ENERGY)
    model = view.energy.model
    terms = {model.index(r, 0).data(): cells(model, r) for r in range(model.rowCount())}
    placed, total = terms["energy to be placed"], terms["sum of the above"]
    assert placed[1:3] == total[1:3]
    assert placed[2] == "J"
    assert "×" in terms["taken up by the reaction"][3]


def test_a_reaction_by_hand_says_that_others_stand_still(make_window):
    window = make_window()
    window.actions_by_name["tab_reactions"].trigger()
    view = window.ends_up.reactions
    assert view.set.model.rowCount() > 2
    view.set.table.setCurrentIndex(view.set.model.index(1, 0))
    view.turn(AMOUNTS)
    assert view.which.currentIndex() == 1
    view.which.setCurrentIndex(0)
    view.which.activated.emit(0)
    assert "ends elsewhere" in view.line.text()


def test_a_pair_that_is_not_worked_out_by_hand_says_so(make_window):
    window = make_window(Project(cases=(shifted(fixed=FixedPair(pair="S,p")),)))
    window.actions_by_name["tab_reactions"].trigger()
    view = window.ends_up.reactions
    view.turn(ENERGY)
    assert "S,p" in view.line.text()
    assert view.energy.model.rowCount() == 0


def test_own_reactions_are_typed_checked_undone_and_saved(make_window, qtbot, tmp_path):
    from solver.project.file import read, write

    window = make_window(Project(cases=(shifted(),)))
    window.actions_by_name["tab_reactions"].trigger()
    view = window.ends_up.reactions
    assert not view.own.isVisible()
    view.own_link.setChecked(True)
    settles = window.session.answer
    qtbot.keyClicks(view.own, "2 CO2 + 2 H2 -> 2 CO + 2 H2O")
    assert view.set.model.index(0, 0).data() == "2 CO₂ + 2 H₂ = 2 CO + 2 H₂O"
    assert window.session.answer is settles  # the end state does not depend on them
    qtbot.keyClick(view.own, Qt.Key.Key_Return)
    qtbot.keyClicks(view.own, "CO + H2O = CO2 + H2")
    assert "follows from the others" in view.own_sentence.text()
    assert view.own.property("faulty") == "true"
    assert window.session.answer.state == "settled"
    path = tmp_path / "own.thalweg"
    write(window.session.project, path)
    assert len(read(path).cases[0].reactions) == 2
    window.session.undo_stack.undo()
    assert window.session.case.reactions == ()
    assert view.own.toPlainText() == ""
    assert view.own_sentence.text() == ""


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("CO + H2O = CO2", "does not balance"),
        ("CO and H2O", "no sign between"),
        ("CO + Xy2 = CO2", "Xy2"),
    ],
)
def test_a_wrong_reaction_says_so_beneath_the_field(view, qtbot, text, says):
    view.own_link.setChecked(True)
    qtbot.keyClicks(view.own, text)
    assert says in view.own_sentence.text()
    assert view.set.model.rowCount() == 1  # a readable set stands in meanwhile


def test_what_is_shown_is_copied_with_full_figures(view):
    view.copy()
    text = QGuiApplication.clipboard().text()
    head, row = (line.split("\t") for line in text.splitlines()[:2])
    assert head[0] == "reaction"
    assert row[0] == "CO + H2O = CO2 + H2"
    assert float(row[4]) == pytest.approx(1.0, abs=1e-9)
    assert len(row[2]) > 8
    view.turn(AMOUNTS)
    view.copy()
    assert QGuiApplication.clipboard().text().startswith("CO + H2O = CO2 + H2\nspecies\t")
    view.turn(SET)


def test_a_flow_is_said_per_second():
    case = settle_case(shifted(streams=(_as_flow(shifted().streams[0]),)))
    reaction = reactions_of(case).reactions[0]
    hand = hand_calculation(reaction, dict(case.prepared.feed), case.prepared.fixed)
    _, rows = reaction_rows.energy_table(hand, flow=True)
    assert {row[2].shown for row in rows} == {"W", "J/mol", "m³/s"}
    assert " mol/s × " in next(r[3].shown for r in rows if "taken up" in r[0].shown)
    assert reaction_rows.amounts_table(hand, flow=True)[0][2] == "fed, mol/s"


def _as_flow(stream):
    amounts = tuple(a.model_copy(update={"unit": "mol/s"}) for a in stream.amounts)
    return stream.model_copy(update={"amounts": amounts})


def test_an_approach_that_is_held_is_read_back(make_window, qtbot):
    from solver.project.model import HeldApproach

    held = HeldApproach(reaction="CO + H2O = CO2 + H2", dT=q(40, "K"))
    fixed = FixedPair(pair="T,p", values={"T": q(700, "K"), "p": q(1, "bar")})
    window = make_window(Project(cases=(shifted(restrictions=(held,), fixed=fixed),)))
    window.actions_by_name["tab_reactions"].trigger()
    settled(qtbot, window)
    row = cells(window.ends_up.reactions.set.model, 0)
    assert float(row[9].replace("−", "-")) == pytest.approx(-40.0, abs=1e-3)
    assert row[4] != "1.000"
    window.ends_up.reactions.turn(AMOUNTS)
    assert "restrictions are left out" in window.ends_up.reactions.line.text().lower()


def test_nothing_is_shown_while_there_is_no_answer(make_window):
    window = make_window(project(burner(streams=())))
    window.actions_by_name["tab_reactions"].trigger()
    assert window.ends_up.reactions.set.model.rowCount() == 0
    assert window.ends_up.empty.isVisible()
