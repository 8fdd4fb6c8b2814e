"""Seconds until a hundred conductors of 5000 facets each are read and their gaps known.

Writes them as binary STL files and a scene file to a temporary folder, then times what
``bem inspect`` does, part by part. Every second one has a missing facet with ``--torn``.
"""

from __future__ import annotations

import argparse
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from bodies import block, moved
from stl_out import binary_stl

from bem.geometry.surface import NO_CORNER, Surface
from bem.scene.inspect import inspect
from bem.scene.report import report
from bem.scene.scene_file import load_scene

ROWS, COLUMNS = 10, 10
CELLS = (20, 21, 21)
"""Cells along the edges of a box: 5124 triangles."""

APART = 1.02, 1.3
"""Distances of the bodies' centres along x and y; bodies are 1 wide."""


def globe() -> Surface:
    """Ball of diameter 1 with as many facets as the boxes."""
    box = block(CELLS)
    return Surface(0.5 * box.vertices / np.linalg.norm(box.vertices, axis=1)[:, None], box.faces)


def torn(surface: Surface) -> Surface:
    """Leave a facet out and split another one where its neighbour knows nothing of it."""
    a, b, c = surface.faces[100, :3]
    vertices = np.concatenate([surface.vertices, surface.vertices[[a, b]].mean(axis=0)[None]])
    middle = len(surface.vertices)
    parts = [[a, middle, c, NO_CORNER], [middle, b, c, NO_CORNER]]
    return Surface(vertices, np.concatenate([np.delete(surface.faces, [7, 100], axis=0), parts]))


def write_scene(folder: Path, damaged: bool) -> Path:
    """Write all bodies, boxes and balls in turn, and a scene of them."""
    lines = ['unit = "mm"']
    for k in range(ROWS * COLUMNS):
        row, column = divmod(k, COLUMNS)
        body = globe() if (row + column) % 2 else block(CELLS)
        body = torn(body) if damaged and k % 2 else body
        placed = moved(body, APART[0] * row, APART[1] * column, 0.0)
        (folder / f"body{k}.stl").write_bytes(binary_stl(placed, f"body {k}"))
        lines += ["[[conductor]]", f'name = "body {k}"', f'mesh = "body{k}.stl"']
    path = folder / "scene.toml"
    path.write_text("\n".join(lines))
    return path


def timed(name: str, work: Callable[[], object]):
    """Run a part and print its wall and processor seconds."""
    wall, processor = time.perf_counter(), time.process_time()
    result = work()
    print(
        f"| {name} | {time.perf_counter() - wall:.2f} | {time.process_time() - processor:.2f} |",
        flush=True,
    )
    return result


def run(damaged: bool) -> None:
    """Write, read, inspect and report."""
    with tempfile.TemporaryDirectory() as folder:
        path = write_scene(Path(folder), damaged)
        scene = timed("read, welded, repaired", lambda: load_scene(path))
        found = timed("checked, gaps found", lambda: inspect(scene))
        timed("reported", lambda: report(scene, found))
    faces = sum(body.faces for body in found.bodies)
    print(f"\n{len(found.bodies)} bodies, {faces:,} facets, {len(found.pairs)} gaps")


def main() -> None:
    """Print a table of seconds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--torn", action="store_true", help="damage every second body")
    print("| part | wall, s | CPU, s |\n|---|---|---|")
    run(parser.parse_args().torn)


if __name__ == "__main__":
    main()
