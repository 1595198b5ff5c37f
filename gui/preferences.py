"""What the program remembers between starts: recent files, theme, window geometry."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QByteArray, QSettings, QStandardPaths

ORGANISATION = "Thalweg"
MOST_RECENT = 9


class Preferences:
    """Reads and writes the user's settings."""

    def __init__(self, settings: QSettings | None = None) -> None:
        self._own = settings is not None
        self._settings = settings or QSettings(
            QSettings.Format.IniFormat, QSettings.Scope.UserScope, ORGANISATION, "thalweg"
        )

    def recent(self) -> list[Path]:
        """Files opened or saved lately that still exist, the newest first."""
        found = self._settings.value("recent", [])
        texts = [found] if isinstance(found, str) else list(found or [])
        return [Path(t) for t in texts if t and Path(t).exists()]

    def remember(self, path: Path) -> None:
        """Put a file first in the list."""
        path = path.resolve()
        files = [path, *(p for p in self.recent() if p != path)][:MOST_RECENT]
        self._settings.setValue("recent", [str(p) for p in files])

    def clear_recent(self) -> None:
        """Forget the files."""
        self._settings.setValue("recent", [])

    @property
    def data_folder(self) -> Path:
        """Where the program keeps files of its own."""
        if self._own:
            return Path(self._settings.fileName()).parent / "kept"
        places = QStandardPaths.StandardLocation
        return Path(QStandardPaths.writableLocation(places.AppLocalDataLocation))

    def recoveries(self) -> list[Path]:
        """Files that hold unsaved changes, beside their projects."""
        found = self._settings.value("recoveries", [])
        texts = [found] if isinstance(found, str) else list(found or [])
        return [Path(t) for t in texts if t]

    def remember_recovery(self, file: Path) -> None:
        """There may be something to recover in `file`."""
        known = self.recoveries()
        if file not in known:
            self._settings.setValue("recoveries", [str(p) for p in (*known, file)])
            self._settings.sync()

    def forget_recovery(self, file: Path) -> None:
        """There is nothing to recover in `file` any more."""
        known = self.recoveries()
        if file in known:
            self._settings.setValue("recoveries", [str(p) for p in known if p != file])

    @property
    def theme(self) -> str:
        """'system', 'light' or 'dark'."""
        value = str(self._settings.value("theme", "system"))
        return value if value in ("system", "light", "dark") else "system"

    @theme.setter
    def theme(self, value: str) -> None:
        self._settings.setValue("theme", value)

    @property
    def folder(self) -> str:
        """Where the last file was."""
        recent = self.recent()
        return str(recent[0].parent) if recent else ""

    @property
    def geometry(self) -> QByteArray | None:
        """The window's place and size, if it was kept."""
        value = self._settings.value("geometry")
        return value if isinstance(value, QByteArray) else None

    @geometry.setter
    def geometry(self, value: QByteArray) -> None:
        self._settings.setValue("geometry", value)
