"""Runs plain functions off the GUI thread; the newest request of a channel wins.

A job is a function of two callables, ``progress(share)`` and ``should_stop()``. Its inputs are
frozen and its answer a new value, so nothing is shared between threads.
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from PySide6.QtCore import QObject, QThreadPool, QTimer, Signal

Job = Callable[[Callable[[float], None], Callable[[], bool]], Any]

BUSY_AFTER = 300
"""Milliseconds before a job counts as slow and progress is shown."""


class Stopped(Exception):
    """Raised inside a job that noticed it should stop."""


@dataclass(slots=True)
class _Request:
    key: object
    job: Job
    stop: threading.Event = field(default_factory=threading.Event)


class Channel(QObject):
    """One question at a time: a newer request stops the older one and drops its late answer."""

    finished = Signal(object, object)
    """key, answer"""
    failed = Signal(object, object)
    """key, exception"""
    progressed = Signal(float)
    slow = Signal(bool)
    """True once a request takes longer than `BUSY_AFTER`, False when all is done."""
    _landed = Signal(object, object, object)
    _moved = Signal(object, float)

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._pool = QThreadPool(self)
        self._pool.setMaxThreadCount(1)
        self._running: _Request | None = None
        self._waiting: _Request | None = None
        self._latest: object = None
        self._slow = False
        self._patience = QTimer(self, singleShot=True, interval=BUSY_AFTER)
        self._patience.timeout.connect(lambda: self._say_slow(True))
        self._landed.connect(self._land)
        self._moved.connect(self._move)

    def submit(self, key: object, job: Job) -> None:
        """Ask for `job`; only the answer to the newest request is ever reported."""
        request = _Request(key, job)
        self._latest = request
        if self._running is None:
            self._start(request)
        else:
            self._running.stop.set()
            self._waiting = request

    def cancel(self) -> None:
        """Give up on whatever is asked for; no answer will come."""
        self._latest = self._waiting = None
        if self._running is not None:
            self._running.stop.set()
        self._patience.stop()
        self._say_slow(False)

    def is_idle(self) -> bool:
        """Whether nothing runs or waits."""
        return self._running is None and self._waiting is None

    def close(self) -> None:
        """Stop and wait for the thread; the channel is of no use afterwards."""
        self.cancel()
        self._pool.waitForDone()

    def _start(self, request: _Request) -> None:
        self._running = request
        if not self._patience.isActive() and not self._slow:
            self._patience.start()
        self._pool.start(lambda: self._work(request))

    def _work(self, request: _Request) -> None:
        answer, error = None, None
        try:
            answer = request.job(lambda s: self._moved.emit(request, s), request.stop.is_set)
        except Exception as caught:
            error = caught
        self._landed.emit(request, answer, error)

    def _land(self, request: _Request, answer: object, error: Exception | None) -> None:
        self._running = None
        late = request is not self._latest
        if self._waiting is not None:
            following, self._waiting = self._waiting, None
            self._start(following)
        else:
            self._patience.stop()
            self._say_slow(False)
        if late or isinstance(error, Stopped):
            return
        if error is None:
            self.finished.emit(request.key, answer)
        else:
            self.failed.emit(request.key, error)

    def _move(self, request: _Request, share: float) -> None:
        if request is self._latest:
            self.progressed.emit(share)

    def _say_slow(self, slow: bool) -> None:
        if slow != self._slow:
            self._slow = slow
            self.slow.emit(slow)
