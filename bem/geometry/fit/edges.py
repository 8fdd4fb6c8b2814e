"""Edges of facets bent to the smooth surface: cubic curves with given directions at their ends.

A handle along the unit tangent t of a chord c has the length

    (2/3) |c| / (1 + cos phi),     phi the angle between t and c,

which makes the best cubic of a circular arc: off by the sixth power of its angle. Tangents of a
soft edge lie square to the normals of the surface. Creases and free rims are followed as curves:
at a vertex where exactly two of them meet at less than the crease angle the tangent is that of
the circle through three vertices; a stretch much longer than its neighbours is straight. Where
there is no tangent, at a corner or a tip, the curve is made symmetric to its other end; a free
rim with corners follows the surface.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.fit.facets import Facets
from bem.geometry.fit.flats import MUCH_WIDER
from bem.geometry.fit.normals import Normals

STEEPEST = 0.2
"""Cosine between chord and tangent below which the edge is left straight."""


class _Bends(NamedTuple):
    """Vertices (b,) where a crease runs on, its two edges (b, 2), and the way (b, 2, 3) along."""

    vertex: np.ndarray
    edge: np.ndarray
    step: np.ndarray

    @property
    def length(self) -> np.ndarray:
        """(b, 2) lengths of the two edges."""
        return np.linalg.norm(self.step, axis=2)


def crease_tangents(facets: Facets, crease: float) -> np.ndarray:
    """(v, 3) unit tangent of the crease or rim through each vertex, zero where none runs on."""
    bends = _bends(facets, crease)
    length = bends.length
    straight = _straight(len(facets.ends), bends)[bends.edge]
    weight = np.where(straight.any(axis=1, keepdims=True), straight, 1.0) / length**2
    tangent = np.zeros_like(facets.points)
    tangent[bends.vertex] = _unit(np.einsum("bk,bki->bi", weight, bends.step))
    return tangent


def _bends(facets: Facets, crease: float) -> _Bends:
    creases = np.flatnonzero(~facets.soft)
    vertex = facets.ends[creases].ravel()
    order = np.argsort(vertex, kind="stable")
    found, first, count = np.unique(vertex[order], return_index=True, return_counts=True)
    two = order[first[count == 2][:, None] + np.arange(2)]
    here, edge = found[count == 2], creases[two // 2]
    other = facets.ends[edge, 1 - two % 2]
    step = facets.points[other] - facets.points[here][:, None]
    step[:, 0] *= -1.0
    unit = step / np.linalg.norm(step, axis=2, keepdims=True)
    smooth = _dot(unit[:, 0], unit[:, 1]) >= np.cos(crease)
    return _Bends(here[smooth], edge[smooth], step[smooth])


def _straight(edges: int, bends: _Bends) -> np.ndarray:
    """(e,) which edges are much longer than each that runs on from them."""
    length = bends.length
    some, against = np.zeros(edges, dtype=bool), np.zeros(edges, dtype=bool)
    some[bends.edge] = True
    against[bends.edge[length < MUCH_WIDER * length[:, ::-1]]] = True
    return some & ~against


def edge_curves(facets: Facets, normals: Normals, tangent: np.ndarray) -> np.ndarray:
    """(e, 2, 3) inner control points of the cubic along each edge, the lower end's first.

    Args:
        facets: of one body.
        normals: at their corners.
        tangent: (v, 3) of creases, as ``crease_tangents`` gives them.
    """
    chord = facets.chord
    length = np.linalg.norm(chord, axis=1)
    unit = chord / length[:, None]
    ends = [_end_tangents(facets, normals, tangent, unit, k) for k in (0, 1)]
    low, high = (_or_mirrored(ends[k], ends[1 - k], unit) for k in (0, 1))
    points = facets.points[facets.ends]
    reach = [(length / (1.5 * (1.0 + _dot(t, unit))))[:, None] * t for t in (low, high)]
    return np.stack([points[:, 0] + reach[0], points[:, 1] - reach[1]], axis=1)


def _end_tangents(
    facets: Facets, normals: Normals, tangent: np.ndarray, unit: np.ndarray, end: int
) -> np.ndarray:
    """(e, 3) unit tangents at one end of each edge, the way of its chord, zero where none is."""
    vertex = facets.ends[:, end]
    along = tangent[vertex] * np.sign(_dot(tangent[vertex], unit))[:, None]
    triangle = facets.sides[:, 0]
    place = np.argmax(facets.corners[triangle] == vertex[:, None], axis=1)
    fan = normals.fan[triangle, place]
    normal = normals.normal[fan]
    level = _unit(unit - _dot(unit, normal)[:, None] * normal)
    level[normals.pointed[fan]] = 0.0
    square = facets.soft | (facets.rim & ~np.any(along, axis=1))
    found = np.where(square[:, None], level, along)
    found[_dot(found, unit) < STEEPEST] = 0.0
    return found


def _or_mirrored(tangent: np.ndarray, other: np.ndarray, unit: np.ndarray) -> np.ndarray:
    """Where there is no tangent: the mirror image of the other end's, or the chord."""
    mirrored = 2.0 * _dot(other, unit)[:, None] * unit - other
    instead = np.where(np.any(other, axis=1, keepdims=True), mirrored, unit)
    return np.where(np.any(tangent, axis=1, keepdims=True), tangent, instead)


def _dot(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    return np.einsum("ni,ni->n", a, b)


def _unit(vectors: np.ndarray) -> np.ndarray:
    size = np.linalg.norm(vectors, axis=1, keepdims=True)
    return vectors / np.maximum(size, 1e-300)
