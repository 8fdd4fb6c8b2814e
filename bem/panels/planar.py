"""The planar patches that the flat faces of a body make up: only their outlines are kept."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from bem.geometry.flat_faces import FlatFaces, sides_of
from bem.geometry.surface import Surface


class Owner(NamedTuple):
    """What a flat face belongs to: indices of the part, of its conductor, and of its body."""

    part: int
    conductor: int
    body: int

    @classmethod
    def whole(cls, conductor: int) -> Owner:
        """All of a conductor's surface."""
        return cls(conductor, conductor, conductor)


@dataclass(frozen=True)
class Patch:
    """One flat face of one part.

    Args:
        owner: of the face.
        origin: (3,) a point of its plane.
        axes: (3, 3) rows: two in-plane directions and the normal.
        edges: (e, 2, 2) outline in the plane, as unordered segments (holes included).
        faces: (f, 4, 2) the original faces in the plane, a triangle repeating its last corner.
        sagitta: mean distance of the smooth surface that it may stand for, along the normal
            that leads outward.
    """

    owner: Owner
    origin: np.ndarray
    axes: np.ndarray
    edges: np.ndarray
    faces: np.ndarray
    sagitta: float = 0.0

    @property
    def conductor(self) -> int:
        """Index of its conductor, or INTERFACE."""
        return self.owner.conductor

    def lift(self, xy: np.ndarray) -> np.ndarray:
        """Points (..., 2) of the plane in space (..., 3)."""
        return self.origin + xy @ self.axes[:2]

    def drop(self, xyz: np.ndarray) -> np.ndarray:
        """Points (..., 3) projected to the plane (..., 2)."""
        return (xyz - self.origin) @ self.axes[:2].T

    @property
    def size(self) -> float:
        """Diagonal of the outline's bounding box in the plane."""
        points = self.edges.reshape(-1, 2)
        return float(np.linalg.norm(np.ptp(points, axis=0)))


def _in_plane_axes(points: np.ndarray, normal: np.ndarray) -> np.ndarray:
    """Axes (3, 3) whose first runs along the longest side of the given (s, 2, 3) segments."""
    step = points[:, 1] - points[:, 0]
    along = step[np.argmax(np.linalg.norm(step, axis=1))]
    along = along - normal * (along @ normal)
    along /= np.linalg.norm(along)
    return np.stack([along, np.cross(normal, along), normal])


def _join_collinear(edges: np.ndarray, vertices: np.ndarray, limit: float) -> np.ndarray:
    """Vertex pairs (e, 2) with corners removed where exactly two collinear edges meet."""
    links: dict[int, list[int]] = {}
    for a, b in edges.tolist():
        links.setdefault(a, []).append(b)
        links.setdefault(b, []).append(a)
    for vertex in list(links):
        if len(links[vertex]) != 2:
            continue
        a, b = links[vertex]
        if a == b or b in links[a]:
            continue
        if _is_between(vertices[vertex], vertices[a], vertices[b], limit):
            links[a][links[a].index(vertex)] = b
            links[b][links[b].index(vertex)] = a
            del links[vertex]
    return np.array(sorted({(min(a, b), max(a, b)) for a in links for b in links[a]}))


def _is_between(x: np.ndarray, a: np.ndarray, b: np.ndarray, limit: float) -> bool:
    step = b - a
    t = float((x - a) @ step) / float(step @ step)
    return 0.0 < t < 1.0 and float(np.linalg.norm(x - a - t * step)) <= limit


def patches_of(faces: FlatFaces, owner: Owner, sagitta: np.ndarray | None = None) -> list[Patch]:
    """The flat faces of a part with their outlines, and the sagitta (count,) of each."""
    bulge = np.zeros(faces.count) if sagitta is None else sagitta
    origin, normal = faces.planes()
    order = np.argsort(faces.label, kind="stable")
    starts = np.searchsorted(faces.label[order], np.arange(faces.count + 1))
    return [
        _make_patch(
            faces.vertices,
            faces.corners[order[starts[g] : starts[g + 1]]],
            owner,
            (origin[g], normal[g], faces.limit),
            float(bulge[g]),
        )
        for g in range(faces.count)
    ]


def planar_patches(surface: Surface, conductor: int) -> list[Patch]:
    """The flat faces of a body, coplanar neighbours joined."""
    return patches_of(FlatFaces.of(surface), Owner.whole(conductor))


def _make_patch(vertices, corners, owner, plane, sagitta) -> Patch:
    origin, normal, limit = plane
    edges = sides_of(corners)
    rim = np.unique(edges.pairs[edges.count[edges.group] == 1], axis=0)
    if len(corners) > 1:
        rim = _join_collinear(rim, vertices, 0.1 * limit)
    axes = _in_plane_axes(vertices[rim], normal)
    down = axes[:2].T
    flat = (vertices[corners] - origin) @ down
    return Patch(owner, origin, axes, (vertices[rim] - origin) @ down, flat, sagitta)
