"""The first extraction with an empty compile cache, alone and several at once.

    python benchmarks/bench_first_run.py

Exit code 1 if a run fails, does not say that it compiles, or several at once differ.
"""

from __future__ import annotations

import json
import sys
import tempfile
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path

from timing import Command, bem_command, run_command, write_cube

AT_ONCE = 4


@dataclass(frozen=True)
class Trial:
    """One finished command and the capacitances it saved, in farad."""

    command: Command
    capacitance: list[list[float]] | None

    @property
    def says_compiling(self) -> bool:
        """Whether the command said that it compiles."""
        return "compiling" in self.command.err


def extract(folder: Path, cache: Path, name: str) -> Trial:
    """Extract the cube with compiled code in ``cache``."""
    saved = folder / f"{name}.json"
    words = bem_command("extract", str(folder / "cube.stl"), "--unit", "m", "--json", str(saved))
    done = run_command(words, NUMBA_CACHE_DIR=str(cache))
    values = json.loads(saved.read_text())["capacitance_F"] if saved.exists() else None
    return Trial(done, values)


def report(label: str, trial: Trial) -> bool:
    """Print a line; returns whether the run was as it should be."""
    done = trial.command
    compiling = "says that it compiles" if trial.says_compiling else "silent about compiling"
    print(f"{label:24} {done.seconds:7.2f} s   exit code {done.code}   {compiling}")
    if done.code != 0:
        print(done.err.strip())
    return done.code == 0 and trial.capacitance is not None


def first_and_second(folder: Path) -> bool:
    """One run that compiles, and one that finds everything in the cache."""
    cache = folder / "alone"
    first, second = extract(folder, cache, "first"), extract(folder, cache, "second")
    sound = [report("empty cache", first), report("same cache again", second)]
    return all(sound) and first.says_compiling and not second.says_compiling


def several(folder: Path) -> bool:
    """Several runs that start at once on one empty cache."""
    with ThreadPoolExecutor(AT_ONCE) as pool:
        names = [f"together_{k}" for k in range(AT_ONCE)]
        trials = list(pool.map(lambda name: extract(folder, folder / "shared", name), names))
    sound = [report(f"{AT_ONCE} at once, number {k}", t) for k, t in enumerate(trials, 1)]
    same = all(trial.capacitance == trials[0].capacitance for trial in trials)
    print("same numbers from all" if same else "the numbers differ")
    return all(sound) and same


def main() -> int:
    """Run both."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_cube(folder)
        sound = [first_and_second(folder), several(folder)]
    return 0 if all(sound) else 1


if __name__ == "__main__":
    sys.exit(main())
