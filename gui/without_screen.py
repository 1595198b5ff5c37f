"""What is done where no window can open: the same project as a table, and a picture of it."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from pathlib import Path


def tell(file: str, drawable: bool, no_screen: bool) -> int:
    """Settle `file` in the terminal and write a picture of the window.

    Parameters
    ----------
    file : str
        A project, or "" for none.
    drawable : bool
        Whether Qt can draw into memory here.
    no_screen : bool
        Whether it is the display that is missing (and not a library).
    """
    if no_screen:
        print("No display here, so no window opens.")
    if not file:
        print(
            "Name a project to settle it in the terminal, for example "
            "thalweg samples/reformer-outlet.thalweg"
        )
        return 0 if no_screen else 2
    from solver.cli import main as headless

    print(f"{file}, settled in the terminal:\n", flush=True)
    code = headless(["settle", file])
    if code == 0 and drawable:
        sys.stdout.flush()
        code = _picture(file)
    return code


def _picture(file: str) -> int:
    """Draw the window in a process of its own, so that an abort in Qt ends only that one."""
    out = Path(tempfile.gettempdir()) / f"thalweg-{Path(file).stem}.png"
    environment = dict(os.environ, QT_QPA_PLATFORM="offscreen")
    done = subprocess.run(
        [sys.executable, "-m", "gui.picture", str(out), file],
        env=environment,
        capture_output=True,
        text=True,
        check=False,
    )
    if done.returncode:
        print(f"The window could not be drawn: {done.stderr.strip()[-300:]}", file=sys.stderr)
        return 0
    print(f"\nA picture of the window: {out}")
    return 0
