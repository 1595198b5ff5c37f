"""The entry point: headless commands go to the command line, anything else opens the window."""

from __future__ import annotations

import sys
from collections.abc import Sequence

COMMANDS = ("settle", "what-if", "sheet", "species")
OFFER_AFTER = 500
"""Milliseconds after the start at which unsaved changes of an earlier run are offered."""
WARM_AFTER = 2.0
"""Seconds after the start at which what may be needed later is loaded."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run `thalweg`.

    Parameters
    ----------
    argv : sequence of str, optional
        The arguments without the program's name; those of the process when left out.

    Returns
    -------
    int
        The exit code: 0 when all is well, 2 for bad input, 3 where there is no end state.
    """
    arguments = list(sys.argv[1:] if argv is None else argv)
    first = arguments[0] if arguments else ""
    if first == "--version":
        from gui.version import program_version

        print(f"thalweg {program_version()}")
        return 0
    if first in COMMANDS or first.startswith("-"):
        from solver.cli import main as headless

        return headless(arguments)
    if len(arguments) > 1:
        print(
            f"thalweg opens one file at a time; {arguments[1]!r} is one too many. "
            f"Commands are {', '.join(COMMANDS)}.",
            file=sys.stderr,
        )
        return 2
    from gui.screen import missing_libraries, there_is_a_screen

    on_screen = there_is_a_screen()
    missing = missing_libraries(on_screen)
    if missing:
        print(missing, file=sys.stderr)
    if missing or not on_screen:
        from gui.without_screen import tell

        return tell(first, drawable=not missing_libraries(False), no_screen=not on_screen)
    return show(first)


def _warm_units() -> None:
    """Bring in the library of rare units, so that the first half-typed one costs no pause."""
    from contextlib import suppress

    from solver.project.units import UnitError, unit_kind

    with suppress(UnitError):
        unit_kind("furlong", "volume")


def show(file: str) -> int:
    """Open the window on `file` ("" for an empty project) and run until it is closed."""
    import threading
    from pathlib import Path

    from PySide6.QtCore import QTimer

    from gui.application import make

    app, window = make([sys.argv[0]])
    window.session.messages.catch_uncaught()
    window.show()
    if file:
        window.files.read(Path(file))
    else:
        QTimer.singleShot(OFFER_AFTER, window, window.files.offer_leftovers)
    threading.Timer(WARM_AFTER, _warm_units).start()
    try:
        return app.exec()
    finally:
        window.session.messages.release()


if __name__ == "__main__":
    raise SystemExit(main())
