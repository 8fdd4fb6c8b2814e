"""Surfaces of revolution cut by a plane in circles, such as that between two layers."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.errors import GeometryError
from bem.geometry.planes import Plane
from bem.geometry.regions.chains import chains, stretches
from bem.geometry.regions.coaxial import is_ball, scale_of, with_axis
from bem.geometry.regions.contact import contact
from bem.geometry.regions.marks import level_line, level_of, spread
from bem.geometry.revolved import Revolution
from bem.geometry.shapes.round import faceted
from bem.geometry.shapes.steps import AROUND
from bem.geometry.surface import Surface

ON_PLANE = 1e-6
"""A surface lies on one side of a plane if it passes it by no more than this part of its size."""
OBLIQUE = (
    "is cut by the plane {plane} otherwise than across its axis; turn it, or give it as a mesh, "
    "whose facets may be cut anywhere"
)


def cut_at_plane(surface: Surface, plane: Plane) -> list[Surface]:
    """Parts of a curved surface on both sides of a plane, in the order of the profile.

    Args:
        surface: with a curve, which every part keeps.
        plane: in the same unit.

    Returns:
        The surface alone if the plane does not cut it; else each part with facets of its own,
        joined where it was cut.

    Raises:
        GeometryError: the plane is not normal to the axis; spheres and ellipsoids have any axis.
    """
    curve, normal = surface.curve, np.eye(3)[plane.axis]
    assert curve is not None
    low, high = spread(curve, normal)
    tolerance = ON_PLANE * (high - low)
    if low >= plane.at - tolerance or high <= plane.at + tolerance:
        return [surface]
    curve = with_axis(curve, normal) if is_ball(curve) else curve
    level = level_of(curve, normal, plane.at, tolerance)
    if level is None:
        raise GeometryError(OBLIQUE.format(plane=plane))
    parts = _parted(curve, level, tolerance / scale_of(curve))
    return [replace(faceted(part, AROUND), rounding=surface.rounding) for part in parts]


def _parted(curve: Revolution, level: float, tolerance: float) -> list[Revolution]:
    """Chains of stretches on one side of z = level each, in local lengths."""
    cuts = contact(curve.profile, level_line(curve, level), tolerance).cuts
    line = stretches(curve, cuts, tolerance)
    pieces = [(curve.profile[k], 0.5 * (low + high) - k) for k, low, high in line]
    height = np.array([piece.at(np.array(t))[1] - level for piece, t in pieces])
    side = np.where(np.abs(height) <= tolerance, 0, np.sign(height)).astype(int)
    return [part for _, part in chains(curve, line, [(k, k) for k in side.tolist()])]
