"""A small read-only table of figures: a header and rows of texts and numbers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, Qt

from gui.tables.clipboard import COPY_ROLE
from gui.tables.delegates import MUTED_ROLE
from solver.project.wording import SIGNIFICANT, number_text

_TOP = QModelIndex()


@dataclass(frozen=True, slots=True)
class Words:
    """Text that is copied in another form than it is shown in, with a hint of its own."""

    shown: str
    plain: str
    hint: str = ""


Cell = str | float | Words | None


class FiguresModel(QAbstractTableModel):
    """Shows headers and rows that it is given."""

    def __init__(self, parent: QObject | None = None, digits: int = SIGNIFICANT) -> None:
        super().__init__(parent)
        self._digits = digits
        self._headers: tuple[str, ...] = ()
        self._rows: list[tuple[Cell, ...]] = []
        self._stale = False

    def show(self, headers: tuple[str, ...], rows: list[tuple[Cell, ...]], stale: bool) -> None:
        """Show other figures."""
        if (headers, rows, stale) == (self._headers, self._rows, self._stale):
            return
        self.beginResetModel()
        self._headers, self._rows, self._stale = headers, rows, stale
        self.endResetModel()

    def rowCount(self, parent: QModelIndex = _TOP) -> int:
        """Rows."""
        return 0 if parent.isValid() else len(self._rows)

    def columnCount(self, parent: QModelIndex = _TOP) -> int:
        """Columns."""
        return 0 if parent.isValid() else len(self._headers)

    def _right(self, column: int) -> bool:
        return any(_is_figure(row[column]) for row in self._rows)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = 0) -> Any:
        """Column titles."""
        if orientation != Qt.Orientation.Horizontal:
            return None
        if role == Qt.ItemDataRole.DisplayRole:
            return self._headers[section]
        if role == Qt.ItemDataRole.TextAlignmentRole:
            right = self._right(section)
            side = Qt.AlignmentFlag.AlignRight if right else Qt.AlignmentFlag.AlignLeft
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def data(self, index: QModelIndex, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Rounded text, full value."""
        if not index.isValid():
            return None
        cell = self._rows[index.row()][index.column()]
        if role == Qt.ItemDataRole.DisplayRole:
            if cell is None:
                return ""
            if isinstance(cell, Words):
                return cell.shown
            return number_text(cell, self._digits) if isinstance(cell, float) else cell
        if role == COPY_ROLE:
            if isinstance(cell, Words):
                return cell.plain
            return "" if cell is None else cell
        if role == Qt.ItemDataRole.ToolTipRole:
            if isinstance(cell, Words):
                return cell.hint or cell.shown
            return repr(cell) if isinstance(cell, float) else None
        if role == MUTED_ROLE:
            return self._stale
        return None


def _is_figure(cell: Cell) -> bool:
    if isinstance(cell, Words):
        return cell.shown[:1].isdigit() or cell.shown[:1] == "\u2212"
    return isinstance(cell, float)
