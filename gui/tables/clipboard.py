"""Rows of text to and from a spreadsheet (tab-separated values)."""

from __future__ import annotations

from PySide6.QtCore import QModelIndex, Qt
from PySide6.QtGui import QGuiApplication, QKeySequence
from PySide6.QtWidgets import QTableView

COPY_ROLE = Qt.ItemDataRole.UserRole + 1
"""The full value of a cell as a spreadsheet reads it."""


def rows_of(text: str) -> list[list[str]]:
    """The cells of pasted text, blank lines at the end left out."""
    lines = text.replace("\r\n", "\n").replace("\r", "\n").rstrip("\n").split("\n")
    return [[cell.strip() for cell in line.split("\t")] for line in lines]


def as_text(view: QTableView) -> str:
    """The selected cells (all of them without a selection), with headers for whole tables."""
    model = view.model()
    chosen = [i for i in view.selectedIndexes() if not view.isColumnHidden(i.column())]
    whole = len(chosen) <= 1
    columns = [c for c in range(model.columnCount()) if not view.isColumnHidden(c)]
    if whole:
        rows = list(range(model.rowCount()))
    else:
        rows = sorted({i.row() for i in chosen})
        columns = [c for c in columns if c in {i.column() for i in chosen}]
    lines = [[_cell(model.index(r, c)) for c in columns] for r in rows]
    if whole:
        across = Qt.Orientation.Horizontal
        heads = [model.headerData(c, across, COPY_ROLE) for c in columns]
        if not any(heads):
            heads = [model.headerData(c, across) for c in columns]
        lines.insert(0, [str(h or "") for h in heads])
    return "\n".join("\t".join(line) for line in lines)


def copy(view: QTableView) -> None:
    """Put the selected cells on the clipboard."""
    QGuiApplication.clipboard().setText(as_text(view))


class CopyView(QTableView):
    """A table view that copies to a spreadsheet."""

    def keyPressEvent(self, event):  # type: ignore[no-untyped-def]
        """Copy on the system's copy key."""
        if event.matches(QKeySequence.StandardKey.Copy):
            copy(self)
            return
        super().keyPressEvent(event)


def _cell(index: QModelIndex) -> str:
    value = index.data(COPY_ROLE)
    if value is None:
        value = index.data(Qt.ItemDataRole.DisplayRole)
    if isinstance(value, float):
        return repr(value)
    return "" if value is None else str(value)
