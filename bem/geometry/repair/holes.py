"""Small holes in an otherwise closed piece are filled: a facet or a few that went missing.

A loop of open edges is such a hole if it has at most ``MOST_SIDES`` sides and if a facet of
its cap continues a neighbour within ``SMOOTH``; all caps of a piece together may have at most
``MOST_AREA`` of its area. The open end of a tube has a sharp rim all round, and a box without
a lid misses far more: both stay the sheets they are, as does any piece that would not be
closed after all its holes are filled. A hole of that size changes the capacitance of a sphere
by 4e-4 (spherical bowl, Thomson 1869).
"""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from bem.geometry.quads import thickness
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import Edges, edges_of, pieces_of

MOST_SIDES = 8
MOST_LINKED = 4 * MOST_SIDES
"""Loops that touch are told apart up to this many open edges."""

MOST_AREA = 0.01
SMOOTH = np.radians(45.0)
MOST_HOLES = 200
"""A surface with more holes than this is not sound enough to guess."""


class Filled(NamedTuple):
    """A surface with its small holes filled.

    Args:
        surface: the new faces, caps last.
        holes: number of holes filled.
        area: of the largest cap, m^2.
        place: (3,) a corner of the largest hole, metres.
    """

    surface: Surface
    holes: int
    area: float
    place: np.ndarray


def fill_holes(surface: Surface) -> Filled:
    """Fill the holes of pieces that are closed but for small ones."""
    edges = edges_of(surface.triangles)
    loops = _loops(edges)
    caps = [_cap(surface, edges, loop) for loop in loops]
    fit = _fitting(surface, edges, loops, caps).tolist() if loops else []
    if not fit:
        return Filled(surface, 0, 0.0, np.zeros(3))
    areas = [float(_areas(surface.vertices, caps[k]).sum()) for k in fit]
    largest = int(np.argmax(areas))
    new = np.concatenate([caps[k] for k in fit])
    faces = np.column_stack([new, np.full(len(new), NO_CORNER)])
    return Filled(
        replace(surface, faces=np.concatenate([surface.faces, faces])),
        len(fit),
        areas[largest],
        surface.vertices[loops[fit[largest]][0]],
    )


def _loops(edges: Edges) -> list[np.ndarray]:
    """Vertices of each short loop of open edges, in order; none if there are many."""
    rim = edges.ends[edges.uses % 2 == 1]
    vertices, ends = np.unique(rim, return_inverse=True)
    ends = ends.reshape(-1, 2)
    links = coo_array((np.ones(len(ends)), ends.T), shape=(len(vertices), len(vertices)))
    number, member = connected_components(links, directed=False)
    group = member[ends[:, 0]]
    short = np.flatnonzero(np.bincount(group, minlength=number) <= MOST_LINKED)
    if len(short) > MOST_HOLES:
        return []
    loops = [loop for k in short for loop in _cycles(rim[group == k].tolist())]
    return [np.array(loop) for loop in loops if len(loop) <= MOST_SIDES]


def _cycles(ends: list[list[int]]) -> list[list[int]]:
    """Loops without repeated vertices that edges form; a walk is cut where it meets itself."""
    found, path = [], list[int]()
    while ends:
        path = path or ends[-1][:1]
        step = next((k for k, pair in enumerate(ends) if path[-1] in pair), None)
        if step is None:
            path = []
            continue
        one, two = ends.pop(step)
        path.append(two if one == path[-1] else one)
        start = path.index(path[-1])
        if start < len(path) - 1:
            found.append(path[start + 1 :])
            path = path[: start + 1]
    return found


def _cap(surface: Surface, edges: Edges, loop: np.ndarray) -> np.ndarray:
    """Triangles (n, 3) that close a loop: the fan, from any corner, with the highest triangles.

    Empty if each fan folds over or repeats an edge of the surface.
    """
    span = len(surface.vertices)
    taken = edges.ends[:, 0] * span + edges.ends[:, 1]
    best, height = np.empty((0, 3), dtype=np.int64), 0.0
    for start in range(len(loop)):
        around = np.roll(loop, start)
        fan = np.stack([np.full(len(loop) - 2, around[0]), around[1:-1], around[2:]], axis=1)
        spokes = np.sort(fan[1:, :2], axis=1)
        lowest = float(thickness(surface.vertices, np.insert(fan, 3, NO_CORNER, axis=1)).min())
        free = not np.isin(spokes[:, 0] * span + spokes[:, 1], taken).any()
        if lowest > height and free and _is_flat(_normals(surface.vertices, fan)):
            best, height = fan, lowest
    return best


def _is_flat(normals: np.ndarray) -> bool:
    """Whether all normals lie within ``SMOOTH`` of their mean direction."""
    mean = normals.sum(axis=0)
    size = np.linalg.norm(normals, axis=1) * np.linalg.norm(mean)
    return bool((normals @ mean >= np.cos(SMOOTH) * size).all())


def _normals(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    """Twice the areas, as normal vectors (t, 3)."""
    a, b, c = np.moveaxis(vertices[triangles], 1, 0)
    return np.cross(b - a, c - a)


def _areas(vertices: np.ndarray, triangles: np.ndarray) -> np.ndarray:
    return 0.5 * np.linalg.norm(_normals(vertices, triangles), axis=1)


def _fitting(
    surface: Surface, edges: Edges, loops: list[np.ndarray], caps: list[np.ndarray]
) -> np.ndarray:
    """Which holes to fill: all those of a piece, if they fit and close it."""
    triangles, cap = surface.triangles, np.concatenate(caps)
    number, piece = pieces_of(triangles)
    at = np.full(len(surface.vertices), -1)
    at[triangles] = piece[:, None]
    home = at[[loop[0] for loop in loops]]
    hole = np.repeat(np.arange(len(caps)), [len(c) for c in caps])
    rough = np.ones(len(caps), dtype=bool)
    rough[hole[_continuing(surface.vertices, triangles, cap)]] = False
    sides = np.bincount(home, [len(loop) for loop in loops], minlength=number)
    every = np.bincount(at[edges.ends[edges.uses % 2 == 1, 0]], minlength=number)
    missing = np.bincount(at[cap[:, 0]], _areas(surface.vertices, cap), minlength=number)
    area = np.bincount(piece, _areas(surface.vertices, triangles), minlength=number)
    good = (sides == every) & (missing <= MOST_AREA * area)
    good[home[rough]] = False
    return np.flatnonzero(good[home])


def _continuing(vertices: np.ndarray, triangles: np.ndarray, cap: np.ndarray) -> np.ndarray:
    """Triangles of the caps (indices) that lie within ``SMOOTH`` of a neighbour's plane."""
    both = np.concatenate([triangles, cap])
    edges = edges_of(both)
    order = np.argsort(edges.owner, kind="stable")
    first = (np.cumsum(edges.uses) - edges.uses)[edges.uses == 2]
    one, two = order[first], order[first + 1]
    rim = (one < 3 * len(triangles)) & (two >= 3 * len(triangles))
    one, two = one[rim], two[rim]
    normals = _normals(vertices, both)
    a, b = normals[one // 3], normals[two // 3]
    turned = np.where(edges.forward[one] == edges.forward[two], -1.0, 1.0)
    size = np.linalg.norm(a, axis=1) * np.linalg.norm(b, axis=1)
    smooth = turned * np.einsum("nx,nx->n", a, b) >= np.cos(SMOOTH) * size
    return two[smooth] // 3 - len(triangles)
