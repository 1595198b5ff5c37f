"""The composition at the end: fluids first, condensed after them, the most abundant on top."""

from __future__ import annotations

import math
from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, Qt

from gui.colours import SpeciesColours
from gui.readings import FluidRows, SpeciesRow, Units, composition
from gui.tables.clipboard import COPY_ROLE
from gui.tables.delegates import BAR_ROLE, MUTED_ROLE, SECTION_ROLE, WARNING_ROLE
from gui.theme import Theme
from solver.project.wording import formula_text, number_text, unit_text

SPECIES, NAME, BAR, SHARE, AMOUNT, MASS = range(6)
DECADES = 8.0
"""Decades that a logarithmic bar spans; less is a trace."""
TRACE = 1e-6
_TOP = QModelIndex()
_Row = SpeciesRow | str


class CompositionModel(QAbstractTableModel):
    """Shows an end state; numbers rounded for the eye, whole for the tool tip and the copy."""

    def __init__(
        self, theme: Theme, colours: SpeciesColours, parent: QObject | None = None
    ) -> None:
        super().__init__(parent)
        self._theme = theme
        self._colours = colours
        self._rows: list[_Row] = []
        self._units = Units()
        self._stale = False
        self._full = 1.0
        self.logarithmic = False

    @property
    def rows(self) -> list[_Row]:
        """Species rows and section titles, as shown."""
        return list(self._rows)

    def show(self, end: Any, units: Units) -> None:
        """Show an end state."""
        fluids, condensed = composition(end)
        new = _rows(fluids, condensed)
        heads = (self._units, self._full)
        self._units = units
        top = max((r.share for r in new if not isinstance(r, str)), default=1.0)
        self._full = min(math.ceil(top * 10 - 1e-9) / 10, 1.0) or 1.0
        kinds = [isinstance(r, str) for r in new]
        if kinds == [isinstance(r, str) for r in self._rows]:
            self._rows = new
            self.repaint()
        else:
            self.beginResetModel()
            self._rows = new
            self.endResetModel()
        if heads != (self._units, self._full):
            self.headerDataChanged.emit(Qt.Orientation.Horizontal, 0, MASS)

    def clear(self) -> None:
        """Show nothing."""
        if self._rows:
            self.beginResetModel()
            self._rows = []
            self.endResetModel()

    def set_stale(self, stale: bool) -> None:
        """Grey everything out."""
        if stale != self._stale:
            self._stale = stale
            self.repaint()

    def set_logarithmic(self, on: bool) -> None:
        """Draw the bars over decades."""
        self.logarithmic = on
        self.repaint()
        self.headerDataChanged.emit(Qt.Orientation.Horizontal, BAR, BAR)

    def repaint(self) -> None:
        """Values changed, rows did not."""
        if self._rows:
            self.dataChanged.emit(self.index(0, 0), self.index(len(self._rows) - 1, MASS))

    def rowCount(self, parent: QModelIndex = _TOP) -> int:
        """Species and section titles."""
        return 0 if parent.isValid() else len(self._rows)

    def columnCount(self, parent: QModelIndex = _TOP) -> int:
        """Species, name, bar, mol %, amount, mass %."""
        return 0 if parent.isValid() else MASS + 1

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = 0) -> Any:
        """Titles with units."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            amount = unit_text(self._units.amount)
            bar = f"share, 0 to {100 * self._full:.0f} %"
            if self.logarithmic:
                bar = f"share, {DECADES:.0f} decades to 100 %"
            return ("species", "", bar, "mol %", amount, "mass %")[section]
        if role == COPY_ROLE:
            return ("species", "name", "", "mol %", self._units.amount, "mass %")[section]
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if section >= SHARE else Qt.AlignmentFlag.AlignLeft
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def flags(self, index: QModelIndex) -> Qt.ItemFlag:
        """Readable and selectable."""
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        if isinstance(self._rows[index.row()], str):
            return Qt.ItemFlag.ItemIsEnabled
        return Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable

    def data(self, index: QModelIndex, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Text, bar, full value and marks of a cell."""
        if not index.isValid():
            return None
        row, column = self._rows[index.row()], index.column()
        if isinstance(row, str):
            if role == Qt.ItemDataRole.DisplayRole and column == SPECIES:
                return row
            return True if role in (SECTION_ROLE, MUTED_ROLE) else None
        if role == Qt.ItemDataRole.DisplayRole:
            return self._text(row, column)
        if role == COPY_ROLE:
            return row.key if column == SPECIES else self._value(row, column)
        if role == BAR_ROLE and column == BAR:
            return (
                self._bar(row.share),
                self._colours.fill(row.key, self._theme.tokens),
                self._stale,
            )
        if role == MUTED_ROLE:
            return self._stale or column in (NAME, BAR)
        if role == WARNING_ROLE:
            return row.outside and column == SPECIES and not self._stale
        if role == Qt.ItemDataRole.ToolTipRole:
            return self._hint(row, column)
        return None

    def _text(self, row: SpeciesRow, column: int) -> str:
        if column == SPECIES:
            return formula_text(row.key) + (" ⚠" if row.outside else "")
        if column == NAME:
            return row.name
        if column == BAR:
            return "trace" if self._bar(row.share) < 0.004 and row.share < 1e-3 else ""
        return number_text(self._value(row, column))

    def _value(self, row: SpeciesRow, column: int) -> Any:
        if column == NAME:
            return row.name
        if column == SHARE:
            return 100.0 * row.share
        if column == AMOUNT:
            return self._units.amount_of(row.amount)
        return 100.0 * row.mass_share if column == MASS else ""

    def _hint(self, row: SpeciesRow, column: int) -> str:
        if column in (SHARE, AMOUNT, MASS):
            unit = ("mol %", unit_text(self._units.amount), "mass %")[column - SHARE]
            return f"{self._value(row, column)!r} {unit}"
        hint = f"{row.key}, {row.name}"
        if row.outside:
            hint += "; the temperature lies outside the range of its data"
        return hint

    def _bar(self, share: float) -> float:
        if share <= 0:
            return 0.0
        if self.logarithmic:
            return max(1.0 + math.log10(share) / DECADES, 0.0)
        return share / self._full


def _rows(fluids: list[FluidRows], condensed: list[SpeciesRow]) -> list[_Row]:
    """Phase by phase, each under its title; a gas alone needs none."""
    if not condensed and [f.name for f in fluids] == ["gas"]:
        return list(fluids[0].rows)
    # Condensed phases stand before the traces of the fluids, or nobody would see them.
    out: list[_Row] = []
    traces: list[_Row] = []
    for fluid in fluids:
        main = [r for r in fluid.rows if r.share >= TRACE]
        title = fluid.name.capitalize()
        if len(fluids) > 1:
            title += f", {number_text(100 * fluid.share, 3)} % of all moles"
        out += [title, *main] if main else []
        rest = fluid.rows[len(main) :]
        traces += [f"Traces in the {fluid.name}", *rest] if rest else []
    out += ["Condensed, as share of the whole", *condensed] if condensed else []
    return out + traces
