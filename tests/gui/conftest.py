"""Offscreen Qt, settings of their own for each test, and no worker left behind."""

import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

from time import monotonic

import pytest
from PySide6.QtCore import QSettings, QThreadPool, QTimer, qInstallMessageHandler
from PySide6.QtWidgets import QApplication

from gui.application import make
from gui.files import Choice
from gui.preferences import Preferences
from gui.session import settle_case
from solver.project.file import write

from .cases import burner, project

HARMLESS = ("This plugin does not support",)
"""What the offscreen platform says of window managers it does not have."""


@pytest.fixture(autouse=True)
def no_qt_warnings():
    """A warning of Qt fails the test that caused it."""
    said: list[str] = []

    def keep(kind, context, text):
        if not any(word in text for word in HARMLESS):
            said.append(text)

    before = qInstallMessageHandler(keep)
    yield
    qInstallMessageHandler(before)
    assert not said


@pytest.fixture
def preferences(tmp_path):
    settings = QSettings(str(tmp_path / "settings.ini"), QSettings.Format.IniFormat)
    return Preferences(settings)


@pytest.fixture
def make_window(qtbot, preferences, monkeypatch):
    """A factory of windows, shown and settled; each is closed again and leaves nothing running."""
    made = []
    monkeypatch.setattr("gui.parts.card.Sentence.DELAY", 0)
    monkeypatch.setattr("gui.line.POINTS", 7)  # a coarse line is settled sooner

    def factory(start=None, settle=settle_case, path=None, theme="light", wait=True):
        _, window = make(["thalweg"], preferences, settle, theme)
        window.files.ask = lambda parent, name: Choice.DISCARD
        window.files.ask_recover = lambda parent, leftover: "later"
        made.append(window)
        qtbot.addWidget(window)
        window.resize(1440, 900)
        window.show()
        qtbot.waitUntil(lambda: window.what_if.plot is not None)
        if path is not None:
            assert window.files.read(path)
        else:
            window.session.open_document(start or project(burner()), None)
        if wait:
            settled(qtbot, window)
        return window

    yield factory
    for window in made:
        window.close()
        window.shut()
        window.theme.close()
        assert window.session.is_idle()
        assert window.is_idle()
        assert not [t for t in window.findChildren(QTimer) if t.isActive() and not t.isSingleShot()]
        for pool in window.findChildren(QThreadPool):
            assert pool.activeThreadCount() == 0


@pytest.fixture
def window(make_window):
    """A window on the burner of `cases`."""
    return make_window()


@pytest.fixture
def saved(tmp_path):
    """A project file."""
    path = tmp_path / "burner.thalweg"
    write(project(burner()), path)
    return path


def settled(qtbot, window, timeout=20.0):
    """Wait until the answer and the plot are as new as they get."""
    until = monotonic() + timeout
    while monotonic() < until:
        QApplication.processEvents()
        if window.is_idle():
            return
        qtbot.wait(5)
    raise AssertionError("not settled in time")
