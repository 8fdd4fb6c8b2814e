"""What another body does to a surface of revolution: cut it in circles, touch it, or spoil it."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np

from bem.geometry.gap import deepest_crossing, smallest_gap
from bem.geometry.regions.coaxial import is_ball, scale_of, seen_by
from bem.geometry.regions.contact import contact
from bem.geometry.regions.flat_outlines import (
    FlatFace,
    Lies,
    circle_lies,
    discs,
    flat_faces,
    ring_lies,
    stacked,
)
from bem.geometry.regions.meridian import parameter
from bem.geometry.revolved import Arc, Piece, Revolution, Segment
from bem.geometry.surface import Surface
from bem.geometry.tree import Tree, build_tree

FACETS = 192
"""Facets around, where bodies without a common axis are looked at: good to 1.4e-4 of the radius."""
ASKEW = 0.37
"""Facets start at this part of their width: planes of symmetry then run through them."""
UPRIGHT = 0.1
"""Slope from which no face counts as normal to the axis, however small the surface."""
SAGITTA = 1.5e-4
"""How far these facets lie inside the surface, in parts of its size."""


class Mark(NamedTuple):
    """What one partner does to a surface of revolution.

    Args:
        cuts: (c,) parameters s where the surface must be cut.
        touching: (t, 2) ranges of s wholly in contact with the partner.
        open: (o,) flat pieces that the partner cuts or covers otherwise than in circles.
        opens: (p,) flat pieces of a curved partner that the surface cuts or covers so.
        spoilt: whether the partner cuts it otherwise than in circles.
    """

    cuts: np.ndarray = np.zeros(0)
    touching: np.ndarray = np.zeros((0, 2))
    open: tuple[int, ...] = ()
    opens: tuple[int, ...] = ()
    spoilt: bool = False

    @property
    def some(self) -> bool:
        """Whether the partner does anything to the surface."""
        return bool(len(self.cuts) or len(self.touching) or self.open or self.spoilt)

    def joined(self, other: Mark) -> Mark:
        """Both together."""
        return Mark(
            np.append(self.cuts, other.cuts),
            np.concatenate([self.touching, other.touching]),
            tuple({*self.open, *other.open}),
            tuple({*self.opens, *other.opens}),
            self.spoilt or other.spoilt,
        )


NOTHING = Mark()


def boxes_meet(a: Surface, b: Surface, tolerance: float) -> bool:
    """Whether the bounding boxes of two bodies, curved ones widened, come near each other."""
    (low, high), (lower, higher) = _box(a), _box(b)
    return bool((low <= higher + tolerance).all() and (lower <= high + tolerance).all())


def _box(surface: Surface) -> np.ndarray:
    """Lowest and highest coordinates, (2, 3), of the true surface."""
    if surface.curve is None:
        return surface.bounds
    ranges = [spread(surface.curve, axis) for axis in np.eye(3)]
    return np.array(ranges).T


def spread(curve: Revolution, normal: np.ndarray) -> tuple[float, float]:
    """Lowest and highest coordinate of a surface along a direction (3,)."""
    local = curve.matrix.T @ normal
    across, along = float(np.hypot(*local[:2])), float(local[2])
    at = float(normal @ curve.shift)
    low = -max(_farthest(piece, (across, -along)) for piece in curve.profile)
    return at + low, at + max(_farthest(piece, (across, along)) for piece in curve.profile)


def _farthest(piece: Piece, way: tuple[float, float]) -> float:
    """Largest product of a point of a piece with (a, b)."""
    points = np.array([piece.start, piece.end])
    if isinstance(piece, Arc):
        beyond = np.array([piece.centre]) + piece.radius * np.array([way]) / np.hypot(*way)
        points = np.concatenate([points, piece.at(parameter(piece, beyond))])
    return float((points @ way).max())


def coaxial_mark(curve: Revolution, other: Revolution, tolerance: float) -> Mark | None:
    """Mark left by a surface with the same axis; None if it has another one."""
    local = tolerance / scale_of(curve)
    seen = seen_by(curve, other, local)
    if seen is None:
        return None
    found = contact(curve.profile, seen, local)
    return Mark(found.cuts, found.touching)


def flat_mark(curve: Revolution, faces: Sequence[FlatFace], tolerance: float) -> Mark:
    """Mark left by flat faces."""
    mark, oblique = NOTHING, []
    for face in _cutting(curve, faces, tolerance):
        level = _level(curve, face, tolerance)
        if level is None:
            oblique.append(face)
        else:
            mark = mark.joined(_level_mark(curve, face, level, tolerance))
    if not oblique or is_ball(curve):
        return mark
    return mark.joined(_oblique_mark(curve, build_tree(stacked(oblique)), tolerance))


def _cutting(curve: Revolution, faces: Sequence[FlatFace], tolerance: float) -> list[FlatFace]:
    """Faces whose planes have parts of the surface on both sides, or a flat piece in them."""
    return [face for face in faces if _reaches(curve, face, tolerance)]


def _reaches(curve: Revolution, face: FlatFace, tolerance: float) -> bool:
    low, high = spread(curve, face.normal)
    at = float(face.normal @ face.origin)
    slack = tolerance if _level(curve, face, tolerance) is not None else -tolerance
    return low - slack < at < high + slack


def _level(curve: Revolution, face: FlatFace, tolerance: float) -> float | None:
    return level_of(curve, face.normal, float(face.normal @ face.origin), tolerance)


def level_of(curve: Revolution, normal: np.ndarray, at: float, tolerance: float) -> float | None:
    """Level z of a plane in the surface's own coordinates; None if it is not normal to the axis.

    Args:
        curve: the surface.
        normal: (3,) unit normal of the plane.
        at: its coordinate along the normal.
        tolerance: by which it may slope over the width of the surface.
    """
    local = curve.matrix.T @ normal
    widest = max(_farthest(piece, (1.0, 0.0)) for piece in curve.profile)
    if np.hypot(*local[:2]) * widest > min(tolerance, UPRIGHT * abs(local[2]) * widest):
        return None
    return (at - float(normal @ curve.shift)) / float(local[2])


def _outline(curve: Revolution, face: FlatFace) -> np.ndarray:
    """Sides (e, 2, 2) of a face in the surface's own coordinates across the axis."""
    local = np.linalg.solve(curve.matrix, (face.sides.reshape(-1, 3) - curve.shift).T).T
    return local[:, :2].reshape(-1, 2, 2)


def _level_mark(curve: Revolution, face: FlatFace, level: float, tolerance: float) -> Mark:
    """Mark left by a face normal to the axis."""
    local = tolerance / scale_of(curve)
    found = contact(curve.profile, level_line(curve, level), local)
    if not found.some:
        return NOTHING
    sides = _outline(curve, face)
    circles = [circle_lies(sides, _radius(curve, s), local) for s in found.cuts]
    rings = [ring_lies(sides, _radii(curve, span), local) for span in found.touching]
    across = [span for span, lies in zip(found.touching, rings, strict=True) if lies is Lies.ACROSS]
    meets = any(lies is not Lies.OUTSIDE for lies in circles + rings)
    return Mark(
        found.cuts[[lies is Lies.INSIDE for lies in circles]],
        found.touching[[lies is Lies.INSIDE for lies in rings]],
        tuple(k for low, high in across for k in range(int(low), int(np.ceil(high)))),
        (face.piece,) if meets and face.piece >= 0 else (),
        Lies.ACROSS in circles,
    )


def level_line(curve: Revolution, level: float) -> tuple[Piece]:
    """Profile of the plane z = level, in local coordinates, as far as the surface may reach."""
    size = max(abs(x) for piece in curve.profile for x in (*piece.start, *piece.end))
    return (Segment((0.0, level), (4.0 * size, level)),)


def _radius(curve: Revolution, s: float) -> float:
    k = min(int(s), curve.pieces - 1)
    return float(curve.profile[k].at(np.array(s - k))[0])


def _radii(curve: Revolution, span: np.ndarray) -> tuple[float, float]:
    low, high = sorted((_radius(curve, float(span[0])), _radius(curve, float(span[1]))))
    return low, high


def bent_mark(curve: Revolution, other: Revolution, tolerance: float) -> Mark:
    """Mark left by the bent pieces of a surface with another axis."""
    tree = _tree(other, _bent(other))
    return NOTHING if tree is None else _oblique_mark(curve, tree, tolerance)


def _oblique_mark(curve: Revolution, tree: Tree, tolerance: float) -> Mark:
    spoilt = _crossed(_tree(curve, _bent(curve)), tree, _near(curve, tolerance))
    flat = (k for k in discs(curve) if _crossed(_tree(curve, (k,)), tree, tolerance))
    return Mark(open=tuple(flat), spoilt=spoilt)


def _near(curve: Revolution, tolerance: float) -> float:
    low, high = spread(curve, np.eye(3)[0])
    return tolerance + SAGITTA * (high - low)


def _crossed(one: Tree | None, two: Tree, limit: float) -> bool:
    """Whether surfaces cross by more than can be told from touching."""
    if one is None or smallest_gap(one, two, limit, limit).distance > limit:
        return False
    return deepest_crossing(one, two, 2.0 * limit)[0] > 2.0 * limit


def _bent(curve: Revolution) -> tuple[int, ...]:
    return tuple(sorted(set(range(curve.pieces)) - set(discs(curve))))


@lru_cache(maxsize=8)
def _tree(curve: Revolution, pieces: tuple[int, ...]) -> Tree | None:
    """Tree over facets of some pieces."""
    found = [_piece_facets(curve, k) for k in pieces]
    return build_tree(np.concatenate(found)) if found else None


def _piece_facets(curve: Revolution, k: int) -> np.ndarray:
    """(t, 3, 3) triangles along a piece."""
    bend = curve.profile[k].bend
    count = max(1, int(np.ceil(FACETS * bend / (2.0 * np.pi))))
    s = k + np.arange(count + 1) / count
    points = curve.point((np.arange(FACETS) + ASKEW) / FACETS, s[:, None])
    right = np.roll(points, -1, axis=1)
    corners = np.stack([points[:-1], right[:-1], right[1:], points[1:]], axis=2).reshape(-1, 4, 3)
    return np.concatenate([corners[:, [0, 1, 2]], corners[:, [0, 2, 3]]])


def mark_of(curve: Revolution, partner: Surface, tolerance: float) -> Mark:
    """What a partner does to a surface of revolution.

    Args:
        curve: the surface, with its axis chosen.
        partner: surface of the other body.
        tolerance: surfaces closer than this coincide.
    """
    if partner.curve is None:
        return flat_mark(curve, flat_faces(partner), tolerance)
    mark = coaxial_mark(curve, partner.curve, tolerance)
    if mark is None:
        mark = flat_mark(curve, flat_faces(partner), tolerance)
        mark = mark.joined(bent_mark(curve, partner.curve, tolerance))
    return mark
