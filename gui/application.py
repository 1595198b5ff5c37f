"""Makes the Qt application and the window, with the user's preferences."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from PySide6.QtWidgets import QApplication

from gui.edits import blank_project
from gui.preferences import Preferences
from gui.session import Session, settle_case
from gui.theme import Theme
from gui.window import Window

if TYPE_CHECKING:
    from gui.session import Settle


def make(
    arguments: Sequence[str],
    preferences: Preferences | None = None,
    settle: Settle = settle_case,
    theme: str | None = None,
) -> tuple[QApplication, Window]:
    """The application (the running one, if there is one) and a window that is not yet shown."""
    app = QApplication.instance() or QApplication(list(arguments))
    assert isinstance(app, QApplication)
    app.setApplicationName("Thalweg")
    app.setDesktopFileName("thalweg")
    preferences = preferences or Preferences()
    window = Window(Session(settle), Theme(app, theme or preferences.theme), preferences)
    window.session.open_document(blank_project(), None)
    return app, window
