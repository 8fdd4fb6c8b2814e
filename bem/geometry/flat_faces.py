"""Flat faces: which faces of a body lie in one plane with their neighbours.

How a flat face was triangulated says nothing about the body. Flatness tolerance: FLATNESS of
the body's size, which is above the rounding of single-precision files and far below any
tolerance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from bem.geometry.surface import Surface

FLATNESS = 1e-6


@dataclass(frozen=True)
class Sides:
    """Sides of faces: sorted vertex pairs, grouped by equal pair."""

    pairs: np.ndarray
    face: np.ndarray
    group: np.ndarray
    count: np.ndarray


def _face_corners(faces: np.ndarray) -> np.ndarray:
    """(f, 4) with a triangle's last corner repeated."""
    corners = faces.copy()
    triangle = corners[:, 3] < 0
    corners[triangle, 3] = corners[triangle, 2]
    return corners


def sides_of(corners: np.ndarray) -> Sides:
    """Sides of faces (f, 4), a triangle repeating its last corner."""
    ends = np.stack([corners, np.roll(corners, -1, axis=1)], axis=2).reshape(-1, 2)
    face = np.repeat(np.arange(len(corners)), 4)
    real = ends[:, 0] != ends[:, 1]
    ends, face = ends[real], face[real]
    pairs = np.sort(ends, axis=1)
    key = pairs[:, 0] * (int(corners.max()) + 1) + pairs[:, 1]
    _, group, count = np.unique(key, return_inverse=True, return_counts=True)
    return Sides(pairs, face, group, count)


def _area_vectors(points: np.ndarray) -> np.ndarray:
    return 0.5 * np.cross(points[:, 2] - points[:, 0], points[:, 3] - points[:, 1])


def _neighbours(edges: Sides) -> np.ndarray:
    """(p, 2) faces that share a side which belongs to no third one."""
    inner = edges.count[edges.group] == 2
    order = np.argsort(edges.group[inner], kind="stable")
    return edges.face[inner][order].reshape(-1, 2)


def _coplanar(pairs: np.ndarray, points: np.ndarray, area: np.ndarray, limit: float) -> np.ndarray:
    """Which pairs of faces lie within ``limit`` of the plane of the larger one."""
    size = np.linalg.norm(area, axis=1)
    larger = np.where(size[pairs[:, 0]] >= size[pairs[:, 1]], pairs[:, 0], pairs[:, 1])
    smaller = pairs.sum(axis=1) - larger
    normal = area[larger] / np.maximum(size[larger], 1e-300)[:, None]
    height = np.einsum("pkc,pc->pk", points[smaller] - points[larger][:, :1], normal)
    return np.abs(height).max(axis=1) <= limit


def _group_faces(points: np.ndarray, corners: np.ndarray, limit: float) -> np.ndarray:
    """Label of each face; coplanar neighbours share one unless the whole group is bent."""
    area = _area_vectors(points)
    pairs = _neighbours(sides_of(corners))
    pairs = pairs[_coplanar(pairs, points, area, limit)] if len(pairs) else pairs
    n = len(points)
    graph = coo_matrix((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    count, label = connected_components(graph, directed=False)
    bent = _bent_groups(points, area, label, count, limit)
    alone = bent[label]
    label[alone] = count + np.arange(alone.sum())
    return np.unique(label, return_inverse=True)[1]


def _group_planes(points, area, label, count):
    """Origin (g, 3) and normal (g, 3) of each group; signs of opposed faces are aligned first."""
    size = np.linalg.norm(area, axis=1)
    largest = np.zeros(count, dtype=int)
    order = np.argsort(size)
    largest[label[order]] = order
    sign = np.sign(np.einsum("fc,fc->f", area, area[largest[label]]))
    total = np.zeros((count, 3))
    np.add.at(total, label, area * sign[:, None])
    normal = total / np.maximum(np.linalg.norm(total, axis=1), 1e-300)[:, None]
    weight = np.bincount(label, size, count)
    center = points.mean(axis=1)
    origin = np.stack([np.bincount(label, size * center[:, c], count) for c in range(3)], axis=1)
    return origin / np.maximum(weight, 1e-300)[:, None], normal


def _bent_groups(points, area, label, count, limit) -> np.ndarray:
    origin, normal = _group_planes(points, area, label, count)
    height = np.einsum("fkc,fc->fk", points - origin[label][:, None], normal[label])
    worst = np.zeros(count)
    np.maximum.at(worst, label, np.abs(height).max(axis=1))
    return worst > 2.0 * limit


def _split_bent_quads(surface: Surface, limit: float) -> np.ndarray:
    """(f, 4) corner indices; quadrilaterals that are not flat become two triangles."""
    corners = _face_corners(surface.faces)
    points = surface.vertices[corners]
    area = _area_vectors(points)
    normal = area / np.maximum(np.linalg.norm(area, axis=1), 1e-300)[:, None]
    height = np.abs(np.einsum("fkc,fc->fk", points - points.mean(axis=1)[:, None], normal))
    bent = (height.max(axis=1) > limit) & (surface.faces[:, 3] >= 0)
    first, second = corners[bent][:, [0, 1, 2, 2]], corners[bent][:, [0, 2, 3, 3]]
    return np.concatenate([corners[~bent], first, second])


@dataclass(frozen=True)
class FlatFaces:
    """The faces of one body, grouped by the flat face that they belong to.

    Args:
        vertices: (v, 3).
        corners: (f, 4) vertices of each face, a triangle repeating its last.
        label: (f,) number of the flat face.
        count: number of flat faces.
        limit: distance below which faces count as coplanar.
    """

    vertices: np.ndarray
    corners: np.ndarray
    label: np.ndarray
    count: int
    limit: float

    @classmethod
    def of(cls, surface: Surface, extent: float = 0.0) -> FlatFaces:
        """Join coplanar neighbours.

        Args:
            surface: of a body, or a part of it.
            extent: size of the whole body, if it is larger.
        """
        limit = FLATNESS * max(surface.extent, extent)
        corners = _split_bent_quads(surface, limit)
        label = _group_faces(surface.vertices[corners], corners, limit)
        return cls(surface.vertices, corners, label, int(label.max()) + 1, limit)

    def planes(self) -> tuple[np.ndarray, np.ndarray]:
        """Origin (count, 3) and unit normal (count, 3) of each flat face."""
        points = self.vertices[self.corners]
        return _group_planes(points, _area_vectors(points), self.label, self.count)
