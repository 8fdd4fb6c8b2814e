"""One setting for the threads of the compiled integrals.

The linear algebra stays on one thread: it takes a tenth of the time, and on a machine that
others use as well a threaded factorisation was measured four to eleven times slower.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from numbers import Integral

from threadpoolctl import threadpool_limits

from bem.errors import UsageError
from bem.kernels.parallel import working_with


def usable_cores() -> int:
    """Cores this process may run on."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


@contextmanager
def use_threads(asked: int | None) -> Iterator[int]:
    """Set the number of threads while the body runs; yields the number used.

    Raises:
        UsageError: less than one thread, or more than the machine has processors.
    """
    most = os.cpu_count() or 1
    if asked is not None and not (isinstance(asked, Integral) and 1 <= asked <= most):
        raise UsageError(f"threads: found {asked!r}, allowed is 1 to {most} on this machine")
    count = int(asked) if asked is not None else usable_cores()
    with threadpool_limits(limits=1, user_api="blas"), working_with(count):
        yield count
