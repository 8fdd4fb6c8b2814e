"""Surfaces of revolution that share an axis, so that one half-plane shows both.

A sphere shares the axis of everything whose axis passes through its centre. Its own axis, and
that of an ellipsoid, may be chosen: with local coordinates y, x = M y + b, any M with the same
M M^T gives the same surface.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from bem.geometry.regions.meridian import moved
from bem.geometry.revolved import Arc, Piece, Revolution, Segment

EXACT = 1e-9
"""Directions and scales that differ by less are the same."""


def is_ball(curve: Revolution) -> bool:
    """Whether a surface is a whole sphere or ellipsoid."""
    arc = curve.profile[0]
    if len(curve.profile) > 1 or not isinstance(arc, Arc) or not all(curve.poles):
        return False
    return abs(arc.centre[0]) <= EXACT * arc.radius


def scale_of(curve: Revolution) -> float:
    """Smallest factor by which the place of a surface stretches lengths."""
    return float(np.linalg.svd(curve.matrix, compute_uv=False)[-1])


def is_sphere(curve: Revolution) -> bool:
    """Whether a surface is a whole sphere."""
    spread = np.linalg.svd(curve.matrix, compute_uv=False)
    return is_ball(curve) and bool(spread[0] - spread[-1] <= EXACT * spread[0])


def centre_of(ball: Revolution) -> np.ndarray:
    """Centre (3,) of a sphere or ellipsoid."""
    arc = ball.profile[0]
    assert isinstance(arc, Arc)
    return ball.shift + ball.matrix[:, 2] * arc.centre[1]


def radius_of(sphere: Revolution) -> float:
    """Radius of a sphere."""
    arc = sphere.profile[0]
    assert isinstance(arc, Arc)
    return arc.radius * scale_of(sphere)


def with_axis(ball: Revolution, normal: np.ndarray) -> Revolution:
    """The same ball, cut by planes of some normal in circles about its axis.

    Args:
        ball: sphere or ellipsoid.
        normal: (3,) of the planes, any length; for a sphere the direction of the axis.
    """
    up = ball.matrix.T @ normal
    up = up / np.linalg.norm(up)
    aside = np.cross(up, np.eye(3)[np.argmin(np.abs(up))])
    aside = aside / np.linalg.norm(aside)
    matrix = ball.matrix @ np.column_stack([aside, np.cross(up, aside), up])
    arc = ball.profile[0]
    assert isinstance(arc, Arc)
    return replace(ball, matrix=matrix, shift=centre_of(ball) - matrix[:, 2] * arc.centre[1])


def aligned(curve: Revolution) -> Revolution:
    """The same surface with u = 0 where all that share its axis have it.

    Points at equal u on circles that two surfaces share are then the same points.
    """
    up = np.cross(curve.matrix[:, 0], curve.matrix[:, 1])
    up = up / np.linalg.norm(up)
    aside = np.eye(3)[np.argmin(np.round(np.abs(up), 6))]
    local = np.linalg.solve(curve.matrix, aside - (aside @ up) * up)
    c, s = local[:2] / np.hypot(*local[:2])
    turn = np.array([[c, -s, 0.0], [s, c, 0.0], [0.0, 0.0, 1.0]])
    return replace(curve, matrix=curve.matrix @ turn)


def seen_by(curve: Revolution, other: Revolution, tolerance: float) -> tuple[Piece, ...] | None:
    """Profile of another surface in the half-plane of ``curve``; None without a common axis.

    Args:
        curve: whose local coordinates count.
        other: the other surface.
        tolerance: how far its axis may lie from that of ``curve``, in local lengths.
    """
    if is_sphere(other) and is_sphere(replace(curve, profile=other.profile)):
        return _sphere_seen(curve, other, tolerance)
    inverse = np.linalg.inv(curve.matrix)
    local, shift = inverse @ other.matrix, inverse @ (other.shift - curve.shift)
    size = max(abs(x) for piece in other.profile for x in (*piece.start, *piece.end))
    if _off_axis(local, shift, size) > tolerance:
        return None
    across, along = float(np.linalg.norm(local[:2, 0])), float(local[2, 2])
    stretched = abs(abs(along) / across - 1.0) > EXACT
    if stretched and not all(isinstance(piece, Segment) for piece in other.profile):
        return None
    return _profile_seen(other.profile, across, along, float(shift[2]))


def _off_axis(local: np.ndarray, shift: np.ndarray, size: float) -> float:
    """How far a map takes points within ``size`` from one that keeps the axis and circles."""
    turned = 0.5 * np.array([local[0, 0] + local[1, 1], local[1, 0] - local[0, 1]])
    mirrored = 0.5 * np.array([local[0, 0] - local[1, 1], local[1, 0] + local[0, 1]])
    skew = min(np.linalg.norm(turned), np.linalg.norm(mirrored))
    tilt = max(np.linalg.norm(local[:2, 2]), np.linalg.norm(local[2, :2]))
    return float(np.linalg.norm(shift[:2]) + size * (skew + tilt))


def _profile_seen(
    profile: Sequence[Piece], across: float, along: float, shift: float
) -> tuple[Piece, ...]:
    if abs(abs(along) / across - 1.0) <= EXACT:
        along = float(np.copysign(across, along))
    return tuple(moved(piece, across, along, shift) for piece in profile)


def _sphere_seen(
    curve: Revolution, sphere: Revolution, tolerance: float
) -> tuple[Piece, ...] | None:
    at = np.linalg.solve(curve.matrix, centre_of(sphere) - curve.shift)
    if np.hypot(at[0], at[1]) > tolerance:
        return None
    z, radius = float(at[2]), radius_of(sphere) / scale_of(curve)
    start, end = (0.0, z - radius), (0.0, z + radius)
    return (Arc(start, end, (0.0, z), -0.5 * np.pi, np.pi),)
