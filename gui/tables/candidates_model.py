"""The species that may form, each with a check mark and what became of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, Qt, Signal

from gui.tables.delegates import MUTED_ROLE
from solver.project.wording import formula_text

_TOP = QModelIndex()
HEADERS = ("may form", "name", "")


@dataclass(frozen=True, slots=True)
class CandidateRow:
    """A species, whether it may form, and a remark on the answer."""

    key: str
    name: str
    allowed: bool
    remark: str = ""


class CandidatesModel(QAbstractTableModel):
    """Shows rows it is given; a click on a check mark is passed on as `toggled`."""

    toggled = Signal(str, bool)

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._rows: list[CandidateRow] = []

    @property
    def rows(self) -> list[CandidateRow]:
        """The rows as shown."""
        return list(self._rows)

    def show(self, rows: list[CandidateRow]) -> None:
        """Show other rows; the view keeps its place where the species are the same."""
        if rows == self._rows:
            return
        if [r.key for r in rows] == [r.key for r in self._rows]:
            self._rows = rows
            self.dataChanged.emit(self.index(0, 0), self.index(len(rows) - 1, 2))
            return
        self.beginResetModel()
        self._rows = rows
        self.endResetModel()

    def rowCount(self, parent: QModelIndex = _TOP) -> int:
        """One row per species."""
        return 0 if parent.isValid() else len(self._rows)

    def columnCount(self, parent: QModelIndex = _TOP) -> int:
        """Check mark with formula, name, remark."""
        return 0 if parent.isValid() else len(HEADERS)

    def headerData(self, section: int, orientation: Qt.Orientation, role: int = 0) -> Any:
        """Column titles."""
        if orientation == Qt.Orientation.Horizontal and role == Qt.ItemDataRole.DisplayRole:
            return HEADERS[section]
        return None

    def flags(self, index: QModelIndex) -> Qt.ItemFlag:
        """The first column carries the check mark."""
        if not index.isValid():
            return Qt.ItemFlag.NoItemFlags
        flags = Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEnabled
        if index.column() == 0:
            flags |= Qt.ItemFlag.ItemIsUserCheckable
        return flags

    def data(self, index: QModelIndex, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        """Texts and check states."""
        if not index.isValid():
            return None
        row, column = self._rows[index.row()], index.column()
        if role == Qt.ItemDataRole.DisplayRole:
            return (formula_text(row.key), row.name, row.remark)[column]
        if role == Qt.ItemDataRole.CheckStateRole and column == 0:
            return Qt.CheckState.Checked if row.allowed else Qt.CheckState.Unchecked
        if role == MUTED_ROLE:
            return column > 0 or not row.allowed
        if role == Qt.ItemDataRole.ToolTipRole:
            return f"{row.key}, {row.name}"
        if role == Qt.ItemDataRole.TextAlignmentRole:
            side = Qt.AlignmentFlag.AlignRight if column == 2 else Qt.AlignmentFlag.AlignLeft
            return int(side | Qt.AlignmentFlag.AlignVCenter)
        return None

    def setData(self, index: QModelIndex, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:
        """Pass a changed check mark on."""
        if role != Qt.ItemDataRole.CheckStateRole or not index.isValid() or index.column():
            return False
        allowed = Qt.CheckState(value) == Qt.CheckState.Checked
        row = self._rows[index.row()]
        if allowed == row.allowed:
            return False
        self.toggled.emit(row.key, allowed)
        return True
