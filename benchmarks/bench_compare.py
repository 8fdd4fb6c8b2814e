"""How sharp the change between two scenes is, whether its bar holds, and what it costs.

    python benchmarks/bench_compare.py

Every pair runs at three tolerances. Where the change is not known from outside, a run at 1e-5
is the truth, and its own bar is what is not known of it.
"""

from __future__ import annotations

import argparse
import os
import time
from dataclasses import dataclass

for _variable in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS"):
    os.environ.setdefault(_variable, "1")

import numpy as np  # noqa: E402
from changes import FARAD, PAIRS, Pair  # noqa: E402

import bem  # noqa: E402
from bem.results.comparison import Comparison  # noqa: E402

TOLERANCES = (1e-2, 1e-3, 3e-4)
TIGHT, MOST = 1e-5, 2500
SHOWN = 1e-3
"""Tolerance of the table by pair."""


@dataclass(frozen=True)
class Tried:
    """One comparison beside the truth.

    Args:
        pair: name.
        tolerance: asked.
        sharpness: largest bar over largest change, both over sqrt(C_ii C_jj).
        error: (m,) true error over bar of every entry and row sum.
        cost: time over that of one extraction.
    """

    pair: str
    tolerance: float
    sharpness: float
    error: np.ndarray
    cost: float


def run(pair: Pair, tolerance: float) -> Comparison:
    """Compare on one thread."""
    return bem.compare(*pair.scenes, tolerance, threads=1, max_panels=MOST)


def columns(matrix: np.ndarray, row_sum: np.ndarray) -> np.ndarray:
    """(n, n + 1) L, the row sums last."""
    return np.concatenate([matrix, row_sum[:, None]], axis=1) / FARAD


def truth_of(pair: Pair) -> tuple[np.ndarray, np.ndarray]:
    """Change (n, n + 1) in L, and what is not known of it."""
    if pair.exact is not None:
        change = columns(pair.exact, pair.exact.sum(axis=1)) * FARAD
        return change, np.zeros_like(change)
    found = run(pair, TIGHT)
    return (
        columns(found.change, found.row_sum_change),
        columns(found.change_error, found.row_sum_change_error),
    )


def tried(pair: Pair, tolerance: float, truth: tuple[np.ndarray, np.ndarray]) -> Tried:
    """Compare once, and extract once for the time."""
    started = time.process_time()
    bem.extract(pair.scenes[0], tolerance, threads=1, max_panels=MOST)
    once = time.process_time() - started
    started = time.process_time()
    found = run(pair, tolerance)
    cost = (time.process_time() - started) / once
    value = columns(found.change, found.row_sum_change)
    bar = columns(found.change_error, found.row_sum_change_error)
    off = np.maximum(np.abs(value - truth[0]) - truth[1], 0.0) / bar
    rows, places = np.triu_indices(len(value), 0, value.shape[1])
    largest = np.abs(found.change / found.scale).max()
    sharpness = float((found.change_error / found.scale).max() / largest)
    return Tried(pair.name, tolerance, sharpness, off[rows, places], cost)


def print_pairs(results: list[Tried]) -> None:
    """One line per pair at the usual tolerance."""
    print("| pair | largest bar / largest change | largest error / bar | time / one extraction |")
    print("|---|---|---|---|")
    for r in results:
        if r.tolerance == SHOWN:
            print(f"| {r.pair} | {r.sharpness:.2g} | {r.error.max():.2g} | {r.cost:.1f} |")


def print_totals(results: list[Tried]) -> None:
    """One line per tolerance."""
    print("\n| tolerance | entries | inside | worst largest bar / largest change | time, median |")
    print("|---|---|---|---|---|")
    for tolerance in TOLERANCES:
        here = [r for r in results if r.tolerance == tolerance]
        error = np.concatenate([r.error for r in here])
        inside = 100.0 * np.mean(error <= 1.0)
        sharpness = max(r.sharpness for r in here)
        cost = np.median([r.cost for r in here])
        print(f"| {tolerance:g} | {len(error)} | {inside:.1f} % | {sharpness:.2g} | {cost:.1f} |")


def main() -> None:
    """Run the pairs whose name holds a word."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--only", default="", help="only pairs whose name holds this")
    args = parser.parse_args()
    run(PAIRS[0], 0.1)
    results = []
    for pair in PAIRS:
        if args.only in pair.name:
            truth = truth_of(pair)
            results += [tried(pair, tolerance, truth) for tolerance in TOLERANCES]
    print_pairs(results)
    print_totals(results)


if __name__ == "__main__":
    main()
