"""The bodies of one surface: pieces that share no vertex, each with its inner walls.

A closed piece inside an odd number of other closed pieces is the inner wall of a hollow body,
and stays with the piece just around it; one inside an even number is a body of its own.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.rays import points_inside, ray_directions
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import edges_of, open_edges, pieces_of
from bem.geometry.tree import build_tree
from bem.geometry.weld import WELD


def split_bodies(surface: Surface) -> list[Surface]:
    """Bodies of a surface, in the order of their first faces.

    Args:
        surface: welded, metres.
    """
    triangles = surface.triangles
    number, piece = pieces_of(triangles)
    face_piece = np.empty(len(surface.faces), dtype=np.int64)
    face_piece[_face_of_triangles(surface)] = piece
    body = _bodies(surface, triangles, piece) if number > 1 else np.zeros(1, dtype=np.int64)
    order = dict.fromkeys(body[face_piece].tolist())
    return [_portion(surface, body[face_piece] == one) for one in order]


def _face_of_triangles(surface: Surface) -> np.ndarray:
    """Face (t,) of each of ``surface.triangles``."""
    quads = np.flatnonzero(~surface.is_triangle)
    return np.concatenate([np.flatnonzero(surface.is_triangle), quads, quads])


def _portion(surface: Surface, chosen: np.ndarray) -> Surface:
    """Some of the faces, with the vertices that they use."""
    faces = surface.faces[chosen]
    used = np.unique(faces[faces != NO_CORNER])
    place = np.full(len(surface.vertices) + 1, NO_CORNER)
    place[used] = np.arange(len(used))
    return replace(surface, vertices=surface.vertices[used], faces=place[faces])


def _bodies(surface: Surface, triangles: np.ndarray, piece: np.ndarray) -> np.ndarray:
    """Body (p,) of each piece: itself, or the piece whose inner wall it is."""
    closed = _closed(surface, triangles, piece)
    around = _around(surface.vertices[triangles], piece, closed)
    depth = around.sum(axis=1)
    body = np.arange(len(closed))
    for wall in np.flatnonzero(closed & (depth % 2 == 1)):
        (just_around,) = np.flatnonzero(around[wall] & (depth == depth[wall] - 1))[:1]
        body[wall] = just_around
    return body


def _closed(surface: Surface, triangles: np.ndarray, piece: np.ndarray) -> np.ndarray:
    """Which pieces (p,) have no open edge."""
    edges = edges_of(triangles)
    opened = open_edges(surface.vertices, edges, 2.0 * WELD * surface.extent)
    closed = np.ones(int(piece.max()) + 1, dtype=bool)
    closed[piece[np.isin(edges.owner, opened).reshape(-1, 3).any(axis=1)]] = False
    return closed


def _around(corners: np.ndarray, piece: np.ndarray, closed: np.ndarray) -> np.ndarray:
    """Whether piece j is closed and lies around piece i, (p, p) bool.

    Args:
        corners: (t, 3, 3) of the triangles.
        piece: (t,) piece of each.
        closed: (p,) which pieces are.
    """
    _, first = np.unique(piece, return_index=True)
    low, high = _boxes(corners, piece, len(closed))
    around = (low[None] < low[:, None]).all(axis=2) & (high[None] > high[:, None]).all(axis=2)
    around &= closed[None, :]
    if around.any():
        tree, probes = build_tree(corners), corners[first, 0]
        for outer in np.flatnonzero(around.any(axis=0)):
            inner = np.flatnonzero(around[:, outer])
            around[inner, outer] = points_inside(
                tree, piece == outer, probes[inner], ray_directions()
            )
    return around


def _boxes(corners: np.ndarray, piece: np.ndarray, number: int) -> tuple[np.ndarray, np.ndarray]:
    """Lowest and highest coordinates (p, 3) of each piece."""
    low, high = np.full((number, 3), np.inf), np.full((number, 3), -np.inf)
    for k in range(3):
        np.minimum.at(low, piece, corners[:, k])
        np.maximum.at(high, piece, corners[:, k])
    return low, high
