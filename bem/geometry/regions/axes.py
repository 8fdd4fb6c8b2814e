"""Axes of spheres and ellipsoids, chosen so that others cut them in circles about the axis."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from bem.geometry.regions.coaxial import (
    centre_of,
    is_ball,
    is_sphere,
    radius_of,
    scale_of,
    seen_by,
    with_axis,
)
from bem.geometry.regions.contact import contact
from bem.geometry.regions.flat_outlines import FlatFace, flat_faces
from bem.geometry.regions.marks import coaxial_mark, flat_mark, spread
from bem.geometry.revolved import Revolution
from bem.geometry.surface import Surface


def suited(ball: Revolution, partners: Sequence[Surface], tolerance: float) -> Revolution | None:
    """A ball with an axis that suits all that cuts it; None if there is none.

    Args:
        ball: a sphere or ellipsoid.
        partners: bodies that may cut it.
        tolerance: surfaces closer than this coincide.
    """
    wanted: list[np.ndarray] = []
    for partner in partners:
        ways = _ways(ball, partner, tolerance)
        if ways is None:
            return None
        wanted += ways
    if not wanted:
        return ball
    size = max(high - low for low, high in (spread(ball, axis) for axis in np.eye(3)))
    aside = np.linalg.norm(np.cross(wanted, wanted[0]), axis=1)
    return with_axis(ball, wanted[0]) if aside.max() * size <= tolerance else None


def _ways(ball: Revolution, partner: Surface, tolerance: float) -> list[np.ndarray] | None:
    """Directions (3,) in which a partner wants the axis; None if it cuts otherwise."""
    if partner.curve is None:
        return _face_ways(ball, flat_faces(partner), tolerance)
    if is_sphere(ball) and is_sphere(partner.curve):
        return _sphere_ways(ball, partner.curve, tolerance)
    axis = partner.curve.matrix[:, 2] / np.linalg.norm(partner.curve.matrix[:, 2])
    mark = (
        coaxial_mark(with_axis(ball, axis), partner.curve, tolerance) if is_sphere(ball) else None
    )
    if mark is None:
        return _face_ways(ball, flat_faces(partner), tolerance)
    return [axis] if mark.some else []


def _sphere_ways(ball: Revolution, other: Revolution, tolerance: float) -> list[np.ndarray]:
    line = centre_of(other) - centre_of(ball)
    size = radius_of(ball) + radius_of(other)
    apart = float(np.linalg.norm(line))
    if apart <= tolerance or apart >= size:
        return []
    local = tolerance / scale_of(ball)
    turned = with_axis(ball, line)
    seen = seen_by(turned, other, local)
    crossing = seen is not None and contact(turned.profile, seen, local).some
    return [line / apart] if crossing else []


def _face_ways(
    ball: Revolution, faces: Sequence[FlatFace], tolerance: float
) -> list[np.ndarray] | None:
    """Normals of the faces that cut a ball in whole circles; None if one cuts in part of one."""
    ways = []
    for face in faces:
        low, high = spread(ball, face.normal)
        if not low + tolerance < face.normal @ face.origin < high - tolerance:
            continue
        mark = flat_mark(with_axis(ball, face.normal), [face], tolerance)
        if mark.spoilt:
            return None
        if mark.some:
            ways.append(face.normal)
    return ways


def with_suited_axis(
    curve: Revolution, partners: Sequence[Surface], tolerance: float
) -> Revolution | None:
    """The surface itself, or a ball turned to suit its partners; None if that cannot be."""
    return suited(curve, partners, tolerance) if is_ball(curve) else curve
