"""The part of a faceted surface on one side of a plane; what is cut off leaves no cap."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.planes import Plane
from bem.geometry.surface import NO_CORNER, Surface


def clipped(surface: Surface, plane: Plane, tolerance: float, in_plane: bool) -> Surface:
    """Faces on the side of larger coordinates, those that cross cut at the plane.

    Args:
        surface: faceted.
        plane: where to cut.
        tolerance: vertices this near to the plane are put onto it.
        in_plane: whether faces that lie in the plane stay.
    """
    vertices = surface.vertices.copy()
    on_plane = np.abs(plane.height(vertices)) <= tolerance
    vertices[on_plane, plane.axis] = plane.at
    height = plane.height(vertices)
    of_face = np.where(surface.faces == NO_CORNER, 0.0, height[surface.faces])
    low, high = of_face.min(axis=1), of_face.max(axis=1)
    kept = (low >= 0.0) & ((high > 0.0) | in_plane)
    cutter = _Cutter(vertices, height)
    cut = [part for face in surface.faces[(low < 0.0) & (high > 0.0)] for part in cutter.cut(face)]
    faces = np.concatenate([surface.faces[kept], np.array(cut, dtype=np.int64).reshape(-1, 4)])
    return _compact(replace(surface, vertices=cutter.vertices(), faces=faces))


class _Cutter:
    """Cuts faces at height zero, each edge at one vertex for all faces that share it."""

    def __init__(self, vertices: np.ndarray, height: np.ndarray) -> None:
        self._vertices, self._height = vertices, height
        self._on_edge: dict[tuple[int, int], int] = {}
        self._new: list[np.ndarray] = []

    def vertices(self) -> np.ndarray:
        """All vertices, the new ones last."""
        return np.concatenate([self._vertices, np.array(self._new).reshape(-1, 3)])

    def cut(self, face: np.ndarray) -> list[list[int]]:
        """Faces (4 corners each, -1 last in a triangle) that are left of a convex one."""
        corners = [int(v) for v in face if v != NO_CORNER]
        ring: list[int] = []
        for a, b in zip(corners, [*corners[1:], corners[0]], strict=True):
            if self._height[a] >= 0.0:
                ring.append(a)
            if self._height[a] * self._height[b] < 0.0:
                ring.append(self._crossing(min(a, b), max(a, b)))
        if len(ring) == 4:
            return [ring]
        return [[ring[0], ring[k], ring[k + 1], NO_CORNER] for k in range(1, len(ring) - 1)]

    def _crossing(self, a: int, b: int) -> int:
        """Vertex where the edge from a to b meets the plane."""
        if (a, b) not in self._on_edge:
            t = self._height[a] / (self._height[a] - self._height[b])
            self._on_edge[a, b] = len(self._vertices) + len(self._new)
            self._new.append(self._vertices[a] + t * (self._vertices[b] - self._vertices[a]))
        return self._on_edge[a, b]


def _compact(surface: Surface) -> Surface:
    """The surface without vertices that no face uses."""
    used = np.unique(surface.faces[surface.faces != NO_CORNER])
    place = np.full(len(surface.vertices) + 1, NO_CORNER)
    place[used] = np.arange(len(used))
    return replace(surface, vertices=surface.vertices[used], faces=place[surface.faces])
