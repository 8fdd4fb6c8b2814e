"""Parts of surfaces folded onto the kept side of mirror planes.

Space is divided among whole bodies. A body on the far side of a mirror plane is reflected before
that; of one that the plane cuts, the parts are cut afterwards, and the half on the kept side stays.
Faces in the plane lie within the body and its image together, and go; a sheet there stays, with
the region of the kept side on both of its own.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.geometry.clip import clipped
from bem.geometry.parts import INTERFACE, METAL, Part
from bem.geometry.planes import Plane, Planes
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.symmetry import kept_share, off_plane
from bem.geometry.turning import curve_along


def folded_parts(parts: list[Part], planes: Planes, tolerance: float) -> list[Part]:
    """What is left of parts on the kept side of all mirror planes.

    Parts of dielectrics that lie in a grounded plane go too: with their images, of the opposite
    charge, they are inside.

    Args:
        parts: of whole bodies, each its own mirror image or on the kept side.
        planes: in the same unit.
        tolerance: faces nearer to a plane lie in it.

    Raises:
        GeometryError: a mirror plane cuts a curved part that it does not map onto itself.
    """
    if not planes.all:
        return parts
    parts = [found for part in parts for found in _kept(part, planes.mirrors, tolerance)]
    if planes.ground is not None:
        parts = [found for part in parts for found in _off_ground(part, planes.ground, tolerance)]
    return parts


def _is_sheet(part: Part) -> bool:
    return part.conductor != INTERFACE and part.back != METAL


def _kept(part: Part, mirrors: tuple[Plane, ...], tolerance: float) -> list[Part]:
    if part.surface.curve is not None:
        return _kept_curve(part, mirrors, tolerance)
    parts = [part]
    for mirror in mirrors:
        parts = [found for one in parts for found in _kept_faces(one, mirror, tolerance)]
    return parts


def _kept_faces(part: Part, mirror: Plane, tolerance: float) -> list[Part]:
    """What a mirror plane leaves of a part; faces of a sheet in it are a part of their own."""
    inside, rest = _apart(part.surface, mirror, tolerance)
    rest = clipped(rest, mirror, tolerance, False) if len(rest.faces) else rest
    found = [replace(part, surface=rest)] if len(rest.faces) else []
    if len(inside.faces) and _is_sheet(part):
        found.append(_alike(replace(part, surface=inside), mirror))
    return found


def _kept_curve(part: Part, mirrors: tuple[Plane, ...], tolerance: float) -> list[Part]:
    """What mirror planes leave of a part with a true surface, and of its facets."""
    facets, curve, sheet = part.surface, curve_along(part.surface), _is_sheet(part)
    reached = [mirror for mirror in mirrors if mirror.height(facets.bounds[0]) <= tolerance]
    for mirror in reached:
        facets = clipped(facets, mirror, tolerance, sheet)
        if not len(facets.faces):
            return []
    left = kept_share(curve, reached, not sheet, whole=False) if curve and reached else curve
    found = [] if left is None else [replace(part, surface=replace(facets, curve=left))]
    for mirror in reached:
        if mirror.height(facets.bounds[1]) <= tolerance:
            found = [_alike(one, mirror) for one in found]
    return found


def _off_ground(part: Part, ground: Plane, tolerance: float) -> list[Part]:
    """A part of a dielectric without what lies in the grounded plane."""
    surface = part.surface
    inside, rest = _apart(surface, ground, tolerance)
    if part.conductor != INTERFACE or not len(inside.faces):
        return [part]
    if surface.curve is not None:
        rest = replace(rest, curve=off_plane(surface.curve, ground))
    gone = not len(rest.faces) or (surface.curve is not None and rest.curve is None)
    return [] if gone else [replace(part, surface=rest)]


def _apart(surface: Surface, plane: Plane, tolerance: float) -> tuple[Surface, Surface]:
    """The faces of a surface that lie in a plane, and all others."""
    height = np.abs(plane.height(surface.vertices))
    of_face = np.where(surface.faces == NO_CORNER, 0.0, height[surface.faces])
    here = of_face.max(axis=1) <= tolerance
    return replace(surface, faces=surface.faces[here]), replace(surface, faces=surface.faces[~here])


def _alike(part: Part, mirror: Plane) -> Part:
    """A sheet in a mirror plane: behind it is what is in front, on the kept side."""
    corners = part.surface.vertices[part.surface.triangles[0]]
    normal = np.cross(corners[1] - corners[0], corners[2] - corners[0])
    region = part.front if normal[mirror.axis] > 0.0 else part.back
    return replace(part, back=region, front=region)
