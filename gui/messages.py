"""The one door for what the window tells that belongs to no field: notes, warnings, bugs."""

from __future__ import annotations

import sys
import traceback
from collections.abc import Callable
from dataclasses import dataclass
from types import TracebackType

from PySide6.QtCore import QObject, Signal


@dataclass(frozen=True, slots=True)
class Message:
    """One sentence; `level` is 'note' or 'warning'."""

    level: str
    text: str


class Messages(QObject):
    """Passes messages on and keeps a record of them."""

    told = Signal(object)
    bug = Signal(str)
    """The text of an unexpected exception, with its traceback."""

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.record: list[Message] = []
        self._previous: Callable[..., object] | None = None

    def note(self, text: str) -> None:
        """Tell something that went well."""
        self._tell(Message("note", text))

    def warning(self, text: str) -> None:
        """Tell something that did not go as asked, with the way out."""
        self._tell(Message("warning", text))

    def unexpected(self, error: BaseException) -> None:
        """Report a fault of the program itself."""
        self.bug.emit("".join(traceback.format_exception(error)))

    def catch_uncaught(self) -> None:
        """Show exceptions that nothing handled instead of losing them on the terminal."""
        self._previous = sys.excepthook

        def hook(kind: type[BaseException], error: BaseException, tb: TracebackType | None) -> None:
            if self._previous is not None:
                self._previous(kind, error, tb)
            if not issubclass(kind, KeyboardInterrupt):
                self.unexpected(error)

        sys.excepthook = hook

    def release(self) -> None:
        """Put the earlier hook back."""
        if self._previous is not None:
            sys.excepthook = self._previous
            self._previous = None

    def _tell(self, message: Message) -> None:
        self.record.append(message)
        self.told.emit(message)
