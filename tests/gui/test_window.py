"""The whole window, driven by its widgets: type, settle, undo, save, reopen, recover."""

import json

import pytest
from PySide6.QtCore import QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QDropEvent, QGuiApplication
from PySide6.QtWidgets import QApplication, QFileDialog, QLineEdit

from gui import actions
from gui.dialogs.unsaved import Choice
from gui.edits import blank_project
from gui.tables.stream_model import AMOUNT, SPECIES, UNIT
from solver.project.file import read
from solver.project.model import Project

from .cases import burner, project
from .conftest import settled


def type_cell(qtbot, view, row, column, text, key=Qt.Key.Key_Return):
    """Type into a cell as a person does, and leave it with `key`."""
    view.window().activateWindow()  # the list of offers had taken over
    qtbot.waitUntil(view.isActiveWindow)
    view.setFocus()
    view.setCurrentIndex(view.model().index(row, column))
    qtbot.keyClicks(view, text[0])
    line = QApplication.focusWidget()
    assert isinstance(line, QLineEdit)
    qtbot.keyClicks(line, text[1:])
    popup = line.completer().popup() if line.completer() else None
    # Where offers are shown the keys go to their list, as on a real screen.
    qtbot.keyClick(popup if popup is not None and popup.isVisible() else line, key)
    QApplication.processEvents()  # Qt closes the editor from the event loop


def retype(qtbot, field, text):
    field.setFocus()
    field.selectAll()
    qtbot.keyClick(field, Qt.Key.Key_Delete)
    qtbot.keyClicks(field, text)


def press(window, name):
    window.actions_by_name[name].trigger()


def pick_pair(window, name):
    menu = window.held_fixed.menu
    menu.setCurrentIndex(menu.findData(name))
    menu.activated.emit(menu.currentIndex())


def test_a_case_typed_from_scratch(make_window, qtbot, tmp_path, monkeypatch):
    window = make_window(Project())
    assert window.session.answer.state == "faulty"  # nothing goes in yet
    qtbot.mouseClick(window.going_in.add, Qt.MouseButton.LeftButton)
    section = window.going_in.sections[0]
    qtbot.waitUntil(lambda: section.view.currentIndex().isValid())
    for row, (species, amount) in enumerate((("methane", "1"), ("O2", "2"), ("N2", "7.52 mol"))):
        type_cell(qtbot, section.view, row, SPECIES, species)
        type_cell(qtbot, section.view, row, AMOUNT, amount)
    retype(qtbot, window.held_fixed.rows["T"].field, "1500 K")
    retype(qtbot, window.held_fixed.rows["p"].field, "1 bar")
    settled(qtbot, window)
    end = window.session.answer.value.end
    assert end.T == 1500.0
    # One mole of methane with two of oxygen burns to carbon dioxide and two of water, almost.
    assert end.amounts["CO2"] == pytest.approx(1.0, abs=0.02)
    assert end.amounts["H2O"] == pytest.approx(2.0, abs=0.03)
    assert window.ends_up.line.figures["temperature"].value.text() == "1500"
    assert window.header.pill.text().startswith("proven")
    path = tmp_path / "typed.thalweg"
    monkeypatch.setattr(QFileDialog, "getSaveFileName", lambda *a: (str(path), ""))
    press(window, "save")
    assert read(path) == window.session.project
    assert [a.species for a in read(path).cases[0].streams[0].amounts] == ["methane", "O2", "N2"]
    assert not window.isWindowModified()


def test_every_pair_of_the_menu_settles(window, qtbot):
    names = [window.held_fixed.menu.itemData(i) for i in range(window.held_fixed.menu.count())]
    assert names == ["T,p", "H,p", "U,V", "T,V", "S,p", "S,V"]
    for name in names:
        pick_pair(window, name)
        settled(qtbot, window)
        assert window.session.answer.state == "settled", name
        assert window.session.answer.value.end.fixed.pair == name
        sealed = name.endswith("V")
        assert window.ends_up.vessel.isVisibleTo(window) == sealed
    assert "no design basis" in window.ends_up.vessel.text()
    assert "licensed engineer" in window.ends_up.vessel.text()
    assert "limit and not a rate" in window.ends_up.caution.text()


def test_as_fed_is_the_empty_field(window, qtbot):
    pick_pair(window, "H,p")
    settled(qtbot, window)
    row = window.held_fixed.rows["H"]
    assert row.field.text() == ""
    assert row.field.placeholderText() == "as fed"
    assert row.echo.text().endswith("kJ")
    adiabatic = window.session.answer.value.end.T
    assert 2000 < adiabatic < 2400
    retype(qtbot, window.held_fixed.heat.field, "-200 kJ")
    settled(qtbot, window)
    assert window.session.answer.value.end.T < adiabatic
    assert window.session.answer.value.heat == pytest.approx(-200e3)
    qtbot.mouseClick(window.held_fixed.heat.as_fed, Qt.MouseButton.LeftButton)
    settled(qtbot, window)
    assert window.session.answer.value.end.T == adiabatic


def test_an_answer_comes_as_one_types(window, qtbot):
    seen = []
    window.session.answer_changed.connect(
        lambda: seen.append((window.session.answer.state, window.session.answer.value.end.T))
    )
    field = window.held_fixed.rows["T"].field
    field.setFocus()
    field.setCursorPosition(4)
    qtbot.keyClick(field, Qt.Key.Key_Backspace)  # 150 K
    settled(qtbot, window)
    qtbot.keyClicks(field, "1")  # 1501 K
    settled(qtbot, window)
    assert seen[-1] == ("settled", 1501.0)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("warm", "not a number"),
        ("25 parsec", "parsec"),
        ("-400 degC", "not above absolute zero"),
        ("0 K", "not above absolute zero"),
        ("1e9 K", "out of range"),
    ],
)
def test_a_wrong_temperature_says_so_at_its_field(window, qtbot, text, says):
    row = window.held_fixed.rows["T"]
    retype(qtbot, row.field, text)
    settled(qtbot, window)
    assert says in row.sentence.text()
    assert row.sentence.isVisible()
    assert row.field.property("faulty") == "true"
    assert row.field.text() == text
    assert "Out of date" in window.ends_up.sentence.text()
    assert window.header.pill.text() == "1 thing to mend"
    retype(qtbot, row.field, "1500 K")
    settled(qtbot, window)
    assert not row.sentence.isVisible()
    assert window.header.pill.text().startswith("proven")


@pytest.mark.parametrize(
    ("column", "text", "says"),
    [
        (SPECIES, "Methan", "did you mean"),
        (AMOUNT, "a lot", "not a number"),
        (AMOUNT, "-1", "negative"),
        (UNIT, "buckets", "buckets"),
    ],
)
def test_a_wrong_row_says_so_beneath_its_stream(window, qtbot, column, text, says):
    section = window.going_in.sections[0]
    type_cell(qtbot, section.view, 0, column, text)
    settled(qtbot, window)
    assert says in section.sentence.text()
    assert section.model.fault(0, column)
    assert text in section.model.index(0, column).data()
    press(window, "undo")
    settled(qtbot, window)
    assert not section.sentence.isVisible()


def test_an_empty_stream_is_named(window, qtbot):
    press(window, "add_stream")
    settled(qtbot, window)
    assert "empty" in window.going_in.sections[2].sentence.text()


def test_an_element_without_candidate_is_named(window, qtbot):
    type_cell(qtbot, window.going_in.sections[0].view, 1, SPECIES, "H2S")
    type_cell(qtbot, window.going_in.sections[0].view, 1, AMOUNT, "0.1")
    settled(qtbot, window)
    assert "No candidate holds S" in window.may_form.sentence.text()


def test_energy_that_no_temperature_matches(window, qtbot):
    pick_pair(window, "H,p")
    retype(qtbot, window.held_fixed.rows["H"].field, "-9 GJ")
    settled(qtbot, window)
    assert window.session.answer.state == "faulty"
    assert window.ends_up.sentence.text()
    assert window.held_fixed.rows["H"].field.text() == "-9 GJ"


def test_a_temperature_outside_the_data_is_answered_and_said(window, qtbot):
    retype(qtbot, window.held_fixed.rows["T"].field, "7000 K")
    settled(qtbot, window)
    assert window.session.answer.state == "settled"
    assert "lies outside the data of" in window.ends_up.notes.text()


def test_undo_and_redo_of_typing_and_tables(window, qtbot):
    start = window.session.project
    retype(qtbot, window.held_fixed.rows["T"].field, "1200 K")
    type_cell(qtbot, window.going_in.sections[1].view, 2, SPECIES, "Ar")
    type_cell(qtbot, window.going_in.sections[1].view, 2, AMOUNT, "0.09")
    window.going_in.sections[1].view.setFocus()
    qtbot.keyClick(window.going_in.sections[1].view, Qt.Key.Key_Delete)
    end = window.session.project
    steps = window.session.undo_stack.count()
    for _ in range(steps):
        press(window, "undo")
    assert window.session.project == start
    assert window.held_fixed.rows["T"].field.text() == "1500 K"
    assert not window.actions_by_name["undo"].isEnabled()
    for _ in range(steps):
        press(window, "redo")
    assert window.session.project == end


def test_undo_by_key_while_in_a_field(window, qtbot):
    field = window.held_fixed.rows["T"].field
    window.activateWindow()
    retype(qtbot, field, "1200 K")
    qtbot.keyClick(field, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert field.text() == "1500 K"


def test_paste_and_copy_with_a_spreadsheet(window, qtbot):
    view = window.going_in.sections[0].view
    QGuiApplication.clipboard().setText("CH4\t93,5\tkmol/h\nC2H6\t4\nN2\t2.5\n")
    view.setFocus()
    view.setCurrentIndex(view.model().index(0, SPECIES))
    qtbot.keyClick(view, Qt.Key.Key_V, Qt.KeyboardModifier.ControlModifier)
    rows = [(a.species, a.value, a.unit) for a in window.session.case.streams[0].amounts]
    assert rows == [("CH4", 93.5, "kmol/h"), ("C2H6", 4.0, "kmol/h"), ("N2", 2.5, "kmol/h")]
    press(window, "undo")
    settled(qtbot, window)
    press(window, "copy_view")
    lines = QGuiApplication.clipboard().text().split("\n")
    assert lines[0].split("\t") == ["species", "name", "", "mol %", "mol", "mass %"]
    first = lines[1].split("\t")
    assert first[0] == "N2"
    amounts = window.session.answer.value.end.amounts
    assert float(first[4]) == amounts["N2"]  # every digit
    assert float(first[3]) == pytest.approx(100 * amounts["N2"] / sum(amounts.values()))


def test_rows_and_streams_are_moved_by_key(window, qtbot):
    view = window.going_in.sections[1].view
    view.setFocus()
    view.setCurrentIndex(view.model().index(1, SPECIES))
    qtbot.keyClick(view, Qt.Key.Key_Up, Qt.KeyboardModifier.AltModifier)
    assert [a.species for a in window.session.case.streams[1].amounts] == ["N2", "O2"]
    assert view.currentIndex().row() == 0
    press(window, "stream_up")
    assert [s.name for s in window.session.case.streams] == ["air", "fuel"]
    press(window, "remove_stream")
    assert len(window.session.case.streams) == 1


def test_candidates_are_excluded_and_added(window, qtbot):
    panel = window.may_form
    at = next(i for i, r in enumerate(panel.model.rows) if r.key == "NO")
    panel.view.setFocus()
    panel.view.setCurrentIndex(panel.model.index(at, 1))
    qtbot.keyClick(panel.view, Qt.Key.Key_Space)
    settled(qtbot, window)
    assert "NO" not in window.session.answer.value.end.amounts
    retype(qtbot, panel.search, "nitrogen dioxide")
    qtbot.keyClick(panel.search, Qt.Key.Key_Return)
    settled(qtbot, window)
    assert "NO2" in window.session.answer.value.end.amounts
    assert panel.search.text() == ""
    retype(qtbot, panel.search, "nitrogen dioxyd")
    qtbot.keyClick(panel.search, Qt.Key.Key_Return)
    assert panel.search_sentence.text()
    assert panel.search.text() == "nitrogen dioxyd"


def test_an_excluded_species_of_the_rule_keeps_its_place(make_window, qtbot):
    from solver.project.model import Candidates

    window = make_window(project(burner(candidates=Candidates())))
    panel = window.may_form
    keys = [r.key for r in panel.model.rows]
    at = keys.index("NO")
    mark = panel.model.index(at, 0)
    panel.model.setData(mark, Qt.CheckState.Unchecked, Qt.ItemDataRole.CheckStateRole)
    settled(qtbot, window)
    assert window.session.case.candidates.excluded == ("NO",)
    assert panel.model.rows[at].key == "NO"
    assert not panel.model.rows[at].allowed
    assert "NO" in panel.excluded.text()
    mark = panel.model.index(at, 0)
    panel.model.setData(mark, Qt.CheckState.Checked, Qt.ItemDataRole.CheckStateRole)
    settled(qtbot, window)
    assert window.session.case.candidates.excluded == ()


def test_elements_are_left_out_and_named(make_window, qtbot):
    from solver.project.model import Candidates

    window = make_window(project(burner(candidates=Candidates())))
    chips = window.may_form.chips
    names = [chips.itemAt(i).widget().text() for i in range(chips.count())]
    assert names == ["C", "H", "N", "O"]
    chips.itemAt(2).widget().click()
    settled(qtbot, window)
    assert window.session.case.candidates.elements == ("C", "H", "O")
    amounts = window.session.answer.value
    assert window.session.answer.state in ("settled", "faulty")
    assert amounts is not None


def test_cases_are_added_renamed_and_deleted(window, qtbot, monkeypatch):
    from PySide6.QtWidgets import QInputDialog

    press(window, "duplicate_case")
    assert len(window.session.project.cases) == 2
    assert window.session.document.index == 1
    monkeypatch.setattr(QInputDialog, "getText", lambda *a, **k: ("hotter", True))
    press(window, "rename_case")
    assert "hotter" in window.header.case_button.text()
    assert "2 of 2" in window.header.case_button.text()
    retype(qtbot, window.held_fixed.rows["T"].field, "1800 K")
    press(window, "previous_case")
    assert window.held_fixed.rows["T"].field.text() == "1500 K"
    settled(qtbot, window)
    assert window.session.answer.value.end.T == 1500.0
    press(window, "next_case")
    settled(qtbot, window)
    assert window.session.answer.value.end.T == 1800.0
    press(window, "delete_case")
    assert [c.name for c in window.session.project.cases] == ["burner"]
    press(window, "undo")
    assert [c.name for c in window.session.project.cases] == ["burner", "hotter"]
    press(window, "add_case")
    settled(qtbot, window)
    assert window.session.answer.value is None
    assert window.ends_up.line.figures["temperature"].value.text() == "–"


def test_saving_and_reopening_gives_the_same_window(make_window, qtbot, saved):
    window = make_window(path=saved)
    assert window.windowTitle().startswith("burner.thalweg")
    retype(qtbot, window.held_fixed.rows["T"].field, "1250 degC")
    pick_pair(window, "T,V")
    retype(qtbot, window.held_fixed.rows["V"].field, "2 parsec")  # what is wrong is kept too
    assert window.isWindowModified()
    press(window, "save")
    assert not window.isWindowModified()
    other = make_window(path=saved)
    assert other.session.project == window.session.project
    assert other.held_fixed.rows["T"].field.text() == "1250 °C"
    assert other.held_fixed.rows["V"].field.text() == "2 parsec"
    assert other.held_fixed.menu.currentData() == "T,V"
    assert "parsec" in other.held_fixed.rows["V"].sentence.text()


def test_saving_takes_the_open_cell_along(make_window, qtbot, saved):
    window = make_window(path=saved)
    view = window.going_in.sections[0].view
    window.activateWindow()
    qtbot.waitUntil(view.isActiveWindow)
    view.setFocus()
    view.setCurrentIndex(view.model().index(0, SPECIES))
    qtbot.keyClicks(view, "C")
    qtbot.keyClicks(QApplication.focusWidget(), "2H6")
    press(window, "save")
    assert read(saved).cases[0].streams[0].amounts[0].species == "C2H6"
    assert QApplication.focusWidget().text() == "C2H6"  # the cell stays open


@pytest.mark.parametrize(
    ("content", "says"), [("{ not json", "line"), (json.dumps({"format": "other"}), "format")]
)
def test_a_broken_file_is_refused_and_left_alone(window, qtbot, tmp_path, content, says):
    before = window.session.project
    path = tmp_path / "broken.thalweg"
    path.write_text(content)
    assert not window.files.open_path(path)
    assert window.notice.isVisible()
    assert says in window.notice.label.text()
    assert window.session.project == before
    assert path.read_text() == content


def test_a_file_is_dragged_in(window, qtbot, saved):
    press(window, "add_stream")
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(saved))])
    event = QDropEvent(
        QPointF(50, 50),
        Qt.DropAction.CopyAction,
        data,
        Qt.MouseButton.LeftButton,
        Qt.KeyboardModifier.NoModifier,
    )
    window.dropEvent(event)
    assert window.session.path == saved.resolve()
    assert [p.name for p in window.preferences.recent()] == ["burner.thalweg"]
    window.header.recent.aboutToShow.emit()
    assert window.header.recent.actions()[0].text() == "burner.thalweg"


def test_unsaved_changes_are_asked_about(window, qtbot, tmp_path):
    asked = []

    def ask(answer):
        return lambda parent, name: asked.append(name) or answer

    window.files.ask = ask(Choice.CANCEL)
    press(window, "new")
    assert asked == []  # nothing to lose yet
    press(window, "add_stream")
    project_before = window.session.project
    press(window, "new")
    assert len(asked) == 1
    assert window.session.project == project_before
    assert not window.close()
    window.session.path = tmp_path / "kept.thalweg"
    window.files.ask = ask(Choice.SAVE)
    press(window, "new")
    assert read(tmp_path / "kept.thalweg") == project_before
    assert window.session.project == blank_project()


def test_every_action_has_a_key_of_its_own(window):
    keys = [k for row in actions.ACTIONS for k in row.keys]
    assert all(row.keys for row in actions.ACTIONS)
    assert len(keys) == len(set(keys))
    for row in actions.ACTIONS:
        assert window.actions_by_name[row.name].shortcut().toString() == row.keys[0]


def test_views_of_the_end_state(window, qtbot):
    for title in ("Phases", "Reactions", "Energy", "Proof", "Composition"):
        press(window, f"tab_{title.lower()}")
        assert window.ends_up.current_table().model().rowCount() > 0
    press(window, "tab_proof")
    figures = window.ends_up.proof.figures.model
    assert [figures.index(i, 0).data() for i in range(4)] == [
        "element closure",
        "trace closure",
        "energy closure",
        "gap",
    ]
    assert figures.index(0, 3).data()
    absent = window.ends_up.proof.absent.model
    assert absent.index(0, 0).data().startswith("C(gr)")
    assert float(absent.index(0, 2).data()) > 99  # soot is far off in a lean flame


def test_themes_take_turns(window, qtbot):
    first = window.theme.tokens
    window.theme.choose("dark")
    dark = window.grab().toImage().pixelColor(4, 600)
    assert dark.lightness() < 60
    window.theme.choose("light")
    assert window.theme.tokens == first
    assert window.grab().toImage().pixelColor(4, 600).lightness() > 200


def test_a_fault_of_the_program_opens_its_report(window, qtbot):
    from gui.dialogs.report import BugReport

    window.session.messages.unexpected(ValueError("wires crossed"))
    report = window.findChild(BugReport)
    assert "wires crossed" in report.text.toPlainText()
    report.reject()


def test_enter_in_the_list_of_offers_goes_on_in_the_table(make_window, qtbot):
    window = make_window(blank_project())
    view = window.going_in.sections[0].view
    window.activateWindow()
    qtbot.waitUntil(view.isActiveWindow)
    view.setFocus()
    view.setCurrentIndex(view.model().index(0, SPECIES))
    qtbot.keyClicks(view, "C")
    line = QApplication.focusWidget()
    qtbot.keyClicks(line, "H4")
    assert line.completer().popup().isVisible()
    qtbot.keyClick(line.completer().popup(), Qt.Key.Key_Return)
    QApplication.processEvents()
    assert window.focusWidget() is view  # not the first button of the window
    assert view.currentIndex().column() == AMOUNT


def test_a_new_project_invites_and_finds_no_fault(make_window, qtbot):
    window = make_window(blank_project())
    assert window.header.pill.text() == "nothing fed yet"
    assert window.ends_up.empty.isVisible()
    assert not window.ends_up.sentence.isVisible()
    assert not window.going_in.sections[0].sentence.isVisible()
    type_cell(qtbot, window.going_in.sections[0].view, 0, SPECIES, "CH4")
    settled(qtbot, window)
    assert window.header.pill.text() == "1 thing to mend"
    assert window.going_in.sections[0].sentence.isVisible()


def test_reversible_expansion_gives_work_and_not_heat(window, qtbot):
    pick_pair(window, "S,p")
    retype(qtbot, window.held_fixed.rows["p"].field, "0.5 bar")
    settled(qtbot, window)
    figure = window.ends_up.line.figures["heat added"]
    assert figure.title.text() == "work put in"
    assert figure.beneath.text() == "reversible"
