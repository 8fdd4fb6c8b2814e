"""Libraries that read files kept quiet: what they print is dropped, a warning is a failure."""

from __future__ import annotations

import contextlib
import io
import logging
import warnings
from collections.abc import Iterator

import numpy as np


@contextlib.contextmanager
def quiet() -> Iterator[io.StringIO]:
    """Keep a library from printing and logging; gives what it would have printed."""
    sink = io.StringIO()
    before = logging.root.manager.disable
    logging.disable(logging.CRITICAL)
    try:
        with warnings.catch_warnings(), np.errstate(all="ignore"):
            warnings.simplefilter("error")
            with contextlib.redirect_stdout(sink), contextlib.redirect_stderr(sink):
                yield sink
    finally:
        logging.disable(before)
