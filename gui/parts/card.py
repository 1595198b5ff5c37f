"""A card: a panel with a title, a remark at the right, and its contents."""

from __future__ import annotations

from PySide6.QtCore import QEvent, Qt, QTimer, Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QToolButton, QVBoxLayout, QWidget

from gui.theme import CARD_PADDING, GRID, sized


class Label(QLabel):
    """Text in a role ('title', 'muted', 'fault', 'warning', 'good') and one of three sizes."""

    def __init__(self, text: str = "", role: str = "", size: str = "body") -> None:
        super().__init__(text)
        self.setProperty("role", role)
        self.setFont(sized(self.font(), size))
        self.setTextFormat(Qt.TextFormat.PlainText)

    def set_stale(self, stale: bool) -> None:
        """Grey the text out as belonging to an earlier input."""
        value = "true" if stale else "false"
        if self.property("stale") != value:
            self.setProperty("stale", value)
            self._restyle()

    def _restyle(self) -> None:
        self.style().unpolish(self)
        self.style().polish(self)


class Sentence(Label):
    """A wrapped sentence that takes no room while it is empty.

    It waits a moment before it appears: half-typed text is wrong most of the time, and a line
    that comes and goes with each key would make the panel jump.
    """

    shown_or_hidden = Signal()
    DELAY = 350
    """Milliseconds."""

    def __init__(self, role: str = "fault", size: str = "small") -> None:
        super().__init__("", role, size)
        self.setWordWrap(True)
        self.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        self._timer = QTimer(self, singleShot=True, interval=self.DELAY)
        self._timer.timeout.connect(self.show)
        self.hide()

    def event(self, event: QEvent) -> bool:
        """Tell when it comes and goes."""
        done = super().event(event)
        if event.type() in (QEvent.Type.ShowToParent, QEvent.Type.HideToParent):
            self.shown_or_hidden.emit()
        return done

    def say(self, text: str) -> None:
        """Show `text`; "" hides the sentence."""
        if text != self.text():
            self.setText(text)
        if not text:
            self._timer.stop()
            self.hide()
        elif self.isHidden():
            if self.DELAY and self.property("role") in ("fault", "warning"):
                self._timer.start()
            else:
                self.show()


class Card(QFrame):
    """A surface with one-pixel lines; `head` and `body` are its layouts."""

    def __init__(self, title: str, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("card")
        self.setAccessibleName(title)
        outer = QVBoxLayout(self)
        outer.setContentsMargins(CARD_PADDING, GRID, CARD_PADDING, GRID)
        outer.setSpacing(GRID // 2)
        self.head = QHBoxLayout()
        self.head.setSpacing(GRID)
        self.head.addWidget(Label(title, "title"))
        self.head.addStretch(1)
        self.remark = Label("", "muted", "small")
        self.head.addWidget(self.remark)
        self.body = QVBoxLayout()
        self.body.setSpacing(GRID // 2)
        outer.addLayout(self.head)
        outer.addLayout(self.body, 1)


def link(text: str, tip: str = "") -> QToolButton:
    """A button that reads as a link."""
    button = QToolButton()
    button.setText(text)
    button.setProperty("link", "true")
    button.setToolTip(tip)
    button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    button.setCursor(Qt.CursorShape.PointingHandCursor)
    return button


def choice(text: str, tip: str = "") -> QToolButton:
    """One of a few words, of which one is picked."""
    button = QToolButton()
    button.setText(text)
    button.setCheckable(True)
    button.setProperty("choice", "true")
    button.setToolTip(tip)
    button.setFont(sized(button.font(), "small"))
    button.setFocusPolicy(Qt.FocusPolicy.TabFocus)
    return button


def rule() -> QFrame:
    """A one-pixel line across."""
    line = QFrame()
    line.setObjectName("rule")
    return line
