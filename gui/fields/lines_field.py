"""A few lines of text that are an edit of the project at each keystroke."""

from __future__ import annotations

from PySide6.QtCore import QEvent, Signal
from PySide6.QtGui import QFocusEvent, QKeyEvent, QKeySequence
from PySide6.QtWidgets import QPlainTextEdit, QWidget


class LinesField(QPlainTextEdit):
    """Emits `typed` with its lines; undo belongs to the window, Tab moves on."""

    typed = Signal(object)
    """tuple of str; () when empty."""
    left = Signal()

    def __init__(self, lines: int, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: tuple[str, ...] = ()
        self._filling = False
        self.setTabChangesFocus(True)
        self.setUndoRedoEnabled(False)
        self.setLineWrapMode(QPlainTextEdit.LineWrapMode.NoWrap)
        self.setFixedHeight(self.fontMetrics().lineSpacing() * lines + 12)
        self.textChanged.connect(self._read)

    def lines(self) -> tuple[str, ...]:
        """What is typed, without empty lines at the end."""
        text = self.toPlainText().rstrip("\n")
        return tuple(text.split("\n")) if text.strip() else ()

    def show_lines(self, lines: tuple[str, ...]) -> None:
        """Show lines; text that already means them stays as it was typed."""
        if lines == self._shown:
            return
        self._shown = lines
        self._filling = True
        self.setPlainText("\n".join(lines))
        self._filling = False

    def set_fault(self, text: str) -> None:
        """Mark the field as faulty; "" clears the mark."""
        value = "true" if text else "false"
        self.setAccessibleDescription(text)
        if self.property("faulty") != value:
            self.setProperty("faulty", value)
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

    def _read(self) -> None:
        if self._filling:
            return
        lines = self.lines()
        if lines != self._shown:
            self._shown = lines
            self.typed.emit(lines)
