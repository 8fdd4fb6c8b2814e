"""Pieces of profiles in the half-plane (r, z): where they meet, how far points are, what is inside.

All lengths are in the unit of the profile.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence

import numpy as np

from bem.geometry.revolved import Arc, Piece, Position, Segment

FULL = 2.0 * math.pi
LARGEST = math.pi / 2.0
"""Arcs are looked at in parts that turn by no more: these lie on one side of their chord."""


def parameter(piece: Piece, points: np.ndarray) -> np.ndarray:
    """(n,) where along a piece points (n, 2) are nearest, in [0, 1]."""
    if isinstance(piece, Segment):
        along = np.subtract(piece.end, piece.start)
        return np.clip((points - piece.start) @ along / (along @ along), 0.0, 1.0)
    assert isinstance(piece, Arc)
    off = points - piece.centre
    angle = np.arctan2(off[:, 1], off[:, 0])
    ahead = (angle - piece.first) * np.sign(piece.sweep) % FULL
    sweep = abs(piece.sweep)
    return np.where(ahead <= 0.5 * (sweep + FULL), np.minimum(ahead / sweep, 1.0), 0.0)


def distance(piece: Piece, points: np.ndarray) -> np.ndarray:
    """(n,) distance of points (n, 2) from a piece."""
    return np.linalg.norm(piece.at(parameter(piece, points)) - points, axis=1)


def profile_distance(profile: Sequence[Piece], points: np.ndarray) -> np.ndarray:
    """(n,) distance of points (n, 2) from the nearest of some pieces."""
    return np.min([distance(piece, points) for piece in profile], axis=0)


def length(piece: Piece) -> float:
    """Length of a piece."""
    if isinstance(piece, Arc):
        return piece.radius * abs(piece.sweep)
    return math.dist(piece.start, piece.end)


def cut_up(piece: Piece, cuts: Sequence[float]) -> list[Piece]:
    """Parts of a piece between increasing parameters, the first and last of which may be 0 and 1.

    Parts that meet share their end to the last bit.
    """
    ends = [_end(piece, t) for t in cuts]
    return [
        _part(piece, (low, high), pair)
        for (low, high), pair in zip(
            itertools.pairwise(cuts), itertools.pairwise(ends), strict=True
        )
    ]


def _end(piece: Piece, t: float) -> Position:
    if t in (0.0, 1.0):
        return piece.end if t else piece.start
    r, z = piece.at(np.array(t))
    return float(r), float(z)


def _part(piece: Piece, t: tuple[float, float], ends: tuple[Position, Position]) -> Piece:
    if t == (0.0, 1.0):
        return piece
    if isinstance(piece, Segment):
        return Segment(*ends)
    assert isinstance(piece, Arc)
    first, sweep = piece.first + t[0] * piece.sweep, (t[1] - t[0]) * piece.sweep
    return Arc(*ends, piece.centre, first, sweep)


def moved(piece: Piece, across: float, along: float, shift: float) -> Piece:
    """A piece after (r, z) goes to (across r, along z + shift).

    Args:
        piece: straight, unless ``across`` and ``along`` have the same size.
        across: positive.
        along: not zero.
        shift: along z.
    """
    start, end = _moved(piece.start, across, along, shift), _moved(piece.end, across, along, shift)
    if isinstance(piece, Segment):
        return Segment(start, end)
    assert isinstance(piece, Arc)
    turn = math.copysign(1.0, along)
    centre = _moved(piece.centre, across, along, shift)
    return Arc(start, end, centre, turn * piece.first, turn * piece.sweep)


def _moved(at: Position, across: float, along: float, shift: float) -> Position:
    return across * at[0], along * at[1] + shift


def meeting_points(a: Piece, b: Piece) -> np.ndarray:
    """(n, 2) points where the whole lines or circles of two pieces cross, up to two."""
    if isinstance(a, Arc) and isinstance(b, Arc):
        return _circles(a, b)
    if isinstance(a, Segment) and isinstance(b, Segment):
        return _lines(a, b)
    return _line_and_circle(a, b) if isinstance(a, Segment) else _line_and_circle(b, a)


def _lines(a: Segment, b: Segment) -> np.ndarray:
    along, other = np.subtract(a.end, a.start), np.subtract(b.end, b.start)
    across = along[0] * other[1] - along[1] * other[0]
    if abs(across) <= 1e-12 * np.linalg.norm(along) * np.linalg.norm(other):
        return np.zeros((0, 2))
    to = np.subtract(b.start, a.start)
    t = (to[0] * other[1] - to[1] * other[0]) / across
    return (np.array(a.start) + t * along)[None]


def _line_and_circle(line: Piece, circle: Piece) -> np.ndarray:
    assert isinstance(circle, Arc)
    along = np.subtract(line.end, line.start)
    along = along / np.linalg.norm(along)
    to = np.subtract(circle.centre, line.start)
    foot = np.array(line.start) + (to @ along) * along
    return _either_side(foot, along, circle.radius**2 - ((foot - circle.centre) ** 2).sum())


def _circles(a: Arc, b: Arc) -> np.ndarray:
    apart = np.subtract(b.centre, a.centre)
    gap = float(np.linalg.norm(apart))
    if gap <= 1e-12 * (a.radius + b.radius):
        return np.zeros((0, 2))
    apart = apart / gap
    reach = 0.5 * (gap + (a.radius - b.radius) * (a.radius + b.radius) / gap)
    foot = np.array(a.centre) + reach * apart
    return _either_side(foot, np.array([-apart[1], apart[0]]), a.radius**2 - reach**2)


def _either_side(foot: np.ndarray, along: np.ndarray, square: float) -> np.ndarray:
    if square < 0.0:
        return np.zeros((0, 2))
    return foot + np.array([[-1.0], [1.0]]) * math.sqrt(square) * along


def holds(profile: Sequence[Piece], points: np.ndarray) -> np.ndarray:
    """(n,) whether the body of a closed profile holds points (n, 2), none of them on it.

    The profile closes on itself or ends on the axis; its image at -r then closes the line, which
    winds round the points inside.
    """
    turns = _angle(profile, points)
    if profile[0].start != profile[-1].end:
        turns = turns + _angle(profile, points * [-1.0, 1.0])
    return np.abs(turns) > math.pi


def _angle(profile: Sequence[Piece], points: np.ndarray) -> np.ndarray:
    """(n,) angle that a point sweeps as it runs along a profile, seen from each of the points."""
    return np.sum([_piece_angle(piece, points) for piece in profile], axis=0)


def _piece_angle(piece: Piece, points: np.ndarray) -> np.ndarray:
    if isinstance(piece, Segment):
        return _chord_angle(piece, points)[0]
    assert isinstance(piece, Arc)
    count = math.ceil(abs(piece.sweep) / LARGEST)
    return np.sum([_arc_angle(a, points) for a in cut_up(piece, _steps(count))], axis=0)


def _steps(count: int) -> list[float]:
    return [k / count for k in range(count + 1)]


def _chord_angle(piece: Piece, points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Angle from start to end, and on which side of the chord the points lie, left positive."""
    a, b = piece.start - points, piece.end - points
    side = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return np.arctan2(side, np.sum(a * b, axis=1)), side


def _arc_angle(piece: Piece, points: np.ndarray) -> np.ndarray:
    assert isinstance(piece, Arc)
    angle, side = _chord_angle(piece, points)
    within = np.linalg.norm(points - piece.centre, axis=1) < piece.radius
    turn = math.copysign(FULL, piece.sweep)
    return angle + np.where(within & (side * piece.sweep < 0.0), turn, 0.0)
