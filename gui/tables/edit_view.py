"""What the tables that are typed in have in common: their look and their keys."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeyEvent, QKeySequence
from PySide6.QtWidgets import QAbstractItemView, QHeaderView, QTableView, QWidget

from gui.tables import clipboard
from gui.theme import ROW_HEIGHT

HEADER = 22


class EditView(QTableView):
    """A table that is typed in, copied from and pasted into; rows are removed by key."""

    def __init__(self, name: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setShowGrid(False)
        self.setTabKeyNavigation(False)
        self.setWordWrap(False)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setEditTriggers(
            QAbstractItemView.EditTrigger.DoubleClicked
            | QAbstractItemView.EditTrigger.SelectedClicked
            | QAbstractItemView.EditTrigger.AnyKeyPressed
            | QAbstractItemView.EditTrigger.EditKeyPressed
        )
        self.setSelectionMode(QAbstractItemView.SelectionMode.ContiguousSelection)
        self.setAccessibleName(name)
        self.verticalHeader().hide()
        self.verticalHeader().setDefaultSectionSize(ROW_HEIGHT)
        self.verticalHeader().setMinimumSectionSize(ROW_HEIGHT)
        header = self.horizontalHeader()
        header.setHighlightSections(False)
        header.setFixedHeight(HEADER)
        header.setSectionsClickable(False)
        header.setSectionResizeMode(QHeaderView.ResizeMode.Fixed)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Copy, cut, paste, remove rows, open the cell."""
        at = self.currentIndex()
        key, alt = event.key(), event.modifiers() == Qt.KeyboardModifier.AltModifier
        if event.matches(QKeySequence.StandardKey.Copy):
            clipboard.copy(self)
        elif event.matches(QKeySequence.StandardKey.Paste):
            self.paste()
        elif event.matches(QKeySequence.StandardKey.Cut):
            clipboard.copy(self)
            self.remove_rows()
        elif key in (Qt.Key.Key_Delete, Qt.Key.Key_Backspace) and not alt:
            self.remove_rows()
        elif key in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            # An editor passes its Enter on to here; then there is nothing to open.
            if at.isValid() and self.state() != QAbstractItemView.State.EditingState:
                self.edit(at)
        else:
            super().keyPressEvent(event)

    def paste(self) -> None:
        """Write the clipboard's cells from the current cell on."""
        raise NotImplementedError

    def remove_rows(self) -> None:
        """Remove the rows of the selection."""
        raise NotImplementedError
