"""One body as the checks see it: its triangles, and what hangs together in them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from bem.geometry.fine import fine_facets
from bem.geometry.rays import points_inside, ray_directions
from bem.geometry.surface import Surface
from bem.geometry.topology import Edges, edges_of, open_edges, orient, pieces_of
from bem.geometry.tree import Tree, build_tree
from bem.geometry.weld import WELD, weld
from bem.scene.scene import Conductor, Dielectric

NUDGE = 1e-3
"""How far off its surface a body is probed for its inner side, per size of the triangle."""


@dataclass(frozen=True, eq=False)
class Body:
    """A conductor or dielectric and its triangles; quadrilaterals and curves count as faceted.

    Args:
        owner: in metres, placed.
        surface: its facets, welded.
    """

    owner: Conductor | Dielectric
    surface: Surface

    @cached_property
    def finer(self) -> Body:
        """The body itself, or with fine facets if it is curved."""
        curve = self.surface.curve
        return self if curve is None else Body(self.owner, fine_facets(curve))

    @cached_property
    def triangles(self) -> np.ndarray:
        """Vertices of the triangles, (t, 3)."""
        return self.surface.triangles

    @cached_property
    def corners(self) -> np.ndarray:
        """Corners of the triangles, (t, 3, 3) metres."""
        return self.surface.vertices[self.triangles]

    @cached_property
    def bounds(self) -> np.ndarray:
        """Lowest and highest coordinates, (2, 3) metres."""
        corners = self.corners.reshape(-1, 3)
        return np.array([corners.min(axis=0), corners.max(axis=0)])

    @cached_property
    def extent(self) -> float:
        """Diagonal of the bounding box, metres."""
        return float(np.linalg.norm(self.bounds[1] - self.bounds[0]))

    @cached_property
    def tree(self) -> Tree:
        """Tree over the triangles, for gaps and rays."""
        return build_tree(self.corners)

    @cached_property
    def edges(self) -> Edges:
        """Edges of the triangles."""
        return edges_of(self.triangles)

    @cached_property
    def open_edges(self) -> np.ndarray:
        """Edges (indices) that leave the surface open."""
        return open_edges(self.surface.vertices, self.edges, 2.0 * WELD * self.extent)

    @cached_property
    def pieces(self) -> tuple[int, np.ndarray]:
        """Number of pieces, and the piece (t,) of each triangle."""
        return pieces_of(self.triangles)

    @cached_property
    def in_closed_piece(self) -> np.ndarray:
        """Which triangles (t,) belong to a piece without open edges."""
        number, piece = self.pieces
        at_open_edge = np.isin(self.edges.owner, self.open_edges).reshape(-1, 3).any(axis=1)
        closed = np.ones(number, dtype=bool)
        closed[piece[at_open_edge]] = False
        return closed[piece]

    @property
    def closed(self) -> bool:
        """Whether every piece is closed."""
        return len(self.open_edges) == 0

    @cached_property
    def probes(self) -> np.ndarray:
        """One corner of each piece, (pieces, 3) metres."""
        _, first = np.unique(self.pieces[1], return_index=True)
        return self.corners[first, 0]

    def encloses(self, points: np.ndarray) -> np.ndarray:
        """Which points (n, 3) lie inside closed pieces; none may lie on the surface."""
        low, high = self.bounds
        near = ((points >= low) & (points <= high)).all(axis=1)
        if near.any() and self.in_closed_piece.any():
            near[near] = points_inside(
                self.tree, self.in_closed_piece, points[near], ray_directions()
            )
            return near
        return np.zeros(len(points), dtype=bool)

    @cached_property
    def area(self) -> float:
        """Area of the facets, m^2."""
        return 0.5 * float(np.linalg.norm(_vector_areas(self.corners), axis=1).sum())

    @cached_property
    def volume(self) -> float | None:
        """Volume between the facets, m^3; None if the surface is open.

        Each patch of triangles that run the same way round contributes the volume under
        it (divergence theorem), with the sign that its inner side tells.
        """
        if not self.closed:
            return None
        patch, sign = orient(self.triangles, self.edges)
        off = self.corners - self.bounds.mean(axis=0)
        under = np.einsum("tx,tx->t", off[:, 0], _vector_areas(self.corners)) / 6.0
        volumes = np.bincount(patch, weights=sign * under)
        if len(volumes) == 1:
            return abs(float(volumes[0]))
        return float(volumes @ self._outward(patch, sign))

    def _outward(self, patch: np.ndarray, sign: np.ndarray) -> np.ndarray:
        """Sign (p,) that turns each patch's normals outward."""
        areas = _vector_areas(self.corners) * sign[:, None]
        size = np.linalg.norm(areas, axis=1)
        order = np.lexsort([size, patch])
        largest = order[np.append(np.diff(patch[order]) > 0, True)]
        normal = areas[largest] / size[largest, None]
        nudge = NUDGE * np.sqrt(size[largest])[:, None]
        return np.where(self.encloses(self.corners[largest].mean(axis=1) + nudge * normal), -1, 1)

    @cached_property
    def worst_aspect(self) -> float:
        """Largest ratio of longest edge to smallest height among the triangles."""
        sides = np.roll(self.corners, -1, axis=1) - self.corners
        longest2 = np.einsum("tkx,tkx->tk", sides, sides).max(axis=1)
        doubled = np.linalg.norm(_vector_areas(self.corners), axis=1)
        return float((longest2 / doubled).max())


def _vector_areas(corners: np.ndarray) -> np.ndarray:
    """Twice the areas of triangles, as normal vectors (t, 3)."""
    return np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])


def body_of(owner: Conductor | Dielectric) -> Body:
    """Body as the checks need it; the facets of a curved shape are welded."""
    surface = owner.surface
    return Body(owner, surface if surface.curve is None else weld(surface)[0])
