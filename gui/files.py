"""Opening and saving: the steps between the menu, the dialogs and the project file."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtWidgets import QAbstractItemView, QApplication, QFileDialog, QLineEdit, QWidget

from gui.dialogs.unsaved import Choice, ask_unsaved
from gui.edits import blank_project
from gui.preferences import Preferences
from gui.recovery import Leftover, Recovery
from gui.session import Session
from solver.errors import SettleError

SUFFIX = ".thalweg"
FILTER = f"Thalweg projects (*{SUFFIX});;All files (*)"


class Files:
    """New, open, save and save as; nothing unsaved is given up without a question."""

    def __init__(
        self,
        session: Session,
        preferences: Preferences,
        window: QWidget,
        ask: Callable[[QWidget, str], Choice] = ask_unsaved,
        ask_recover: Callable[[QWidget, Leftover], str] | None = None,
    ) -> None:
        self._session = session
        self._preferences = preferences
        self._window = window
        self.ask = ask
        self.ask_recover = ask_recover or _ask_recover
        self.recovery = Recovery(session, preferences)

    def may_leave(self) -> bool:
        """Whether the project may be replaced or the window closed."""
        commit_typing()
        if not self._session.modified:
            return True
        answer = self.ask(self._window, self.name())
        if answer is Choice.SAVE:
            return self.save()
        return answer is Choice.DISCARD

    def name(self) -> str:
        """The file's name, or what an unsaved project is called."""
        path = self._session.path
        return path.name if path else (self._session.project.title or "Untitled")

    def new(self) -> bool:
        """Start an empty project."""
        if not self.may_leave():
            return False
        self._session.open_document(blank_project(), None)
        return True

    def open(self) -> bool:
        """Ask for a file and open it."""
        if not self.may_leave():
            return False
        text, _ = QFileDialog.getOpenFileName(
            self._window, "Open a project", self._preferences.folder, FILTER
        )
        return bool(text) and self.read(Path(text))

    def open_path(self, path: Path) -> bool:
        """Open a known file (recent, dropped, from the command line)."""
        return self.may_leave() and self.read(path)

    def read(self, path: Path) -> bool:
        """Read `path`; a file that cannot be read is refused with the reason."""
        from solver.project.file import read

        try:
            project = read(path)
        except SettleError as error:
            self._session.messages.warning(str(error))
            return False
        self._session.open_document(project, path.resolve())
        self._preferences.remember(path)
        leftover = self.recovery.beside(path.resolve())
        if leftover is not None:
            self.recovery.offer(leftover, lambda found: self.ask_recover(self._window, found))
        return True

    def offer_leftovers(self) -> None:
        """At the start: ask about the newest changes that an earlier run could not save."""
        for leftover in self.recovery.leftovers()[:1]:
            self.recovery.offer(leftover, lambda found: self.ask_recover(self._window, found))

    def save(self) -> bool:
        """Save where the project came from, or ask."""
        path = self._session.path
        return self.save_as() if path is None else self.write(path)

    def save_as(self) -> bool:
        """Ask for a place and save there."""
        stem = self._session.path or Path(self._preferences.folder) / (
            (self._session.project.title or "Untitled") + SUFFIX
        )
        text, _ = QFileDialog.getSaveFileName(self._window, "Save the project", str(stem), FILTER)
        if not text:
            return False
        path = Path(text)
        return self.write(path if path.suffix else path.with_suffix(SUFFIX))

    def write(self, path: Path) -> bool:
        """Write the project to `path`."""
        commit_typing()
        from solver.project.file import write

        try:
            write(self._session.project, path)
        except (SettleError, OSError) as error:
            self._session.messages.warning(f"{path.name} was not saved: {error}")
            return False
        self._session.saved_as(path.resolve())
        self._preferences.remember(path)
        self._session.messages.note(f"Saved {path.name}.")
        return True


def _ask_recover(window: QWidget, leftover: Leftover) -> str:
    from gui.dialogs.recover import ask_recover

    return ask_recover(window, leftover)


def commit_typing() -> None:
    """Take over what stands in a cell that is still open."""
    line = QApplication.focusWidget()
    above = line.parentWidget() if isinstance(line, QLineEdit) else None
    view = above.parentWidget() if above is not None else None
    if isinstance(view, QAbstractItemView):
        view.commitData(line)
