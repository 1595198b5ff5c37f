"""Makes a failing problem small: fewer candidates, fewer feeds, rounder numbers."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from dataclasses import replace

from tests.fuzz.problems import Problem


def shrink(problem: Problem, fails: Callable[[Problem], bool], seconds: float = 60.0) -> Problem:
    """The smallest problem found that still fails."""
    until = time.monotonic() + seconds
    changed = True
    while changed and time.monotonic() < until:
        changed = False
        for smaller in _smaller(problem):
            if time.monotonic() > until:
                break
            if fails(smaller):
                problem, changed = smaller, True
                break
    return problem


def _smaller(problem: Problem) -> Iterator[Problem]:
    for key in problem.feed:
        if len(problem.feed) > 1:
            yield replace(problem, feed={k: x for k, x in problem.feed.items() if k != key})
    free = [key for key in problem.candidates if key not in problem.feed]
    size = len(free)
    while size:
        for begin in range(0, len(free), size):
            gone = set(free[begin : begin + size])
            rest = tuple(key for key in problem.candidates if key not in gone)
            if rest:
                yield replace(problem, candidates=rest)
        size //= 2
    if problem.offset:
        yield replace(problem, offset=0.0)
    if problem.V:
        yield replace(problem, V=0.0)
    for digits in (0, 1, 2, 4):
        for name in ("T", "p", "V", "offset"):
            value = getattr(problem, name)
            if value and _rounded(value, digits) != value:
                yield replace(problem, **{name: _rounded(value, digits)})
        for key, value in problem.feed.items():
            if _rounded(value, digits) != value:
                yield replace(problem, feed={**problem.feed, key: _rounded(value, digits)})
                if digits == 0 and value != 1.0:
                    yield replace(problem, feed={**problem.feed, key: 1.0})


def _rounded(value: float, digits: int) -> float:
    return float(f"{value:.{digits}e}")
