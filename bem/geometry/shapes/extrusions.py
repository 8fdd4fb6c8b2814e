"""Sheets and prisms with any outline and holes.

The corners of facets that stand for an arc lie on it; what has arcs is solved on a smooth surface
fitted to them.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from bem.geometry.shapes import values as need
from bem.geometry.shapes.outlines import AROUND, Hole, Region, region
from bem.geometry.shapes.steps import Step
from bem.geometry.surface import NO_CORNER, Surface

FACETS_TO_CREASE = 1.5
"""Corners that turn by more than this times the facets of an arc are sharp."""


def sheet(outline: Sequence[Step], holes: Sequence[Hole] = (), around: int = AROUND) -> Surface:
    """Sheet without thickness in the xy-plane, with any outline and holes.

    Args:
        outline: the first step is a point (x, y); each further one is a point, reached in a
            straight line, or an ``ArcTo``. The last is joined to the first.
        holes: each given like an outline, or as ``{"center": (x, y), "radius": r}``.
        around: facets that a full circle is cut into for the fit.

    Raises:
        UsageError: an outline meets itself or another one, a hole does not lie inside, or a
            number is not finite.
    """
    flat = region(outline, holes, around)
    faces = _with_three_corners(flat.triangles())
    return _made(_lifted(flat.points, 0.0), faces, flat)


def extrude(
    outline: Sequence[Step], height: float, holes: Sequence[Hole] = (), around: int = AROUND
) -> Surface:
    """Solid prism from z = 0 to ``height`` with any outline and holes through it.

    Args:
        outline: the first step is a point (x, y); each further one is a point, reached in a
            straight line, or an ``ArcTo``. The last is joined to the first.
        height: length along z.
        holes: each given like an outline, or as ``{"center": (x, y), "radius": r}``.
        around: facets that a full circle is cut into for the fit.

    Raises:
        UsageError: an outline meets itself or another one, a hole does not lie inside, or a
            number is not finite.
    """
    top = need.length("height", height)
    flat = region(outline, holes, around)
    vertices = np.concatenate([_lifted(flat.points, 0.0), _lifted(flat.points, top)])
    return _made(vertices, _prism(flat), flat)


def _made(vertices: np.ndarray, faces: np.ndarray, flat: Region) -> Surface:
    """Surface that knows which of its edges are sharp."""
    crease = FACETS_TO_CREASE * 2.0 * np.pi / flat.around
    return Surface(vertices, faces, smooth=flat.curved, crease=crease)


def _prism(flat: Region) -> np.ndarray:
    """(f, 4) faces outward: the bottom, the top and the walls."""
    bottom, count = flat.triangles(), len(flat.points)
    here, there = flat.sides().T
    walls = np.stack([here, there, there + count, here + count], axis=1)
    ends = _with_three_corners(np.concatenate([bottom[:, ::-1], bottom + count]))
    return np.concatenate([ends, walls])


def _lifted(points: np.ndarray, z: float) -> np.ndarray:
    return np.column_stack([points, np.full(len(points), z)])


def _with_three_corners(triangles: np.ndarray) -> np.ndarray:
    return np.column_stack([triangles, np.full(len(triangles), NO_CORNER)])
