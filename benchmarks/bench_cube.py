"""Time for the unit cube: in process and of whole commands, beside general finite elements.

    pip install ngsolve        # optional: without it the ratios are left out
    python benchmarks/bench_cube.py

One thread, warm. CPU seconds of the process, least of three runs; whole commands by the clock
on the wall, least of five. Machines differ and are shared: the ratios count.
"""

from __future__ import annotations

import os
import sys
import tempfile
import time
from dataclasses import dataclass, field
from pathlib import Path

from timing import REPEATS, SINGLE, bem_command, run_command, write_cube

os.environ.update(SINGLE)

from cases import FARAD  # noqa: E402
from peer_finite_elements import EXACT, TARGETS, TUNED, cube_capacitance, time_to_error  # noqa: E402

import bem  # noqa: E402
from bem.extraction.progress import Progress  # noqa: E402
from bem.geometry.shapes.round import box  # noqa: E402

TOLERANCES = (1e-2, 1e-3, 1e-4, 1e-5)
COMMAND_REPEATS = 5


@dataclass
class Clock:
    """Receives progress and keeps the CPU time at which each round began."""

    start: float = field(default_factory=time.process_time)
    began: dict[int, float] = field(default_factory=dict)

    def __call__(self, progress: Progress) -> None:
        """Note the first sign of life of a round."""
        self.began.setdefault(progress.round, time.process_time() - self.start)


@dataclass(frozen=True)
class Timing:
    """Seconds until the bar and until the true error are below a target.

    Args:
        bar: until the extraction returns.
        error: until after the first round from which on the true error stays below.
        panels: of the last round.
        error_panels: of that earlier round.
        reached: true relative error of the result.
    """

    bar: float
    error: float
    panels: int
    error_panels: int
    reached: float


def extract_cube(tolerance: float) -> Timing:
    """One extraction."""
    scene = bem.Scene(unit="m").add_conductor("cube", box(1.0, 1.0, 1.0))
    clock = Clock()
    result = bem.extract(scene, tolerance, threads=1, progress=clock)
    seconds = time.process_time() - clock.start
    errors = [abs(r.capacitance[0, 0] / FARAD / EXACT - 1.0) for r in result.rounds]
    first = len(errors) - 1
    while first > 0 and errors[first - 1] <= tolerance:
        first -= 1
    known = clock.began.get(first + 2, seconds)
    return Timing(seconds, known, result.panels, result.rounds[first].panels, errors[-1])


def fastest(tolerance: float) -> Timing:
    """Least times of some extractions."""
    runs = [extract_cube(tolerance) for _ in range(REPEATS)]
    last = runs[-1]
    bar, error = min(r.bar for r in runs), min(r.error for r in runs)
    return Timing(bar, error, last.panels, last.error_panels, last.reached)


def peer_seconds() -> dict[float, float]:
    """CPU seconds of tuned finite elements by target; none where they are not installed."""
    try:
        cube_capacitance(TUNED[1e-2])
    except SystemExit as missing:
        print(missing, file=sys.stderr)
        return {}
    return {target: time_to_error(target)[0] for target in TARGETS}


def print_in_process() -> None:
    """Print the table of times in process."""
    extract_cube(1e-3)
    peer = peer_seconds()
    print("unit cube, in process, warm, one thread, CPU seconds")
    print("target   bar below   panels   error below   panels   true error   peer   ratio")
    for t in TOLERANCES:
        cube, other = fastest(t), peer.get(t)
        beside = f"{other:6.2f} s {other / cube.error:6.1f}" if other else "      -      -"
        print(
            f"{t:6.0e} {cube.bar:9.3f} s {cube.panels:8d} {cube.error:11.3f} s "
            f"{cube.error_panels:8d} {cube.reached:12.1e} {beside}"
        )


@dataclass(frozen=True)
class Cost:
    """Least seconds of a command: on the wall, and of processors."""

    wall: float
    cpu: float

    def __sub__(self, other: Cost) -> Cost:
        return Cost(self.wall - other.wall, self.cpu - other.cpu)


def _children() -> float:
    times = os.times()
    return times.children_user + times.children_system


def command_cost(words: list[str]) -> Cost:
    """Least cost of a command that must succeed.

    Raises:
        RuntimeError: it did not.
    """
    costs = []
    for _ in range(COMMAND_REPEATS):
        before = _children()
        done = run_command(words)
        if done.code != 0:
            raise RuntimeError(f"{' '.join(words)}: exit code {done.code}: {done.err.strip()}")
        costs.append(Cost(done.seconds, _children() - before))
    return Cost(min(c.wall for c in costs), min(c.cpu for c in costs))


def print_commands(folder: Path) -> None:
    """Print the table of whole commands."""
    extract = ["extract", str(write_cube(folder)), "--unit", "m", "--threads", "1", "--quiet"]
    bare = command_cost([sys.executable, "-c", "pass"])
    print("\nwhole command, warm cache      wall       CPU     beyond the bare interpreter (wall)")
    print(f"{'bare interpreter':24} {bare.wall:8.3f} s {bare.cpu:8.3f} s")
    for label, words in (
        ("bem --help", ["--help"]),
        ("cube.stl at 1e-3", [*extract, "--tolerance", "1e-3"]),
        ("cube.stl at 1e-4", [*extract, "--tolerance", "1e-4"]),
    ):
        cost = command_cost(bem_command(*words))
        more = (cost - bare).wall
        print(f"{label:24} {cost.wall:8.3f} s {cost.cpu:8.3f} s {more:12.3f} s")


def main() -> None:
    """Print both tables."""
    print_in_process()
    with tempfile.TemporaryDirectory() as folder:
        print_commands(Path(folder))


if __name__ == "__main__":
    main()
