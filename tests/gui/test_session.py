"""The session: undo, the clean mark, and answers that are never older than they look."""

import pytest

from gui import edits
from gui.document import Document
from gui.session import Session
from solver.errors import InputError, NoEndState
from solver.project.case import CaseFaults

from .cases import burner, project, q
from .fakes import SlowSettle, answer


@pytest.fixture
def make_session(qtbot):
    made = []

    def factory(settle=lambda case: answer(T=float(case.fixed.values["T"].value))):
        session = Session(settle)
        made.append(session)
        session.open_document(project(burner()), None)
        return session

    yield factory
    for session in made:
        session.close()


def hold(session, kelvin, field="fixed.T"):
    session.edit_case(edits.set_value(session.case, "T", q(kelvin, "K")), "type", field)


def held(session):
    return session.case.fixed.values["T"].value


def test_every_edit_is_undone_and_redone(make_session, qtbot):
    session = make_session()
    start = session.project
    hold(session, 1200.0, None)
    session.edit_case(edits.add_stream(session.case), "add stream")
    end = session.project
    assert len(session.case.streams) == 3
    session.undo_stack.undo()
    session.undo_stack.undo()
    assert session.project == start
    session.undo_stack.redo()
    session.undo_stack.redo()
    assert session.project == end


def test_typing_in_one_visit_is_one_step(make_session):
    session = make_session()
    for kelvin in (1.0, 12.0, 120.0, 1200.0):
        hold(session, kelvin)
    assert session.undo_stack.count() == 1
    session.end_visit()
    hold(session, 1300.0)
    assert session.undo_stack.count() == 2
    session.undo_stack.undo()
    assert held(session) == 1200.0
    session.undo_stack.undo()
    assert held(session) == 1500.0


def test_typing_back_to_the_start_leaves_no_step(make_session):
    session = make_session()
    hold(session, 1501.0)
    hold(session, 1500.0)
    assert session.undo_stack.count() == 0
    assert not session.modified


def test_the_clean_mark_follows_saving_and_undo(make_session, tmp_path):
    session = make_session()
    assert not session.modified
    hold(session, 1200.0)
    assert session.modified
    session.saved_as(tmp_path / "x.thalweg")
    assert not session.modified
    hold(session, 1300.0)  # the same visit, but what is saved stays a step of its own
    assert session.modified
    session.undo_stack.undo()
    assert held(session) == 1200.0
    assert not session.modified
    session.undo_stack.undo()
    assert session.modified


def test_only_the_newest_answer_is_shown(make_session, qtbot):
    slow = SlowSettle()
    session = make_session(slow)
    seen = []
    session.answer_changed.connect(
        lambda: seen.append(session.answer.value and session.answer.value.end.T)
    )
    qtbot.waitUntil(lambda: len(slow.cases) == 1)
    for kelvin in (1000.0, 1100.0, 1200.0):
        hold(session, kelvin)
        qtbot.wait(30)
    assert session.answer.state == "settling"
    slow.gate.set()
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    assert session.answer.value.end.T == 1200.0
    assert 1000.0 not in seen
    assert 1100.0 not in seen
    assert len(slow.cases) == 2  # the first, and the newest of those that waited


def test_an_older_answer_is_marked_while_settling(make_session, qtbot):
    slow = SlowSettle()
    slow.gate.set()
    session = make_session(slow)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    slow.gate.clear()
    hold(session, 1000.0)
    assert session.answer.state == "settling"
    assert session.answer.value.end.T == 1500.0
    slow.gate.set()
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    assert session.answer.value.end.T == 1000.0


def test_an_answer_that_is_known_comes_at_once(make_session, qtbot):
    slow = SlowSettle()
    slow.gate.set()
    session = make_session(slow)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    hold(session, 1000.0)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    session.undo_stack.undo()
    assert session.answer.state == "settled"
    assert session.answer.value.end.T == 1500.0
    assert len(slow.cases) == 2


def test_names_and_plot_range_do_not_settle_again(make_session, qtbot):
    slow = SlowSettle()
    slow.gate.set()
    session = make_session(slow)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    session.edit(edits.rename_case(session.document, "other"), "rename")
    qtbot.wait(60)
    assert len(slow.cases) == 1
    assert session.answer.state == "settled"


def test_faults_are_found_by_their_field(make_session, qtbot):
    def settle(case):
        raise CaseFaults(
            (
                InputError("No such thing as Xx.", "streams[0].amounts[2].species", "Xx", ""),
                InputError("Too cold.", "fixed.T", -1, ""),
            )
        )

    session = make_session(settle)
    qtbot.waitUntil(lambda: session.answer.state == "faulty")
    assert [f.text for f in session.faults_at("streams[0].amounts[2]")] == ["No such thing as Xx."]
    assert [f.text for f in session.faults_at("streams[0]")] == ["No such thing as Xx."]
    assert not session.faults_at("streams[0].amounts[20]")
    assert [f.text for f in session.faults_at("fixed.T")] == ["Too cold."]


def test_an_impossible_case_keeps_the_last_good_answer(make_session, qtbot):
    def settle(case):
        if case.fixed.values["T"].value < 1000:
            raise NoEndState("No state has so little energy.", "fixed.T", 1, "")
        return answer()

    session = make_session(settle)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    hold(session, 10.0)
    qtbot.waitUntil(lambda: session.answer.state == "faulty")
    assert session.answer.value is not None
    session.undo_stack.undo()
    assert session.answer.state == "settled"


def test_another_case_never_shows_the_first_ones_answer(make_session, qtbot):
    slow = SlowSettle()
    slow.gate.set()
    session = make_session(slow)
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    slow.gate.clear()
    session.edit(edits.duplicate_case(session.document), "duplicate")
    assert session.answer.state == "settled"  # the same physics: the same answer
    other = burner().model_copy(update={"name": "cold"})
    two = project(burner(), edits.set_value(other, "T", q(900.0, "K")))
    session.open_document(two, None)
    session.look_at(1)
    assert session.answer.value is None
    slow.gate.set()
    qtbot.waitUntil(lambda: session.answer.state == "settled")
    assert session.answer.value.end.T == 900.0


def test_undo_returns_to_the_case_that_was_edited(make_session):
    session = make_session()
    session.edit(edits.duplicate_case(session.document), "duplicate")
    hold(session, 1000.0)
    session.look_at(0)
    session.undo_stack.undo()
    assert session.document.index == 1
    assert held(session) == 1500.0
    session.undo_stack.undo()
    assert len(session.project.cases) == 1
    assert session.document.index == 0


def test_stopping_says_so_and_an_edit_starts_again(make_session, qtbot):
    slow = SlowSettle()
    session = make_session(slow)
    qtbot.waitUntil(lambda: len(slow.cases) == 1)
    session.cancel()
    assert session.answer.state == "faulty"
    assert "stopped" in session.answer.faults[0].text
    slow.gate.set()
    qtbot.wait(50)
    assert session.answer.state == "faulty"  # the late answer is dropped
    hold(session, 1000.0)
    qtbot.waitUntil(lambda: session.answer.state == "settled")


def test_a_fault_of_the_program_is_reported_and_the_project_stays(make_session, qtbot):
    def settle(case):
        raise ZeroDivisionError("of our own making")

    session = make_session(settle)
    told = []
    session.messages.bug.connect(told.append)
    hold(session, 1000.0)
    qtbot.waitUntil(lambda: bool(told))
    assert "of our own making" in told[-1]
    assert held(session) == 1000.0


def test_a_document_gives_its_case():
    document = Document(project(burner(), burner(name="b")), 1)
    assert document.case.name == "b"
    assert document.with_case(burner(name="c")).project.cases[0].name == "burner"
