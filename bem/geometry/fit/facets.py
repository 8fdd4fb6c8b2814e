"""The facets of a body that may stand for a smooth surface: which of their edges are creases.

Two flat faces that share an edge and turn there by less than the crease angle are taken for
neighbouring facets of one smooth surface: their edge is soft. All other edges are creases:
sharper ones, free rims, and edges of three faces and more. An edge inside a flat face, where
it was cut into triangles, is soft and does not turn.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np

from bem.geometry.flat_faces import FlatFaces
from bem.geometry.topology import Edges, edges_of, orient


@dataclass(frozen=True, eq=False)
class Facets:
    """Triangles of a body that run the same way round, by themselves outward if it is closed.

    Args:
        points: (v, 3) vertices.
        corners: (t, 3) vertices of each triangle.
        flat: (t,) flat face that each belongs to.
        normal: (t, 3) unit normal of that face.
        edge: (t, 3) edge on the sides 01, 12, 20 of each.
        ends: (e, 2) vertices of each edge, the lower first.
        sides: (e, 2) triangles at each edge; alone, or where three meet, the first twice.
        uses: (e,) number of triangles at each edge.
        turn: (e,) angle between the normals on both sides, radians.
        soft: (e,) bool, whether the surface runs on smoothly.
    """

    points: np.ndarray
    corners: np.ndarray
    flat: np.ndarray
    normal: np.ndarray
    edge: np.ndarray
    ends: np.ndarray
    sides: np.ndarray
    uses: np.ndarray
    turn: np.ndarray
    soft: np.ndarray

    @classmethod
    def of(cls, faces: FlatFaces, crease: float, turned: bool = False) -> Facets:
        """Triangles of flat faces.

        Args:
            faces: of one body.
            crease: a turn above this is sharp, radians.
            turned: the faces run the right way round already.
        """
        triangles, flat = _triangles(faces)
        edges = edges_of(triangles)
        corners, edge = triangles, edges.owner.reshape(-1, 3)
        if not turned:
            corners, edge = _oriented(faces.vertices, triangles, edges)
        normal = _normals(faces.vertices[corners], flat)
        sides, alike = _meeting(corners, edge, edges.uses)
        turn = np.where(flat[sides[:, 0]] == flat[sides[:, 1]], 0.0, _angle(*normal[sides.T]))
        soft = alike & (turn <= crease)
        lines = edges.ends, sides, edges.uses, turn, soft
        return cls(faces.vertices, corners, flat, normal, edge, *lines)

    @cached_property
    def flats(self) -> int:
        """Number of flat faces."""
        return int(self.flat.max()) + 1

    @cached_property
    def bent(self) -> np.ndarray:
        """(e,) bool: soft edges between two flat faces."""
        return self.soft & (self.flat[self.sides[:, 0]] != self.flat[self.sides[:, 1]])

    @property
    def rim(self) -> np.ndarray:
        """(e,) bool: edges of one triangle only."""
        return self.uses == 1

    @cached_property
    def chord(self) -> np.ndarray:
        """(e, 3) from the lower to the higher end of each edge."""
        return self.points[self.ends[:, 1]] - self.points[self.ends[:, 0]]

    @cached_property
    def area(self) -> np.ndarray:
        """(t,) area of each triangle."""
        return np.linalg.norm(_area_vectors(self.points[self.corners]), axis=1)

    @property
    def steepest(self) -> np.ndarray:
        """(t,) largest turn at a soft edge of the flat face that each triangle belongs to."""
        largest, bent = np.zeros(self.flats), self.bent
        for side in self.sides[bent].T:
            np.maximum.at(largest, self.flat[side], self.turn[bent])
        return largest[self.flat]


def _triangles(faces: FlatFaces) -> tuple[np.ndarray, np.ndarray]:
    """Triangles (t, 3) of flat faces and the face (t,) that each belongs to."""
    first, second = faces.corners[:, [0, 1, 2]], faces.corners[:, [0, 2, 3]]
    quad = faces.corners[:, 2] != faces.corners[:, 3]
    return (
        np.concatenate([first, second[quad]]),
        np.concatenate([faces.label, faces.label[quad]]),
    )


def _area_vectors(points: np.ndarray) -> np.ndarray:
    return 0.5 * np.cross(points[:, 1] - points[:, 0], points[:, 2] - points[:, 0])


def _oriented(
    points: np.ndarray, triangles: np.ndarray, edges: Edges
) -> tuple[np.ndarray, np.ndarray]:
    """Corners (t, 3) of the triangles, turned alike, and the edges (t, 3) on their sides."""
    patch, sign = orient(triangles, edges)
    turned = sign * _outward(points[triangles], patch, sign)[patch] < 0
    corners, edge = triangles.copy(), edges.owner.reshape(-1, 3).copy()
    corners[turned] = triangles[turned][:, [0, 2, 1]]
    edge[turned] = edge[turned][:, ::-1]
    return corners, edge


def _outward(corners: np.ndarray, patch: np.ndarray, sign: np.ndarray) -> np.ndarray:
    """(p,) sign of the volume under each patch, seen from its own middle."""
    count = np.bincount(patch)
    middle = corners.mean(axis=1)
    centre = np.stack([np.bincount(patch, x) for x in middle.T], axis=1) / count[:, None]
    height = np.einsum("tx,tx->t", middle - centre[patch], _area_vectors(corners))
    return np.where(np.bincount(patch, sign * height) < 0.0, -1, 1)


def _normals(corners: np.ndarray, flat: np.ndarray) -> np.ndarray:
    """(t, 3) unit normals of the flat faces that triangles belong to."""
    total = np.stack([np.bincount(flat, x) for x in _area_vectors(corners).T], axis=1)
    size = np.linalg.norm(total, axis=1, keepdims=True)
    return (total / np.maximum(size, 1e-300))[flat]


class _Meeting(NamedTuple):
    """Triangles (e, 2) at each edge, and whether (e,) there are two that run the same way."""

    sides: np.ndarray
    alike: np.ndarray


def _meeting(corners: np.ndarray, edge: np.ndarray, uses: np.ndarray) -> _Meeting:
    order = np.argsort(edge.ravel(), kind="stable")
    first = np.cumsum(uses) - uses
    one, two = order[first], order[first + (uses == 2)]
    forward = (corners < np.roll(corners, -1, axis=1)).ravel()
    alike = (uses == 2) & (forward[one] != forward[two])
    return _Meeting(np.stack([one, two], axis=1) // 3, alike)


def _angle(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """(n,) angles between unit vectors (n, 3), accurate where small."""
    return 2.0 * np.arctan2(np.linalg.norm(a - b, axis=1), np.linalg.norm(a + b, axis=1))
