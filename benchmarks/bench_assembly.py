"""Nanoseconds per pair of panels, tier by tier, beside plain numpy 1/r of as many pairs.

    python benchmarks/bench_assembly.py

One thread, warm, CPU seconds, least of three runs. The fill gives each pair its value and its
four tests; the near tiers are the exact values alone, on panels that touch or nearly do. The
last lines are a real mesh: how its pairs fall into the tiers, and what a pair costs on average.
"""

from __future__ import annotations

import os

from timing import SINGLE, least_seconds

os.environ.update(SINGLE)

import numpy as np  # noqa: E402
from bodies import JITTER, block, sheet, turned_about_z  # noqa: E402
from numba import njit  # noqa: E402

from bem.geometry.surface import Surface  # noqa: E402
from bem.kernels import pairs  # noqa: E402
from bem.kernels.arrays import PanelArrays, panel_arrays  # noqa: E402
from bem.kernels.images import plain_sources  # noqa: E402
from bem.kernels.targets import make_targets  # noqa: E402
from bem.operators.dense import NEAR, far_reach  # noqa: E402

CELLS = 24
ALWAYS = np.inf
NEVER = -1.0


def panels_of(surface: Surface) -> PanelArrays:
    """Panels of a mesh of triangles."""
    corners = surface.vertices[surface.triangles]
    return panel_arrays(np.concatenate([corners, corners[:, 2:]], axis=1))


def squares(count: int) -> np.ndarray:
    """Corners (n, 4, 3) of a square sheet cut into count x count squares."""
    line = np.arange(count) / count
    x, y = (a.ravel()[:, None] for a in np.meshgrid(line, line, indexing="ij"))
    side = 1.0 / count
    across, along = np.array([0.0, side, side, 0.0]), np.array([0.0, 0.0, side, side])
    return np.stack([x + across, y + along, np.zeros((count**2, 4))], axis=-1)


def fill_nanoseconds(panels: PanelArrays, reach: tuple[float, float]) -> float:
    """Per pair of a fill whose tiers begin at ``reach``."""
    targets, n = make_targets(panels), len(panels.area)
    sources = plain_sources(panels)
    none = pairs.Matrices(np.empty((0, 0)), np.empty((4, 0, 0), dtype=np.float32))
    new = pairs.Matrices(np.empty((n, n)), np.empty((4, n, n), dtype=np.float32))
    limits, origin = np.array(reach), np.full(n, -1)

    def work() -> None:
        pairs.fill(sources, targets, limits, origin, none, new)

    work()
    return 1e9 * least_seconds(work) / n**2


@njit(cache=False)
def _sum_near(first: np.ndarray, second: np.ndarray, panels: PanelArrays) -> float:
    total = 0.0
    for k in range(first.size):
        total += pairs.near_pair(first[k], second[k], panels)
    return total


def near_nanoseconds(panels: PanelArrays, divide: int) -> float:
    """Per exact pair of near panels, one before ``divide`` and one after (0: any two)."""
    step = np.linalg.norm(panels.center[:, None] - panels.center, axis=2)
    near = step <= NEAR * (panels.radius[:, None] + panels.radius)
    if divide:
        near[:divide, :divide] = near[divide:] = False
    first, second = np.nonzero(near)
    first, second = first[:20000], second[:20000]
    _sum_near(first, second, panels)
    return 1e9 * least_seconds(lambda: _sum_near(first, second, panels)) / len(first)


def leaning(count: int) -> np.ndarray:
    """Make a sheet of squares and one that leans over it by 40 degrees, hinged along its rim."""
    flat = squares(count)
    cos, sin = np.cos(np.radians(40.0)), np.sin(np.radians(40.0))
    turn = np.array([[cos, 0.0, sin], [0.0, 1.0, 0.0], [-sin, 0.0, cos]])
    return np.concatenate([flat, flat @ turn])


def numpy_nanoseconds(center: np.ndarray) -> float:
    """Per pair of 1/r between ``center`` (n, 3) in plain numpy."""

    def work() -> np.ndarray:
        dx, dy, dz = (np.subtract.outer(x, x) for x in center.T)
        with np.errstate(divide="ignore"):
            return 1.0 / np.sqrt(dx * dx + dy * dy + dz * dz)

    return 1e9 * least_seconds(work) / len(center) ** 2


def tiers() -> dict[str, float]:
    """Nanoseconds per pair by tier."""
    square = panel_arrays(squares(CELLS))
    rough = sheet((CELLS, CELLS), jitter=JITTER)
    count = len(square.area)
    return {
        "far, value and tests": fill_nanoseconds(square, (NEVER, NEVER)),
        "middle, value and tests": fill_nanoseconds(square, (NEVER, ALWAYS)),
        "near, closed (rectangles)": near_nanoseconds(square, 0),
        "near, side pairs (triangles in a plane)": near_nanoseconds(panels_of(rough), 0),
        "near, clustered (40 degrees)": near_nanoseconds(panel_arrays(leaning(CELLS)), count),
    }


def shares(panels: PanelArrays, reach: tuple[float, float]) -> tuple[float, float]:
    """Parts of all pairs that are near and far."""
    step = np.linalg.norm(panels.center[:, None] - panels.center, axis=2)
    distance = step / (panels.radius[:, None] + panels.radius)
    return float(np.mean(distance <= reach[0])), float(np.mean(distance > reach[1]))


def main() -> None:
    """Print the tables."""
    plain = numpy_nanoseconds(panel_arrays(squares(CELLS)).center)
    print("nanoseconds per pair, one thread                 ns    over numpy's 1/r")
    print(f"{'numpy 1/r':42} {plain:8.1f} {1.0:10.1f}")
    for name, cost in tiers().items():
        print(f"{name:42} {cost:8.1f} {cost / plain:10.1f}")
    mesh = panels_of(turned_about_z(block((10, 10, 10), jitter=JITTER), 20.0))
    for tolerance in (1e-3, 1e-4):
        reach = (NEAR, far_reach(tolerance))
        near, far = shares(mesh, reach)
        cost = fill_nanoseconds(mesh, reach)
        label = f"cube, {len(mesh.area)} irregular triangles, {tolerance:g}"
        print(
            f"{label:42} {cost:8.1f} {cost / plain:10.1f}"
            f"   {100 * near:.1f} % near, {100 * far:.1f} % far"
        )


if __name__ == "__main__":
    main()
