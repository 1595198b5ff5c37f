"""Completion of species by key, name or formula while one types."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QEvent, QObject, Qt
from PySide6.QtGui import QKeyEvent, QStandardItem, QStandardItemModel
from PySide6.QtWidgets import QApplication, QCompleter, QLineEdit

from solver.project.wording import formula_text

LIMIT = 12
_DONE = (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Tab, Qt.Key.Key_Backtab)
Search = Callable[[str, int], list]  # type: ignore[type-arg]


def library_search(text: str, limit: int) -> list:  # type: ignore[type-arg]
    """Species of the library that answer to `text`."""
    import species_db

    return [sp for sp in species_db.load().find(text, limit * 2) if not sp.charge][:limit]


class PassOn(QObject):
    """Enter and Tab in a list of offers take the offer, then mean what they mean in the line.

    Qt by itself closes the list and swallows the key, so that a cell stays open.
    """

    def __init__(self, completer: QCompleter, line: QLineEdit) -> None:
        super().__init__(line)
        self._completer = completer
        self._line = line
        completer.popup().installEventFilter(self)

    def eventFilter(self, popup: QObject, event: QEvent) -> bool:
        """Hand the key to the line."""
        if not isinstance(event, QKeyEvent) or event.type() != QEvent.Type.KeyPress:
            return False
        if event.key() not in _DONE:
            return False
        at = self._completer.popup().currentIndex()
        if at.isValid():
            self._line.setText(str(at.data(self._completer.completionRole())))
        self._completer.popup().hide()
        QApplication.sendEvent(
            self._line, QKeyEvent(event.type(), event.key(), event.modifiers(), event.text())
        )
        return True


class SpeciesCompleter(QCompleter):
    """Offers species for what is typed in a line; the line then holds the key."""

    def __init__(self, search: Search = library_search, parent: QObject | None = None) -> None:
        self._offers = QStandardItemModel(0, 1)
        super().__init__(self._offers, parent)
        self._search = search
        self.enabled = True
        self.setCompletionMode(QCompleter.CompletionMode.UnfilteredPopupCompletion)
        self.setCompletionRole(Qt.ItemDataRole.UserRole)
        self.setCaseSensitivity(Qt.CaseSensitivity.CaseSensitive)
        self.setMaxVisibleItems(LIMIT)
        self.popup().setObjectName("offers")

    def attach(self, line: QLineEdit) -> None:
        """Complete in `line`."""
        line.setCompleter(self)
        self._keys = PassOn(self, line)
        line.textEdited.connect(self._offer)

    def offered(self) -> list[str]:
        """The keys on offer."""
        model = self._offers
        return [model.item(i).data(Qt.ItemDataRole.UserRole) for i in range(model.rowCount())]

    def _offer(self, text: str) -> None:
        self._offers.clear()
        if not text.strip() or not self.enabled:
            self.popup().hide()
            return
        for sp in self._search(text.strip(), LIMIT):
            item = QStandardItem(f"{formula_text(sp.key)}   {sp.name}")
            item.setData(sp.key, Qt.ItemDataRole.UserRole)
            self._offers.appendRow(item)
        if self._offers.rowCount():
            popup = self.popup()
            popup.setMinimumWidth(300)
            self.complete()
        else:
            self.popup().hide()
