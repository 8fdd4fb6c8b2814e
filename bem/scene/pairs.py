"""How two bodies lie to each other: apart, touching, crossing, or one inside the other."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np

from bem.geometry.gap import Gap, deepest_crossing, smallest_gap
from bem.scene.body import Body

CONTACT = 1e-6
"""Bodies touch if their gap is at most this times the smaller one's diagonal."""

ALL_PAIRS = 30
"""Up to this many conductors the gap of every pair is found."""


@dataclass(frozen=True)
class PairReport:
    """How two conductors lie to each other.

    Args:
        first: name.
        second: name.
        gap: smallest distance of their facets, metres; 0 if they cross, and at most the
            contact tolerance if they touch.
        relation: "apart", "touch", "cross" or "inside".
        place: (3,) point of the first where the gap is reached, or where they cross, metres.
        inner: name of the one that lies, wholly or with a piece, in the other; or None.
    """

    first: str
    second: str
    gap: float
    relation: str
    place: tuple[float, float, float]
    inner: str | None = None


def contact_tolerance(a: Body, b: Body) -> float:
    """Largest gap at which two bodies count as touching, metres."""
    return CONTACT * min(a.extent, b.extent)


def all_pairs(bodies: list[Body]) -> list[PairReport]:
    """Relations of all pairs, sorted by gap.

    Contact and containment are looked for in every pair. With more than ``ALL_PAIRS``
    bodies, gaps are found as far as the nearest neighbour of each body needs; pairs
    farther apart are left out. Where facets of curved bodies seem to touch, finer ones
    decide.
    """
    gaps = _every_gap(bodies) if len(bodies) <= ALL_PAIRS else _neighbour_gaps(bodies)
    boxes = _box_gaps(bodies)
    for i, j in itertools.combinations(range(len(bodies)), 2):
        if boxes[i, j] == 0.0 and (i, j) not in gaps and _inner(bodies[i], bodies[j]):
            gaps[i, j] = smallest_gap(bodies[i].tree, bodies[j].tree)
    reports = [_report(bodies[i], bodies[j], gap) for (i, j), gap in sorted(gaps.items())]
    return sorted(reports, key=lambda report: report.gap)


def _every_gap(bodies: list[Body]) -> dict[tuple[int, int], Gap]:
    return {
        (i, j): _gap(bodies[i], bodies[j], math.inf)
        for i, j in itertools.combinations(range(len(bodies)), 2)
    }


def _gap(a: Body, b: Body, limit: float) -> Gap:
    return smallest_gap(a.tree, b.tree, limit, contact_tolerance(a, b))


def _box_gaps(bodies: list[Body]) -> np.ndarray:
    """Distances (n, n) between bounding boxes, metres."""
    low = np.array([body.bounds[0] for body in bodies])
    high = np.array([body.bounds[1] for body in bodies])
    apart = np.maximum(low[:, None] - high[None, :], low[None, :] - high[:, None])
    return np.linalg.norm(np.maximum(apart, 0.0), axis=2)


def _neighbour_gaps(bodies: list[Body]) -> dict[tuple[int, int], Gap]:
    """Gaps of all pairs in contact, and of each body to its nearest neighbour at least."""
    boxes = _box_gaps(bodies)
    found: dict[tuple[int, int], Gap] = {}
    beyond: dict[tuple[int, int], float] = {}
    for i, body in enumerate(bodies):
        nearest = math.inf
        for j in np.argsort(boxes[i], kind="stable").tolist():
            if j == i:
                continue
            limit = max(nearest, contact_tolerance(body, bodies[j]))
            if boxes[i, j] > limit:
                continue
            pair = (min(i, j), max(i, j))
            if pair not in found and beyond.get(pair, -1.0) < limit:
                gap = _gap(bodies[pair[0]], bodies[pair[1]], limit)
                if gap.distance <= limit:
                    found[pair] = gap
                else:
                    beyond[pair] = limit
            if pair in found:
                nearest = min(nearest, found[pair].distance)
    return found


def _inner(a: Body, b: Body) -> Body | None:
    """Find which of two bodies, not in contact, has a piece inside the other."""
    if b.encloses(a.probes).any():
        return a
    return b if a.encloses(b.probes).any() else None


def _report(a: Body, b: Body, gap: Gap) -> PairReport:
    names = a.owner.name, b.owner.name
    tolerance = contact_tolerance(a, b)
    if gap.distance <= tolerance and (a.finer is not a or b.finer is not b):
        a, b = a.finer, b.finer
        gap = _gap(a, b, math.inf)
    if gap.distance <= tolerance:
        depth, where = deepest_crossing(a.tree, b.tree, tolerance)
        if depth > tolerance:
            return PairReport(*names, 0.0, "cross", where)
        return PairReport(*names, gap.distance, "touch", gap.here)
    inner = _inner(a, b)
    if inner is None:
        return PairReport(*names, gap.distance, "apart", gap.here)
    return PairReport(*names, gap.distance, "inside", gap.here, inner.owner.name)
