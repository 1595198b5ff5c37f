"""Nothing is lost: what is not saved is kept, offered again, and put away when it is saved."""

import os

import pytest
from PySide6.QtCore import QSettings

from gui import edits
from gui.dialogs.notes import NotesDialog
from gui.files import Files
from gui.preferences import Preferences
from gui.recovery import Leftover, Recovery
from gui.session import Session
from solver.project.file import read, write

from .cases import burner, project, q
from .fakes import answer


@pytest.fixture
def start(qtbot, tmp_path):
    """A factory of sessions with their recovery, all with the same settings, as after a crash."""
    made = []

    def factory(path=None):
        session = Session(lambda case: answer())
        made.append(session)
        settings = QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat)
        recovery = Recovery(session, Preferences(settings))
        session.open_document(read(path) if path else project(burner()), path)
        return session, recovery

    yield factory
    for session in made:
        session.close()


def hold(session, kelvin):
    session.edit_case(edits.set_value(session.case, "T", q(kelvin, "K")), "type", None)


def crash(recovery):
    """What the system does for a process that dies: its lock no longer counts."""
    recovery._session.document_changed.disconnect(recovery._follow)
    recovery._session.file_changed.disconnect(recovery._follow)
    recovery._timer.stop()
    recovery._lock.unlock()


def test_unsaved_changes_are_kept_beside_the_project(start, saved, qtbot, monkeypatch):
    session, recovery = start(saved)
    recovery._timer.setInterval(10)
    before = saved.read_bytes()
    hold(session, 1234.0)
    kept = saved.with_name(saved.name + ".recovery")
    qtbot.waitUntil(kept.exists)
    assert read(kept) == session.project
    assert saved.read_bytes() == before
    hold(session, 1300.0)
    qtbot.waitUntil(lambda: read(kept) == session.project)
    session.undo_stack.undo()
    session.undo_stack.undo()
    assert not kept.exists()  # nothing unsaved, nothing kept
    assert not list(saved.parent.glob("*.lock"))


def test_saving_puts_the_kept_changes_away(start, saved):
    session, recovery = start(saved)
    hold(session, 1234.0)
    recovery.keep()
    assert saved.with_name(saved.name + ".recovery").exists()
    write(session.project, saved)
    session.saved_as(saved)
    assert [p.name for p in saved.parent.iterdir() if "burner" in p.name] == ["burner.thalweg"]


def test_after_a_crash_the_changes_are_offered_and_taken(start, saved):
    session, recovery = start(saved)
    hold(session, 1234.0)
    recovery.keep()
    crash(recovery)
    again, second = start()
    found = second.leftovers()
    assert [x.original for x in found] == [saved]
    asked = []

    def take(leftover):
        asked.append(leftover.name)
        return "take"

    assert second.offer(found[0], take)
    assert asked == ["burner.thalweg"]
    assert again.path == saved
    assert again.case.fixed.values["T"].value == 1234.0
    assert again.modified
    again.undo_stack.undo()
    assert again.project == read(saved)
    assert not second.leftovers()


def test_a_project_without_a_file_is_kept_too(start):
    session, recovery = start()
    hold(session, 999.0)
    recovery.keep()
    crash(recovery)
    again, second = start()
    (found,) = second.leftovers()
    assert found.original is None
    assert second.offer(found, lambda leftover: "take")
    assert again.path is None
    assert again.case.fixed.values["T"].value == 999.0


def test_later_keeps_and_discard_removes(start, saved):
    session, recovery = start(saved)
    hold(session, 1234.0)
    recovery.keep()
    crash(recovery)
    _, second = start()
    (found,) = second.leftovers()
    assert not second.offer(found, lambda leftover: "later")
    assert second.leftovers() == [found]
    assert not second.offer(found, lambda leftover: "discard")
    assert second.leftovers() == []
    assert not found.file.exists()


def test_another_open_window_is_no_crash(start, saved):
    session, recovery = start(saved)
    hold(session, 1234.0)
    recovery.keep()
    other, second = start(saved)
    assert second.leftovers() == []
    assert second.beside(saved) is None
    hold(other, 1500.5)
    second.keep()  # must not write over what the first window keeps
    assert read(saved.with_name(saved.name + ".recovery")) == session.project


def test_a_damaged_recovery_file_is_told_and_left(start, saved):
    session, recovery = start(saved)
    hold(session, 1234.0)
    recovery.keep()
    crash(recovery)
    kept = saved.with_name(saved.name + ".recovery")
    kept.write_text("{ not json")
    again, second = start(saved)
    assert not second.offer(second.beside(saved), lambda leftover: "take")
    assert "could not be read" in again.messages.record[-1].text
    assert kept.exists()


def test_a_folder_that_cannot_be_written_is_told_once(start, saved, monkeypatch):
    session, recovery = start(saved)

    def refuse(*args):
        raise OSError("read-only file system")

    monkeypatch.setattr("solver.project.file.write", refuse)
    hold(session, 1234.0)
    recovery.keep()
    hold(session, 1235.0)
    recovery.keep()
    assert [m.level for m in session.messages.record] == ["warning"]


def test_opening_a_project_offers_what_was_left_beside_it(make_window, saved, qtbot):
    changed = project(burner(notes="typed, never saved"))
    kept = saved.with_name(saved.name + ".recovery")
    write(changed, kept)
    os.utime(kept, (1.7e9, 1.7e9))
    window = make_window()
    asked = []

    def ask(parent, leftover: Leftover):
        asked.append(leftover)
        return "take"

    window.files.ask_recover = ask
    assert window.files.read(saved)
    assert asked[0].original == saved
    assert window.session.project == changed
    assert window.isWindowModified()
    window.close()
    assert not kept.exists()  # given up by the user, who was asked


def test_start_without_a_file_offers_the_newest(make_window, saved, qtbot):
    window = make_window()
    kept = saved.with_name(saved.name + ".recovery")
    write(project(burner(notes="typed")), kept)
    window.preferences.remember_recovery(kept)
    window.files.ask_recover = lambda parent, leftover: "take"
    window.files.offer_leftovers()
    assert window.session.case.notes == "typed"
    assert isinstance(window.files, Files)


def test_title_and_notes_are_one_step(make_window, qtbot):
    window = make_window()
    window.actions_by_name["notes"].trigger()
    dialog = window.findChild(NotesDialog)
    dialog.title.setText("Fellside flare")
    dialog.notes.setPlainText("Two lines\nof notes")
    dialog.case_notes.setPlainText("This case")
    settles = window.session.answer
    dialog.accept()
    assert window.session.project.title == "Fellside flare"
    assert window.session.project.notes == "Two lines\nof notes"
    assert window.session.case.notes == "This case"
    assert window.header.title.text() == "Fellside flare"
    assert window.session.answer is settles  # words do not settle anew
    window.session.undo_stack.undo()
    assert window.session.project.title == "trial"
    assert window.header.title.text() == "trial"
