"""Signs of life on standard error while an extraction runs."""

from __future__ import annotations

import math
import shutil
import sys
from typing import TYPE_CHECKING, TextIO

from bem.cli.terminal import showable

if TYPE_CHECKING:
    from bem.extraction.progress import Progress

_COMPILING = "compiling"


class Live:
    """Receives progress; a terminal gets one line that is rewritten, a file a line per round.

    Args:
        tolerance: what was asked, shown beside how far the bars are from it.
        stream: where to write; standard error in the program.
    """

    def __init__(self, tolerance: float, stream: TextIO) -> None:
        self._tolerance = tolerance
        self._stream = stream
        self._rewrites = stream.isatty()
        self._width = 0
        self._told: set[str | int] = set()

    def __call__(self, progress: Progress) -> None:
        """Show where the extraction is."""
        if self._rewrites:
            self._rewrite(line_of(progress, self._tolerance))
        elif _milestone(progress) not in self._told:
            self._told.add(_milestone(progress))
            self._write(line_of(progress, self._tolerance) + "\n")

    def close(self) -> None:
        """Wipe the line that was rewritten, so that the report starts on a clean one."""
        if self._width:
            self._write("\r" + " " * self._width + "\r")
            self._width = 0

    def _rewrite(self, line: str) -> None:
        line = line[: shutil.get_terminal_size().columns - 1]
        self._write("\r" + line.ljust(self._width))
        self._width = len(line)

    def _write(self, text: str) -> None:
        try:
            self._stream.write(showable(text, self._stream))
            self._stream.flush()
        except OSError:  # nobody listens any more: the computation goes on
            self._rewrites = False


def _milestone(progress: Progress) -> str | int:
    """Name what deserves a line: each round's mesh, and the one wait for the compiler."""
    if progress.round == 0 or progress.phase.startswith(_COMPILING):
        return progress.phase
    return progress.panels


def line_of(progress: Progress, tolerance: float) -> str:
    """One line: elapsed, round, panels, largest bar in units of the target, target, phase."""
    elapsed = f"{progress.elapsed:.1f} s"
    if progress.round == 0:
        return f"{elapsed}: {progress.phase}"
    known = math.isfinite(progress.worst)
    bar = f"{progress.worst:.3g} x" if known else "unknown,"
    return (
        f"{elapsed}: round {progress.round}, {progress.panels} panels, "
        f"largest bar {bar} target {tolerance:g}, {progress.phase}"
    )


def live_or_none(quiet: bool, tolerance: float) -> Live | None:
    """Progress on standard error, unless nobody wants it."""
    return None if quiet or sys.stderr is None else Live(tolerance, sys.stderr)
