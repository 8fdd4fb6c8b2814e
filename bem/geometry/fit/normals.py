"""Normals of the smooth surface at the corners of facets.

The corners of triangles around a vertex, between one crease and the next, make up a fan and
share a normal. It starts from the weights of N. Max (1999, "Weights for computing vertex normals
from facet normals"), sin(a) / (|e1| |e2|) for the corner of a flat face with angle a between
edges e1 and e2, which are exact on spheres and round cylinders. On other surfaces cut irregularly
they are off by the first power of the facets' size, as all local averages are, and so are those of
fans that a crease or rim cuts short. A few sweeps, over the latter first, draw them towards

    (n_a + n_b) . (b - a) = 0     on every edge ab,

which holds up to the third power of its length on any smooth surface, and exactly on spheres and
round cylinders.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from bem.geometry.fit.facets import Facets
from bem.geometry.fit.flats import straight_edges, truly_flat

SWEEPS, DAMPING = 6, 0.5
"""How often, and by which part of the way, normals follow those of their neighbours."""
FIRM = 1e-3
"""Weight of a fan's own normal in a direction that none of its edges shows."""
POINTED = 0.75
"""A fan is a tip, as of a cone, if a facet leans by more than this part of the crease angle."""


@dataclass(frozen=True, eq=False)
class Normals:
    """Normals at the corners of facets.

    Args:
        fan: (t, 3) fan that each corner of a triangle belongs to.
        normal: (f, 3) unit normal of each fan.
        pointed: (f,) bool: the surface has no normal there.
    """

    fan: np.ndarray
    normal: np.ndarray
    pointed: np.ndarray


def normals_of(facets: Facets, crease: float, tangent: np.ndarray) -> Normals:
    """Normals of all fans.

    Args:
        facets: of one body.
        crease: angle above which an edge is sharp, radians.
        tangent: (v, 3) unit tangent of the crease through each vertex, zero where there is none.
    """
    fan = _fans(facets)
    count = int(fan.max()) + 1
    normal = _averaged(facets, fan, count)
    lean = np.einsum("tki,ti->tk", normal[fan], facets.normal)
    pointed = np.zeros(count, dtype=bool)
    pointed[fan[lean < np.cos(POINTED * crease)]] = True
    fixed, held = _held(facets, fan, count)
    normal[held] = fixed[held]
    along = _level(facets, fan, tangent)
    normal = np.where(held[:, None], normal, _upright(normal, along))
    pull = _Pull.of(facets, fan, normal, pointed)
    free = ~(held | pointed)
    at_crease = np.zeros(count, dtype=bool)
    at_crease[fan[_beside_creases(facets)]] = True
    for moved, part in ((free & at_crease, 1.0), (free, DAMPING)):
        for _ in range(SWEEPS):
            normal[moved] = _upright(normal + part * pull.step(normal), along)[moved]
    return Normals(fan, normal, pointed)


def _level(facets: Facets, fan: np.ndarray, tangent: np.ndarray) -> np.ndarray:
    """(f, 3) directions that normals must be square to: of straight edges and of creases."""
    along = np.zeros((int(fan.max()) + 1, 3))
    straight = straight_edges(facets)
    chord = facets.chord[straight]
    triangle = facets.sides[straight, 0]
    for end in facets.ends[straight].T:
        along[fan[triangle, _place(facets.corners[triangle], end)]] = _unit(chord)
    creased = np.any(tangent[facets.corners], axis=2)
    along[fan[creased]] = tangent[facets.corners[creased]]
    return along


def _beside_creases(facets: Facets) -> np.ndarray:
    """(t, 3) corners of triangles at the ends of a crease or rim on one of their own sides."""
    crease = ~facets.soft[facets.edge]
    return crease | np.roll(crease, 1, axis=1)


def _fans(facets: Facets) -> np.ndarray:
    """(t, 3) number of the fan of each corner."""
    t = len(facets.corners)
    soft = np.flatnonzero(facets.soft)
    left, right = facets.sides[soft].T
    rows, columns = [], []
    for end in facets.ends[soft].T:
        rows.append(3 * left + _place(facets.corners[left], end))
        columns.append(3 * right + _place(facets.corners[right], end))
    links = np.concatenate(rows), np.concatenate(columns)
    graph = coo_array((np.ones(len(links[0]), dtype=bool), links), shape=(3 * t, 3 * t))
    return connected_components(graph, directed=False)[1].reshape(t, 3)


def _place(corners: np.ndarray, vertex: np.ndarray) -> np.ndarray:
    return np.argmax(corners == vertex[:, None], axis=1)


class _Wedges(NamedTuple):
    """Corners of flat faces: fan (w,), a triangle (w,), weight after Max and plain angle (w,)."""

    fan: np.ndarray
    triangle: np.ndarray
    weight: np.ndarray
    angle: np.ndarray


def _averaged(facets: Facets, fan: np.ndarray, count: int) -> np.ndarray:
    """(f, 3) weighted means of the normals of the flat faces at each fan."""
    wedges = _wedges(facets, fan)
    normal = facets.normal[wedges.triangle]
    total = _gathered(wedges.fan, wedges.weight[:, None] * normal, count)
    plain = _gathered(wedges.fan, wedges.angle[:, None] * normal, count)
    sure = _gathered(wedges.fan, wedges.weight[:, None], count)
    return _unit(np.where(sure > 0.0, total, plain))


def _wedges(facets: Facets, fan: np.ndarray) -> _Wedges:
    """Corners of triangles that belong to one fan and one flat face are one corner."""
    key = (fan * facets.flats + facets.flat[:, None]).ravel()
    _, first, wedge = np.unique(key, return_index=True, return_inverse=True)
    points = facets.points[facets.corners]
    ahead = np.roll(points, -1, axis=1) - points
    length = np.linalg.norm(ahead, axis=2)
    angle = np.bincount(wedge, _corner_angles(ahead).ravel())
    inner = (facets.soft & ~facets.bent)[facets.edge]
    outer = np.where(inner, 0.0, np.log(length))
    sides = np.bincount(wedge, (outer + np.roll(outer, 1, axis=1)).ravel())
    weight = np.maximum(np.sin(angle), 0.0) * np.exp(-sides)
    weight[angle > np.pi * (1.0 - 1e-6)] = 0.0
    return _Wedges(fan.ravel()[first], first // 3, weight, angle)


def _corner_angles(ahead: np.ndarray) -> np.ndarray:
    """(t, 3) angles at the corners of triangles with sides ``ahead`` (t, 3, 3)."""
    back = -np.roll(ahead, 1, axis=1)
    across = np.linalg.norm(np.cross(ahead, back), axis=2)
    return np.arctan2(across, np.einsum("tki,tki->tk", ahead, back))


def _held(facets: Facets, fan: np.ndarray, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Normals (f, 3) that truly flat faces dictate, and where (f,) they do."""
    flat = truly_flat(facets)
    fans = fan[flat].ravel()
    area = facets.area[flat, None] * facets.normal[flat]
    total = _gathered(fans, np.repeat(area, 3, axis=0), count)
    held = np.zeros(count, dtype=bool)
    held[fans] = True
    return _unit(total), held


@dataclass(frozen=True, eq=False)
class _Pull:
    """Sides of triangles that tie the normals of fans a (n,) and b (n,), and what they ask for.

    Args:
        a: (n,) fan at one end.
        b: (n,) fan at the other.
        side: (n, 3) from one to the other.
        weight: (n,) of the condition.
        inverse: (f, 3, 3) of the least-squares matrix of each fan.
    """

    a: np.ndarray
    b: np.ndarray
    side: np.ndarray
    weight: np.ndarray
    inverse: np.ndarray

    @classmethod
    def of(cls, facets: Facets, fan: np.ndarray, normal: np.ndarray, pointed: np.ndarray) -> _Pull:
        """Tie fans along the sides of triangles; tips pull at nobody."""
        points = facets.points[facets.corners]
        a, b = fan.ravel(), np.roll(fan, -1, axis=1).ravel()
        side = (np.roll(points, -1, axis=1) - points).reshape(-1, 3)
        weight = np.where(pointed[a] | pointed[b], 0.0, 1.0) / _dot(side, side) ** 2
        square = (side[:, :, None] * side[:, None, :]).reshape(-1, 9) * weight[:, None]
        matrix = _gathered(a, square, len(normal)) + _gathered(b, square, len(normal))
        size = np.maximum(matrix[:, ::4].sum(axis=1), 1e-300)[:, None, None]
        stiff = normal[:, :, None] * normal[:, None, :] + FIRM * np.eye(3)
        return cls(
            a, b, side, weight, np.linalg.inv(matrix.reshape(-1, 3, 3) / size + stiff) / size
        )

    def step(self, normal: np.ndarray) -> np.ndarray:
        """(f, 3) least-squares change of each normal that suits those of its neighbours."""
        off = (self.weight * _dot(normal[self.a] + normal[self.b], self.side))[:, None] * self.side
        miss = _gathered(self.a, off, len(normal)) + _gathered(self.b, off, len(normal))
        change = -np.einsum("fij,fj->fi", self.inverse, miss)
        return change - _dot(change, normal)[:, None] * normal


def _upright(normal: np.ndarray, along: np.ndarray) -> np.ndarray:
    """Unit vectors square to the tangents of creases."""
    return _unit(normal - _dot(normal, along)[:, None] * along)


def _gathered(group: np.ndarray, rows: np.ndarray, count: int) -> np.ndarray:
    """(count, c) sums of the rows (n, c) of each group."""
    return np.stack([np.bincount(group, column, count) for column in rows.T], axis=1)


def _dot(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    return np.einsum("ni,ni->n", a, b)


def _unit(vectors: np.ndarray) -> np.ndarray:
    size = np.linalg.norm(vectors, axis=1, keepdims=True)
    return vectors / np.maximum(size, 1e-300)
