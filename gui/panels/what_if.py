"""What if: the composition over a range of temperatures around the case."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QButtonGroup, QProgressBar, QVBoxLayout

from gui import readings
from gui.document import replaced
from gui.fields.quantity_field import QuantityField
from gui.jobs import Channel
from gui.line import Line, composition_line, range_of
from gui.parts.card import Card, Label, Sentence, choice, link
from gui.session import Session
from gui.theme import GRID, Theme, sized
from solver.project.units import UnitError, canonical, from_si
from solver.project.wording import quantity_text

if TYPE_CHECKING:
    from gui.plots.composition_plot import CompositionPlot
    from solver.project.case import CaseAnswer

PAUSE = 120
"""Milliseconds without a new answer before the line is computed."""


class WhatIf(Card):
    """Range, scale and plot; the line is computed off the GUI thread."""

    def __init__(
        self,
        session: Session,
        theme: Theme,
        compute: Callable[..., Line] = composition_line,
    ) -> None:
        super().__init__("What if")
        self._session = session
        self._theme = theme
        self._compute = compute
        self.plot: CompositionPlot | None = None
        self._line: Line | None = None
        self._key: object = None
        self._build()
        self._channel = Channel(self)
        self._channel.finished.connect(self._drawn)
        self._channel.failed.connect(self._failed)
        self._channel.progressed.connect(lambda s: self.progress.setValue(int(100 * s)))
        self._channel.slow.connect(self._slow)
        self._pause = QTimer(self, singleShot=True, interval=PAUSE)
        self._pause.timeout.connect(self._submit)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self._answer)
        self.refresh()

    def _build(self) -> None:
        small = sized(self.font(), "small")
        self.T_from = QuantityField("temperature", "degC")
        self.T_to = QuantityField("temperature", "degC")
        row = self.head
        at = 1
        for widget in (
            Label("temperature from", "muted", "small"),
            self.T_from,
            Label("to", "muted", "small"),
            self.T_to,
        ):
            row.insertWidget(at, widget)
            at += 1
        for field, name in ((self.T_from, "lowest"), (self.T_to, "highest")):
            field.setFixedWidth(88)
            field.setFont(small)
            field.setAccessibleName(f"{name} temperature of the plot")
            field.left.connect(self._session.end_visit)
        self.linear = choice("linear")
        self.logarithmic = choice("log", "Decades of mol % (Ctrl+L)")
        group = QButtonGroup(self)
        for button in (self.linear, self.logarithmic):
            group.addButton(button)
            row.insertWidget(at, button)
            at += 1
        self.held = Label("", "muted", "small")
        row.insertWidget(at, self.held)
        self.stop = link("stop", "Stop computing the line (Esc)")
        self.stop.clicked.connect(self.cancel)
        self.stop.hide()
        row.addWidget(self.stop)
        self.progress = QProgressBar()
        self.progress.setRange(0, 100)
        self.progress.setTextVisible(False)
        self.progress.hide()
        self.body.addWidget(self.progress)
        self.sentence = Sentence()
        self.body.addWidget(self.sentence)
        self._place = QVBoxLayout()
        self.body.addLayout(self._place, 1)
        self.body.setSpacing(GRID // 2)
        self.T_from.typed.connect(lambda q: self._type("T_from", q))
        self.T_to.typed.connect(lambda q: self._type("T_to", q))
        self.logarithmic.clicked.connect(lambda: self.set_logarithmic(True))
        self.linear.clicked.connect(lambda: self.set_logarithmic(False))

    def load_plot(self) -> None:
        """Bring in the plotting library; called once the window is seen."""
        if self.plot is not None:
            return
        from gui.plots.composition_plot import CompositionPlot

        self.plot = CompositionPlot(self._theme, self._session.colours)
        self._place.addWidget(self.plot, 1)
        self.refresh()
        self._answer()

    def close_jobs(self) -> None:
        """Stop computing; waits for the worker."""
        self._pause.stop()
        self._channel.close()

    def is_idle(self) -> bool:
        """Whether the plot is as new as it will get."""
        return not self._pause.isActive() and self._channel.is_idle()

    # -- editing

    def _type(self, which: str, quantity: object) -> None:
        case = self._session.case
        plot = replaced(case.plot, **{which: quantity})
        self._session.edit_case(replaced(case, plot=plot), "type plot range", f"plot.{which}")

    def set_logarithmic(self, on: bool) -> None:
        """Show decades or shares in proportion."""
        case = self._session.case
        if on != case.plot.logarithmic:
            plot = replaced(case.plot, logarithmic=on)
            label = "logarithmic plot" if on else "linear plot"
            self._session.edit_case(replaced(case, plot=plot), label)

    # -- showing

    def refresh(self) -> None:
        """Show range and scale; ask for the line where they changed."""
        wish = self._session.case.plot
        self.T_from.show_quantity(wish.T_from)
        self.T_to.show_quantity(wish.T_to)
        (self.logarithmic if wish.logarithmic else self.linear).setChecked(True)
        if self.plot is not None:
            self.plot.set_logarithmic(wish.logarithmic)
        faults = self._range_faults()
        for field, name in ((self.T_from, "plot.T_from"), (self.T_to, "plot.T_to")):
            field.set_fault(faults.get(name, ""))
        self.sentence.say("\n".join(faults.values()))
        self._ask()

    def _range_faults(self) -> dict[str, str]:
        try:
            low, high = range_of(self._session.case)
        except UnitError as error:
            return {error.field: str(error)}
        if high - low < 1.0:
            return {"plot.T_to": "The range is empty; give an upper temperature above the lower."}
        if low < 150 or high > 20000:
            which = "plot.T_from" if low < 150 else "plot.T_to"
            return {which: "Species data mean nothing there; stay between 150 K and 20 000 K."}
        return {}

    def _answer(self) -> None:
        answer = self._session.answer
        if self.plot is not None and answer.state != "settled":
            self.plot.set_stale(True)
        if answer.value is None:
            self._show(None)
        self._ask()

    def _wanted(self) -> tuple[CaseAnswer, float, float] | None:
        answer = self._session.answer
        if answer.state != "settled" or answer.value is None or self._range_faults():
            return None
        return (answer.value, *range_of(self._session.case))

    def _ask(self) -> None:
        if self.plot is None:
            return
        wanted = self._wanted()
        if wanted is None:
            self._pause.stop()
            return
        if self._key is not None and _same(self._key, wanted):
            if self._line is not None:
                self._show(self._line)
            return
        self._pause.start()

    def _submit(self) -> None:
        wanted = self._wanted()
        if wanted is None:
            return
        self._key = wanted
        answer, low, high = wanted
        compute = self._compute
        self.progress.setValue(0)
        self._channel.submit(
            wanted,
            lambda progress, should_stop: compute(answer, low, high, progress, should_stop),
        )

    def cancel(self) -> None:
        """Give up on the line."""
        self._pause.stop()
        self._channel.cancel()
        self._key = None
        self.remark.setText("stopped; any edit starts it again")

    def _drawn(self, key: Any, line: Line) -> None:
        self._line = line
        if _same(key, self._wanted()):
            self._show(line)

    def _failed(self, key: object, error: Exception) -> None:
        self._key = None
        self._session.messages.unexpected(error)

    def _slow(self, slow: bool) -> None:
        self.progress.setVisible(slow)
        self.stop.setVisible(slow)

    def _show(self, line: Line | None) -> None:
        self._line = line
        if self.plot is None:
            return
        unit = self._unit()
        answer = self._session.answer
        if line is None:
            self._key = None
            if not self._range_faults():
                self.plot.set_empty_range(*range_of(self._session.case))
            self.plot.show_line(None, unit)
            self.remark.setText("")
            self.held.setText("")
            return
        self.plot.show_line(line, unit, _mark(answer.value))
        count = len(line.T)
        took = f"{line.seconds * 1000:.0f} ms" if line.seconds < 0.995 else f"{line.seconds:.1f} s"
        text = f"{count} end states in {took}"
        if line.failed:
            text += f", {line.failed} could not be settled"
        self.remark.setText(text)
        if line.held == "p":
            shown = readings.units_for(self._session.case, answer.value).p
            self.held.setText(f"at {quantity_text(from_si(line.value, shown, 'pressure'), shown)}")
        else:
            self.held.setText(f"at {quantity_text(*readings.volume(line.value, False))}")

    def _unit(self) -> str:
        try:
            return canonical(self._session.case.plot.T_from.unit, "temperature")
        except UnitError:
            return "degC"


def _same(a: Any, b: Any) -> bool:
    return a is not None and b is not None and a[0] is b[0] and a[1:] == b[1:]


def _mark(answer: CaseAnswer | None):  # type: ignore[no-untyped-def]
    from gui.plots.composition_plot import Mark

    if answer is None:
        return None
    total = sum(answer.end.amounts.values())
    return Mark(answer.end.T, {k: n / total for k, n in answer.end.amounts.items()})
