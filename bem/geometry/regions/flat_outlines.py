"""Flat faces by their outlines, as a circle about some axis sees them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import Enum

import numpy as np

from bem.geometry.flat_faces import FlatFaces, sides_of
from bem.geometry.revolved import Revolution, Segment
from bem.geometry.surface import Surface

AROUND = 384
"""Sides of the polygons that stand for the outlines of round faces."""
_ANGLES = np.arange(16) / 16.0 * 2.0 * np.pi + 0.1


class Lies(Enum):
    """How a circle or ring in the plane of a face lies to it."""

    INSIDE = 1
    OUTSIDE = 2
    ACROSS = 3


@dataclass(frozen=True, eq=False)
class FlatFace:
    """A flat face.

    Args:
        piece: of the profile that it belongs to, or -1 for a face of a flat body.
        origin: (3,) a point of its plane.
        normal: (3,) unit normal.
        sides: (e, 2, 3) its outline, in any order.
        corners: (t, 3, 3) triangles that fill it.
    """

    piece: int
    origin: np.ndarray
    normal: np.ndarray
    sides: np.ndarray
    corners: np.ndarray


def flat_faces(surface: Surface) -> list[FlatFace]:
    """All flat faces of a body; a curved one has them where its profile is normal to the axis."""
    if surface.curve is not None:
        return [_disc(surface.curve, k) for k in discs(surface.curve)]
    faces = FlatFaces.of(surface)
    sides = sides_of(faces.corners)
    # A side between two faces of one label is no outline.
    label = faces.label[sides.face]
    key = sides.group * faces.count + label
    _, index, count = np.unique(key, return_inverse=True, return_counts=True)
    outline = count[index] == 1
    pairs, label = sides.pairs[outline], label[outline]
    order, ends = _grouped(label, faces.count)
    rows, row_ends = _grouped(faces.label, faces.count)
    triangles = faces.vertices[faces.corners]
    return [
        FlatFace(
            -1,
            origin,
            normal,
            faces.vertices[pairs[order[ends[k] : ends[k + 1]]]],
            _halves(triangles[rows[row_ends[k] : row_ends[k + 1]]]),
        )
        for k, (origin, normal) in enumerate(zip(*faces.planes(), strict=True))
    ]


def _grouped(label: np.ndarray, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Order that sorts by label, and where each label starts in it."""
    order = np.argsort(label, kind="stable")
    return order, np.searchsorted(label[order], np.arange(count + 1))


def _halves(quads: np.ndarray) -> np.ndarray:
    """(t, 3, 3) triangles with area of faces (f, 4, 3), two corners of which may be one."""
    both = np.concatenate([quads[:, [0, 1, 2]], quads[:, [0, 2, 3]]])
    area = np.linalg.norm(np.cross(both[:, 1] - both[:, 0], both[:, 2] - both[:, 0]), axis=1)
    return both[area > 0.0]


def discs(curve: Revolution) -> list[int]:
    """Pieces of a profile that are flat: normal to the axis."""
    size = max(abs(x) for piece in curve.profile for x in (*piece.start, *piece.end))
    return [
        k
        for k, piece in enumerate(curve.profile)
        if isinstance(piece, Segment) and abs(piece.start[1] - piece.end[1]) <= 1e-12 * size
    ]


def _disc(curve: Revolution, piece: int) -> FlatFace:
    u = np.arange(AROUND) / AROUND
    rings = [curve.point(u, float(s)) for s in (piece, piece + 1)]
    turned = [np.roll(ring, -1, axis=0) for ring in rings]
    sides = [np.stack(pair, axis=1) for pair in zip(rings, turned, strict=True)]
    on_axis = [np.allclose(ring, ring[0], rtol=0.0, atol=0.0) for ring in rings]
    quads = np.stack([rings[0], turned[0], turned[1], rings[1]], axis=1)
    kept = [pairs for pairs, gone in zip(sides, on_axis, strict=True) if not gone]
    normal = curve.normal(0.0, piece + 0.5)
    return FlatFace(
        piece, curve.point(0.0, piece + 0.5), normal, np.concatenate(kept), _halves(quads)
    )


def circle_lies(sides: np.ndarray, radius: float, tolerance: float) -> Lies:
    """How a circle about the origin lies to a face.

    Args:
        sides: (e, 2, 2) outline of the face.
        radius: of the circle.
        tolerance: by which the outline may cross the circle.
    """
    nearest, farthest = _reach(sides)
    if ((nearest < radius - tolerance) & (farthest > radius + tolerance)).any():
        return Lies.ACROSS
    return _in_or_out(sides, radius)


def ring_lies(sides: np.ndarray, radii: tuple[float, float], tolerance: float) -> Lies:
    """How the ring between two circles about the origin lies to a face.

    Args:
        sides: (e, 2, 2) outline of the face.
        radii: of the circles, the smaller first.
        tolerance: by which the outline may reach into the ring.
    """
    nearest, farthest = _reach(sides)
    inner, outer = radii
    if ((nearest < outer - tolerance) & (farthest > inner + tolerance)).any():
        return Lies.ACROSS
    return _in_or_out(sides, 0.5 * (inner + outer))


def _in_or_out(sides: np.ndarray, radius: float) -> Lies:
    points = radius * np.column_stack([np.cos(_ANGLES), np.sin(_ANGLES)])
    votes = np.count_nonzero(_within(sides, points))
    return Lies.INSIDE if 2 * votes > len(points) else Lies.OUTSIDE


def _reach(sides: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Smallest and largest distance (e,) of sides from the origin."""
    start, step = sides[:, 0], sides[:, 1] - sides[:, 0]
    size = np.maximum(np.sum(step * step, axis=1), 1e-300)
    foot = start + np.clip(-np.sum(start * step, axis=1) / size, 0.0, 1.0)[:, None] * step
    return np.linalg.norm(foot, axis=1), np.linalg.norm(sides, axis=2).max(axis=1)


def _within(sides: np.ndarray, points: np.ndarray) -> np.ndarray:
    """(n,) whether points (n, 2) lie inside an outline: parity of the sides to their right."""
    a, b = sides[:, 0], sides[:, 1]
    y = points[:, 1:2]
    spans = (a[:, 1] > y) != (b[:, 1] > y)
    rise = np.where(b[:, 1] == a[:, 1], 1.0, b[:, 1] - a[:, 1])
    x = a[:, 0] + (y - a[:, 1]) * (b[:, 0] - a[:, 0]) / rise
    return np.count_nonzero(spans & (x > points[:, :1]), axis=1) % 2 == 1


def stacked(faces: Sequence[FlatFace]) -> np.ndarray:
    """(t, 3, 3) triangles of several faces."""
    return np.concatenate([face.corners for face in faces])
