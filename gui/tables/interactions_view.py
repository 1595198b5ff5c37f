"""The table in which k_ij are looked up, typed and pasted."""

from __future__ import annotations

from PySide6.QtCore import QObject, Qt
from PySide6.QtGui import QGuiApplication
from PySide6.QtWidgets import QAbstractItemDelegate, QHeaderView, QWidget

from gui import gas_edits as edits
from gui.fields.species_completer import SpeciesCompleter
from gui.session import Session
from gui.tables import clipboard
from gui.tables.delegates import CellDelegate, EditDelegate
from gui.tables.edit_view import EditView
from gui.tables.interactions_model import FIRST, SECOND, SOURCE, InteractionsModel, K
from gui.theme import Theme, sized


class InteractionsView(EditView):
    """Shows an `InteractionsModel`; one's own pairs on top."""

    def __init__(
        self,
        session: Session,
        model: InteractionsModel,
        theme: Theme,
        parent: QWidget | None = None,
    ) -> None:
        super().__init__("interaction parameters k_ij", parent)
        self._session = session
        self._model = model
        self.setModel(model)
        self.setFont(sized(self.font(), "small"))
        end = session.end_visit
        self._delegates = {
            FIRST: _InvitingDelegate(theme, completer=self._completer, done=end, parent=self),
            SECOND: EditDelegate(theme, completer=self._completer, done=end, parent=self),
            K: EditDelegate(theme, live=True, done=end, parent=self),
            SOURCE: CellDelegate(theme, self),
        }
        for column, delegate in self._delegates.items():
            self.setItemDelegateForColumn(column, delegate)
        header = self.horizontalHeader()
        for column, width in ((FIRST, 78), (SECOND, 64), (K, 62)):
            header.resizeSection(column, width)
        header.setSectionResizeMode(SOURCE, QHeaderView.ResizeMode.Stretch)

    def _completer(self, line: QObject) -> SpeciesCompleter:
        return SpeciesCompleter(self._search, line)

    def _search(self, text: str, limit: int) -> list:  # type: ignore[type-arg]
        """Gas candidates that answer to `text`; a pair of others would be refused."""
        answer, low = self._session.answer.value, text.lower()
        candidates = () if answer is None else answer.prepared.candidates
        found = [
            sp
            for sp in candidates
            if sp.phase == "gas" and (sp.key.lower().startswith(low) or low in sp.name.lower())
        ]
        # A formula that begins so comes before a name in which it occurs.
        found.sort(key=lambda sp: (not sp.key.lower().startswith(low), len(sp.key)))
        return found[:limit]

    def paste(self) -> None:
        """Write the clipboard's pairs over one's own from the current row on."""
        at = self.currentIndex()
        cells = clipboard.rows_of(QGuiApplication.clipboard().text())
        self._model.paste(at.row() if at.isValid() else self._model.own, cells)

    def remove_rows(self) -> None:
        """Remove the selected pairs that are one's own; published ones stay."""
        rows = sorted({i.row() for i in self.selectedIndexes() if i.row() < self._model.own})
        if rows:
            label = "remove k_ij" if len(rows) == 1 else f"remove {len(rows)} k_ij"
            self._session.edit_case(edits.remove_pairs(self._session.case, rows), label)

    def closeEditor(self, editor: QWidget, hint: QAbstractItemDelegate.EndEditHint) -> None:
        """Enter goes on through the cells of a pair."""
        super().closeEditor(editor, hint)
        if hint != QAbstractItemDelegate.EndEditHint.SubmitModelCache:
            return
        self.setFocus()
        at = self.currentIndex()
        row, column = (at.row(), at.column() + 1) if at.column() < K else (at.row() + 1, FIRST)
        if row < self._model.rowCount():
            self.setCurrentIndex(self._model.index(row, column))


class _InvitingDelegate(EditDelegate):
    """The empty row invites in muted text."""

    def text(self, painter, option, index) -> None:  # type: ignore[no-untyped-def]
        if index.row() == index.model().own:
            painter.setPen(self.theme.tokens.muted)
            painter.setFont(option.font)
            rect = option.rect.adjusted(4, 0, -4, 0)
            painter.drawText(rect, int(Qt.AlignmentFlag.AlignVCenter), "add a pair …")
            return
        super().text(painter, option, index)
