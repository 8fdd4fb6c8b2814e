"""Blocks of rows shared out over plain threads, with one setting for their number.

Compiled functions give up the interpreter's lock, so ordinary threads run them side by side:
no second thread pool is started, none spins while it waits, and extractions may run in
several threads of one program, each with its own setting.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from contextvars import ContextVar

_WORKERS: ContextVar[int] = ContextVar("workers", default=1)
BLOCKS = 16
"""Blocks per thread: enough to even out rows of different cost."""


def workers() -> int:
    """Number of threads in force here."""
    return _WORKERS.get()


@contextmanager
def working_with(count: int) -> Iterator[None]:
    """Use ``count`` threads while the body runs."""
    token = _WORKERS.set(count)
    try:
        yield
    finally:
        _WORKERS.reset(token)


def sum_over_rows(rows: int, work: Callable[[int, int], int]) -> int:
    """Sum of ``work(first, last)`` over blocks of rows; last is excluded."""
    step = max(1, -(-rows // (BLOCKS * workers())))
    starts = range(0, rows, step)
    ends = [min(start + step, rows) for start in starts]
    if workers() == 1:
        return sum(map(work, starts, ends))
    pool = ThreadPoolExecutor(workers())
    try:
        return sum(pool.map(work, starts, ends))
    finally:
        pool.shutdown(cancel_futures=True)
