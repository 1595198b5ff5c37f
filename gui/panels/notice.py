"""A line over the foot of the window for messages that belong to no field."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QObject, QTimer
from PySide6.QtWidgets import QFrame, QHBoxLayout, QWidget

from gui.messages import Message
from gui.parts.card import Label, link
from gui.theme import GRID

NOTE_FOR = 3500
"""Milliseconds that a note stays; warnings stay until they are put away."""
MOST_WIDE = 760


class Notice(QFrame):
    """Shows the newest message over `page`, so that nothing beneath it moves."""

    def __init__(self, page: QWidget) -> None:
        super().__init__(page)
        self.setObjectName("notice")
        row = QHBoxLayout(self)
        row.setContentsMargins(GRID * 2, GRID, GRID, GRID)
        self.label = Label("")
        self.label.setWordWrap(True)
        row.addWidget(self.label, 1)
        self.close_button = link("put away")
        self.close_button.clicked.connect(self.hide)
        row.addWidget(self.close_button)
        self._timer = QTimer(self, singleShot=True, interval=NOTE_FOR)
        self._timer.timeout.connect(self.hide)
        page.installEventFilter(self)
        self.hide()

    def tell(self, message: Message) -> None:
        """Show a message."""
        self.label.setText(message.text)
        self.close_button.setVisible(message.level != "note")
        self.setProperty("level", message.level)
        self.style().unpolish(self)
        self.style().polish(self)
        self.show()
        self.raise_()
        self._place()
        if message.level == "note":
            self._timer.start()
        else:
            self._timer.stop()

    def eventFilter(self, page: QObject, event: QEvent) -> bool:
        """Keep to the foot of the page."""
        if event.type() == QEvent.Type.Resize and self.isVisible():
            self._place()
        return False

    def _place(self) -> None:
        page = self.parentWidget()
        text = self.label.fontMetrics().horizontalAdvance(self.label.text())
        width = min(text + GRID * 8 + self.close_button.width(), MOST_WIDE, page.width() - GRID * 8)
        height = max(self.heightForWidth(width), self.sizeHint().height())
        self.setGeometry(
            (page.width() - width) // 2, page.height() - height - GRID * 3, width, height
        )
