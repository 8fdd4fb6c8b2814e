"""Two parallel wires as the slope between two lengths, against the published value per length.

    python benchmarks/bench_wires.py [--tolerance 1e-3]

Both wires have radius 1. With +1/2 V and -1/2 V on them each holds (C11 - C12) / 2 per volt
between them, in L; 4 pi times its slope is C' / eps0. The ends add a constant, which the slope does
not see, and about 2 / (l1 l2) of the slope besides. Exit code 1 if the slope between the two
longest lengths is off by more than 0.2 %.
"""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np

import bem

sys.path.insert(0, str(Path(__file__).parent.parent / "tests"))
from reference_values import PER_LENGTH

LENGTHS = (12.0, 24.0, 48.0)
LIMIT = 2e-3
WIRES = next(record for record in PER_LENGTH if record.name == "two wires")


@dataclass(frozen=True)
class Pair:
    """Charge per volt between wires of a length, its bar, both in L, and the panels."""

    length: float
    value: float
    bar: float
    panels: int


def between(length: float, tolerance: float) -> Pair:
    """Extract one pair of wires."""
    scene = bem.Scene(unit="m")
    for side in (-0.5, 0.5):
        x, z = side * WIRES.sizes["distance"], 0.5 * length
        scene.add_conductor(f"wire at {x:g}", bem.wire([(x, 0, -z), (x, 0, z)], radius=1.0))
    result = bem.extract(scene, tolerance=tolerance, threads=1)
    opposite, farad = np.array([0.5, -0.5]), 4.0 * np.pi * bem.EPS0
    value = float(opposite @ result.capacitance @ opposite) / farad
    return Pair(length, value, 0.25 * float(result.error.sum()) / farad, result.panels)


def report(low: Pair, high: Pair) -> float:
    """Print the slope between two lengths; returns its relative error."""
    step = (high.length - low.length) * WIRES.exact / (4.0 * np.pi)
    off = (high.value - low.value) / step - 1.0
    bar = (high.bar + low.bar) / step
    print(
        f"{low.length:6g} {high.length:6g} {low.panels:7} {high.panels:7} {100.0 * off:+9.2f} % "
        f"{100.0 * bar:7.2f} %"
    )
    return off


def main() -> int:
    """Print the table; returns the exit code."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tolerance", type=float, default=1e-3)
    tolerance = parser.parse_args().tolerance
    pairs = [between(length, tolerance) for length in LENGTHS]
    print("    l1     l2       panels        slope off       bar")
    errors = [report(low, high) for low, high in pairwise(pairs)]
    return int(abs(errors[-1]) > LIMIT)


if __name__ == "__main__":
    sys.exit(main())
