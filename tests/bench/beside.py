"""Ratios of two running times, taken turn by turn.

A machine that others use, or that cools its processor, changes speed by a factor of two within
minutes. What runs in turns sees the same machine.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from statistics import median


def times_of(task: Callable[[], object], other: Callable[[], object], rounds: int) -> float:
    """How many times the time of `task` the `other` takes: the median over rounds of both."""
    task(), other()
    ratios = []
    for _ in range(rounds):
        first = _seconds(task)
        ratios.append(_seconds(other) / first)
    return median(ratios)


def _seconds(task: Callable[[], object]) -> float:
    start = time.perf_counter()
    task()
    return time.perf_counter() - start
