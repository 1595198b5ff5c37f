"""The entry point: commands without Qt, and what happens where there is no screen."""

import os
import subprocess
import sys
from pathlib import Path

import pytest
from PySide6.QtGui import QImage

from gui import main as entry
from gui import screen


def run(*arguments, **environment):
    env = {k: v for k, v in os.environ.items() if k not in ("DISPLAY", "WAYLAND_DISPLAY")}
    env.pop("QT_QPA_PLATFORM", None)
    return subprocess.run(
        [sys.executable, "-c", f"from gui.main import main; raise SystemExit(main({arguments!r}))"],
        env=env | environment,
        capture_output=True,
        text=True,
        check=False,
        timeout=100,
    )


NO_QT = """
import sys
class Wall:
    def find_spec(self, name, path=None, target=None):
        if name.partition(".")[0] in ("PySide6", "shiboken6", "pyqtgraph"):
            raise ImportError("no Qt here")
sys.meta_path.insert(0, Wall())
from gui.main import main
raise SystemExit(main({arguments!r}))
"""


@pytest.mark.parametrize("flag", ["--help", "--version"])
def test_commands_do_not_need_qt(flag):
    done = subprocess.run(
        [sys.executable, "-c", NO_QT.format(arguments=[flag])],
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert "thalweg" in done.stdout.lower()


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="a screen is always there")
def test_without_a_screen_there_is_a_table_and_a_picture(saved, tmp_path):
    done = run(str(saved), TMPDIR=str(tmp_path), HOME=str(tmp_path))
    assert done.returncode == 0, done.stderr
    assert "No display here" in done.stdout
    assert "1500" in done.stdout
    named = Path(done.stdout.strip().splitlines()[-1].split(": ", 1)[1])
    image = QImage(str(named))
    assert (image.width(), image.height()) == (1440, 900)
    assert named.parent == tmp_path


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="a screen is always there")
def test_without_a_screen_a_wrong_file_is_refused(tmp_path):
    done = run(str(tmp_path / "none.thalweg"))
    assert done.returncode == 2
    assert "Traceback" not in done.stderr


def test_two_files_are_one_too_many(capsys):
    assert entry.main(["a.thalweg", "b.thalweg"]) == 2
    assert "one file at a time" in capsys.readouterr().err


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="Linux names")
def test_a_missing_library_is_named_with_its_package(monkeypatch):
    monkeypatch.delenv("QT_QPA_PLATFORM", raising=False)
    monkeypatch.setenv("DISPLAY", ":9")
    monkeypatch.setattr(screen, "_loads", lambda library: library != "libxcb-cursor.so.0")
    assert screen.missing_libraries(on_screen=False) == ""
    said = screen.missing_libraries(on_screen=True)
    assert "libxcb-cursor.so.0" in said
    assert "apt-get install libxcb-cursor0" in said
    monkeypatch.setattr(screen, "_loads", lambda library: False)
    assert "libegl1" in screen.missing_libraries(on_screen=False)


def test_a_picture_of_the_window(saved, tmp_path):
    out = tmp_path / "window.png"
    done = subprocess.run(
        [sys.executable, "-m", "gui.picture", str(out), str(saved), "--size", "1280x720", "--dark"],
        capture_output=True,
        text=True,
        check=False,
        timeout=100,
    )
    assert done.returncode == 0, done.stderr
    image = QImage(str(out))
    assert (image.width(), image.height()) == (1280, 720)
    assert image.pixelColor(4, 600).lightness() < 60
    colours = {image.pixel(x, y) for x in range(0, 1280, 5) for y in range(0, 720, 5)}
    assert len(colours) > 20  # text, bars and curves, not an empty surface
