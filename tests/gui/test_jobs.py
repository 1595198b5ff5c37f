"""Jobs off the GUI thread: one at a time, newest wins, progress, stop."""

import threading

import pytest

from gui.jobs import BUSY_AFTER, Channel, Stopped


@pytest.fixture
def channel(qtbot):
    channel = Channel()
    yield channel
    channel.close()
    assert channel.is_idle() or channel._pool.activeThreadCount() == 0


def test_answers_arrive_on_the_gui_thread(channel, qtbot):
    where = []
    channel.finished.connect(lambda key, value: where.append(threading.current_thread()))
    channel.submit("a", lambda progress, stop: threading.current_thread())
    qtbot.waitUntil(lambda: bool(where))
    assert where == [threading.main_thread()]


def test_older_requests_are_told_to_stop_and_dropped(channel, qtbot):
    got, gate = [], threading.Event()
    channel.finished.connect(lambda key, value: got.append((key, value)))

    def first(progress, stop):
        gate.wait(5)
        return f"stopped {stop()}"

    channel.submit(1, first)
    channel.submit(2, lambda progress, stop: "two")
    channel.submit(3, lambda progress, stop: "three")
    gate.set()
    qtbot.waitUntil(lambda: bool(got))
    qtbot.wait(30)
    assert got == [(3, "three")]


def test_errors_are_passed_on_but_not_those_of_stopping(channel, qtbot):
    failed = []
    channel.failed.connect(lambda key, error: failed.append(error))

    def stops(progress, stop):
        raise Stopped

    def breaks(progress, stop):
        raise ValueError("no")

    channel.submit(1, stops)
    qtbot.waitUntil(channel.is_idle)
    assert failed == []
    channel.submit(2, breaks)
    qtbot.waitUntil(lambda: bool(failed))
    assert isinstance(failed[0], ValueError)


def test_slow_work_says_so_and_reports_progress(channel, qtbot):
    gate, slow, shares = threading.Event(), [], []
    channel.slow.connect(slow.append)
    channel.progressed.connect(shares.append)

    def work(progress, stop):
        progress(0.5)
        gate.wait(5)
        return 1

    channel.submit(1, work)
    qtbot.wait(BUSY_AFTER // 2)
    assert slow == []
    qtbot.waitUntil(lambda: slow == [True])
    assert shares == [0.5]
    gate.set()
    qtbot.waitUntil(lambda: slow == [True, False])


def test_cancel_drops_the_answer(channel, qtbot):
    gate, got = threading.Event(), []
    channel.finished.connect(lambda key, value: got.append(value))
    channel.submit(1, lambda progress, stop: gate.wait(5))
    channel.cancel()
    gate.set()
    qtbot.waitUntil(channel.is_idle)
    qtbot.wait(20)
    assert got == []
