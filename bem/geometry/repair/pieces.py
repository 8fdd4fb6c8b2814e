"""Closed pieces of one solid that run into each other become one piece."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from bem.geometry.quads import triangle_owners
from bem.geometry.repair.overlap import Overlaps
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import Edges, edges_of, orient


def unite_pieces(surface: Surface, overlaps: Overlaps) -> tuple[Surface, int]:
    """Unite pieces that overlap or cross, by a library for booleans of solids.

    Args:
        surface: welded faces of a body that is solid where it is closed.
        overlaps: of its triangles, with pieces as ``orient`` tells them.

    Returns:
        The surface, its united faces last, and the number of pieces that went into them;
        zero where a piece is open or the library refuses.
    """
    triangles = surface.triangles
    edges = edges_of(triangles)
    piece, sign = orient(triangles, edges)
    groups = _groups(piece, overlaps, _closed(edges, piece))
    corners = surface.vertices[np.where(sign[:, None] > 0, triangles, triangles[:, ::-1])]
    united = [_union([corners[piece == k] for k in group]) for group in groups]
    done = [k for k, solid in enumerate(united) if solid is not None]
    if not done:
        return surface, 0
    gone = np.isin(piece, np.concatenate([groups[k] for k in done]))
    rest = np.delete(surface.faces, triangle_owners(surface.faces)[gone], axis=0)
    fresh = np.concatenate([united[k] for k in done])
    return with_triangles(replace(surface, faces=rest), fresh), sum(len(groups[k]) for k in done)


def with_triangles(surface: Surface, corners: np.ndarray) -> Surface:
    """Surface with triangles (t, 3, 3) added, not welded."""
    vertices = np.concatenate([surface.vertices, corners.reshape(-1, 3)])
    new = np.arange(len(surface.vertices), len(vertices)).reshape(-1, 3)
    faces = np.column_stack([new, np.full(len(new), NO_CORNER)])
    return replace(surface, vertices=vertices, faces=np.concatenate([surface.faces, faces]))


def _closed(edges: Edges, piece: np.ndarray) -> np.ndarray:
    """Which pieces (p,) have two of their own triangles at each edge."""
    own = np.repeat(piece, 3)
    number = int(piece.max()) + 1
    _, first, uses = np.unique(edges.owner * number + own, return_index=True, return_counts=True)
    closed = np.ones(number, dtype=bool)
    closed[own[first[uses != 2]]] = False
    return closed


def _groups(piece: np.ndarray, overlaps: Overlaps, closed: np.ndarray) -> list[np.ndarray]:
    """Pieces of each group of closed ones that overlap or cross."""
    pairs = piece[np.concatenate([overlaps.coplanar, overlaps.crossing])]
    pairs = pairs[closed[pairs].all(axis=1)]
    size = len(closed)
    links = coo_array((np.ones(len(pairs)), pairs.T), shape=(size, size))
    number, group = connected_components(links, directed=False)
    return [np.flatnonzero(group == k) for k in range(number) if (group == k).sum() > 1]


def _union(pieces: list[np.ndarray]) -> np.ndarray | None:
    """Triangles (t, 3, 3) around the union of solids; None if the library refuses one."""
    from manifold3d import Manifold, OpType

    union = Manifold.batch_boolean([_solid(corners) for corners in pieces], OpType.Add)
    mesh = union.to_mesh64()
    corners = np.asarray(mesh.vert_properties)[:, :3][np.asarray(mesh.tri_verts).astype(np.int64)]
    return None if union.is_empty() else corners


def _solid(corners: np.ndarray):
    from manifold3d import Manifold, Mesh64

    volume = np.einsum("tx,tx->", corners[:, 0], np.cross(corners[:, 1], corners[:, 2]))
    points, index = np.unique(corners.reshape(-1, 3), axis=0, return_inverse=True)
    triangles = index.reshape(-1, 3)[:, :: 1 if volume > 0.0 else -1]
    return Manifold(Mesh64(points, np.ascontiguousarray(triangles, dtype=np.uint64)))
