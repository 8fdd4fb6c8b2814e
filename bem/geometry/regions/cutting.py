"""Faces of one body cut where the surfaces of other bodies meet them.

Faces that come near no other body stay as they are; what hangs together among them is one scrap.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.regions.faces import FlatFace
from bem.geometry.regions.facets import Facets
from bem.geometry.regions.matching import matched
from bem.geometry.regions.near import near_pairs
from bem.geometry.regions.scraps import Scrap, Touch, whole_scrap
from bem.geometry.topology import pieces_of

NEAR = 2.0
"""Triangles further apart than this many tolerances do not meet."""


def near_others(
    index: int, bodies: list[Facets], tolerance: float, apart: set[tuple[int, int]]
) -> dict[int, np.ndarray]:
    """Pairs (n, 2) of a body's own triangles and those near them, for each other body."""
    own = bodies[index]
    return {
        k: near_pairs(own.tree, other.tree, NEAR * tolerance)
        for k, other in enumerate(bodies)
        if k != index
        and (min(index, k), max(index, k)) not in apart
        and boxes_meet(own, other, NEAR * tolerance)
    }


def touches_of(own: Facets, near: dict[int, np.ndarray]) -> dict[int, Touch]:
    """What lies near each flat face of a body that comes near others at all."""
    found = [np.empty((0, 3), dtype=np.int64)]
    for k, pairs in near.items():
        flat = own.flat.label[own.owner[pairs[:, 0]]]
        pairs = np.unique(np.column_stack([flat, pairs[:, 1]]), axis=0)
        found.append(np.insert(pairs, 1, k, axis=1))
    rows = np.concatenate(found)
    rows = rows[np.argsort(rows[:, 0], kind="stable")]
    faces, starts = np.unique(rows[:, 0], return_index=True)
    groups = np.split(rows, starts)[1:]
    return {int(g): Touch(rows[:, 1], rows[:, 2]) for g, rows in zip(faces, groups, strict=True)}


def boxes_meet(one: Facets, two: Facets, margin: float) -> bool:
    """Whether the bounding boxes of two bodies are no further apart than the margin."""
    low, high = one.bounds
    return bool(((low - margin <= two.bounds[1]) & (two.bounds[0] <= high + margin)).all())


def scraps_of(
    index: int, bodies: list[Facets], tolerance: float, apart: set[tuple[int, int]]
) -> list[Scrap]:
    """All scraps of a body; pairs of bodies in ``apart``, the lower first, do not meet."""
    own, near = bodies[index], near_others(index, bodies, tolerance, apart)
    whole, flags = matched(own, bodies, near, tolerance)
    scraps = _uncut(own, np.flatnonzero(whole[own.flat.label[own.owner]]), flags)
    for flat, touch in touches_of(own, near).items():
        if not whole[flat]:
            scraps += FlatFace(own, flat, tolerance).scraps(bodies, touch)
    return scraps


def _uncut(own: Facets, triangles: np.ndarray, flags: np.ndarray) -> list[Scrap]:
    """Scraps of triangles, by their numbers, that hang together and meet the same bodies."""
    scraps = []
    told = np.column_stack([flags, own.covered[own.owner]])[triangles]
    kinds, kind = np.unique(told, axis=0, return_inverse=True)
    for k, (*meets, _) in enumerate(kinds):
        alike = triangles[kind.ravel() == k]
        _, piece = pieces_of(own.triangles[alike])
        order = np.argsort(piece, kind="stable")
        starts = np.flatnonzero(np.diff(piece[order], prepend=-1))
        groups = np.split(alike[order], starts[1:])
        scraps += [replace(whole_scrap(own, group, 0), meets=np.array(meets)) for group in groups]
    return scraps
