"""Faces of one body cut where the surfaces of other bodies meet them.

Faces that come near no other body stay as they are; what hangs together among them is one scrap.
"""

from __future__ import annotations

import numpy as np

from bem.geometry.regions.faces import FlatFace
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.near import near_pairs
from bem.geometry.regions.scraps import Scrap, Touch, whole_scrap
from bem.geometry.topology import pieces_of

NEAR = 2.0
"""Triangles further apart than this many tolerances do not meet."""


def touches_of(index: int, bodies: list[Facets], tolerance: float) -> dict[int, Touch]:
    """What lies near each flat face of a body that comes near others at all."""
    own, found = bodies[index], []
    for k, other in enumerate(bodies):
        if k != index and boxes_meet(own, other, NEAR * tolerance):
            pairs = near_pairs(own.tree, other.tree, NEAR * tolerance)
            flat = own.flat.label[own.owner[pairs[:, 0]]]
            pairs = np.unique(np.column_stack([flat, pairs[:, 1]]), axis=0)
            found.append(np.insert(pairs, 1, k, axis=1))
    rows = np.concatenate([np.empty((0, 3), dtype=np.int64), *found])
    rows = rows[np.argsort(rows[:, 0], kind="stable")]
    faces, starts = np.unique(rows[:, 0], return_index=True)
    groups = np.split(rows, starts)[1:]
    return {int(g): Touch(rows[:, 1], rows[:, 2]) for g, rows in zip(faces, groups, strict=True)}


def boxes_meet(one: Facets, two: Facets, margin: float) -> bool:
    """Whether the bounding boxes of two bodies are no further apart than the margin."""
    low, high = one.bounds
    return bool(((low - margin <= two.bounds[1]) & (two.bounds[0] <= high + margin)).all())


def scraps_of(index: int, bodies: list[Facets], tolerance: float) -> list[Scrap]:
    """All scraps of a body."""
    touches = touches_of(index, bodies, tolerance)
    own = bodies[index]
    scraps = _untouched(own, np.isin(own.flat.label, list(touches)), len(bodies))
    for flat, touch in touches.items():
        scraps += FlatFace(own, flat, tolerance).scraps(bodies, touch)
    return scraps


def _untouched(own: Facets, touched: np.ndarray, bodies: int) -> list[Scrap]:
    """Scraps of faces (flags (f,) of the others given) that hang together."""
    free = np.flatnonzero(~touched[own.owner])
    if len(free) == 0:
        return []
    _, piece = pieces_of(own.triangles[free])
    order = np.argsort(piece, kind="stable")
    starts = np.flatnonzero(np.diff(piece[order], prepend=-1))
    groups = np.split(free[order], starts[1:])
    return [whole_scrap(own, triangles, bodies) for triangles in groups]
