"""Small tables of figures, and the view "Energy", which is one."""

from __future__ import annotations

from PySide6.QtWidgets import QHeaderView, QVBoxLayout, QWidget

from gui import readings
from gui.parts.card import Sentence
from gui.parts.table_view import plain_table
from gui.tables.delegates import CellDelegate, FigureDelegate
from gui.tables.figures_model import Cell, FiguresModel
from gui.theme import GRID, Theme
from solver.project.units import from_si
from solver.project.wording import SIGNIFICANT, quantity_text, unit_text

_ROUNDING = 1e-9
"""Share of the figures that a difference of less is the rounding of."""


class FiguresTable(QWidget):
    """A table of figures with a sentence beneath."""

    def __init__(
        self,
        theme: Theme,
        name: str,
        first_width: int = 190,
        width: int = 118,
        decimals: str = ".00000",
        digits: int = SIGNIFICANT,
    ) -> None:
        super().__init__()
        self.model = FiguresModel(self, digits)
        self.table = plain_table(self.model, name, self)
        self._first, self._width = first_width, width
        self._cells = CellDelegate(theme, self)
        self._figures = FigureDelegate(theme, decimals, parent=self)
        self.table.setItemDelegate(self._figures)
        self.table.setItemDelegateForColumn(0, self._cells)
        self.note = Sentence("muted")
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.setSpacing(GRID // 2)
        layout.addWidget(self.table, 1)
        layout.addWidget(self.note)
        self.model.modelReset.connect(self._widths)

    def _widths(self) -> None:
        header = self.table.horizontalHeader()
        for column in range(self.model.columnCount()):
            header.setSectionResizeMode(column, QHeaderView.ResizeMode.Fixed)
            self.table.setColumnWidth(column, self._width)
        self.table.setColumnWidth(0, self._first)

    def text_column(self, column: int, stretch: bool = True) -> None:
        """A column of words, which may take the room that is left."""
        self.table.setItemDelegateForColumn(column, self._cells)
        if not stretch:
            return
        self.table.horizontalHeader().setSectionResizeMode(column, QHeaderView.ResizeMode.Stretch)


class EnergyView(FiguresTable):
    """The state as fed, at the end, and the difference."""

    def __init__(self, theme: Theme) -> None:
        super().__init__(theme, "energy balance")

    def show_answer(self, answer, units: readings.Units, stale: bool) -> None:  # type: ignore[no-untyped-def]
        """Show the balance of an answer."""
        end, fed, flow = answer.end, answer.fed, answer.basis == "flow"
        rows: list[tuple[Cell, ...]] = []

        def add(words: str, a: float | None, b: float, unit: str, convert) -> None:  # type: ignore[no-untyped-def]
            first = None if a is None else convert(a)
            second = convert(b)
            change = None if first is None else second - first
            if change is not None and abs(change) < _ROUNDING * max(abs(first), abs(second)):
                change = 0.0
            first = "several" if first is None else first
            rows.append((f"{words}, {unit_text(unit)}", first, second, change))

        add("temperature", fed.T, end.T, units.T, lambda x: from_si(x, units.T, "temperature"))
        add("pressure", fed.p, end.p, units.p, lambda x: from_si(x, units.p, "pressure"))
        for words, a, b, scale in (
            ("volume", fed.V, end.V, readings.volume),
            ("enthalpy H", fed.H, end.H, readings.energy),
            ("internal energy U", fed.U, end.U, readings.energy),
            ("entropy S", fed.S, end.S, readings.entropy),
        ):
            unit = scale(max(abs(a), abs(b)), flow)[1]
            factor = scale(max(abs(a), abs(b), 1e-300), flow)[0] / max(abs(a), abs(b), 1e-300)
            add(words, a, b, unit, lambda x, f=factor: x * f)
        self.model.show(("", "as fed", "at the end", "change"), rows, stale)
        size = max(abs(end.H), abs(fed.H), abs(end.U), abs(fed.U))
        heat = answer.heat if abs(answer.heat) > _ROUNDING * size else 0.0
        Q, unit = readings.energy(heat, flow)
        what = {"heat": "Heat added", "work": "Work put in"}.get(
            getattr(answer, "heat_is", "heat"), "Heat added and work put in"
        )
        pair = end.fixed.pair
        law = "U at the end − U as fed" if pair.endswith("V") else "H at the end − H as fed"
        self.note.say(
            f"{what} = {law} = {quantity_text(Q, unit)}. "
            "Enthalpies of formation are included; the elements at 298.15 K are the datum."
        )
