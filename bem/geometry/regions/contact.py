"""Where one profile crosses another, and where both run along together.

Profiles that pass within the tolerance of each other coincide there, but only as far as an end or
a corner of one of them tells: two smooth curves that merely touch, or dip into each other by less
than the tolerance, do so in a point, and nothing is cut.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from bem.geometry.regions.meridian import (
    distance,
    length,
    meeting_points,
    parameter,
    profile_distance,
)
from bem.geometry.revolved import Piece

_SAMPLES = np.array([0.1, 0.3, 0.5, 0.7, 0.9])
_CROSSING, _AXIS, _CORNER, _OWN = range(4)
"""Kinds of stops, the later ones kept where stops coincide."""


class Contact(NamedTuple):
    """What another profile does to one's own.

    Args:
        cuts: (c,) increasing parameters s, ends and joints of the own profile left out.
        touching: (t, 2) ranges of s along which both coincide.
    """

    cuts: np.ndarray
    touching: np.ndarray

    @property
    def some(self) -> bool:
        """Whether there is any."""
        return bool(len(self.cuts) or len(self.touching))


class _Stops(NamedTuple):
    """Increasing parameters (n,) from end to end with the kind (n,) of each."""

    s: np.ndarray
    kind: np.ndarray


def contact(own: Sequence[Piece], other: Sequence[Piece], tolerance: float) -> Contact:
    """Find where a profile crosses another one, and where they coincide.

    Args:
        own: pieces of the profile to be cut, in order.
        other: pieces of the other one, in any order, in the same coordinates.
        tolerance: profiles closer than this coincide.
    """
    stops = _stops(own, other, tolerance)
    low, high = _runs(_near(own, other, stops.s, tolerance))
    whole = (low == 0) & (high == len(stops.s) - 1)
    told = _told(own, stops.kind, low, high)
    touching = np.column_stack([stops.s[low], stops.s[high]])[whole | told]
    real = np.ones(len(stops.s), dtype=bool)
    for a, b, kept in zip(low, high, told, strict=True):
        real[a + kept : b + 1 - kept] &= stops.kind[a + kept : b + 1 - kept] != _CROSSING
    cuts = stops.s[real]
    return Contact(cuts[cuts != np.round(cuts)], touching)


def _told(own: Sequence[Piece], kind: np.ndarray, low: np.ndarray, high: np.ndarray) -> np.ndarray:
    """(t,) whether a corner tells where a run ends."""
    told = np.maximum(kind[low], kind[high]) >= _CORNER
    loops = own[0].start == own[-1].end
    if loops and len(low) > 1 and low[0] == 0 and high[-1] == len(kind) - 1:
        told[[0, -1]] = max(kind[high[0]], kind[low[-1]]) >= _CORNER
    return told


def _stops(own: Sequence[Piece], other: Sequence[Piece], tolerance: float) -> _Stops:
    s, kind = [], []
    for k, piece in enumerate(own):
        for partner in other:
            for points, what in (
                (meeting_points(piece, partner), _CROSSING),
                (_corners(partner), _CORNER),
            ):
                here = _shared(piece, partner, points, tolerance)
                s += (k + here).tolist()
                kind += [what] * len(here)
    joints, kinds = _joints(own, other, tolerance)
    return _merged(own, _Stops(np.append(s, joints), np.append(kind, kinds)), tolerance)


def _corners(piece: Piece) -> np.ndarray:
    """(n, 2) ends of a piece off the axis."""
    ends = np.array([piece.start, piece.end])
    return ends[ends[:, 0] > 0.0]


def _shared(piece: Piece, partner: Piece, points: np.ndarray, tolerance: float) -> np.ndarray:
    """Parameters on a piece of those points that both pieces come to."""
    near = (distance(piece, points) <= tolerance) & (distance(partner, points) <= tolerance)
    return parameter(piece, points[near])


def _joints(
    own: Sequence[Piece], other: Sequence[Piece], tolerance: float
) -> tuple[np.ndarray, np.ndarray]:
    """Ends of pieces, all of which are stops; only those that both share tell where a run ends."""
    ends = np.array([*(piece.start for piece in own), own[-1].end])
    shared = (profile_distance(other, ends) <= 2.0 * tolerance) & (ends[:, 0] > 0.0)
    return np.arange(len(ends)), np.where(shared, _OWN, _AXIS)


def _merged(own: Sequence[Piece], stops: _Stops, tolerance: float) -> _Stops:
    """Stops in order; those closer together than twice the tolerance become one."""
    sizes = np.array([length(piece) for piece in own])
    order = np.lexsort([stops.kind, stops.s])
    s, kind = stops.s[order], stops.kind[order].astype(int)
    at = np.interp(s, np.arange(len(own) + 1), np.append(0.0, np.cumsum(sizes)))
    # Ends of pieces stay whatever lies beside them.
    fixed = s == np.round(s)
    kept: list[int] = []
    for k in np.lexsort([-kind, ~fixed]):
        if fixed[k] and s[k] not in s[kept]:
            kept.append(int(k))
        elif not fixed[k] and (np.abs(at[kept] - at[k]) > 2.0 * tolerance).all():
            kept.append(int(k))
    kept.sort(key=lambda k: s[k])
    return _Stops(s[kept], kind[kept])


def _near(
    own: Sequence[Piece], other: Sequence[Piece], s: np.ndarray, tolerance: float
) -> np.ndarray:
    """(n - 1,) whether all of the own profile between neighbouring stops is near the other."""
    found = []
    for low, high in zip(s[:-1], s[1:], strict=True):
        k = int(low)
        points = own[k].at(low - k + (high - low) * _SAMPLES)
        found.append((profile_distance(other, points) <= tolerance).all())
    return np.array(found)


def _runs(near: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """First and last stop of each unbroken run."""
    step = np.diff(np.concatenate([[0], near.astype(int), [0]]))
    return np.flatnonzero(step > 0), np.flatnonzero(step < 0)
