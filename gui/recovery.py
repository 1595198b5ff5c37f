"""Keeps what is not saved in a file of its own, and finds it again after a crash.

A project with a file is kept beside it (``NAME.thalweg.recovery``), one without in the
program's own folder. While a window is open its file is locked, so that another window does
not take it for a leftover; the lock of a process that is gone counts for nothing.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from PySide6.QtCore import QLockFile, QObject, QTimer

from gui.document import Document
from gui.preferences import Preferences
from gui.session import Session
from solver.errors import SettleError
from solver.project.model import Project

SUFFIX = ".recovery"
PAUSE = 2000
"""Milliseconds after an edit until it is kept."""


@dataclass(frozen=True, slots=True)
class Leftover:
    """Changes that were not saved: where they are, and the file they belong to."""

    file: Path
    original: Path | None
    kept: datetime

    @property
    def name(self) -> str:
        """What to call the project."""
        return self.original.name if self.original else "a project without a file"


class Recovery(QObject):
    """Follows the session; a file exists exactly while there is something unsaved."""

    def __init__(self, session: Session, preferences: Preferences) -> None:
        super().__init__(session)
        self._session = session
        self._preferences = preferences
        self._file: Path | None = None
        self._lock: QLockFile | None = None
        self._kept: Project | None = None
        self._said = False
        self._timer = QTimer(self, singleShot=True, interval=PAUSE)
        self._timer.timeout.connect(self.keep)
        session.document_changed.connect(self._follow)
        session.file_changed.connect(self._follow)

    # -- keeping

    def _follow(self) -> None:
        if self._file is not None and self._file != self._place():
            self.forget()  # another project was opened, or this one was saved under a name
        if not self._session.modified:
            self.forget()
        elif not self._timer.isActive() and self._session.project != self._kept:
            self._timer.start()

    def keep(self) -> None:
        """Write what is not saved now."""
        self._timer.stop()
        if not self._session.modified or self._session.project == self._kept:
            return
        from solver.project.file import write

        file = self._place()
        try:
            file.parent.mkdir(parents=True, exist_ok=True)
            if not self._claim(file):
                return
            write(self._session.project, file)
        except (SettleError, OSError) as error:
            if not self._said:
                self._said = True
                self._session.messages.warning(
                    f"Unsaved changes cannot be kept at {file.parent}: {error} Save now and then."
                )
            return
        self._file, self._kept = file, self._session.project
        self._preferences.remember_recovery(file)

    def _claim(self, file: Path) -> bool:
        if self._lock is not None and self._file == file:
            return True
        lock = _lock(file)
        if not lock.tryLock(0):
            return False  # another window has this project open, and keeps its own changes
        self._lock = lock
        return True

    def _place(self) -> Path:
        path = self._session.path
        if path is not None:
            return path.with_name(path.name + SUFFIX)
        folder = self._preferences.data_folder
        return folder / f"unnamed-{os.getpid()}-{id(self):x}.thalweg{SUFFIX}"

    def forget(self) -> None:
        """Remove the file: all is saved, or given up."""
        self._timer.stop()
        self._kept = None
        if self._file is not None:
            _remove(self._file)
            self._preferences.forget_recovery(self._file)
            self._file = None
        if self._lock is not None:
            self._lock.unlock()
            self._lock = None

    # -- finding again

    def leftovers(self) -> list[Leftover]:
        """What earlier runs left behind, the newest first."""
        files = {*self._preferences.recoveries(), *_unnamed(self._preferences.data_folder)}
        found = [_leftover(file) for file in files if file != self._file]
        return sorted((x for x in found if x is not None), key=lambda x: x.kept, reverse=True)

    def beside(self, path: Path) -> Leftover | None:
        """What was left behind for the project at `path`."""
        file = path.with_name(path.name + SUFFIX)
        return None if file == self._file else _leftover(file)

    def offer(self, leftover: Leftover, ask: Callable[[Leftover], str]) -> bool:
        """Ask what to do with it: 'take', 'discard', or anything else for later.

        Returns whether it was taken. The changes then are an edit that can be undone.
        """
        from solver.project.file import read

        answer = ask(leftover)
        if answer == "discard":
            self._drop(leftover)
        if answer != "take":
            return False
        session = self._session
        try:
            project = read(leftover.file)
        except SettleError as error:
            session.messages.warning(f"The unsaved changes could not be read: {error}")
            return False
        if session.path != leftover.original or leftover.original is None:
            _open_original(session, leftover.original)
        session.edit(Document(project), "take unsaved changes back")
        self.keep()
        if self._file != leftover.file:
            self._drop(leftover)
        return True

    def _drop(self, leftover: Leftover) -> None:
        _remove(leftover.file)
        self._preferences.forget_recovery(leftover.file)


def _open_original(session: Session, original: Path | None) -> None:
    from gui.edits import blank_project
    from solver.project.file import read

    if original is not None:
        with contextlib.suppress(SettleError):
            session.open_document(read(original), original)
            return
    session.open_document(blank_project(), None)


def _leftover(file: Path) -> Leftover | None:
    """The file as a leftover, unless it is gone or belongs to a window that is open."""
    try:
        kept = datetime.fromtimestamp(file.stat().st_mtime)
    except OSError:
        return None
    lock = _lock(file)
    if not lock.tryLock(0):
        return None
    lock.unlock()
    unnamed = file.name.startswith("unnamed-")
    return Leftover(file, None if unnamed else file.with_name(file.name.removesuffix(SUFFIX)), kept)


def _unnamed(folder: Path) -> list[Path]:
    return list(folder.glob(f"unnamed-*{SUFFIX}")) if folder.is_dir() else []


def _lock(file: Path) -> QLockFile:
    lock = QLockFile(str(file.with_name(file.name + ".lock")))
    lock.setStaleLockTime(0)  # stale only when its process is gone, however long it runs
    return lock


def _remove(file: Path) -> None:
    with contextlib.suppress(OSError):
        file.unlink()
