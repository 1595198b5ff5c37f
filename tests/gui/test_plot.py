"""The what-if plot: what is drawn, named, read out, stopped."""

import threading
from itertools import pairwise

import numpy as np
import pytest

import solver
from gui.colours import PALETTE, SpeciesColours
from gui.jobs import Stopped
from gui.line import Line, composition_line, phase_changes, shown_keys
from gui.plots.end_labels import spread
from gui.theme import Theme

from .cases import burner, project
from .fakes import answer


def line(shares, keys=("H2", "N2", "C(gr)"), condensed=("C(gr)",)):
    shares = np.array(shares, dtype=float)
    T = np.linspace(1000.0, 1400.0, len(shares))
    return Line(T, keys, shares, condensed, 0, 0.01, "p", 1e5)


STEADY = [[0.25, 0.749, 0.001], [0.3, 0.7, 0.0], [0.35, 0.65, 0.0]]


@pytest.fixture
def plot(qtbot, qapp):
    from gui.plots.composition_plot import CompositionPlot

    theme = Theme(qapp, "light")
    plot = CompositionPlot(theme, SpeciesColours())
    qtbot.addWidget(plot)
    plot.resize(700, 320)
    plot.show()
    yield plot
    theme.close()


def test_species_of_no_account_have_no_curve():
    assert shown_keys(line(STEADY), logarithmic=False) == ["N2", "H2"]
    assert shown_keys(line(STEADY), logarithmic=True) == ["N2", "H2", "C(gr)"]


def test_a_point_that_could_not_be_settled_is_a_gap():
    broken = line([[np.nan] * 3, *STEADY])
    assert shown_keys(broken, logarithmic=False) == ["N2", "H2"]


def test_phase_changes_are_named_between_their_points():
    assert phase_changes(line(STEADY)) == [(1100.0, "C(gr) gone")]


def test_curves_are_named_at_their_ends(plot):
    plot.show_line(line(STEADY), "degC")
    assert plot.curve_names() == ["N₂", "H₂"]
    ends = {text: y for text, y, _, _ in plot.labels.placed()}
    assert ends["N₂"] < ends["H₂"]  # the larger share stands higher
    plot.show_line(None, "degC")
    assert plot.curve_names() == []


def test_the_mouse_reads_a_point_out(plot, qtbot):
    plot.show_line(line(STEADY), "K")
    told = []
    plot.read_out.connect(told.append)
    plot._read(1100.0)
    assert told[-1].startswith("1100 K: N2 72.4")
    assert plot.note.isVisible()
    assert "27.5" in plot.note.text()
    plot._read(None)
    assert not plot.note.isVisible()


def test_the_arrow_keys_read_out_too(plot, qtbot):
    from PySide6.QtCore import Qt

    plot.show_line(line(STEADY), "K")
    told = []
    plot.read_out.connect(told.append)
    plot.view.setFocus()
    qtbot.keyClick(plot.view, Qt.Key.Key_Right)
    assert told[-1].startswith("1200 K")


def test_decades(plot):
    plot.show_line(line(STEADY), "degC")
    plot.set_logarithmic(True)
    assert plot.axis.tickStrings([2, 0, -2, -4], 1, 1) == ["100", "1", "0.01", "10⁻⁴"]
    assert plot.curve_names()[:2] == ["N₂", "H₂"]


def test_labels_move_apart_and_stay_in_order():
    places = spread([10.0, 11.0, 12.0, 60.0], 14.0, 0.0, 100.0)
    assert places == sorted(places)
    assert all(b - a >= 14.0 - 1e-9 for a, b in pairwise(places))
    assert places[-1] == 60.0
    assert all(7 <= y <= 93 for y in spread([99.0, 99.5, 100.0], 14.0, 0.0, 100.0))


def test_a_species_keeps_its_colour():
    colours = SpeciesColours()
    first = {k: colours.base(k) for k in ("H2", "SO2", "C(gr)", "Fe2O3(s)")}
    again = SpeciesColours()
    for key in reversed(first):
        again.seat(key)
    assert colours.base("SO2") == first["SO2"]
    assert first["H2"] == again.base("H2") == PALETTE[0]
    seats = [colours.seat(f"X{i}") for i in range(20)]
    assert len(set(seats)) == 20


def test_the_line_is_the_solver_at_each_temperature(qtbot):
    from solver import Fixed, settle
    from solver.project.case import settle_case

    case = settle_case(burner())
    shares = []
    got = composition_line(case, 1000.0, 2000.0, shares.append, lambda: False, points=3)
    alone = settle(
        case.prepared.candidates, dict(case.prepared.feed), Fixed("T,p", T=1500.0, p=case.end.p)
    )
    total = sum(alone.amounts.values())
    assert got.shares[1] == pytest.approx([alone.amounts[k] / total for k in got.keys], abs=1e-10)
    assert shares == [1.0]
    assert got.failed == 0


def test_a_sealed_case_keeps_its_volume():
    from solver.project.case import settle_case
    from solver.project.model import FixedPair

    case = settle_case(burner(fixed=FixedPair(pair="U,V")))
    seen = []

    def settle_many(*args, **more):
        seen.append(solver.settle_many(*args, **more))
        return seen[-1]

    got = composition_line(
        case, 1000.0, 2000.0, lambda s: None, lambda: False, points=2, settle_many=settle_many
    )
    assert got.held == "V"
    assert list(seen[0].V) == pytest.approx([case.end.V] * 2)
    # At fixed volume the pressure goes with T, but for the moles that dissociation adds.
    assert seen[0].p[1] / seen[0].p[0] == pytest.approx(2.0, rel=0.02)


def test_a_line_that_is_told_to_stop_stops():
    with pytest.raises(Stopped):
        composition_line(
            answer(), 1000.0, 2000.0, lambda s: None, lambda: True, settle_many=lambda *a, **k: None
        )


def test_the_range_is_typed_and_checked(make_window, qtbot):
    window = make_window()
    panel = window.what_if
    field = panel.T_to
    field.setFocus()
    field.selectAll()
    qtbot.keyClicks(field, "200 degC")
    assert "range is empty" in panel.sentence.text()
    assert field.property("faulty") == "true"
    window.session.undo_stack.undo()
    assert not panel.sentence.isVisible()
    window.actions_by_name["log_plot"].trigger()
    assert window.session.case.plot.logarithmic
    assert panel.logarithmic.isChecked()


def test_the_line_is_computed_once_for_an_answer(make_window, qtbot):
    window = make_window()
    panel = window.what_if
    before = panel._line
    assert before is not None
    window.session.answer_changed.emit()
    qtbot.wait(200)
    assert panel._line is before


def test_stopping_the_line(make_window, qtbot):
    window = make_window()
    gate = threading.Event()

    def endless(answer, low, high, progress, should_stop):
        progress(0.25)
        while not should_stop() and not gate.wait(0.01):
            pass
        raise Stopped

    panel = window.what_if
    panel._compute = endless
    field = panel.T_to
    field.setFocus()
    field.selectAll()
    qtbot.keyClicks(field, "1300 degC")
    qtbot.waitUntil(lambda: panel.progress.isVisible(), timeout=3000)
    assert panel.progress.value() == 25
    window.actions_by_name["stop"].trigger()
    qtbot.waitUntil(panel.is_idle)
    assert not panel.progress.isVisible()
    assert "stopped" in panel.remark.text()


def test_the_project_is_what_the_window_draws(make_window, qtbot):
    window = make_window(project(burner()))
    names = window.what_if.plot.curve_names()
    assert names[0] == "N₂"
    assert {"H₂O", "CO₂"} <= set(names)
