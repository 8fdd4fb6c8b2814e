"""Corners on the edges of neighbours become corners of those neighbours too (T-junctions).

A triangle with a foreign corner on one of its edges falls in two there. Where exporters
leave out such corners, surfaces hang together only to the eye; afterwards they share
edges, so that they count as closed and flat neighbours are joined to one face.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.quads import triangle_owners
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import Edges, corners_on, edges_of

MOST_ROUNDS = 40
"""Each round halves the number of corners on an edge; more rounds than this are no joint."""


def join_corners(surface: Surface, tolerance: float) -> tuple[Surface, int]:
    """Split triangles at corners of others that lie on their open edges.

    Args:
        surface: welded faces; a quadrilateral with such a corner becomes triangles.
        tolerance: a corner this near to an edge lies on it, metres.

    Returns:
        The surface, and the number of corners joined; the surface itself if that leaves
        as many open edges as before.
    """
    before = _odd_count(surface)
    joined, corners = surface, set[int]()
    for _ in range(MOST_ROUNDS):
        joined, found = _split_once(joined, tolerance)
        if not found:
            break
        corners.update(found)
    if not corners or _odd_count(joined) >= before:
        return surface, 0
    return joined, len(corners)


def _odd_count(surface: Surface) -> int:
    return int((edges_of(surface.triangles).uses % 2).sum())


def _split_once(surface: Surface, tolerance: float) -> tuple[Surface, list[int]]:
    """Split each triangle at one corner on one of its open edges at most; tell the corners."""
    edges = edges_of(surface.triangles)
    corner_on = _middle_corners(surface.vertices, edges, tolerance)
    if not (corner_on >= 0).any():
        return surface, []
    surface, opened = _without_quads(surface, edges, corner_on)
    if opened:
        edges = edges_of(surface.triangles)
        corner_on = _middle_corners(surface.vertices, edges, tolerance)
    return _split_triangles(surface, corner_on[edges.owner].reshape(-1, 3))


def _middle_corners(vertices: np.ndarray, edges: Edges, tolerance: float) -> np.ndarray:
    """The corner (e,) on each open edge that lies nearest to its middle, or -1."""
    result = np.full(len(edges.ends), -1)
    odd = np.flatnonzero(edges.uses % 2)
    if len(odd) == 0:
        return result
    ends = edges.ends[odd]
    on, corner = corners_on(vertices, ends, tolerance)
    off_middle = np.linalg.norm(vertices[corner] - vertices[ends[on]].mean(axis=1), axis=1)
    order = np.lexsort([-off_middle, on])
    result[odd[on[order]]] = corner[order]
    return result


def _without_quads(surface: Surface, edges: Edges, corner_on: np.ndarray) -> tuple[Surface, bool]:
    """Turn quadrilaterals with a corner on an edge into triangles; tell whether there are any."""
    hit = (corner_on[edges.owner].reshape(-1, 3) >= 0).any(axis=1)
    hit_faces = np.unique(triangle_owners(surface.faces)[hit])
    split = hit_faces[~surface.is_triangle[hit_faces]]
    faces = surface.faces.copy()
    halves = faces[split][:, [0, 2, 3, 3]]
    faces[split, 3] = halves[:, 3] = NO_CORNER
    return replace(surface, faces=np.concatenate([faces, halves])), len(split) > 0


def _split_triangles(surface: Surface, corner_on: np.ndarray) -> tuple[Surface, list[int]]:
    """Split triangles at the corner on their first such side; ``corner_on`` is (t, 3)."""
    rows = np.flatnonzero(surface.is_triangle)
    corner_on = corner_on[: len(rows)]
    usable = (corner_on >= 0) & (corner_on != np.roll(surface.faces[rows][:, :3], 1, axis=1))
    hit = usable.any(axis=1)
    side = usable[hit].argmax(axis=1)
    corner = corner_on[hit, side]
    turned = np.take_along_axis(
        surface.faces[rows[hit]][:, :3], (side[:, None] + np.arange(3)) % 3, axis=1
    )
    faces = surface.faces.copy()
    faces[rows[hit], :3] = np.column_stack([turned[:, 0], corner, turned[:, 2]])
    second = np.column_stack([corner, turned[:, 1:], np.full(len(corner), NO_CORNER)])
    return replace(surface, faces=np.concatenate([faces, second])), corner.tolist()
