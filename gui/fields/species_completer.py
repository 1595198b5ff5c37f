"""Completion of species by key, name or formula while one types."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QObject, Qt
from PySide6.QtGui import QStandardItem, QStandardItemModel
from PySide6.QtWidgets import QCompleter, QLineEdit

from solver.project.wording import formula_text

LIMIT = 12
Search = Callable[[str, int], list]  # type: ignore[type-arg]


def library_search(text: str, limit: int) -> list:  # type: ignore[type-arg]
    """Species of the library that answer to `text`."""
    import species_db

    return [sp for sp in species_db.load().find(text, limit * 2) if not sp.charge][:limit]


class SpeciesCompleter(QCompleter):
    """Offers species for what is typed in a line; the line then holds the key."""

    def __init__(self, search: Search = library_search, parent: QObject | None = None) -> None:
        self._offers = QStandardItemModel(0, 1)
        super().__init__(self._offers, parent)
        self._search = search
        self.setCompletionMode(QCompleter.CompletionMode.UnfilteredPopupCompletion)
        self.setCompletionRole(Qt.ItemDataRole.UserRole)
        self.setCaseSensitivity(Qt.CaseSensitivity.CaseSensitive)
        self.setMaxVisibleItems(LIMIT)

    def attach(self, line: QLineEdit) -> None:
        """Complete in `line`."""
        line.setCompleter(self)
        line.textEdited.connect(self._offer)

    def offered(self) -> list[str]:
        """The keys on offer."""
        model = self._offers
        return [model.item(i).data(Qt.ItemDataRole.UserRole) for i in range(model.rowCount())]

    def _offer(self, text: str) -> None:
        self._offers.clear()
        if not text.strip():
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
