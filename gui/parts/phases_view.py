"""The view "Phases": how much of each, what is in gas and liquid, what is left out and why."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QScrollArea, QVBoxLayout, QWidget

from gui import readings
from gui.parts.card import Sentence
from gui.parts.figures_view import FiguresTable
from gui.tables import clipboard
from gui.tables.figures_model import Cell, Words
from gui.theme import GRID, ROW_HEIGHT, Theme
from solver.project.wording import formula_text, unit_text

_HEADER = 26
TRACE = 1e-6
"""Share of every fluid below which a species is no row of the comparison."""


class PhasesView(QScrollArea):
    """Each phase with amount and mass; gas and liquid side by side where both are there."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.setWidgetResizable(True)
        self.setFocusPolicy(self.focusPolicy().NoFocus)
        self.phases = FiguresTable(theme, "phases at the end")
        self.split = FiguresTable(theme, "composition of gas and liquid", width=124)
        self.split.table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAsNeeded)
        self.left_out = Sentence("muted")
        page = QWidget()
        layout = QVBoxLayout(page)
        layout.setContentsMargins(0, 0, GRID // 2, 0)
        layout.setSpacing(GRID)
        for widget in (self.phases, self.split, self.left_out):
            layout.addWidget(widget)
        layout.addStretch(1)
        self.setWidget(page)

    @property
    def table(self) -> QWidget:
        """The table of the phases."""
        return self.phases.table

    def show_answer(self, answer: Any, units: readings.Units, stale: bool) -> None:
        """Show the phases of an answer."""
        end = answer.end
        names = {sp.key: sp.name for sp in end.species}
        rows: list[tuple[Cell, ...]] = []
        for row in readings.phases(end):
            name = row.name
            if name in names:
                name = f"{formula_text(name)}  {names[name]}"
            rows.append(
                (
                    name,
                    units.amount_of(row.amount),
                    100 * row.share,
                    units.mass_of(row.mass),
                    100 * row.mass_share,
                )
            )
        heads = ("phase", unit_text(units.amount), "mol %", unit_text(units.mass), "mass %")
        self._fill(self.phases, heads, rows, stale)
        count = len(end.proof.absent)
        absent = f"{count} condensed candidates did not form; Proof has their margins."
        if count == 1:
            absent = "1 condensed candidate did not form; Proof has its margin."
        self.phases.note.say(absent if count else "")
        self._fill(self.split, *split_table(end, units), stale)
        self.split.setVisible(self.split.model.rowCount() > 0)
        first_two = list(end.fluids)[:2]
        self.split.note.say(
            f"Ratio: mole fraction in the {first_two[0]} over that in the {first_two[1]}."
            if len(first_two) == 2
            else ""
        )
        self.left_out.say("\n".join(left_out_text(end)))

    def _fill(self, table: FiguresTable, heads: Any, rows: Any, stale: bool) -> None:
        table.model.show(heads, rows, stale)
        scrolled = GRID if table is self.split else 0
        table.table.setFixedHeight(_HEADER + ROW_HEIGHT * len(rows) + scrolled)

    def clear(self) -> None:
        """Show nothing."""
        for table in (self.phases, self.split):
            table.model.show((), [], False)
            table.note.say("")
        self.split.hide()
        self.left_out.say("")

    def copy(self) -> None:
        """Put the tables and the sentences on the clipboard."""
        texts = []
        for table in (self.phases, self.split):
            if table.model.rowCount():
                table.table.clearSelection()
                texts.append(clipboard.as_text(table.table))
        texts += [self.left_out.text()] if self.left_out.text() else []
        QGuiApplication.clipboard().setText("\n\n".join(texts))


def split_table(end: Any, units: readings.Units) -> tuple[tuple[str, ...], list[tuple[Cell, ...]]]:
    """Amount and mole fraction of each species in every fluid phase; no rows for a single one."""
    fluids, _ = readings.composition(end)
    if len(fluids) < 2:
        return (), []
    heads = ["species"]
    for fluid in fluids:
        heads += [f"{fluid.name}, {unit_text(units.amount)}", f"{fluid.name}, mol %"]
    heads.append("ratio")
    in_phase = [{row.key: row for row in fluid.rows} for fluid in fluids]
    order = sorted(in_phase[0], key=lambda key: -max(held[key].share for held in in_phase))
    rows: list[tuple[Cell, ...]] = []
    for key in order:
        found = [held[key] for held in in_phase]
        if max(row.share for row in found) < TRACE:
            continue
        cells: list[Cell] = [Words(f"{formula_text(key)}  {found[0].name}", key)]
        for row in found:
            cells += [units.amount_of(row.amount), 100 * row.share]
        first, second = found[0].share, found[1].share
        cells.append(first / second if second > 0 else None)
        rows.append(tuple(cells))
    return tuple(heads), rows


def left_out_text(end: Any) -> list[str]:
    """Which pure liquids and which constants an equation of state does without, and why."""
    out = []
    if end.left_out:
        pairs = ", ".join(formula_text(key) for key in end.left_out)
        it, its = (
            ("it", "its gas species") if len(end.left_out) == 1 else ("they", "the gas species")
        )
        out.append(
            f"Left out: {pairs}. The liquid of the equation of state is made of {its} and would "
            f"count the same substance twice if {it} stood beside it."
        )
    if end.taken_as_ideal:
        total = sum(end.amounts.values())
        seen = [key for key in end.taken_as_ideal if end.amounts[key] > TRACE * total]
        rest = len(end.taken_as_ideal) - len(seen)
        named = ", ".join(formula_text(key) for key in seen)
        others = f"{rest} {'more' if seen else 'species'} present in traces only" if rest else ""
        listed = " and ".join(part for part in (named, others) if part)
        out.append(f"Taken as ideal, for want of usable critical constants: {listed}.")
    return out
