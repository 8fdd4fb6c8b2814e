"""How the triangles of one body hang together: pieces, open edges, orientation.

A piece is closed if each of its edges has an even number of triangles. Where a corner of
one triangle lies on the edge of another, the edge is cut there first, so that a mesh with
such joints, or without the needles that some exporters put there, still counts as closed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

MOST_JOINTS = 5_000_000
"""Candidates for corners on open edges beyond this are not looked through."""


@dataclass(frozen=True)
class Edges:
    """Edges of a set of t triangles.

    Args:
        ends: (e, 2) vertices, the lower first.
        owner: (3 t,) edge on each triangle's sides 01, 12, 20, triangle after triangle.
        forward: (3 t,) bool, whether the side runs from the lower to the higher vertex.
        uses: (e,) number of triangles at each edge.
    """

    ends: np.ndarray
    owner: np.ndarray
    forward: np.ndarray
    uses: np.ndarray


def edges_of(triangles: np.ndarray) -> Edges:
    """Edges of triangles (t, 3), given by their vertices."""
    sides = triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2)
    low, high = sides.min(axis=1), sides.max(axis=1)
    span = int(triangles.max()) + 1
    key, owner, uses = np.unique(low * span + high, return_inverse=True, return_counts=True)
    ends = np.stack([key // span, key % span], axis=1)
    return Edges(ends, owner, sides[:, 0] < sides[:, 1], uses)


def pieces_of(triangles: np.ndarray) -> tuple[int, np.ndarray]:
    """Count pieces that share no vertex; also returns the piece (t,) of each triangle."""
    _, compact = np.unique(triangles, return_inverse=True)
    compact = compact.reshape(-1, 3)
    rows, columns = compact[:, [0, 1]].T.ravel(), compact[:, [1, 2]].T.ravel()
    size = int(compact.max()) + 1
    links = coo_array((np.ones(len(rows), dtype=bool), (rows, columns)), shape=(size, size))
    number, piece = connected_components(links, directed=False)
    return number, piece[compact[:, 0]]


def open_edges(vertices: np.ndarray, edges: Edges, tolerance: float) -> np.ndarray:
    """Edges (indices) with an odd number of triangles after cutting at corners on them.

    Args:
        vertices: (v, 3) metres.
        edges: of the triangles.
        tolerance: a corner this near to an edge lies on it, metres.
    """
    odd = np.flatnonzero(edges.uses % 2)
    if len(odd) == 0:
        return odd
    ends = edges.ends[odd]
    cut, corner = corners_on(vertices, ends, tolerance)
    segments, source = cut_edges(vertices, ends, cut, corner)
    span = len(vertices)
    key = segments.min(axis=1) * span + segments.max(axis=1)
    _, group, count = np.unique(key, return_inverse=True, return_counts=True)
    return odd[np.unique(source[count[group] % 2 == 1])]


def corners_on(
    vertices: np.ndarray, ends: np.ndarray, tolerance: float
) -> tuple[np.ndarray, np.ndarray]:
    """Find corners of edges that lie on other edges.

    Args:
        vertices: (v, 3) metres.
        ends: (e, 2) vertices of the edges.
        tolerance: a corner this near to an edge lies on it, metres.

    Returns:
        (n,) edge and (n,) vertex of each find.
    """
    from scipy.spatial import cKDTree

    used = np.unique(ends)
    tree = cKDTree(vertices[used])
    start, stop = vertices[ends[:, 0]], vertices[ends[:, 1]]
    ball = (0.5 * (start + stop), 0.5 * np.linalg.norm(stop - start, axis=1))
    many = tree.query_ball_point(*ball, return_length=True)
    if many.sum() > MOST_JOINTS:
        return np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64)
    corner = used[np.concatenate(tree.query_ball_point(*ball)).astype(np.int64)]
    edge = np.repeat(np.arange(len(ends)), many)
    on = _lies_on(vertices[corner], start[edge], stop[edge], tolerance)
    return edge[on], corner[on]


def _lies_on(
    point: np.ndarray, start: np.ndarray, stop: np.ndarray, tolerance: float
) -> np.ndarray:
    """Whether points (n, 3) lie on segments, and not at their ends."""
    along = stop - start
    length = np.linalg.norm(along, axis=1)
    far = np.einsum("nx,nx->n", point - start, along) / length
    off = np.linalg.norm(np.cross(point - start, along), axis=1) / length
    return (off <= tolerance) & (far > tolerance) & (far < length - tolerance)


def cut_edges(
    vertices: np.ndarray, ends: np.ndarray, cut: np.ndarray, corner: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Segments (s, 2) that edges fall into at corners on them, and the edge (s,) of each."""
    edge = np.concatenate([np.arange(len(ends)), np.arange(len(ends)), cut])
    vertex = np.concatenate([ends[:, 0], ends[:, 1], corner])
    start = vertices[ends[edge, 0]]
    far = np.einsum("nx,nx->n", vertices[vertex] - start, vertices[ends[edge, 1]] - start)
    order = np.lexsort([far, edge])
    edge, vertex = edge[order], vertex[order]
    inner = edge[1:] == edge[:-1]
    return np.stack([vertex[:-1], vertex[1:]], axis=1)[inner], edge[:-1][inner]


def orient(triangles: np.ndarray, edges: Edges) -> tuple[np.ndarray, np.ndarray]:
    """Make neighbours run the same way round.

    Works on a double cover: each triangle stands there as it is and reversed, linked to
    its neighbours across edges of two triangles; what hangs together is one orientation.

    Returns:
        (t,) patch of each triangle, numbered from 0, and (t,) sign +1 or -1 that makes
        all triangles of a patch run the same way.
    """
    t = len(triangles)
    order = np.argsort(edges.owner, kind="stable")
    first = (np.cumsum(edges.uses) - edges.uses)[edges.uses == 2]
    one, two = order[first], order[first + 1]
    agree = edges.forward[one] != edges.forward[two]
    a, b = one // 3, two // 3
    rows = np.concatenate([a, a + t])
    columns = np.concatenate([np.where(agree, b, b + t), np.where(agree, b + t, b)])
    links = coo_array((np.ones(len(rows), dtype=bool), (rows, columns)), shape=(2 * t, 2 * t))
    _, side = connected_components(links, directed=False)
    as_is, reverse = side[:t], side[t:]
    _, patch = np.unique(np.minimum(as_is, reverse), return_inverse=True)
    return patch, np.where(as_is <= reverse, 1, -1)
