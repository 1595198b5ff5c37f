"""Every table model under Qt's own tester; what is typed, pasted and copied."""

import pytest
from PySide6.QtCore import Qt
from PySide6.QtTest import QAbstractItemModelTester

from gui import edits
from gui.colours import SpeciesColours
from gui.readings import Units
from gui.session import Session
from gui.tables import clipboard, composition_model, stream_model
from gui.tables.candidates_model import CandidateRow, CandidatesModel
from gui.tables.composition_model import CompositionModel
from gui.tables.figures_model import FiguresModel
from gui.tables.stream_model import AMOUNT, SHARE, SPECIES, UNIT, StreamModel
from gui.theme import Theme

from .cases import burner, project
from .fakes import answer

REPORT = QAbstractItemModelTester.FailureReportingMode.Warning  # a Qt warning fails the test
EDIT, SHOWN = Qt.ItemDataRole.EditRole, Qt.ItemDataRole.DisplayRole


@pytest.fixture
def session(qtbot):
    session = Session(lambda case: answer())
    session.open_document(project(burner()), None)
    yield session
    session.close()


@pytest.fixture
def air(session):
    model = StreamModel(session, 1)
    session.document_changed.connect(model.refresh)
    model.tester = QAbstractItemModelTester(model, REPORT)
    return model


@pytest.fixture
def theme(qapp):
    theme = Theme(qapp, "light")
    yield theme
    theme.close()


def rows(session, stream=1):
    return [(a.species, a.value, a.unit) for a in session.case.streams[stream].amounts]


def test_typing_in_the_last_row_makes_a_new_one(session, air):
    assert air.rowCount() == 3
    assert air.index(2, SPECIES).data(EDIT) == ""
    assert air.setData(air.index(2, SPECIES), "Ar")
    assert rows(session)[2] == ("Ar", "", "mol")
    assert air.rowCount() == 4
    assert air.setData(air.index(2, AMOUNT), "0.09")
    assert rows(session)[2] == ("Ar", 0.09, "mol")


def test_an_amount_may_bring_its_unit(session, air):
    air.setData(air.index(0, AMOUNT), "3 kmol/h")
    assert rows(session)[0] == ("O2", 3.0, "kmol/h")
    air.setData(air.index(0, UNIT), "Nm³/h")
    assert rows(session)[0] == ("O2", 3.0, "Nm3/h")


def test_what_is_no_number_is_kept(session, air):
    air.setData(air.index(0, AMOUNT), "a lot")
    assert rows(session)[0] == ("O2", "a lot", "mol")
    assert air.index(0, AMOUNT).data(SHOWN) == "a lot"
    air.setData(air.index(0, UNIT), "barrels")
    assert rows(session)[0] == ("O2", "a lot", "barrels")


def test_the_share_is_read_only(session, air):
    assert not air.flags(air.index(0, SHARE)) & Qt.ItemFlag.ItemIsEditable
    assert not air.setData(air.index(0, SHARE), "5")


def test_shares_show_four_digits_and_copy_all(air):
    air.set_shares((0.21008403361344538, 0.7899159663865546))
    assert air.index(0, SHARE).data(SHOWN) == "21.01"
    assert air.index(0, SHARE).data(clipboard.COPY_ROLE) == 21.008403361344538


def test_paste_from_a_spreadsheet(session, air):
    air.paste(0, SPECIES, clipboard.rows_of("CO2\t1,5\tkg\r\nH2O\t2\r\nargon\tx\r\n"))
    assert rows(session) == [("CO2", 1.5, "kg"), ("H2O", 2.0, "mol"), ("argon", "x", "mol")]
    assert session.undo_stack.count() == 1
    session.undo_stack.undo()
    assert rows(session) == rows_of_burner()


def rows_of_burner():
    return [(a.species, a.value, a.unit) for a in burner().streams[1].amounts]


def test_removing_and_moving_rows_follow_in_the_model(session, air):
    session.edit_case(edits.move_amount(session.case, 1, 0, 1), "move")
    assert air.index(0, SPECIES).data(EDIT) == "N2"
    session.edit_case(edits.remove_amounts(session.case, 1, [0]), "remove")
    assert air.rowCount() == 2
    assert air.index(0, SPECIES).data(EDIT) == "O2"
    session.edit_case(edits.remove_amounts(session.case, 1, [0]), "remove")
    assert air.rowCount() == 1
    session.undo_stack.undo()
    session.undo_stack.undo()
    session.undo_stack.undo()
    assert air.rowCount() == 3


def test_a_formula_shows_its_subscripts_and_edits_plain(session, air):
    assert air.index(0, SPECIES).data(SHOWN) == "O₂"
    assert air.index(0, SPECIES).data(EDIT) == "O2"


def test_composition_in_two_sections(qtbot, theme):
    model = CompositionModel(theme, SpeciesColours())
    model.tester = QAbstractItemModelTester(model, REPORT)
    model.show(answer().end, Units())
    assert [r.key for r in model.rows] == ["N2", "H2"]
    first = model.index(0, composition_model.SHARE)
    assert first.data(SHOWN) == "75.00"
    assert first.data(clipboard.COPY_ROLE) == 75.0
    model.show(answer({"C(gr)": 1.0}).end, Units())
    assert model.rows[0] == "Gas"
    assert model.rows[3].startswith("Condensed")
    assert model.rows[4].key == "C(gr)"
    assert model.index(4, composition_model.SHARE).data(SHOWN) == "20.00"
    model.clear()
    assert model.rowCount() == 0


def test_bars_in_proportion_and_by_decades(qtbot, theme):
    from gui.tables.delegates import BAR_ROLE

    model = CompositionModel(theme, SpeciesColours())
    model.show(answer({"H2": 3e-4, "N2": 2.9997}).end, Units())
    bar = model.index(1, composition_model.BAR)
    assert bar.data(BAR_ROLE)[0] == pytest.approx(1e-4)
    model.set_logarithmic(True)
    assert bar.data(BAR_ROLE)[0] == pytest.approx(0.5)  # four of eight decades


def test_candidates_pass_a_mark_on(qtbot):
    model = CandidatesModel()
    model.tester = QAbstractItemModelTester(model, REPORT)
    model.show([CandidateRow("H2", "hydrogen", True), CandidateRow("CO", "monoxide", False)])
    with qtbot.waitSignal(model.toggled) as told:
        model.setData(model.index(0, 0), Qt.CheckState.Unchecked, Qt.ItemDataRole.CheckStateRole)
    assert told.args == ["H2", False]
    assert model.rows[0].allowed  # the session decides, the model follows


def test_figures_round_for_the_eye_only(qtbot):
    model = FiguresModel()
    model.tester = QAbstractItemModelTester(model, REPORT)
    model.show(("what", "value"), [("x", 1.23456789e-5)], False)
    cell = model.index(0, 1)
    assert cell.data(SHOWN) == "1.235 × 10⁻⁵"
    assert cell.data(clipboard.COPY_ROLE) == 1.23456789e-5
    assert cell.data(Qt.ItemDataRole.ToolTipRole) == "1.23456789e-05"


def test_headers_of_the_stream_table(air):
    across = Qt.Orientation.Horizontal
    heads = [air.headerData(c, across, SHOWN) for c in range(4)]
    assert heads == list(stream_model.HEADERS)
