"""Smooth surfaces of revolution, known exactly: what the panels of a round body follow.

A profile in the half-plane (r >= 0, z) is turned about the z-axis and then placed by an
affine map:

    x(u, s) = M (r(s) cos 2 pi u, r(s) sin 2 pi u, z(s)) + b

The profile is a chain of pieces, straight or circular; piece k covers s in [k, k + 1]. Four
points (u0 or u1, s0 or s1) always lie in one plane: they are an isosceles trapezoid, or its
image under M. Equal parameters give equal points to the last bit, u = 0 and u = 1 coincide,
and a profile point on the axis is one single point whatever u.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import NamedTuple, Protocol

import numpy as np

Position = tuple[float, float]
"""(r, z) in the half-plane of the profile."""


class Piece(Protocol):
    """A smooth part of a profile, with t in [0, 1] along it."""

    @property
    def start(self) -> Position:
        """Position at t = 0."""

    @property
    def end(self) -> Position:
        """Position at t = 1."""

    @property
    def least_r(self) -> float:
        """Smallest r of the piece, an end on the axis left out."""

    @property
    def bend(self) -> float:
        """Angle by which the direction changes from end to end, radians."""

    def at(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): r and z at t; exactly ``start`` and ``end`` at 0 and 1."""

    def slope(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): derivatives of r and z by t."""

    def reversed(self) -> Piece:
        """Give the same piece, run through the other way."""


@dataclass(frozen=True)
class Segment:
    """A straight piece."""

    start: Position
    end: Position

    @property
    def least_r(self) -> float:
        """Smallest r of the piece, an end on the axis left out."""
        return min(self.start[0], self.end[0]) or max(self.start[0], self.end[0])

    @property
    def bend(self) -> float:
        """Zero."""
        return 0.0

    def at(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): r and z at t."""
        t = np.asarray(t)[..., None]
        return (1.0 - t) * np.array(self.start) + t * np.array(self.end)

    def slope(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): derivatives of r and z by t."""
        change = np.subtract(self.end, self.start)
        return np.broadcast_to(change, (*np.shape(t), 2))

    def reversed(self) -> Segment:
        """Give the same piece, run through the other way."""
        return Segment(self.end, self.start)


@dataclass(frozen=True)
class Arc:
    """A circular piece.

    Args:
        start: position at t = 0.
        end: position at t = 1.
        centre: of the circle.
        first: direction of ``start`` from the centre, radians from the r-axis towards z.
        sweep: signed angle from ``start`` to ``end``, radians.
    """

    start: Position
    end: Position
    centre: Position
    first: float
    sweep: float

    @property
    def radius(self) -> float:
        """Radius of the circle."""
        return float(np.hypot(*np.subtract(self.start, self.centre)))

    @property
    def least_r(self) -> float:
        """Smallest r of the piece, an end on the axis left out."""
        to_innermost = (np.pi - self.first) * np.sign(self.sweep) % (2.0 * np.pi)
        if 0.0 < to_innermost < abs(self.sweep):
            return self.centre[0] - self.radius
        ends = min(self.start[0], self.end[0]) or max(self.start[0], self.end[0])
        return ends or self.radius

    @property
    def bend(self) -> float:
        """Angle by which the direction changes from end to end, radians."""
        return abs(self.sweep)

    def at(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): r and z at t."""
        t = np.asarray(t)[..., None]
        on_circle = self.radius * _direction(self.first + self.sweep * t[..., 0]) + self.centre
        return np.where(t == 0.0, self.start, np.where(t == 1.0, self.end, on_circle))

    def slope(self, t: np.ndarray) -> np.ndarray:
        """(..., 2): derivatives of r and z by t."""
        ahead = np.asarray(self.first + np.pi / 2 + self.sweep * np.asarray(t))
        return self.radius * self.sweep * _direction(ahead)

    def reversed(self) -> Arc:
        """Give the same piece, run through the other way."""
        return Arc(self.end, self.start, self.centre, self.first + self.sweep, -self.sweep)


def _direction(angle: np.ndarray) -> np.ndarray:
    return np.stack([np.cos(angle), np.sin(angle)], axis=-1)


def arc_through(start: Position, via: Position, end: Position) -> Arc | None:
    """Arc from ``start`` to ``end`` by way of ``via``; None if the three are in line."""
    a, b = np.subtract(via, start), np.subtract(end, start)
    twice_area = float(a[0] * b[1] - a[1] * b[0])
    if abs(twice_area) <= 1e-12 * float(np.hypot(*a) * np.hypot(*b)):
        return None
    a2, b2 = float(a @ a), float(b @ b)
    centre = np.array([b[1] * a2 - a[1] * b2, a[0] * b2 - b[0] * a2]) / (2.0 * twice_area) + start
    first, last = (float(np.arctan2(*(np.subtract(p, centre)[::-1]))) for p in (start, end))
    turn = 2.0 * np.pi
    sweep = (last - first) % turn if twice_area > 0.0 else -((first - last) % turn)
    return Arc(start, end, (float(centre[0]), float(centre[1])), first, sweep)


def _turned(u: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Cosine and sine of 2 pi u, exact at quarters and alike in all eight octants."""
    quarters = np.round(4.0 * u)
    angle = 2.0 * np.pi * (u - 0.25 * quarters)
    c, s = np.cos(angle), np.sin(angle)
    which = quarters.astype(np.int64) & 3
    return np.choose(which, [c, -s, -c, s]), np.choose(which, [s, c, -s, -c])


class Frame(NamedTuple):
    """Points of the surface with their derivatives, each (..., 3)."""

    point: np.ndarray
    by_u: np.ndarray
    by_s: np.ndarray


@dataclass(frozen=True, eq=False)
class Revolution:
    """A profile turned about the z-axis, then placed.

    The normal points to the right of the profile's direction: outward if the profile runs
    from the lower end of the axis round the outside to the upper end, or counterclockwise
    in the (r, z) plane if it closes on itself.

    Args:
        profile: pieces, each starting where the one before ends; r = 0 only at the two ends.
        matrix: (3, 3), regular; a reflection is replaced by a rotation to the same surface.
        shift: (3,), in the unit of the placed body.
        turn: part of the full turn that is there, from u = 0: 1, or 1/2 or 1/4 where planes of
            symmetry through the axis stand for the rest.
        cut: whether the profile is cut short at its start, and at its end, by a plane of symmetry.
        joined: whether other surfaces go on from its start, and from its end.
    """

    profile: tuple[Piece, ...]
    matrix: np.ndarray
    shift: np.ndarray
    turn: float = 1.0
    cut: tuple[bool, bool] = (False, False)
    joined: tuple[bool, bool] = (False, False)

    def __post_init__(self) -> None:
        # The body is its own mirror image in y, so a proper map to the same surface exists.
        matrix = np.array(self.matrix, dtype=float)
        if np.linalg.det(matrix) < 0.0:
            matrix[:, 1] *= -1.0
        object.__setattr__(self, "matrix", matrix)
        object.__setattr__(self, "shift", np.array(self.shift, dtype=float))

    @property
    def pieces(self) -> int:
        """Number of pieces K; s runs from 0 to K."""
        return len(self.profile)

    @property
    def loops(self) -> bool:
        """Whether the profile closes on itself, so that s = K is s = 0."""
        return self.profile[0].start == self.profile[-1].end

    @property
    def poles(self) -> tuple[bool, bool]:
        """Whether the profile starts, and whether it ends, on the axis."""
        return self.profile[0].start[0] == 0.0, self.profile[-1].end[0] == 0.0

    @property
    def free_rims(self) -> tuple[bool, bool]:
        """Whether the surface has a free rim at s = 0, and at s = K."""
        (at_start, at_end), (cut_start, cut_end) = self.poles, self.cut
        start, end = at_start or cut_start or self.joined[0], at_end or cut_end or self.joined[1]
        return not (self.loops or start), not (self.loops or end)

    def point(self, u: np.ndarray | float, s: np.ndarray | float) -> np.ndarray:
        """(..., 3): points of the placed surface; ``u`` and ``s`` broadcast."""
        u, s = _together(u, s)
        c, n = _turned(u)
        r, z = np.moveaxis(self._along(s, _position), -1, 0)
        return self._mapped(np.stack([r * c, r * n, z], axis=-1)) + self.shift

    def frame(self, u: np.ndarray | float, s: np.ndarray | float) -> Frame:
        """Points with the derivatives by u and by s; ``u`` and ``s`` broadcast.

        Where two pieces meet, the derivative by s is that of the later one.
        """
        u, s = _together(u, s)
        c, n = _turned(u)
        r, z = np.moveaxis(self._along(s, _position), -1, 0)
        dr, dz = np.moveaxis(self._along(s, _slope), -1, 0)
        turn = 2.0 * np.pi * r
        return Frame(
            self._mapped(np.stack([r * c, r * n, z], axis=-1)) + self.shift,
            self._mapped(np.stack([-turn * n, turn * c, np.zeros_like(r)], axis=-1)),
            self._mapped(np.stack([dr * c, dr * n, dz], axis=-1)),
        )

    def normal(self, u: np.ndarray | float, s: np.ndarray | float) -> np.ndarray:
        """(..., 3): unit normals; where two pieces meet, that of the later one."""
        u, s = _together(u, s)
        c, n = _turned(u)
        dr, dz = np.moveaxis(self._along(s, _slope), -1, 0)
        # Normals go by the inverse transpose of the map.
        across = np.stack([dz * c, dz * n, -dr], axis=-1) @ np.linalg.inv(self.matrix)
        return across / np.linalg.norm(across, axis=-1, keepdims=True)

    def placed(self, matrix: np.ndarray, shift: np.ndarray) -> Revolution:
        """Give the surface with every point x moved to ``matrix @ x + shift``.

        Args:
            matrix: (3, 3), regular.
            shift: (3,).
        """
        matrix = np.asarray(matrix, dtype=float)
        return replace(self, matrix=matrix @ self.matrix, shift=matrix @ self.shift + shift)

    def reversed(self) -> Revolution:
        """Give the same surface with its normal on the other side."""
        backwards = tuple(piece.reversed() for piece in self.profile[::-1])
        return replace(self, profile=backwards, cut=self.cut[::-1], joined=self.joined[::-1])

    def _mapped(self, x: np.ndarray) -> np.ndarray:
        # Written out: a matrix product may round one row differently from another.
        m = self.matrix
        return x[..., :1] * m[:, 0] + x[..., 1:2] * m[:, 1] + x[..., 2:] * m[:, 2]

    def _along(self, s: np.ndarray, look: Callable[[Piece, np.ndarray], np.ndarray]) -> np.ndarray:
        """(..., 2): what ``look`` finds on the piece that each s falls on."""
        which = np.clip(np.floor(s), 0, self.pieces - 1).astype(np.int64)
        found = np.empty((*s.shape, 2))
        for k, piece in enumerate(self.profile):
            here = which == k
            found[here] = look(piece, s[here] - k)
        return found


def _together(u: np.ndarray | float, s: np.ndarray | float) -> tuple[np.ndarray, np.ndarray]:
    u, s = np.broadcast_arrays(np.asarray(u, dtype=float), np.asarray(s, dtype=float))
    # Contiguous: strided sines may be rounded differently.
    return u.copy(), s.copy()


def _position(piece: Piece, t: np.ndarray) -> np.ndarray:
    return piece.at(t)


def _slope(piece: Piece, t: np.ndarray) -> np.ndarray:
    return piece.slope(t)
