"""Faces that overlap in one plane are cut along each other's outlines and kept once.

Each piece that takes part is a layer. The layers are laid over one another as polygons, and
each region of the plane that results is meshed by itself, so that a wall between two pieces
stands alone afterwards and can be told from their outside.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from bem.geometry.quads import triangle_owners
from bem.geometry.repair.pieces import with_triangles
from bem.geometry.surface import Surface
from bem.geometry.topology import corners_on


def overlay(surface: Surface, pairs: np.ndarray, piece: np.ndarray, snap: float) -> Surface:
    """Replace overlapping coplanar faces by regions that do not overlap.

    Args:
        surface: welded faces.
        pairs: (n, 2) triangles that overlap in a plane.
        piece: (t,) piece of each triangle.
        snap: new corners this near to old ones take their place, metres.

    Returns:
        The faces, new ones last and not welded.
    """
    corners = surface.vertices[surface.triangles]
    owners = triangle_owners(surface.faces)
    member = np.isin(owners, owners[pairs])
    pairs = np.concatenate([pairs, _halves(owners, member)])
    links = coo_array((np.ones(len(pairs)), pairs.T), shape=(len(corners), len(corners)))
    _, plane = connected_components(links, directed=False)
    fresh = [
        _regions(corners[plane == k], piece[plane == k], snap) for k in np.unique(plane[member])
    ]
    rest = np.delete(surface.faces, owners[member], axis=0)
    return with_triangles(replace(surface, faces=rest), np.concatenate(fresh))


def _halves(owners: np.ndarray, member: np.ndarray) -> np.ndarray:
    """Pairs (n, 2) of triangles in ``member`` that are halves of one quadrilateral."""
    order = np.argsort(owners, kind="stable")
    twin = owners[order[1:]] == owners[order[:-1]]
    pairs = np.stack([order[:-1][twin], order[1:][twin]], axis=1)
    return pairs[member[pairs].all(axis=1)]


def _regions(corners: np.ndarray, piece: np.ndarray, snap: float) -> np.ndarray:
    """Triangles (n, 3, 3) of the regions that coplanar triangles (t, 3, 3) of pieces make."""
    from scipy.spatial import cKDTree

    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    size = np.linalg.norm(normals, axis=1)
    base = int(size.argmax())
    side = corners[base, 1] - corners[base, 0]
    side, normal = side / np.linalg.norm(side), normals[base] / size[base]
    axes = np.stack([side, np.cross(normal, side)])
    scale = float(np.ptp(corners.reshape(-1, 3), axis=0).max())
    rims = [(rim - corners[base, 0]) @ axes.T / scale for rim in _rims(corners, snap)]
    layers = [[rims[t] for t in np.flatnonzero(piece == k)] for k in np.unique(piece)]
    cut = _laid_over([_section(layer) for layer in layers])
    points = np.concatenate([_meshed(region) for region in cut]).reshape(-1, 2)
    lifted = corners[base, 0] + scale * points @ axes
    off, nearest = cKDTree(corners.reshape(-1, 3)).query(lifted)
    lifted[off <= snap] = corners.reshape(-1, 3)[nearest[off <= snap]]
    return lifted.reshape(-1, 3, 3)


def _rims(corners: np.ndarray, snap: float) -> list[np.ndarray]:
    """Rim (n, 3) of each triangle with the corners of others that lie on it.

    Without these, rounding would leave such corners just off the side that they lie on.
    """
    points, index = np.unique(corners.reshape(-1, 3), axis=0, return_inverse=True)
    index = index.reshape(-1, 3)
    ends = np.stack([index, np.roll(index, -1, axis=1)], axis=2).reshape(-1, 2)
    side, point = corners_on(points, ends, snap)
    far = np.linalg.norm(points[point] - points[ends[side, 0]], axis=1)
    side = np.concatenate([np.arange(len(ends)), side])
    order = np.lexsort([np.concatenate([np.zeros(len(ends)), far]), side])
    rim = np.concatenate([ends[:, 0], point])[order]
    starts = np.searchsorted(side[order] // 3, np.arange(1, len(corners)))
    return np.split(points[rim], starts)


def _section(rims: list[np.ndarray]) -> Any:
    """Union of polygons, each (n, 2), as one of the library."""
    from manifold3d import CrossSection, FillRule

    return CrossSection([rim if _is_left(rim) else rim[::-1] for rim in rims], FillRule.NonZero)


def _is_left(rim: np.ndarray) -> bool:
    """Whether a polygon runs counterclockwise."""
    after = np.roll(rim, -1, axis=0)
    return float((rim[:, 0] * after[:, 1] - rim[:, 1] * after[:, 0]).sum()) > 0.0


def _laid_over(layers: list[Any]) -> list[Any]:
    """Regions that differ in which layers cover them."""
    regions: list[Any] = []
    for layer in layers:
        rest = layer
        parts = []
        for region in regions:
            parts += [region - layer, region ^ layer]
            rest = rest - region
        regions = [part for part in [*parts, rest] if not part.is_empty()]
    return regions


def _meshed(region: Any) -> np.ndarray:
    """Triangles (t, 3, 2) of a polygon of the library."""
    from manifold3d import triangulate

    outlines = region.to_polygons()
    return np.concatenate(outlines)[np.asarray(triangulate(outlines)).astype(np.int64)]
