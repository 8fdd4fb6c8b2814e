"""Facets that stand for a smooth surface: true error and bar, left as they are and fitted.

    python benchmarks/bench_facets.py [--tolerance 3e-3] [--max-panels 6000] [PART OF A NAME ...]

Truth: exact values of spheres, ellipsoids (elliptic integral) and discs, and of the open half
sphere (Kelvin 1869, from memory); for cylinder, ring and annulus the shapes with a true surface
at a tolerance of 5e-5.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path
from typing import NamedTuple

import numpy as np
from scipy.special import elliprf

import bem
from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.units import EPS0

sys.path.append(str(Path(__file__).resolve().parent.parent / "tests"))

import faceted_bodies as made  # noqa: E402

LENGTH = 4.0 * np.pi * EPS0
"""Farad of L = 1 m."""
AXES = (3.0, 2.0, 1.0)


@lru_cache
def tight(shape: str) -> float:
    """L of a shape that knows its surface."""
    surface = {
        "cylinder": lambda: shapes.cylinder(1.0, 2.0),
        "ring": lambda: shapes.torus(2.0, 1.0),
        "annulus": lambda: shapes.annulus(0.5, 1.0),
    }[shape]()
    scene = bem.Scene(unit="m").add_conductor("body", surface)
    return float(bem.extract(scene, 5e-5, threads=1).capacitance[0, 0] / LENGTH)


class Case(NamedTuple):
    """A faceted body and what its smooth surface has for L."""

    name: str
    surface: Callable[[], Surface]
    truth: Callable[[], float]


def one() -> float:
    """L of the unit sphere."""
    return 1.0


def ellipsoid() -> float:
    """L of the ellipsoid with half axes ``AXES``."""
    return float(1.0 / elliprf(*np.square(AXES)))


CASES = [
    *(Case("sphere", lambda n=n: made.icosphere(n), one) for n in (2, 3, 4)),
    *(Case("sphere of rings", lambda n=n: made.uv_sphere(n), one) for n in (12, 24)),
    *(Case("uneven sphere", lambda n=n: made.uneven_sphere(n), one) for n in (160, 640)),
    Case("uneven ellipsoid", lambda: made.stretched(made.uneven_sphere(640), *AXES), ellipsoid),
    *(Case("ring", lambda n=n: made.torus(2 * n, n), lambda: tight("ring")) for n in (12, 20)),
    Case("uneven ring", lambda: made.torus(36, 18, 0.2), lambda: tight("ring")),
    *(Case("cylinder", lambda n=n: made.cylinder(n), lambda: tight("cylinder")) for n in (16, 48)),
    *(Case("bowl, a sheet", lambda n=n: made.bowl(n), lambda: 0.5 + 1.0 / np.pi) for n in (16, 32)),
    *(Case("disc, a sheet", lambda n=n: made.disc(n), lambda: 2.0 / np.pi) for n in (16, 48)),
    Case("annulus, a sheet", lambda: made.annulus(32), lambda: tight("annulus")),
]


def solved(surface: Surface, smooth: bool | None, args: argparse.Namespace) -> list[float]:
    """Relative true value, bar, and the facets' part of it; number of panels."""
    scene = bem.Scene(unit="m").add_conductor("body", surface, smooth=smooth)
    result = bem.extract(scene, args.tolerance, threads=1, max_panels=args.max_panels)
    part = result.budget["facets of the file"][0, 0]
    return [x / LENGTH for x in (result.capacitance[0, 0], result.error[0, 0], part)] + [
        result.panels
    ]


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser()
    parser.add_argument("names", nargs="*")
    parser.add_argument("--tolerance", type=float, default=3e-3)
    parser.add_argument("--max-panels", type=int, default=6000)
    args = parser.parse_args()
    print("| body | facets | smooth | true error | bar | of it facets | panels |")
    print("|---|---|---|---|---|---|---|")
    for name, surface, truth in CASES:
        if args.names and not any(part in name for part in args.names):
            continue
        for smooth in (None, True):
            value, bar, part, panels = solved(surface(), smooth, args)
            exact = truth()
            miss = value / exact - 1.0
            said = "true" if smooth else "left out"
            outside = " (outside)" if abs(miss) > bar / exact else ""
            print(
                f"| {name} | {len(surface().triangles)} | {said} | {miss:+.1e}{outside} "
                f"| {bar / exact:.1e} | {part / exact:.1e} | {panels:.0f} |",
                flush=True,
            )


if __name__ == "__main__":
    main()
