"""One body as the partition sees it: oriented facets, its flat faces, and what lies inside."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from bem.geometry.flat_faces import FlatFaces
from bem.geometry.rays import points_inside, ray_directions
from bem.geometry.regions.inside import inside_curve
from bem.geometry.revolved import Revolution
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import edges_of, open_edges, orient, pieces_of
from bem.geometry.tree import Tree, build_tree
from bem.geometry.weld import WELD

NUDGE = 1e-3
"""How far off its surface a body is probed for its inner side, per size of the triangle."""


@dataclass(frozen=True, eq=False)
class Facets:
    """Faces of one body; where it is closed their normals lead outward.

    Args:
        vertices: (v, 3).
        rows: (f, 4) corners of the faces, a triangle repeating its last.
        flat: the same faces, before they were turned, grouped by flat face.
        hollow: whether no point counts as inside, as for a sheet or a shell.
        curve: the true surface that the faces stand for, or None.
        covered: (f,) faces of which the partition of curved bodies has taken care.
    """

    vertices: np.ndarray
    rows: np.ndarray
    flat: FlatFaces
    hollow: bool
    curve: Revolution | None
    covered: np.ndarray

    @classmethod
    def of(cls, surface: Surface, hollow: bool) -> Facets:
        """Facets of a surface; a curve that it may have does not count."""
        flat = FlatFaces.of(surface)
        covered = np.zeros(len(flat.corners), dtype=bool)
        raw = cls(flat.vertices, flat.corners, flat, hollow, None, covered)
        rows = np.where(raw._turned()[:, None], reversed_rows(flat.corners), flat.corners)
        return replace(raw, rows=rows)

    @cached_property
    def triangles(self) -> np.ndarray:
        """(t, 3) vertices: a face's first triangle in its own place, second halves last."""
        quads = self.rows[self._is_quad]
        return np.concatenate([self.rows[:, :3], quads[:, [0, 2, 3]]])

    @cached_property
    def owner(self) -> np.ndarray:
        """(t,) face that each triangle belongs to."""
        return np.concatenate([np.arange(len(self.rows)), np.flatnonzero(self._is_quad)])

    @property
    def _is_quad(self) -> np.ndarray:
        return self.rows[:, 2] != self.rows[:, 3]

    @cached_property
    def corners(self) -> np.ndarray:
        """(t, 3, 3) corners of the triangles."""
        return self.vertices[self.triangles]

    @cached_property
    def areas(self) -> np.ndarray:
        """(t, 3) area vectors of the triangles."""
        c = self.corners
        return 0.5 * np.cross(c[:, 1] - c[:, 0], c[:, 2] - c[:, 0])

    @cached_property
    def normals(self) -> np.ndarray:
        """(t, 3) unit normals of the triangles."""
        return self.areas / np.linalg.norm(self.areas, axis=1)[:, None]

    @cached_property
    def bounds(self) -> np.ndarray:
        """(2, 3) lowest and highest coordinates."""
        points = self.corners.reshape(-1, 3)
        return np.array([points.min(axis=0), points.max(axis=0)])

    @cached_property
    def planes(self) -> tuple[np.ndarray, np.ndarray]:
        """Origin (g, 3) and normal (g, 3) of each flat face, the way its triangles run."""
        origin, normal = self.flat.planes()
        label = self.flat.label[self.owner]
        total = np.stack([np.bincount(label, self.areas[:, k]) for k in range(3)], axis=1)
        return origin, np.where(np.einsum("gx,gx->g", total, normal)[:, None] < 0, -normal, normal)

    @cached_property
    def tree(self) -> Tree:
        """Tree over the triangles."""
        return build_tree(self.corners)

    @cached_property
    def open_ends(self) -> np.ndarray:
        """(n, 2, 3) edges that leave the surface open."""
        edges = edges_of(self.triangles)
        size = float(np.linalg.norm(self.bounds[1] - self.bounds[0]))
        return self.vertices[edges.ends[open_edges(self.vertices, edges, 2.0 * WELD * size)]]

    @cached_property
    def closed(self) -> np.ndarray:
        """(t,) which triangles belong to a piece without open edges that bounds a solid."""
        number, piece = pieces_of(self.triangles)
        if self.hollow:
            return np.zeros(len(piece), dtype=bool)
        edges = edges_of(self.triangles)
        size = float(np.linalg.norm(self.bounds[1] - self.bounds[0]))
        open_ones = open_edges(self.vertices, edges, 2.0 * WELD * size)
        closed = np.ones(number, dtype=bool)
        closed[piece[np.isin(edges.owner, open_ones).reshape(-1, 3).any(axis=1)]] = False
        return closed[piece]

    def inside(self, points: np.ndarray) -> np.ndarray:
        """Which points (n, 3), none of them on the surface, lie inside closed pieces."""
        if self.curve is not None:
            return inside_curve(self.curve, points) & self.closed.all()
        low, high = self.bounds
        near = ((points >= low) & (points <= high)).all(axis=1)
        if near.any() and self.closed.any():
            near[near] = points_inside(self.tree, self.closed, points[near], ray_directions())
            return near
        return np.zeros(len(points), dtype=bool)

    def _turned(self) -> np.ndarray:
        """(f,) which faces have to be turned for normals to agree and to lead outward."""
        patch, sign = orient(self.triangles, edges_of(self.triangles))
        size = np.linalg.norm(self.areas, axis=1)
        order = np.lexsort([size, patch])
        largest = order[np.append(np.diff(patch[order]) > 0, True)]
        normal = self.normals[largest] * sign[largest, None]
        nudge = NUDGE * np.sqrt(size[largest])[:, None]
        inward = self.inside(self.corners[largest].mean(axis=1) + nudge * normal)
        return (np.where(inward[patch], -sign, sign) < 0)[: len(self.rows)]


def reversed_rows(rows: np.ndarray) -> np.ndarray:
    """Faces (f, 4) that run the other way round."""
    quad = rows[:, 2:3] != rows[:, 3:4]
    return np.where(quad, rows[:, [0, 3, 2, 1]], rows[:, [0, 2, 1, 1]])


def as_faces(rows: np.ndarray) -> np.ndarray:
    """Rows (f, 4) as a surface has them, a triangle with NO_CORNER last."""
    faces = rows.copy()
    faces[rows[:, 2] == rows[:, 3], 3] = NO_CORNER
    return faces
