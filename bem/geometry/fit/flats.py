"""What is truly flat, or truly straight, among facets of a smooth surface.

A facet of a smooth surface bulges towards it on all of its area. A flat face that a fillet
joins tangentially does not, and the surface normal on their common edge is that of the flat face.
What tells them apart is that a flat face is much wider than each of its soft neighbours. In the
same way an edge along a straight tube that runs on into a bend is much longer than those there.
"""

from __future__ import annotations

import numpy as np

from bem.geometry.fit.facets import Facets

MUCH_WIDER = 3.0
"""A flat face is this many times wider than its soft neighbours, a straight edge longer."""
AHEAD = 0.7
"""Cosine of the angle within which an edge runs on from another."""


def truly_flat(facets: Facets) -> np.ndarray:
    """(t,) whether each triangle belongs to a flat face that only fillets join smoothly."""
    bent = np.flatnonzero(facets.bent)
    flat = facets.flat[facets.sides[bent]]
    width = np.stack([_widths(facets, bent, side) for side in flat.T], axis=1)
    some, against = np.zeros((2, facets.flats), dtype=bool)
    some[flat] = True
    against[flat[width < MUCH_WIDER * width[:, ::-1]]] = True
    return (some & ~against)[facets.flat]


def rise_by_turns(facets: Facets) -> np.ndarray:
    """(t,) largest turn across a soft edge times the width of the flat face there."""
    bent, rise = np.flatnonzero(facets.bent), np.zeros(facets.flats)
    for side in facets.sides[bent].T:
        flat = facets.flat[side]
        np.maximum.at(rise, flat, facets.turn[bent] * _widths(facets, bent, flat))
    return rise[facets.flat]


def straight_edges(facets: Facets) -> np.ndarray:
    """(s,) soft edges between strips, much longer than all those that they run on into.

    Strips are flat faces of two triangles or more, which uneven facets hardly ever make.
    """
    length = np.linalg.norm(facets.chord, axis=1)
    shortest = np.full(len(facets.points), np.inf)
    for end in facets.ends.T:
        np.minimum.at(shortest, end, length)
    near = shortest[facets.ends].min(axis=1)
    strip = (np.bincount(facets.flat) > 1)[facets.flat[facets.sides]].all(axis=1)
    long = np.flatnonzero(facets.bent & strip & (length > MUCH_WIDER * near))
    which, other = _running_on(facets, long)
    some, against = np.zeros((2, len(long)), dtype=bool)
    some[which] = True
    against[which[MUCH_WIDER * length[other] > length[long[which]]]] = True
    return long[some & ~against]


def _running_on(facets: Facets, long: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Pairs of an edge among ``long`` (by place) and an edge that runs on from one of its ends."""
    order = np.argsort(facets.ends.ravel(), kind="stable")
    start = np.searchsorted(facets.ends.ravel()[order], np.arange(len(facets.points) + 1))
    unit = facets.chord / np.linalg.norm(facets.chord, axis=1, keepdims=True)
    pairs = []
    for end in (0, 1):
        vertex = facets.ends[long, end]
        row, place = _ragged(start[vertex], start[vertex + 1])
        edge, its_end = order[place] // 2, order[place] % 2
        cosine = np.einsum("ni,ni->n", unit[long[row]], unit[edge])
        ahead = np.where(its_end == end, -cosine, cosine) > AHEAD
        pairs.append((row[ahead], edge[ahead]))
    return np.concatenate([p[0] for p in pairs]), np.concatenate([p[1] for p in pairs])


def _ragged(start: np.ndarray, stop: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Rows and places of all numbers from ``start`` to ``stop`` of each row."""
    many = stop - start
    row = np.repeat(np.arange(len(start)), many)
    return row, np.arange(len(row)) + np.repeat(start - (np.cumsum(many) - many), many)


def _widths(facets: Facets, bent: np.ndarray, flat: np.ndarray) -> np.ndarray:
    """(b,) largest distance of a corner of the given flat faces from the lines of soft edges."""
    start, vertex = _outlines(facets)
    row, place = _ragged(start[flat], start[flat + 1])
    chord = facets.chord[bent]
    unit = chord / np.linalg.norm(chord, axis=1, keepdims=True)
    reach = facets.points[vertex[place]] - facets.points[facets.ends[bent, 0]][row]
    along = np.einsum("ni,ni->n", reach, unit[row])
    off2 = np.maximum(np.einsum("ni,ni->n", reach, reach) - along**2, 0.0)
    widest = np.zeros(len(bent))
    np.maximum.at(widest, row, off2)
    return np.sqrt(widest)


def _outlines(facets: Facets) -> tuple[np.ndarray, np.ndarray]:
    """Vertices on the outline of each flat face: those of face g are [start[g]:start[g + 1]]."""
    inner = facets.soft & ~facets.bent
    on_outline = ~inner[facets.edge]
    flat = np.repeat(facets.flat, 3)[on_outline.ravel()]
    vertex = facets.corners.ravel()[on_outline.ravel()]
    order = np.argsort(flat, kind="stable")
    start = np.searchsorted(flat[order], np.arange(facets.flats + 1))
    return start, vertex[order]
