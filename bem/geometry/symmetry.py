"""The part of a surface of revolution that mirror planes leave of it.

A plane maps such a surface onto itself if it contains the axis (half of the turn stays) or is
normal to it and the profile is its own mirror image (the pieces on one side stay). In local
coordinates y, with x = M y + b, the reflection H in the plane reads L y + l, L = M^-1 H M:
of the first kind if L leaves z alone, of the second if L reverses z alone.
"""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np

from bem.errors import GeometryError
from bem.geometry.planes import Plane
from bem.geometry.revolved import Arc, Piece, Revolution, Segment

EXACT = 1e-9
"""Relative to the size: how well a body must be its own mirror image."""
NOT_SYMMETRIC = (
    "is cut by the mirror plane {plane} but is not its own mirror image there; "
    "move it, or cut it at the plane in the drawing"
)


def kept_part(curve: Revolution, mirrors: list[Plane], solid: bool) -> Revolution:
    """Part of a surface on the side of larger coordinates of planes that cut or touch it.

    Args:
        curve: the whole surface.
        mirrors: planes of symmetry.
        solid: pieces that lie in a plane are inside the metal, and go.

    Raises:
        GeometryError: a plane cuts the surface, which is not its own mirror image there.
    """
    found = kept_share(curve, mirrors, solid, whole=True)
    if found is None:
        raise _asymmetric(mirrors[0])
    return found


def kept_share(
    curve: Revolution, mirrors: list[Plane], solid: bool, whole: bool
) -> Revolution | None:
    """The same of a part of a surface, which need not be its own mirror image; maybe nothing.

    Args:
        curve: the surface.
        mirrors: planes of symmetry.
        solid: pieces that lie in a plane go.
        whole: it must be its own mirror image.

    Raises:
        GeometryError: the planes do not map the surface onto itself.
    """
    curve = _aligned_ball(curve, mirrors)
    across = []
    for mirror in mirrors:
        local, offset = _local(curve, mirror)
        size = np.abs(offset).max() + _size(curve)
        if _close(local[2], [0, 0, 1]) and _close(local[:, 2], [0, 0, 1]):
            if np.abs(offset).max() > EXACT * size:
                raise _asymmetric(mirror)
            across.append(mirror)
        elif _close(local, np.diag([1, 1, -1])) and np.abs(offset[:2]).max() <= EXACT * size:
            half = _half_profile(curve, (mirror, 0.5 * float(offset[2])), solid, whole)
            if half is None:
                return None
            curve = half
        else:
            raise _asymmetric(mirror)
    return _turned(curve, across) if across else curve


def _asymmetric(mirror: Plane) -> GeometryError:
    return GeometryError(NOT_SYMMETRIC.format(plane=mirror))


def _close(a: np.ndarray, b: np.ndarray | list[int]) -> bool:
    return bool(np.abs(a - np.asarray(b)).max() <= EXACT)


def _local(curve: Revolution, mirror: Plane) -> tuple[np.ndarray, np.ndarray]:
    """Matrix and shift of the reflection in the surface's own coordinates."""
    reflection = np.eye(3)
    reflection[mirror.axis, mirror.axis] = -1.0
    moved = mirror.reflect(curve.shift) - curve.shift
    inverse = np.linalg.inv(curve.matrix)
    return inverse @ reflection @ curve.matrix, inverse @ moved


def _size(curve: Revolution) -> float:
    """Largest coordinate of the profile."""
    return max(abs(x) for piece in curve.profile for x in (*piece.start, *piece.end))


def _aligned_ball(curve: Revolution, mirrors: list[Plane]) -> Revolution:
    """A sphere or ellipsoid with its axis of revolution chosen to suit the planes.

    Any M with the same M M^T gives the same ellipsoid.
    """
    arc = curve.profile[0]
    round_ball = len(curve.profile) == 1 and isinstance(arc, Arc) and all(curve.poles)
    if not round_ball or not isinstance(arc, Arc) or arc.centre[0] != 0.0:
        return curve
    chosen = [mirror.axis for mirror in mirrors]
    rest = [k for k in range(3) if k not in chosen]
    square = curve.matrix @ curve.matrix.T
    if np.abs(square[np.ix_(chosen, rest)]).max(initial=0.0) > EXACT * np.abs(square).max():
        return curve
    columns = [np.eye(3)[k] * np.sqrt(square[k, k]) for k in chosen]
    values, vectors = np.linalg.eigh(square[np.ix_(rest, rest)])
    for value, vector in zip(values, vectors.T, strict=True):
        columns.append(np.zeros(3))
        columns[-1][rest] = np.sqrt(value) * vector
    center = curve.shift + curve.matrix[:, 2] * arc.centre[1]
    matrix = np.array(columns).T
    return replace(curve, matrix=matrix, shift=center - matrix[:, 2] * arc.centre[1])


def off_plane(curve: Revolution, plane: Plane) -> Revolution | None:
    """What is left of a surface on one side of a plane without its pieces that lie in it."""
    local, offset = _local(curve, plane)
    if not _close(local, np.diag([1, 1, -1])):
        return curve
    level, pieces = 0.5 * float(offset[2]), list(curve.profile)
    slack = EXACT * (np.abs(offset).max() + _size(curve))
    stay = np.array([_above(piece, level, slack) != 0 for piece in pieces])
    return _chain(curve, pieces, stay, plane)


def _half_profile(
    curve: Revolution, mirror: tuple[Plane, float], solid: bool, whole: bool
) -> Revolution | None:
    """The pieces of a profile that lie on the kept side of a plane, z = level in local ones."""
    plane, level = mirror
    pieces = [part for piece in curve.profile for part in split_at(piece, level)]
    upward = curve.matrix[plane.axis, 2] > 0.0
    side = np.array([_above(piece, level, EXACT * _size(curve)) for piece in pieces])
    side = side if upward else -side
    if whole and (side < 0).any() and not _own_image(pieces, level, EXACT * _size(curve)):
        raise _asymmetric(plane)
    return _chain(curve, pieces, (side > 0) | ((side == 0) & (not solid)), plane)


def _chain(
    curve: Revolution, pieces: list[Piece], stay: np.ndarray, plane: Plane
) -> Revolution | None:
    """The pieces that stay, which must follow each other, cut short where others are missing."""
    if stay.all():
        return curve
    if not stay.any():
        return None
    first = int(np.flatnonzero(stay & ~np.roll(stay, 1))[0]) if curve.loops else 0
    order = np.roll(np.arange(len(pieces)), -first)
    kept = np.flatnonzero(stay[order])
    if kept[-1] - kept[0] + 1 != len(kept):
        raise _asymmetric(plane)
    chain = tuple(pieces[order[k]] for k in kept)
    low = curve.cut[0] if kept[0] == 0 and not curve.loops else True
    high = curve.cut[1] if kept[-1] == len(order) - 1 and not curve.loops else True
    return replace(curve, profile=chain, cut=(low, high))


def _above(piece: Piece, level: float, tolerance: float) -> int:
    """1 above the level, -1 below, 0 in it; the piece does not cross it."""
    z = piece.at(np.array([0.0, 0.5, 1.0]))[:, 1] - level
    worst = z[np.argmax(np.abs(z))]
    return 0 if abs(worst) <= tolerance else int(np.sign(worst))


def _own_image(pieces: list[Piece], level: float, tolerance: float) -> bool:
    """Whether the middles of all pieces, mirrored, are middles of pieces."""
    middle = np.array([piece.at(np.array(0.5)) for piece in pieces])
    ends = np.array([[piece.start, piece.end] for piece in pieces])
    mirrored = middle * [1.0, -1.0] + [0.0, 2.0 * level]
    apart = np.linalg.norm(mirrored[:, None] - middle, axis=2)
    partner = apart.argmin(axis=1)
    there = ends[partner][:, ::-1] * [1.0, -1.0] + [0.0, 2.0 * level]
    close = np.abs(there - ends).max(axis=(1, 2)) <= tolerance
    return bool((apart.min(axis=1) <= tolerance).all() and close.all())


def split_at(piece: Piece, level: float) -> list[Piece]:
    """Pieces of one cut where it passes through z = level."""
    cuts = sorted(t for t in _crossings(piece, level) if 1e-9 < t < 1.0 - 1e-9)
    stops = [0.0, *cuts, 1.0]
    return [_between(piece, a, b, level) for a, b in itertools.pairwise(stops)]


def _crossings(piece: Piece, level: float) -> list[float]:
    if isinstance(piece, Segment):
        rise = piece.end[1] - piece.start[1]
        return [(level - piece.start[1]) / rise] if rise else []
    assert isinstance(piece, Arc)
    sine = (level - piece.centre[1]) / piece.radius
    if abs(sine) >= 1.0:
        return []
    angles = np.array([np.arcsin(sine), np.pi - np.arcsin(sine)])
    ahead = (angles - piece.first) * np.sign(piece.sweep) % (2.0 * np.pi)
    return (ahead / abs(piece.sweep)).tolist()


def _between(piece: Piece, low: float, high: float, level: float) -> Piece:
    """Part of a piece; ends inside it lie exactly at the level."""
    if (low, high) == (0.0, 1.0):
        return piece
    ends = [_end(piece, t, level) for t in (low, high)]
    if isinstance(piece, Segment):
        return Segment(*ends)
    assert isinstance(piece, Arc)
    first = piece.first + low * piece.sweep
    return Arc(ends[0], ends[1], piece.centre, first, (high - low) * piece.sweep)


def _end(piece: Piece, t: float, level: float) -> tuple[float, float]:
    if t in (0.0, 1.0):
        return piece.end if t else piece.start
    return float(piece.at(np.array(t))[0]), level


def _turned(curve: Revolution, across: list[Plane]) -> Revolution:
    """The kept half or quarter of the turn, beginning at u = 0."""
    share = 0.5 ** len(across)
    angles = [angle for mirror in across for angle in _line(curve, mirror)]
    for angle in angles:
        c, s = np.cos(angle), np.sin(angle)
        turned = replace(
            curve, matrix=curve.matrix @ np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]]), turn=share
        )
        middle = turned.matrix @ [np.cos(np.pi * share), np.sin(np.pi * share), 0.0]
        if all(middle[mirror.axis] > 0.0 for mirror in across):
            return turned
    raise _asymmetric(across[0])


def _line(curve: Revolution, mirror: Plane) -> list[float]:
    """Both directions in the local xy-plane that lie in the mirror plane, radians."""
    a, b = curve.matrix[mirror.axis, :2]
    angle = float(np.arctan2(-a, b))
    return [angle, angle + np.pi]
