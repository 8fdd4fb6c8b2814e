"""Faces inside solid metal leave: walls between cells that were glued to one body.

Each triangle has two sides. Around an edge, the side of one triangle faces the side of the
next one; sides that are linked so bound one and the same region. A region whose boundary,
seen from within, encloses a negative volume is a cell; a face between cells carries no
charge. Surfaces that leak make fewer cells, so that nothing leaves by mistake.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from bem.geometry.quads import triangle_owners
from bem.geometry.surface import Surface
from bem.geometry.topology import Edges, edges_of

LEAST_VOLUME = 1e-12
"""Cells smaller than this, per cube of the size, may be rounding."""


def drop_walls(surface: Surface) -> tuple[Surface, int]:
    """Drop faces with metal on both sides.

    Args:
        surface: welded faces of a body that is solid where it is closed.

    Returns:
        The surface, and the number of faces dropped.
    """
    triangles = surface.triangles
    edges = edges_of(triangles)
    if edges.uses.max() <= 2:
        return surface, 0
    cell = _cells(surface.vertices, triangles, edges)
    outer = np.unique(triangle_owners(surface.faces)[~cell.reshape(2, -1).all(axis=0)])
    return replace(surface, faces=surface.faces[outer]), len(surface.faces) - len(outer)


def _cells(vertices: np.ndarray, triangles: np.ndarray, edges: Edges) -> np.ndarray:
    """Which front sides (t,), then back sides (t,), bound a cell."""
    t = len(triangles)
    upper, lower = _facing(vertices, triangles, edges)
    links = coo_array((np.ones(len(upper), dtype=bool), (upper, lower)), shape=(2 * t, 2 * t))
    number, region = connected_components(links, directed=False)
    points = vertices[triangles] - vertices.mean(axis=0)
    under = np.einsum("tx,tx->t", points[:, 0], np.cross(points[:, 1], points[:, 2])) / 6.0
    volume = np.bincount(region, np.concatenate([under, -under]), minlength=number)
    least = LEAST_VOLUME * np.linalg.norm(np.ptp(vertices, axis=0)) ** 3
    return (volume < -least)[region]


def _facing(
    vertices: np.ndarray, triangles: np.ndarray, edges: Edges
) -> tuple[np.ndarray, np.ndarray]:
    """Pairs of sides (front t, back t + t) that face each other around an edge.

    Triangles at an edge are sorted by their angle about it. The front of one that runs along
    the edge looks towards the next angle, the back of it to the one before.
    """
    t = len(triangles)
    angle = _angles(vertices, triangles, edges)
    order = np.lexsort([angle, edges.owner])
    last = np.cumsum(edges.uses) - 1
    following = np.arange(3 * t) + 1
    following[last] = last - edges.uses + 1
    owner, forward = order // 3, edges.forward[order]
    towards_next = np.where(forward, owner, owner + t)
    towards_last = np.where(forward, owner + t, owner)
    return towards_next, towards_last[following]


def _angles(vertices: np.ndarray, triangles: np.ndarray, edges: Edges) -> np.ndarray:
    """Angle (3 t,) of each triangle about each of its edges, from any one at the edge."""
    start, stop = vertices[edges.ends[edges.owner]].transpose(1, 0, 2)
    axis = (stop - start) / np.linalg.norm(stop - start, axis=1)[:, None]
    away = vertices[np.roll(triangles, 1, axis=1).ravel()] - start
    away -= axis * np.einsum("nx,nx->n", away, axis)[:, None]
    zero = np.empty(len(edges.ends), dtype=np.int64)
    zero[edges.owner] = np.arange(len(edges.owner))
    base = away[zero[edges.owner]]
    along = np.einsum("nx,nx->n", base, away)
    across = np.einsum("nx,nx->n", np.cross(axis, base), away)
    return np.arctan2(across, along)
