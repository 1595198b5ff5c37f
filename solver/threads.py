"""How many threads the matrix products of a batch may use."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache

from threadpoolctl import ThreadpoolController


@cache
def _controller() -> ThreadpoolController:
    return ThreadpoolController()


@contextmanager
def one_thread() -> Iterator[None]:
    """Keep numpy's matrix products on the calling thread.

    The matrices of a batch are too narrow to gain from more, and on a busy machine the
    threads of the linear algebra library wait for each other ten times longer than they work.
    """
    with _controller().limit(limits=1):
        yield
