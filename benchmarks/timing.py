"""Clocks that the time benchmarks share."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

REPEATS = 3
SINGLE = {"OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1", "NUMBA_NUM_THREADS": "1"}
"""Keeps every thread pool at one thread; to be set before numpy is imported."""


def least_seconds(work: Callable[[], object], repeats: int = REPEATS) -> float:
    """Least process CPU seconds of some calls."""
    shortest = float("inf")
    for _ in range(repeats):
        start = time.process_time()
        work()
        shortest = min(shortest, time.process_time() - start)
    return shortest


@dataclass(frozen=True)
class Command:
    """What a finished command left behind: wall seconds, exit code, output, error output."""

    seconds: float
    code: int
    out: str
    err: str


def run_command(words: Sequence[str], **environment: str) -> Command:
    """Run a command with extra variables in its environment."""
    start = time.perf_counter()
    done = subprocess.run(
        words, capture_output=True, text=True, env={**os.environ, **environment}, check=False
    )
    return Command(time.perf_counter() - start, done.returncode, done.stdout, done.stderr)


def bem_command(*words: str) -> list[str]:
    """Words that run bem with this interpreter."""
    script = Path(sys.executable).with_name("bem")
    return [str(script), *words] if script.exists() else [sys.executable, "-m", "bem", *words]


def write_cube(folder: Path) -> Path:
    """Write a unit cube of 12 triangles."""
    from bodies import block
    from stl_out import binary_stl

    path = folder / "cube.stl"
    path.write_bytes(binary_stl(block((1, 1, 1)), "cube"))
    return path
