"""Draws the window into a picture file: ``python -m gui.picture OUT.png [FILE] [--size WxH]``."""

from __future__ import annotations

import argparse
import os
import sys
import tempfile
from collections.abc import Sequence
from pathlib import Path
from time import monotonic

WAIT = 30.0
"""Seconds to wait for the answer and the plot."""


def main(argv: Sequence[str] | None = None) -> int:
    """Write the picture; returns the exit code."""
    parser = argparse.ArgumentParser(prog="python -m gui.picture", description=__doc__)
    parser.add_argument("out", type=Path)
    parser.add_argument("file", type=Path, nargs="?")
    parser.add_argument("--size", default="1440x900", help="width x height in pixels")
    parser.add_argument("--dark", action="store_true", help="in the dark theme")
    parser.add_argument("--tab", default="Composition", help="the view of the end state")
    options = parser.parse_args(argv)
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    from gui.screen import missing_libraries

    missing = missing_libraries(False)
    if missing:
        print(missing, file=sys.stderr)
        return 2
    width, _, height = options.size.partition("x")
    return draw(
        options.out,
        options.file,
        (int(width), int(height)),
        "dark" if options.dark else "light",
        options.tab,
    )


def draw(out: Path, file: Path | None, size: tuple[int, int], theme: str, tab: str) -> int:
    """Open `file` in a window of `size`, wait until all is settled, and save what it shows."""
    from PySide6.QtCore import QEventLoop, QSettings
    from PySide6.QtWidgets import QApplication

    from gui.application import make
    from gui.preferences import Preferences

    with tempfile.TemporaryDirectory() as folder:
        settings = QSettings(str(Path(folder) / "settings.ini"), QSettings.Format.IniFormat)
        app, window = make(["thalweg"], Preferences(settings), theme=theme)
        window.files.ask_recover = lambda parent, leftover: "later"  # nobody is there to answer
        window.resize(*size)
        window.show()
        if file is not None and not window.files.read(file):
            print(window.session.messages.record[-1].text, file=sys.stderr)
            window.shut()
            return 2
        window.ends_up.show_tab(tab)
        until = monotonic() + WAIT
        while monotonic() < until:
            QApplication.processEvents(QEventLoop.ProcessEventsFlag.AllEvents, 50)
            loaded = window.what_if.plot is not None
            if loaded and window.is_idle():
                break
        window.resize(*size)
        window.setFocus()
        for _ in range(5):
            QApplication.processEvents()
        written = window.grab().save(str(out))
        window.shut()
        window.theme.close()
        app.processEvents()
    if not written:
        print(f"{out} could not be written.", file=sys.stderr)
        return 2
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
