"""Bodies folded onto the kept side of mirror planes, where the images stand for the rest.

The kept side is that of larger coordinates. A body on the other side is replaced by its mirror
image, which with the planes is the same thing; one that a plane cuts must be its own mirror image
there, and the half on the kept side stays. A face of solid metal that lies in a mirror plane is
inside the metal of body and image together, and goes.
"""

from __future__ import annotations

import numpy as np

from bem.errors import GeometryError
from bem.geometry.clip import clipped
from bem.geometry.fit.fit import fit_of
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.planes import Plane, Planes
from bem.geometry.surface import Surface
from bem.geometry.symmetry import NOT_SYMMETRIC, kept_part
from bem.geometry.topology import edges_of

ON_PLANE = 1e-6
"""A body reaches a plane if it comes as near as this part of its diagonal."""
ALIKE = 1e-2
"""Relative to the diagonal: how well a faceted body must be its own mirror image."""

CUT_FACETS = (
    "has facets that the mirror plane {plane} cuts, and half a facet does not show the smooth "
    "surface; mesh it with edges in the plane, or give smooth = false"
)


def folded(surface: Surface, planes: Planes, solid: bool) -> Surface:
    """What is left of a body on the kept side of all mirror planes.

    Args:
        surface: of the whole body.
        planes: in the same unit.
        solid: whether a closed surface bounds metal.

    Raises:
        GeometryError: a plane cuts the body, which is not its own mirror image there.
    """
    solid = solid and _closed(surface)
    reached = []
    for mirror in planes.mirrors:
        side = side_of(surface, mirror)
        surface = reflected(surface, mirror) if side < 0 else surface
        if side == 0 or touches(surface, mirror):
            reached.append(mirror)
    if surface.curve is not None:
        curve = kept_part(surface.curve, reached, solid) if reached else surface.curve
        return Surface(surface.vertices, surface.faces, curve, surface.rounding)
    for mirror in reached:
        surface = _kept_half(surface, mirror, solid)
    return surface


def _closed(surface: Surface) -> bool:
    if surface.curve is not None:
        return not any(surface.curve.free_rims)
    return bool((edges_of(surface.triangles).uses % 2 == 0).all())


def side_of(surface: Surface, plane: Plane) -> int:
    """1 or -1 for the side of the plane that a surface lies on, 0 if the plane cuts it."""
    low, high = plane.height(surface.bounds)
    tolerance = ON_PLANE * surface.extent
    if low < -tolerance and high > tolerance:
        return 0
    return 1 if low >= -tolerance else -1


def touches(surface: Surface, plane: Plane) -> bool:
    """Whether a surface on one side of a plane reaches it."""
    return float(np.abs(plane.height(surface.bounds)).min()) <= ON_PLANE * surface.extent


def reflected(surface: Surface, plane: Plane) -> Surface:
    """Mirror image of a surface."""
    matrix, shift = np.eye(3), np.zeros(3)
    matrix[plane.axis, plane.axis] = -1.0
    shift[plane.axis] = 2.0 * plane.at
    return surface.placed(matrix, shift)


def _kept_half(surface: Surface, mirror: Plane, solid: bool) -> Surface:
    tolerance = ON_PLANE * surface.extent
    if surface.smooth and _cuts_facets(surface, mirror, tolerance):
        raise GeometryError(CUT_FACETS.format(plane=mirror))
    kept = clipped(surface, mirror, tolerance, not solid)
    if side_of(surface, mirror) == 0:
        other = clipped(reflected(surface, mirror), mirror, tolerance, not solid)
        if not np.allclose(_measures(kept), _measures(other), rtol=0, atol=ALIKE * surface.extent):
            raise GeometryError(NOT_SYMMETRIC.format(plane=mirror))
    return kept


def _cuts_facets(surface: Surface, mirror: Plane, tolerance: float) -> bool:
    """Whether a plane runs through the middle of facets that the fitted surface leaves."""
    fit = fit_of(surface, FlatFaces.of(surface))
    if fit is None:
        return False
    bent = fit.sagitta[fit.facets.flat] != 0.0
    height = mirror.height(fit.facets.points)[fit.facets.corners[bent]]
    return bool(((height < -tolerance).any(axis=1) & (height > tolerance).any(axis=1)).any())


def _measures(surface: Surface) -> np.ndarray:
    """Bounds, centroid and root of the area of a surface, in the unit of length."""
    corners = surface.vertices[surface.triangles]
    cross = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    area = 0.5 * np.linalg.norm(cross, axis=1)
    centroid = area @ corners.mean(axis=1) / area.sum()
    return np.concatenate([surface.bounds.ravel(), centroid, [np.sqrt(area.sum())]])
