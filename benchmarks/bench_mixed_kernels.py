"""Nanoseconds per pair of the mixed formulation, tier by tier, over the tiers of conductors alone.

    python benchmarks/bench_mixed_kernels.py

One thread, warm, CPU seconds, least of three runs. Every tier is run by itself on the same sheet
of squares: conductors on conductors, either kind on the other, interfaces on interfaces. What
``pairs`` needs for the value and four tests of a pair in the same run is the unit. The last
lines are a real mesh, all of it conductors or all of it interfaces.
"""

from __future__ import annotations

import os

from timing import SINGLE, least_seconds

os.environ.update(SINGLE)

import numpy as np  # noqa: E402
from bench_assembly import ALWAYS, NEVER, fill_nanoseconds, squares  # noqa: E402
from bodies import JITTER, block, turned_about_z  # noqa: E402

from bem.kernels import mixed  # noqa: E402
from bem.kernels.arrays import panel_arrays  # noqa: E402
from bem.kernels.mixed_arrays import empty_matrices, mixed_panels, no_images  # noqa: E402
from bem.operators.dense import NEAR, far_reach  # noqa: E402

CELLS = 24
TIERS = {
    "middle": (NEVER, ALWAYS, ALWAYS),
    "far": (NEVER, NEVER, ALWAYS),
    "distant": (NEVER, NEVER, NEVER),
}
"""Limits behind which each tier serves all pairs."""
KINDS = {"on conductors": (0, 1), "mixed, half of each": (1, 2), "on interfaces": (1, 1)}
"""Interfaces among the panels, as a fraction."""


def mixed_nanoseconds(corners: np.ndarray, metal: int, limits: tuple[float, ...]) -> float:
    """Per pair of a fill whose tiers begin at ``limits``."""
    count = len(corners)
    setup = mixed_panels(corners[None], metal, no_images(count))
    origin, every = np.full(count, -1), np.arange(count)
    lanes = mixed.blocks_of(setup, every)
    new, bounds = empty_matrices(metal, count - metal), np.array(limits)

    def work() -> None:
        mixed.fill_block(0, count, setup, bounds, (lanes, lanes), origin, True, new)

    work()
    return 1e9 * least_seconds(work) / count**2


def tiers() -> None:
    """Print a line for each tier and kind of panels."""
    corners = squares(CELLS)
    panels, count = panel_arrays(corners), len(corners)
    plain = {name: fill_nanoseconds(panels, TIERS[name][:2]) for name in ("middle", "far")}
    for name, limits in TIERS.items():
        unit = plain["middle" if name == "middle" else "far"]
        for label, (part, whole) in KINDS.items():
            cost = mixed_nanoseconds(corners, count - count * part // whole, limits)
            print(f"{name + ' ' + label:42} {cost:8.1f} {cost / unit:10.2f}")


def whole_meshes() -> None:
    """Print what a pair costs on average where all tiers take part."""
    surface = turned_about_z(block((10, 10, 10), jitter=JITTER), 20.0)
    triangles = surface.vertices[surface.triangles]
    corners = np.concatenate([triangles, triangles[:, 2:]], axis=1)
    for tolerance in (1e-3, 1e-4):
        reach = np.array([NEAR, far_reach(tolerance)])
        limits = tuple(mixed.all_limits(reach))
        unit = fill_nanoseconds(panel_arrays(corners), (reach[0], reach[1]))
        for label, metal in (("conductors", len(corners)), ("interfaces", 0)):
            cost = mixed_nanoseconds(corners, metal, limits)
            name = f"cube, {len(corners)} {label}, {tolerance:g}"
            print(f"{name:42} {cost:8.1f} {cost / unit:10.2f}")


def main() -> None:
    """Print the tables."""
    print("nanoseconds per pair, one thread                 ns    over conductors alone")
    tiers()
    whole_meshes()


if __name__ == "__main__":
    main()
