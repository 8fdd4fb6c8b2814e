"""The cells that segments part a plane into.

End points that coincide within the tolerance become one, and segments bend to the end points that
lie on them; only then are crossings looked for, by a geometry library that rounds to a much finer
grid. So outlines that run along one another do so exactly, and leave no slivers.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.topology import corners_on, cut_edges
from bem.geometry.weld import near_groups

FINE = 1e-6
"""Grid of the crossings, per tolerance."""
FEW = 200
"""Up to this many end points all pairs are looked at."""
INSIDE = 0.1
"""Points inside cells may lie this many tolerances off the triangles that cover them."""


class Network(NamedTuple):
    """Segments that meet in common end points.

    Args:
        points: (n, 2).
        own: (e, 2) end points of the outline's segments, the lower first.
        other: (k, 2) those that do not run along the outline.
    """

    points: np.ndarray
    own: np.ndarray
    other: np.ndarray


def joined(own: np.ndarray, other: np.ndarray, tolerance: float) -> Network:
    """Join segments (s, 2, 2) of an outline, and others, where they nearly meet."""
    ends = np.concatenate([own, other]).reshape(-1, 2)
    first, label = _few_groups(ends, tolerance) if len(ends) <= FEW else _groups(ends, tolerance)
    pairs = label.reshape(-1, 2)
    return _split_at_points(ends[first], pairs[: len(own)], pairs[len(own) :], tolerance)


def _few_groups(points: np.ndarray, tolerance: float) -> tuple[np.ndarray, np.ndarray]:
    """Where each group of close points (n, 2) begins, and the group (n,) of each."""
    off = points[:, None] - points[None]
    near = np.einsum("ijx,ijx->ij", off, off) <= tolerance * tolerance
    first = near.argmax(axis=1)
    while (first[first] != first).any():
        first = first[first]
    return np.unique(first, return_inverse=True)


def _groups(points: np.ndarray, tolerance: float) -> tuple[np.ndarray, np.ndarray]:
    """What ``_few_groups`` gives, for many points."""
    exact, first, index = np.unique(points, axis=0, return_index=True, return_inverse=True)
    order = np.argsort(first)
    keep, label = near_groups(exact[order], tolerance)
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = label
    return first[order][keep], rank[index.ravel()]


def _split_at_points(points, own, other, tolerance) -> Network:
    pairs = np.concatenate([own, other])
    source = np.flatnonzero(pairs[:, 0] != pairs[:, 1])
    lifted = np.column_stack([points, np.zeros(len(points))])
    edge, corner = corners_on(lifted, pairs[source], tolerance)
    pieces, of = cut_edges(lifted, pairs[source], edge, corner)
    key, mine = np.sort(pieces, axis=1) @ [len(points), 1], source[of] < len(own)
    outline = np.unique(key[mine])
    rest = np.setdiff1d(key[~mine], outline)
    return Network(points, *(np.stack(divmod(k, len(points)), axis=1) for k in (outline, rest)))


class Cell(NamedTuple):
    """A polygon.

    Args:
        corners: (t, 3, 2) its triangles, counterclockwise.
        point: (2,) well inside.
        area: of all of it.
    """

    corners: np.ndarray
    point: np.ndarray
    area: float


def cells_of(network: Network, tolerance: float) -> list[Cell]:
    """Cells that the segments bound, without those narrower than the tolerance.

    Holes are cells too, and so is what segments bound outside the outline.
    """
    import shapely

    lines = shapely.linestrings(network.points[np.concatenate([network.own, network.other])])
    noded = shapely.union_all(lines, grid_size=FINE * tolerance)
    cells = shapely.get_parts(shapely.polygonize(shapely.get_parts(noded)))
    wide = 2.0 * shapely.area(cells) > tolerance * shapely.length(cells)
    return [_cell(corners) for corners in _meshed(cells[wide])]


def _meshed(polygons: np.ndarray) -> list[np.ndarray]:
    """Triangles (t, 3, 2) of each polygon of the library."""
    import shapely

    meshes = shapely.constrained_delaunay_triangles(polygons)
    parts, cell = shapely.get_parts(meshes, return_index=True)
    corners = shapely.get_coordinates(shapely.orient_polygons(parts)).reshape(-1, 4, 2)[:, :3]
    return np.split(corners, np.searchsorted(cell, np.arange(len(polygons))))[1:]


def _cell(corners: np.ndarray) -> Cell:
    """Cell of triangles, with the middle of the largest as its point."""
    side, other = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    areas = 0.5 * (side[:, 0] * other[:, 1] - side[:, 1] * other[:, 0])
    return Cell(corners, corners[areas.argmax()].mean(axis=0), float(areas.sum()))


def covered_by(points: np.ndarray, triangles: np.ndarray, margin: float) -> np.ndarray:
    """Which points (n, 2) lie in triangles (t, 3, 2), or no further off than a margin, (n, t)."""
    after = np.roll(triangles, -1, axis=1)
    side, to = after - triangles, points[:, None, None] - triangles
    turn = side[..., 0] * to[..., 1] - side[..., 1] * to[..., 0]
    turn /= np.maximum(np.linalg.norm(side, axis=2), 1e-300)
    return (turn >= -margin).all(axis=2) | (turn <= margin).all(axis=2)
