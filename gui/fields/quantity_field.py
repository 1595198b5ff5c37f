"""A line that takes a number with a unit and shows it as it was written."""

from __future__ import annotations

from PySide6.QtCore import QEvent, Signal
from PySide6.QtGui import QFocusEvent, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QLineEdit, QWidget

from gui.fields.reading import read_quantity, show_quantity
from solver.project.model import Quantity


class LiveLine(QLineEdit):
    """A line whose every keystroke is an edit of the project; undo belongs to the window."""

    left = Signal()
    """Focus moved on or Enter was pressed: the visit is over."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._fault = ""
        self._hint = ""
        self.returnPressed.connect(self.left)

    def set_flat(self, heading: bool = False) -> None:
        """Look like text until it is pointed at."""
        self.setProperty("flat", "true")
        if heading:
            self.setProperty("heading", "true")

    def set_hint(self, hint: str) -> None:
        """The tool tip while there is no fault."""
        self._hint = hint
        self.setToolTip(self._fault or hint)

    def set_fault(self, text: str) -> None:
        """Mark the line as faulty; "" clears the mark."""
        if text == self._fault:
            return
        self._fault = text
        self.setProperty("faulty", "true" if text else "false")
        self.setToolTip(text or self._hint)
        self.setAccessibleDescription(text)
        self.style().unpolish(self)
        self.style().polish(self)

    def event(self, event: QEvent) -> bool:
        """Leave undo and redo to the window, whose stack holds the typing."""
        if event.type() == QEvent.Type.ShortcutOverride and isinstance(event, QKeyEvent):
            std = QKeySequence.StandardKey
            if event.matches(std.Undo) or event.matches(std.Redo):
                event.ignore()
                return False
        return super().event(event)

    def focusOutEvent(self, event: QFocusEvent) -> None:
        """End the visit."""
        super().focusOutEvent(event)
        self.left.emit()


class QuantityField(LiveLine):
    """Emits `typed` with a Quantity at each keystroke (None when emptied, if that is allowed)."""

    typed = Signal(object)

    def __init__(
        self, kind: str, default_unit: str, optional: bool = False, parent: QWidget | None = None
    ) -> None:
        super().__init__(parent)
        self.kind = kind
        self.default_unit = default_unit
        self.optional = optional
        self._shown: Quantity | None = None
        self.textEdited.connect(self._read)
        self.left.connect(self._tidy)

    def show_quantity(self, quantity: Quantity | None) -> None:
        """Show a quantity; text that already means it stays as it was typed."""
        if quantity is not None and not isinstance(quantity.value, str) and quantity.unit:
            self.default_unit = quantity.unit
        if quantity == self._shown and (self.hasFocus() or self.text()):
            return
        self._shown = quantity
        self.setText(show_quantity(quantity))
        self.setCursorPosition(0 if not self.hasFocus() else len(self.text()))

    def _read(self, text: str) -> None:
        if not text.strip() and self.optional:
            self._shown = None
        else:
            self._shown = read_quantity(text, self.kind, self.default_unit)
        self.typed.emit(self._shown)

    def _tidy(self) -> None:
        """Once left, a bare number shows the unit that it was taken in."""
        if self._shown is not None and self.text().strip() == _bare(self._shown):
            self.setText(show_quantity(self._shown))


def _bare(quantity: Quantity) -> str:
    return show_quantity(Quantity(value=quantity.value, unit=""))
