"""A real gas in the window: chosen, its k_ij typed, its phases, its proof, the ideal answer."""

import threading

import pytest
from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QApplication

from gui import gas_edits as edits
from gui.parts.gas_view import GasView
from gui.tables.interactions_model import FIRST, SECOND, SOURCE, K
from gui.tables.stream_model import FAULT_ROLE
from solver.project.case import settle_case
from solver.project.file import read, write
from solver.project.model import (
    Amount,
    Candidates,
    Case,
    FixedPair,
    Interaction,
    Stream,
    TemperaturePlot,
)

from .cases import burner, project, q
from .conftest import settled
from .test_window import press


def loop(gas="pr", T=-4, pair="T,p", **changes):
    """Gas of an ammonia loop, cooled; nothing reacts."""
    feed = {"N2": 17.0, "H2": 51.0, "NH3": 22.0, "Ar": 10.0}
    stream = Stream(
        name="loop gas",
        T=q(30, "degC"),
        p=q(190, "bar"),
        amounts=tuple(Amount(species=k, value=n, unit="mol") for k, n in feed.items()),
    )
    case = Case(
        name="chiller",
        streams=(stream,),
        fixed=FixedPair(pair=pair, values={"T": q(T, "degC"), "p": q(190, "bar")}),
        candidates=Candidates(rule="listed", added=tuple(feed)),
        restrictions=({"kind": "inert", "species": "NH3"},),
        gas=gas,
        plot=TemperaturePlot(T_from=q(-20, "degC"), T_to=q(100, "degC")),
    )
    return Case.model_validate(case.model_dump() | changes)


@pytest.fixture
def cold(make_window):
    return make_window(project(loop()))


def pick_gas(window, key):
    menu = window.held_fixed.gas.menu
    menu.setCurrentIndex(menu.findData(key))
    menu.activated.emit(menu.currentIndex())


def shown(table):
    model = table.model
    return [
        [model.index(r, c).data() for c in range(model.columnCount())]
        for r in range(model.rowCount())
    ]


def cell(window, row, column):
    model = window.ends_up.gas.model
    return model.index(row, column)


def put(window, row, column, text):
    """As an editor does when it is left."""
    window.ends_up.gas.model.setData(cell(window, row, column), text)
    window.session.end_visit()


# -- the choice of the model


def test_the_gas_is_chosen_undone_and_saved(make_window, qtbot, tmp_path):
    window = make_window(project(loop("ideal", T=440)))
    row = window.held_fixed.gas
    assert row.menu.currentText() == "ideal gas"
    assert not row.details.isVisible()
    ideal = window.session.answer.value.end
    pick_gas(window, "srk")
    assert row.details.isVisible()
    settled(qtbot, window)
    real = window.session.answer.value.end
    assert real.gas == "srk"
    assert real.V != pytest.approx(ideal.V, rel=1e-3)
    write(window.session.project, tmp_path / "a.thalweg")
    assert read(tmp_path / "a.thalweg").cases[0].gas == "srk"
    press(window, "undo")
    assert row.menu.currentText() == "ideal gas"
    settled(qtbot, window)
    assert window.session.answer.value.end.V == ideal.V


def test_the_link_and_the_key_lead_to_the_gas_view(cold, qtbot):
    qtbot.mouseClick(cold.held_fixed.gas.details, Qt.MouseButton.LeftButton)
    assert cold.ends_up.pages.currentWidget() is cold.ends_up.gas
    press(cold, "tab_composition")
    press(cold, "tab_gas")
    assert cold.ends_up.pages.currentWidget() is cold.ends_up.gas
    settled(qtbot, cold)
    press(cold, "go_end")
    assert cold.ends_up.gas.view.hasFocus()


# -- what is there


def test_gas_and_liquid_stand_one_under_the_other_with_their_own_shares(cold):
    end = cold.session.answer.value.end
    model = cold.ends_up.composition.model
    titles = [row for row in model.rows if isinstance(row, str)]
    assert [title.partition(",")[0] for title in titles] == ["Gas", "Liquid"]
    share = 100 * end.phase_amounts["liquid"] / sum(end.amounts.values())
    assert f"{share:.1f} % of all moles" in titles[1]
    after = model.rows[model.rows.index(titles[1]) + 1]
    assert after.key == "NH3"
    assert after.share == end.fraction("NH3", "liquid")
    assert after.amount == end.fluids["liquid"]["NH3"]


def test_phases_set_gas_and_liquid_side_by_side(cold, qtbot):
    press(cold, "tab_phases")
    view, end = cold.ends_up.phases, cold.session.answer.value.end
    assert [row[0] for row in shown(view.phases)] == ["gas", "liquid"]
    assert view.split.isVisible()
    rows = {row[0].partition(" ")[0]: row for row in shown(view.split)}
    assert set(rows) == {"N₂", "H₂", "NH₃", "Ar"}
    gas, liquid = end.fraction("Ar", "gas"), end.fraction("Ar", "liquid")
    assert float(rows["Ar"][2]) == pytest.approx(100 * gas, rel=1e-3)
    assert float(rows["Ar"][4]) == pytest.approx(100 * liquid, rel=1e-3)
    assert float(rows["Ar"][5]) == pytest.approx(gas / liquid, rel=1e-3)
    cold.ends_up.copy()
    text = QGuiApplication.clipboard().text()
    assert repr(end.fluids["liquid"]["NH3"]) in text
    assert "hydrogen bonds" in cold.ends_up.notes.text()


def test_what_is_left_out_and_what_is_taken_as_ideal_is_said_with_the_reason(make_window):
    window = make_window(
        project(
            burner(
                gas="pr",
                fixed=FixedPair(pair="T,p", values={"T": q(300, "K"), "p": q(5, "bar")}),
                candidates=Candidates(
                    rule="listed", added=("CO2", "O2", "N2", "H2O", "H2O(l)", "OH")
                ),
            )
        )
    )
    press(window, "tab_phases")
    text = window.ends_up.phases.left_out.text()
    assert text.startswith("Left out: H₂O(l). The liquid of the equation of state")
    assert "count the same substance twice" in text
    assert "want of usable critical constants: 1 species present in traces only" in text
    remarks = {row.key: row.remark for row in window.may_form.model.rows}
    assert remarks["H2O(l)"] == "left out, see Phases"


def test_the_proof_says_plainly_that_there_is_no_bound(cold):
    press(cold, "tab_proof")
    proof = cold.session.answer.value.end.proof
    rows = {row[0]: row for row in shown(cold.ends_up.proof.figures)}
    assert rows["starts"][1] == str(proof.starts)
    assert rows["starts"][3] == "Trial phases tried. No better state found; no rigorous bound."
    assert rows["stationarity"][2] == "10⁻⁹"
    assert "tangent plane" in rows
    assert "no rigorous bound" in rows["gap"][3]
    assert "weak duality" not in cold.ends_up.proof.model_line.text()
    assert cold.header.pill.text() == "no better state found"
    figure = cold.ends_up.line.figures["proof"]
    assert figure.title.text() == "proof: gap, no bound"


def test_the_proof_of_an_ideal_gas_is_as_it_was(window):
    press(window, "tab_proof")
    rows = [row[0] for row in shown(window.ends_up.proof.figures)]
    assert rows == ["element closure", "trace closure", "energy closure", "gap"]
    assert "weak duality" in window.ends_up.proof.model_line.text()
    assert window.header.pill.text().startswith("proven: gap")


def test_reactions_are_of_the_real_gas_and_by_hand_plainly_refused(make_window, qtbot):
    window = make_window(project(loop(T=440, restrictions=[])))
    press(window, "tab_reactions")
    view = window.ends_up.reactions
    ((text, *_, ratio, _, _, _, _, _),) = shown(view.set)
    assert "NH₃" in text
    assert float(ratio) == pytest.approx(1.0, abs=1e-6)
    assert "φ y p" in view.line.text()
    qtbot.mouseClick(view.by_hand, Qt.MouseButton.LeftButton)
    assert view.amounts.model.rowCount() == 0
    assert view.line.text().startswith("Nothing is shown here")
    assert "ideal gas only" in view.line.text()


def test_the_plot_follows_the_gas_and_names_the_liquid(cold):
    from gui.line import phase_changes

    line = cold.what_if._line
    assert line.failed == 0
    assert [name for name, _ in line.fluids] == ["liquid"]
    ((T, words),) = phase_changes(line)
    assert words == "liquid gone"
    assert 273.15 < T < 373.15


# -- k_ij


def test_published_pairs_are_listed_with_their_source(cold):
    press(cold, "tab_gas")
    model = cold.ends_up.gas.model
    assert model.own == 0
    rows = [[cell(cold, r, c).data() for c in range(4)] for r in range(1, model.rowCount())]
    found = {(row[0], row[1]): row for row in rows}
    assert found["N₂", "NH₃"][2:] == ["0.2193", "DECHEMA Chemistry Data VI page 326"]
    assert not cell(cold, 1, FIRST).flags() & Qt.ItemFlag.ItemIsEditable
    assert cell(cold, 1, K).flags() & Qt.ItemFlag.ItemIsEditable


def test_where_none_is_published_that_is_said(make_window):
    window = make_window(project(loop("srk")))
    press(window, "tab_gas")
    assert "none published" in window.ends_up.gas.title.text()
    assert window.ends_up.gas.model.rowCount() == 1  # the empty row


def test_gas_candidates_are_offered_for_a_pair(cold):
    found = [sp.key for sp in cold.ends_up.gas.view._search("n", 12)]
    assert found[:2] == ["N2", "NH3"]
    assert cold.ends_up.gas.view._search("water", 12) == []


def test_a_pair_is_typed_used_marked_and_undone(cold, qtbot):
    before = cold.session.answer.value.end.fluids["liquid"]["H2"]
    put(cold, 0, FIRST, "hydrogen")
    put(cold, 0, SECOND, "NH3")
    settled(qtbot, cold)
    assert cold.session.answer.state == "faulty"
    assert "not said" in cold.ends_up.gas.faults.text()
    put(cold, 0, K, "0,2")
    settled(qtbot, cold)
    assert cold.session.answer.state == "settled"
    assert cold.session.case.interactions == (Interaction(a="hydrogen", b="NH3", k=0.2),)
    assert cell(cold, 0, SOURCE).data() == "your value"
    assert cell(cold, 1, FIRST).data() == ""  # the empty row comes after it
    assert cold.session.answer.value.end.fluids["liquid"]["H2"] < before
    for _ in range(3):
        press(cold, "undo")
    assert cold.session.case.interactions == ()
    settled(qtbot, cold)
    assert cold.session.answer.value.end.fluids["liquid"]["H2"] == before
    press(cold, "redo")
    assert cell(cold, 0, FIRST).data() == "hydrogen"


def test_typing_over_a_published_value_makes_it_ones_own(cold, qtbot):
    gas = cold.ends_up.gas
    rows = [gas.model.index(r, SECOND).data() for r in range(gas.model.rowCount())]
    at = rows.index("NH₃")
    put(cold, at, K, "0.1")
    assert cold.session.case.interactions == (Interaction(a="N2", b="NH3", k=0.1),)
    settled(qtbot, cold)
    assert cold.session.answer.value.prepared.gas.interactions == (("N2", "NH3", 0.1),)
    assert cell(cold, at + 1, SOURCE).data().startswith("your value is used; DECHEMA")
    put(cold, at + 1, K, "0.12")  # over it once more: still one pair
    assert cold.session.case.interactions == (Interaction(a="N2", b="NH3", k=0.12),)
    gas.view.setCurrentIndex(gas.model.index(0, K))
    gas.view.remove_rows()
    settled(qtbot, cold)
    assert cold.session.case.interactions == ()
    assert cell(cold, at, SOURCE).data().startswith("DECHEMA")
    gas.view.setCurrentIndex(gas.model.index(2, K))
    gas.view.remove_rows()  # a published pair stays
    assert cold.session.case.interactions == ()


def test_pairs_are_pasted_from_a_spreadsheet(cold, qtbot):
    gas = cold.ends_up.gas
    text = "species\twith\tk_ij\tsource\nH2\tNH3\t0.09\nH2\tAr\t-0,01\tnotes\n"
    QGuiApplication.clipboard().setText(text)
    gas.view.paste()
    pairs = cold.session.case.interactions
    assert pairs == (Interaction(a="H2", b="NH3", k=0.09), Interaction(a="H2", b="Ar", k=-0.01))
    settled(qtbot, cold)
    assert cold.session.answer.state == "settled"
    press(cold, "undo")
    assert cold.session.case.interactions == ()


@pytest.mark.parametrize(
    ("pair", "column", "says"),
    [
        (("N2", "Zz", 0.1), SECOND, "not in the library"),
        (("CO", "N2", 0.1), FIRST, "not among the candidates"),
        (("N2", "H2", 1.4), K, "out of range"),
        (("N2", "H2", "lots"), K, "not a number"),
        (("H2", "N2", 0.2), FIRST, "given twice"),
    ],
)
def test_a_fault_stands_at_its_cell_in_the_view_and_beside_the_menu(
    make_window, qtbot, pair, column, says
):
    first = Interaction(a="N2", b="H2", k=0.05)
    pairs = (first,) if says == "given twice" else ()
    a, b, k = pair
    pairs = (*pairs, Interaction(a=a, b=b, k=k))
    window = make_window(project(loop(interactions=[p.model_dump() for p in pairs])))
    row = len(pairs) - 1
    assert window.session.answer.state == "faulty"
    press(window, "tab_gas")
    assert window.ends_up.pages.currentWidget() is window.ends_up.gas  # in reach to be mended
    assert window.ends_up.gas.view.isVisible()
    assert says in cell(window, row, column).data(FAULT_ROLE)
    others = {FIRST, SECOND, K} - {column}
    assert not any(cell(window, row, other).data(FAULT_ROLE) for other in others)
    assert says in window.ends_up.gas.faults.text()
    assert says in window.held_fixed.gas.sentence.text()
    assert window.session.case.interactions == pairs  # nothing typed is lost


def test_pairs_stay_while_the_gas_is_ideal(cold, qtbot):
    cold.session.edit_case(edits.set_pair(cold.session.case, 0, a="N2", b="Ar", k=0.1), "type")
    pick_gas(cold, "ideal")
    settled(qtbot, cold)
    assert cold.session.answer.state == "settled"
    assert cold.session.case.interactions
    press(cold, "tab_gas")
    assert "not used" in cold.ends_up.gas.note.text()
    assert "nothing to set beside" in cold.ends_up.gas.beside.sentence.text()
    pick_gas(cold, "pr")
    settled(qtbot, cold)
    assert cold.session.answer.value.prepared.gas.interactions == (("N2", "Ar", 0.1),)


# -- ideal beside real


def test_the_ideal_answer_is_settled_only_once_it_is_looked_at(cold, qtbot):
    part = cold.ends_up.gas.beside
    asked = []
    real = part._settle
    part._settle = lambda case, answer: asked.append(case) or real(case, answer)
    cold.session.edit_case(cold.session.case.model_copy(update={"notes": "x"}), "note")
    settled(qtbot, cold)
    assert asked == []
    assert part.figures.model.rowCount() == 0
    press(cold, "tab_gas")
    settled(qtbot, cold)
    assert len(asked) == 1
    press(cold, "tab_phases")
    press(cold, "tab_gas")
    settled(qtbot, cold)
    assert len(asked) == 1, "known already"
    rows = {row[0]: row for row in shown(part.figures)}
    alone = settle_case(loop("ideal"))
    end = cold.session.answer.value.end
    assert float(rows["gas, % of all moles"][2]) == 100.0
    number = lambda text: float(text.replace("−", "-"))  # noqa: E731
    assert number(rows["NH₃, mol %"][1]) == pytest.approx(100 * end.fraction("NH3"), rel=1e-3)
    assert number(rows["NH₃, mol %"][2]) == pytest.approx(22.0)
    assert number(rows["NH₃, mol %"][3]) == pytest.approx(
        100 * end.fraction("NH3") - 22.0, rel=1e-3
    )
    assert number(rows["volume, L"][2]) == pytest.approx(1e3 * alone.end.V, rel=1e-3)
    cold.ends_up.copy()
    assert "k_ij" in QGuiApplication.clipboard().text()


def test_an_edit_greys_the_comparison_until_the_new_one_is_there(cold, qtbot):
    press(cold, "tab_gas")
    settled(qtbot, cold)
    part = cold.ends_up.gas.beside
    old = shown(part.figures)
    gate = threading.Event()
    real = part._settle

    def slow(case, answer):
        gate.wait(10)
        return real(case, answer)

    part._settle = slow
    values = {"T": q(20, "degC"), "p": q(190, "bar")}
    fixed = cold.session.case.fixed.model_copy(update={"values": values})
    cold.session.edit_case(cold.session.case.model_copy(update={"fixed": fixed}), "warmer")
    qtbot.waitUntil(lambda: cold.session.is_idle())
    assert shown(part.figures) == old
    assert part.figures.model._stale
    gate.set()
    settled(qtbot, cold)
    assert not part.figures.model._stale
    assert shown(part.figures) != old


def test_a_vessel_says_that_the_ideal_feed_has_its_own_volume(make_window, qtbot):
    window = make_window(project(loop(pair="U,V", restrictions=[])))
    press(window, "tab_gas")
    settled(qtbot, window)
    assert "as the ideal feed has it" in window.ends_up.gas.beside.figures.note.text()


def test_settling_a_real_gas_leaves_the_window_free(make_window, qtbot):
    """The GUI thread goes round while the worker settles."""
    gate, where = threading.Event(), []

    def settle(case):
        where.append(threading.current_thread())
        gate.wait(10)
        return settle_case(case)

    window = make_window(project(loop()), settle=settle, wait=False)
    qtbot.waitUntil(lambda: bool(where))
    assert where[0] is not threading.main_thread()
    turns = 0
    for _ in range(20):
        QApplication.processEvents()
        turns += 1
    assert turns == 20
    assert window.session.answer.state == "settling"
    gate.set()
    settled(qtbot, window)
    assert window.session.answer.state == "settled"


def test_the_view_stacks_its_parts_where_it_is_narrow(cold):
    view: GasView = cold.ends_up.gas
    press(cold, "tab_gas")
    QApplication.processEvents()
    wide = view.pairs.geometry()
    assert wide.left() > view.beside.geometry().right()
    cold.resize(1000, 620)
    QApplication.processEvents()
    assert view.pairs.geometry().top() > view.beside.geometry().top()
    assert view.pairs.geometry().left() == view.beside.geometry().left()
