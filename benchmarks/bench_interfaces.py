"""What panels between dielectrics cost beside panels of conductors, and what contrast costs.

    python benchmarks/bench_interfaces.py

One thread, warm, CPU seconds, least of three runs. First: integrals and solution of N panels on a
turned cube as conductor panels, and as interface panels about a conductor of 12 panels; a linear
potential has three unknowns on a panel. Then: whole extractions of a cube in a cubic coat at 1e-3,
at several contrasts.
"""

from __future__ import annotations

import os
import time

from timing import SINGLE, least_seconds

os.environ.update(SINGLE)

import numpy as np  # noqa: E402
from bodies import JITTER, block, turned_about_z  # noqa: E402

import bem  # noqa: E402
from bem.geometry import shapes  # noqa: E402
from bem.geometry.surface import Surface  # noqa: E402
from bem.kernels.arrays import panel_arrays  # noqa: E402
from bem.kernels.images import plain_sources  # noqa: E402
from bem.kernels.mixed_arrays import mixed_panels, no_images  # noqa: E402
from bem.kernels.targets import make_targets  # noqa: E402
from bem.operators.dense import DenseOperator, far_reach  # noqa: E402
from bem.operators.mixed import Layout, MixedOperator  # noqa: E402
from bem.solve.dense import solve_dense  # noqa: E402
from bem.solve.mixed import solve_mixed  # noqa: E402

CELLS = (4, 6, 8)
TOLERANCE = 1e-3
CONTRASTS = (4.0, 80.0, 1000.0, 1e5)
PERMITTIVITY = np.array([1.0, 6.0])


def corners_of(surface: Surface) -> np.ndarray:
    """Corners (n, 4, 3) of the triangles, outward."""
    corners = surface.vertices[surface.triangles]
    return np.concatenate([corners, corners[:, 2:]], axis=1)


def cube(cells: int) -> np.ndarray:
    """Corners (n, 4, 3) of a turned cube of irregular triangles."""
    return corners_of(turned_about_z(block((cells,) * 3, jitter=JITTER), 20.0))


def conductor_seconds(corners: np.ndarray) -> tuple[float, float]:
    """Of the integrals, and of the solution, of conductor panels."""
    panels = panel_arrays(corners)
    sources, targets = plain_sources(panels), make_targets(panels)
    made = DenseOperator(sources, targets, far_reach(TOLERANCE), None)
    right = panels.area[:, None]
    return (
        least_seconds(lambda: DenseOperator(sources, targets, far_reach(TOLERANCE), None)),
        least_seconds(lambda: solve_dense(made, right)),
    )


def interface_seconds(corners: np.ndarray) -> tuple[float, float]:
    """The same of interface panels, about a conductor of 12 panels."""
    inner = 0.3 * cube(1)
    conductor = np.repeat([0, -1], [len(inner), len(corners)])
    regions = np.repeat([[-1, 1], [1, 0]], [len(inner), len(corners)], axis=0)
    every = np.concatenate([inner, corners])
    layout = Layout.of(conductor, regions, PERMITTIVITY)
    setup = mixed_panels(every[None], len(inner), no_images(len(every)))
    made = MixedOperator(setup, layout, far_reach(TOLERANCE))
    sides = made.right(np.ones((len(inner), 1))), np.ones((len(layout.unknown), 1))
    scale = (np.ones(len(layout.unknown)),) * 2
    return (
        least_seconds(lambda: MixedOperator(setup, layout, far_reach(TOLERANCE))),
        least_seconds(lambda: solve_mixed(made.system(), scale, sides)),
    )


def coated(contrast: float) -> tuple[bem.CapacitanceResult, float]:
    """Cube in a cubic coat, and its CPU seconds."""
    scene = bem.Scene(unit="m").add_conductor("cube", shapes.box(1.0, 1.0, 1.0))
    scene.add_dielectric("coat", shapes.box(1.5, 1.5, 1.5), relative_permittivity=contrast)
    start = time.process_time()
    result = bem.extract(scene, TOLERANCE, threads=1)
    return result, time.process_time() - start


def print_panels() -> None:
    """Print the table of panels."""
    print("CPU seconds         conductor panels         interface panels        ratio")
    print("       N         integrals   solution    integrals   solution       of both")
    for cells in CELLS:
        corners = cube(cells)
        plain, mixed = conductor_seconds(corners), interface_seconds(corners)
        print(
            f"{len(corners):8d} {plain[0]:16.3f} {plain[1]:10.3f} {mixed[0]:12.3f} {mixed[1]:10.3f}"
            f" {sum(mixed) / sum(plain):13.2f}",
            flush=True,
        )


def print_contrasts() -> None:
    """Print the table of contrasts."""
    coated(CONTRASTS[0])
    print("\ncube in a cubic coat, 1e-3: contrast, panels, rounds, seconds, over the first")
    first = 0.0
    for contrast in CONTRASTS:
        result, seconds = coated(contrast)
        first = first or seconds
        row = f"{contrast:10g} {result.panels:8d} {len(result.rounds):4d} {seconds:8.2f}"
        print(f"{row} {seconds / first:8.2f} {'' if result.converged else result.stopped_by}")


def main() -> None:
    """Print both tables."""
    print_panels()
    print_contrasts()


if __name__ == "__main__":
    main()
