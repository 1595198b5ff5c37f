"""Ideal beside real: settled off the GUI thread once it is looked at, and only then."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from PySide6.QtWidgets import QProgressBar, QVBoxLayout, QWidget

from gui import readings
from gui.jobs import Channel
from gui.parts.card import Sentence
from gui.parts.figures_view import FiguresTable
from gui.session import Session
from gui.tables.figures_model import Cell, Words
from gui.theme import GRID, ROW_HEIGHT, Theme
from solver.project.units import from_si
from solver.project.wording import formula_text, number_text, unit_text

_HEADER = 26
_DIFFERENCE = 3
ROUNDING = 1e-9
"""Share of two figures that a difference of less is the rounding of."""
IDEAL = (
    "The gas is ideal here, so there is nothing to set beside it. Choose an equation of state at "
    "“gas” in Held fixed; this view then shows what it changes."
)
Settle = Callable[[Any, Any], Any]


def settle_beside(case: Any, answer: Any) -> Any:
    """Settle the case with an ideal gas, the solver loaded on first use."""
    from solver.project.beside import settle_beside as settle

    return settle(case, answer)


class BesidePart(QWidget):
    """The table of both answers and their differences."""

    def __init__(self, session: Session, theme: Theme, settle: Settle = settle_beside) -> None:
        super().__init__()
        self._session = session
        self._settle = settle
        self._answer: Any = None
        self._beside: Any = None
        self._units = readings.Units()
        self.figures = FiguresTable(theme, "ideal beside real", 140, 98, ".0000")
        self.figures.model.modelReset.connect(self._widen)
        self.progress = QProgressBar()
        self.progress.setRange(0, 0)
        self.progress.setTextVisible(False)
        self.progress.hide()
        self.sentence = Sentence("muted", "body")
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(GRID // 2)
        layout.addWidget(self.progress)
        layout.addWidget(self.sentence)
        layout.addWidget(self.figures)
        layout.addStretch(1)
        self._channel = Channel(self)
        self._channel.finished.connect(self._found)
        self._channel.failed.connect(self._failed)
        self._channel.slow.connect(self.progress.setVisible)

    def show_answer(self, answer: Any, units: readings.Units, stale: bool) -> None:
        """Show the ideal answer beside this one; asks for it where it is not known yet."""
        self._units = units
        if answer.prepared.gas.is_ideal:
            self.clear()
            self.sentence.say(IDEAL)
            return
        if stale:
            self._fill(True)
            return
        if answer is self._answer:
            self._fill(False)
            return
        self._answer = answer
        case, settle = self._session.case, self._settle
        self._channel.submit(answer, lambda progress, should_stop: settle(case, answer))
        self._fill(self._beside is not None)

    def clear(self) -> None:
        """Show nothing."""
        self._channel.cancel()
        self._answer = self._beside = None
        self.sentence.say("")
        self._fill(False)

    def is_idle(self) -> bool:
        """Whether nothing is being settled."""
        return self._channel.is_idle()

    def cancel(self) -> None:
        """Give up on the ideal answer; looking at the view again asks for it."""
        self._channel.cancel()
        self._answer = None

    def close_jobs(self) -> None:
        """Stop; waits for the worker."""
        self._channel.close()

    def _widen(self) -> None:
        """A difference has a sign, which must not be cut off."""
        if self.figures.model.columnCount():
            self.figures.table.setColumnWidth(_DIFFERENCE, 118)

    def _found(self, answer: Any, beside: Any) -> None:
        if answer is self._answer:
            self._beside = beside
            self.sentence.say("")
            self._fill(False)

    def _failed(self, answer: Any, error: Exception) -> None:
        from solver.errors import SettleError

        self._beside = None
        self._fill(False)
        if isinstance(error, SettleError):
            self.sentence.say(f"The same case has no end state with an ideal gas: {error}")
        else:
            self._session.messages.unexpected(error)

    def _fill(self, stale: bool) -> None:
        beside = self._beside
        self.figures.setVisible(beside is not None)
        if beside is None:
            self.figures.model.show((), [], False)
            self.figures.note.say("")
            return
        heads = ("", "real", "ideal", "difference")
        rows = rows_of(beside, self._units)
        self.figures.model.show(heads, rows, stale)
        self.figures.table.setFixedHeight(_HEADER + ROW_HEIGHT * len(rows))
        note = (
            f"Real: {beside.real.prepared.gas.name}. Mole fractions are of the gas, or of all "
            "moles where that is said."
        )
        if beside.held_differs:
            note += " What is held as fed is held here as the ideal feed has it."
        self.figures.note.say(note)


def rows_of(beside: Any, units: readings.Units) -> list[tuple[Cell, ...]]:
    """T, p, V, heat, gas and main fractions: real, ideal, and the first less the second."""
    rows: list[tuple[Cell, ...]] = []
    real, ideal, flow = beside.real, beside.ideal, beside.real.basis == "flow"

    def add(words: str, a: float, b: float, unit: str = "", plain: str = "") -> None:
        change = a - b
        if abs(change) <= ROUNDING * max(abs(a), abs(b)):
            change = 0.0
        shown = f"{words}, {unit_text(unit)}" if unit else words
        sign = "+" if change > 0 else ""
        text = Words(sign + number_text(change), repr(change), repr(change))
        rows.append((Words(shown, plain or shown), float(a), float(b), text))

    def scaled(words: str, a: float, b: float, scale: Any) -> None:
        most = max(abs(a), abs(b), 1e-300)
        value, unit = scale(most, flow)
        add(words, a * value / most, b * value / most, unit)

    for words, name, kind, unit in (
        ("temperature", "T", "temperature", units.T),
        ("pressure", "p", "pressure", units.p),
    ):
        a, b = (from_si(getattr(found.end, name), unit, kind) for found in (real, ideal))
        add(words, a, b, unit)
    scaled("volume flow" if flow else "volume", real.end.V, ideal.end.V, readings.volume)
    heats = [
        0.0 if abs(f.heat) <= ROUNDING * (abs(f.fed.H) + abs(f.end.H)) else f.heat
        for f in (real, ideal)
    ]
    scaled(
        {"heat": "heat added", "work": "work put in"}.get(real.heat_is, "heat and work"),
        *heats,
        readings.energy,
    )
    gas = beside.gas_shares()
    if min(gas) < 1.0:
        add("gas, % of all moles", 100 * gas[0], 100 * gas[1])
    for key in beside.main:
        a, b, of = beside.shares(key)
        where = "mol %" if of == "gas" else "mol % of all"
        add(f"{formula_text(key)}, {where}", 100 * a, 100 * b, plain=f"{key}, mol % of {of}")
    return rows
