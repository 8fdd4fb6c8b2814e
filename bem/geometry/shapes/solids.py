"""Solids joined, cut and intersected, by a solids library.

Bodies that meet in a common face become one: coordinates are first rounded to ``DIGITS``
decimals of the size of it all, so that faces that were meant to meet do.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from bem.errors import InputError, UsageError
from bem.geometry.shapes import values as need
from bem.geometry.shapes.round import faceted
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import edges_of, orient, pieces_of
from bem.geometry.weld import WELD, weld

if TYPE_CHECKING:
    from manifold3d import Manifold

AROUND = 96
"""Facets around the axis of a round shape that is joined to others."""
DIGITS = 10
"""Decimals kept of coordinates, relative to the size of all bodies."""


THIN = 4.0 * WELD
"""Facets thinner than this part of the size of it all are left out of the result."""


def union(of: Sequence[Surface], around: int = AROUND) -> Surface:
    """Solid that holds all points of the given ones.

    Args:
        of: closed surfaces, each standing for a solid body.
        around: facets around the axis that the surface of a round shape is replaced with; their
            corners lie on it. The result is made of facets, and solved as such.

    Raises:
        UsageError: fewer than two bodies, or one that is open or crosses itself.
    """
    return _combined("union", of, around)


def difference(of: Sequence[Surface], around: int = AROUND) -> Surface:
    """Solid that holds the points of the first of the given ones outside all others.

    Args:
        of: closed surfaces, each standing for a solid body.
        around: as for ``union``.

    Raises:
        UsageError: fewer than two bodies, one that is open or crosses itself, or nothing left.
    """
    return _combined("difference", of, around)


def intersection(of: Sequence[Surface], around: int = AROUND) -> Surface:
    """Solid that holds the points common to all of the given ones.

    Args:
        of: closed surfaces, each standing for a solid body.
        around: as for ``union``.

    Raises:
        UsageError: fewer than two bodies, one that is open or crosses itself, or nothing left.
    """
    return _combined("intersection", of, around)


def _combined(kind: str, of: Sequence[Surface], around: int) -> Surface:
    from manifold3d import Manifold, OpType

    how = {"union": OpType.Add, "difference": OpType.Subtract, "intersection": OpType.Intersect}
    bodies = _bodies(kind, of, need.facets("around", around))
    digits = DIGITS - math.ceil(math.log10(max(body.extent for body in bodies)))
    solids = [_solid(f"of[{k}]", body, digits) for k, body in enumerate(bodies)]
    result = Manifold.batch_boolean(solids, how[kind])
    if result.is_empty():
        raise UsageError(f"{kind}: nothing is left of the bodies; check their places and sizes")
    return _surface(result.simplify(THIN * max(body.extent for body in bodies)))


def _bodies(kind: str, of: Any, around: int) -> list[Surface]:
    """Facets of the bodies, vertices joined."""
    bodies = [] if isinstance(of, Surface) or not hasattr(of, "__iter__") else list(of)
    if len(bodies) < 2:
        raise UsageError(f"{kind}: found {len(bodies)} bodies; give a list of at least two")
    return [_facets(f"of[{k}]", body, around) for k, body in enumerate(bodies)]


def _facets(name: str, body: Any, around: int) -> Surface:
    if not isinstance(body, Surface):
        found = type(body).__name__
        raise UsageError(f"{name}: found {found}; give a Surface such as bem.box()")
    if body.curve is not None:
        body = faceted(body.curve, around)
    try:
        return weld(body)[0]
    except InputError as problem:
        raise UsageError(f"{name}: {problem}") from None


def _solid(name: str, body: Surface, digits: int) -> Manifold:
    from manifold3d import Error, Manifold, Mesh64

    triangles = body.triangles
    uses = edges_of(triangles).uses
    if (uses != 2).any():
        open_sides = int(np.count_nonzero(uses != 2))
        raise UsageError(
            f"{name}: is no closed solid ({open_sides} sides without exactly two faces); give "
            f"closed bodies, no sheets"
        )
    vertices = np.round(body.vertices, digits)
    outward = _outward(vertices, triangles).astype(np.uint64)
    solid = Manifold(Mesh64(np.ascontiguousarray(vertices), np.ascontiguousarray(outward)))
    if solid.status() != Error.NoError:
        raise UsageError(f"{name}: is no solid that can be used ({solid.status().name}); mend it")
    return solid


def _outward(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """Triangles (t, 3) with normals out of the metal: a piece inside another is its inner wall."""
    _, sign = orient(triangles, edges_of(triangles))
    turned = np.where((sign > 0)[:, None], triangles, triangles[:, ::-1])
    count, piece = pieces_of(triangles)
    a, b, c = np.moveaxis(vertices[turned], 1, 0)
    volumes = np.bincount(piece, np.einsum("tx,tx->t", a, np.cross(b, c)), count)
    right = (volumes > 0.0) != _inner_walls(vertices[triangles], piece, count)
    return np.where(right[piece][:, None], turned, turned[:, ::-1])


def _inner_walls(corners: np.ndarray, piece: np.ndarray, count: int) -> np.ndarray:
    """(count,) bool: pieces that lie inside an odd number of others."""
    inner = np.zeros(count, dtype=bool)
    if count > 1:
        from bem.geometry.rays import points_inside, ray_directions
        from bem.geometry.tree import build_tree

        tree, directions = build_tree(corners), ray_directions()
        for k in range(count):
            probe = corners[np.argmax(piece == k)].mean(axis=0, keepdims=True)
            inner[k] = points_inside(tree, piece != k, probe, directions)[0]
    return inner


def _surface(solid: Manifold) -> Surface:
    mesh = solid.to_mesh64()
    triangles = np.asarray(mesh.tri_verts).astype(np.int64)
    faces = np.column_stack([triangles, np.full(len(triangles), NO_CORNER)])
    return weld(Surface(np.array(mesh.vert_properties)[:, :3], faces))[0]
