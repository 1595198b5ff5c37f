"""The table of one stream: typed by hand, pasted from a spreadsheet, ordered by keyboard."""

from __future__ import annotations

from PySide6.QtCore import QModelIndex, QObject, QSize, Qt, Signal
from PySide6.QtGui import QGuiApplication, QKeyEvent
from PySide6.QtWidgets import (
    QAbstractItemDelegate,
    QAbstractItemView,
    QCompleter,
    QHeaderView,
    QWidget,
)

from gui import edits
from gui.fields.species_completer import SpeciesCompleter
from gui.session import Session
from gui.tables import clipboard
from gui.tables.delegates import CellDelegate, EditDelegate
from gui.tables.edit_view import HEADER, EditView
from gui.tables.stream_model import AMOUNT, SHARE, SPECIES, UNIT, StreamModel
from gui.theme import ROW_HEIGHT, Theme


class StreamView(EditView):
    """Shows a `StreamModel` at its full height."""

    left_at_end = Signal()

    def __init__(
        self, session: Session, model: StreamModel, theme: Theme, parent: QWidget | None = None
    ) -> None:
        super().__init__("species of the stream", parent)
        self._session = session
        self._model = model
        self.setModel(model)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        end = session.end_visit
        self._delegates = {
            SPECIES: _SpeciesDelegate(
                theme, completer=lambda line: SpeciesCompleter(parent=line), done=end, parent=self
            ),
            AMOUNT: EditDelegate(theme, live=True, done=end, parent=self),
            UNIT: EditDelegate(theme, completer=_unit_completer, done=end, parent=self),
            SHARE: _Muted(theme, self),
        }
        for column, delegate in self._delegates.items():
            self.setItemDelegateForColumn(column, delegate)
        header = self.horizontalHeader()
        header.setSectionResizeMode(SPECIES, QHeaderView.ResizeMode.Stretch)
        for column, width in ((AMOUNT, 92), (UNIT, 78), (SHARE, 70)):
            header.resizeSection(column, width)
        model.rowsInserted.connect(self._fit)
        model.rowsRemoved.connect(self._fit)
        self._fit()

    def _fit(self) -> None:
        self.setFixedHeight(self.sizeHint().height())

    def sizeHint(self) -> QSize:
        """Tall enough for all rows."""
        return QSize(320, HEADER + ROW_HEIGHT * self._model.rowCount() + 2)

    def moveCursor(
        self, action: QAbstractItemView.CursorAction, modifiers: Qt.KeyboardModifier
    ) -> QModelIndex:
        """Tab from cell to cell leaves the share out."""
        to = super().moveCursor(action, modifiers)
        steps = (
            QAbstractItemView.CursorAction.MoveNext,
            QAbstractItemView.CursorAction.MovePrevious,
        )
        if action in steps and to.column() == SHARE:
            if action == steps[1]:
                return self._model.index(to.row(), UNIT)
            return self._model.index(min(to.row() + 1, self._model.rowCount() - 1), SPECIES)
        return to

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Insert and move rows, besides what every such table does."""
        key, alt = event.key(), event.modifiers() == Qt.KeyboardModifier.AltModifier
        if key == Qt.Key.Key_Insert:
            self._edit(edits.insert_amount, max(self.currentIndex().row(), 0), "insert row")
        elif alt and key in (Qt.Key.Key_Up, Qt.Key.Key_Down):
            self.move_row(-1 if key == Qt.Key.Key_Up else 1)
        else:
            super().keyPressEvent(event)

    def paste(self) -> None:
        """Write the clipboard's cells from the current cell on."""
        at = self.currentIndex()
        cells = clipboard.rows_of(QGuiApplication.clipboard().text())
        row = at.row() if at.isValid() else self._model.rowCount() - 1
        column = at.column() if at.isValid() and at.column() != SHARE else SPECIES
        self._model.paste(row, column, cells)

    def remove_rows(self) -> None:
        """Remove the rows of the selection."""
        rows = sorted({i.row() for i in self.selectedIndexes()} - {self._model.rowCount() - 1})
        if rows:
            label = "remove row" if len(rows) == 1 else f"remove {len(rows)} rows"
            self._edit(edits.remove_amounts, rows, label)

    def move_row(self, step: int) -> None:
        """Move the current row up or down."""
        at, to = self.currentIndex(), self.currentIndex().row() + step
        last = self._model.rowCount() - 1
        if at.row() < last and 0 <= to < last:
            case = edits.move_amount(self._session.case, self._model.stream, at.row(), step)
            self._session.edit_case(case, "move row")
            self.setCurrentIndex(self._model.index(to, at.column()))

    def _edit(self, change, where, label: str) -> None:  # type: ignore[no-untyped-def]
        case = change(self._session.case, self._model.stream, where)
        self._session.edit_case(case, label)

    def closeEditor(self, editor: QWidget, hint: QAbstractItemDelegate.EndEditHint) -> None:
        """Enter goes on: from species to amount, from there to the next row."""
        super().closeEditor(editor, hint)
        if hint != QAbstractItemDelegate.EndEditHint.SubmitModelCache:
            return
        # Where Enter came by way of a list of offers, the line had no focus to give back.
        self.setFocus()
        at = self.currentIndex()
        row, column = (at.row(), AMOUNT) if at.column() == SPECIES else (at.row() + 1, SPECIES)
        if row < self._model.rowCount():
            self.setCurrentIndex(self._model.index(row, column))


class _SpeciesDelegate(EditDelegate):
    """The empty last row invites in muted text."""

    def text(self, painter, option, index) -> None:  # type: ignore[no-untyped-def]
        if index.row() == index.model().rowCount() - 1:
            painter.setPen(self.theme.tokens.muted)
            painter.setFont(option.font)
            rect = option.rect.adjusted(4, 0, -4, 0)
            painter.drawText(rect, int(Qt.AlignmentFlag.AlignVCenter), "add a species …")
            return
        super().text(painter, option, index)


class _Muted(CellDelegate):
    """Shares are read, not typed."""

    def colour(self, index: QModelIndex):  # type: ignore[no-untyped-def]
        from PySide6.QtGui import QColor

        return QColor(self.theme.tokens.muted)


def _unit_completer(parent: QObject) -> QCompleter:
    from solver.project.units import units_of

    completer = QCompleter(list(units_of("feed")), parent)
    completer.setCaseSensitivity(Qt.CaseSensitivity.CaseInsensitive)
    completer.setFilterMode(Qt.MatchFlag.MatchStartsWith)
    return completer
