"""A line under the header for messages that belong to no field."""

from __future__ import annotations

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QFrame, QHBoxLayout, QWidget

from gui.messages import Message
from gui.parts.card import Label, link
from gui.theme import GRID

NOTE_FOR = 4000
"""Milliseconds that a note stays; warnings stay until they are put away."""


class Notice(QFrame):
    """Shows the newest message."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("notice")
        row = QHBoxLayout(self)
        row.setContentsMargins(GRID * 2, 4, GRID * 2, 4)
        self.label = Label("")
        self.label.setWordWrap(True)
        row.addWidget(self.label, 1)
        self.close_button = link("put away")
        self.close_button.clicked.connect(self.hide)
        row.addWidget(self.close_button)
        self._timer = QTimer(self, singleShot=True, interval=NOTE_FOR)
        self._timer.timeout.connect(self.hide)
        self.hide()

    def tell(self, message: Message) -> None:
        """Show a message."""
        self.label.setText(message.text)
        self.setProperty("level", message.level)
        self.style().unpolish(self)
        self.style().polish(self)
        self.show()
        if message.level == "note":
            self._timer.start()
        else:
            self._timer.stop()
