"""Repair of one body after welding: what is safe is done and counted, the rest refused or left.

In this order: corners on edges of neighbours are joined; open seams are welded and small holes
filled if that closes the surface; pieces of a solid that run into each other are united; faces
that overlap in one plane are kept once; faces inside solid metal leave. A legal sheet stays a
sheet, and a sound surface stays as it is.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.errors import GeometryError, InputError
from bem.geometry.repair.holes import fill_holes
from bem.geometry.repair.joints import join_corners
from bem.geometry.repair.overlap import Overlaps, find_overlaps
from bem.geometry.repair.pieces import unite_pieces
from bem.geometry.repair.planes import overlay
from bem.geometry.repair.seams import weld_seams
from bem.geometry.repair.walls import drop_walls
from bem.geometry.surface import Surface
from bem.geometry.topology import edges_of, orient
from bem.geometry.weld import WELD, weld
from bem.geometry.wording import counted, metre_text, point_text
from bem.units import metres_per

ON_EDGE = 2.0 * WELD
"""A corner this near to an edge lies on it, as a part of the body's size."""

SEAMS = (0.0, 1e-6, 1e-5, 1e-4)
"""Widths of open seams tried in turn, as parts of the body's size."""

DEPTH = 10.0 * ON_EDGE
"""Coplanar faces that overlap less than this part of the body's size only touch."""


class Repaired(NamedTuple):
    """A surface and what was done to it, one line each."""

    surface: Surface
    changes: list[str]


def repair(surface: Surface, solid: bool, unit: str) -> Repaired:
    """Mend a welded surface as far as that is safe.

    Args:
        surface: faces of one body, welded; a curved shape comes back as it is.
        solid: whether a closed surface bounds metal; in a shell inner walls and holes count.
        unit: for places and areas in the lines.

    Raises:
        GeometryError: faces lie on one another in a plane and cannot be parted.
    """
    if surface.curve is not None or _is_sound(surface):
        return Repaired(surface, [])
    closed = _closed_up(surface, solid, unit)
    apart = _set_apart(closed.surface, solid, unit)
    changes = closed.changes + apart.changes
    if not solid:
        return Repaired(apart.surface, changes)
    outside, walls = drop_walls(apart.surface)
    if walls:
        changes.append(f"{counted(walls, 'face')} inside the solid dropped")
        outside = weld(outside)[0]
    return Repaired(outside, changes)


def _is_closed(surface: Surface) -> bool:
    return not (edges_of(surface.triangles).uses % 2).any()


def _closed_up(surface: Surface, solid: bool, unit: str) -> Repaired:
    """Join corners; weld seams and fill holes in the narrowest way that closes the surface."""
    if _is_closed(surface):
        return Repaired(surface, [])
    tries = (_attempt(surface, width, solid, unit) for width in SEAMS)
    first = next(tries)
    if _is_closed(first.surface):
        return first
    return next((later for later in tries if _is_closed(later.surface)), first)


def _attempt(surface: Surface, width: float, solid: bool, unit: str) -> Repaired:
    """Close a surface with seams up to ``width`` of its size."""
    extent = surface.extent
    seams = weld_seams(surface, width * extent)
    joined, corners = join_corners(seams.surface, max(width, ON_EDGE) * extent)
    changes = []
    if seams.vertices:
        number = counted(seams.vertices, "vertex", "vertices")
        changes.append(f"{number} on open seams welded, largest move {metre_text(seams.move)}")
    if corners:
        number = counted(corners, "corner")
        changes.append(f"{number} on edges of neighbours (T-junctions) joined")
    if not solid:
        return Repaired(joined, changes)
    filled = fill_holes(joined)
    if filled.holes:
        area = f"{filled.area / metres_per(unit) ** 2:.4g} {unit}^2"
        changes.append(
            f"{counted(filled.holes, 'small hole')} filled, the largest {area} "
            f"at {point_text(filled.place, unit)}"
        )
    return Repaired(filled.surface, changes)


def _set_apart(surface: Surface, solid: bool, unit: str) -> Repaired:
    """Part faces that overlap in a plane, and unite pieces of a solid."""
    if _is_sound(surface):
        return Repaired(surface, [])
    found, piece = _overlaps(surface)
    if len(found.coplanar) + len(found.crossing) == 0:
        return Repaired(surface, [])
    if solid:
        united, pieces = _united(surface, found)
        if pieces:
            return Repaired(united, [f"{pieces} pieces that overlap or touch united"])
    if len(found.coplanar) == 0 and not _is_closed(surface):
        return Repaired(surface, [])
    if len(found.coplanar) == 0:
        place = point_text(_middle(surface, found.crossing[0]), unit)
        return Repaired(surface, [f"pieces cross near {place}, left as they are"])
    laid = _tidy(overlay(surface, found.coplanar, piece, ON_EDGE * surface.extent))
    if laid is None or len(_overlaps(laid)[0].coplanar):
        place = point_text(_middle(surface, found.coplanar[0]), unit)
        raise GeometryError(
            f"faces lie on one another near {place}, and could not be parted; "
            "leave out one of them and mesh again"
        )
    faces = counted(len(np.unique(found.coplanar)), "triangle")
    return Repaired(laid, [f"{faces} overlapping in one plane cut and kept once"])


def _is_sound(surface: Surface) -> bool:
    """Whether every edge has two triangles and the bounding boxes of all pieces are apart."""
    edges = edges_of(surface.triangles)
    if (edges.uses != 2).any():
        return False
    piece, _ = orient(surface.triangles, edges)
    return piece.max() == 0 or _boxes_apart(surface.vertices[surface.triangles], piece)


def _overlaps(surface: Surface) -> tuple[Overlaps, np.ndarray]:
    """Overlaps of a surface, and the piece (t,) of each triangle."""
    triangles = surface.triangles
    piece, _ = orient(triangles, edges_of(triangles))
    corners, extent = surface.vertices[triangles], surface.extent
    flat = max(ON_EDGE * extent, 2.0 * surface.rounding)
    return find_overlaps(corners, piece, flat, max(DEPTH * extent, 10.0 * flat)), piece


def _boxes_apart(corners: np.ndarray, piece: np.ndarray) -> bool:
    """Whether the bounding boxes of all pieces are apart."""
    order = np.argsort(piece, kind="stable")
    starts = np.flatnonzero(np.diff(piece[order], prepend=-1))
    low = np.minimum.reduceat(corners.min(axis=1)[order], starts)
    high = np.maximum.reduceat(corners.max(axis=1)[order], starts)
    meet = (low[:, None] <= high[None, :]).all(axis=2)
    return int((meet & meet.T).sum()) == len(starts)


def _united(surface: Surface, found: Overlaps) -> tuple[Surface, int]:
    """Unite pieces, unless faces overlap in a plane afterwards."""
    united, pieces = unite_pieces(surface, found)
    tidy = _tidy(united) if pieces else None
    if tidy is None or not _is_closed(tidy) or len(_overlaps(tidy)[0].coplanar):
        return surface, 0
    return tidy, pieces


def _tidy(surface: Surface) -> Surface | None:
    """Weld new faces to old ones; None if that fails."""
    try:
        welded, _ = weld(surface)
    except InputError:
        return None
    return join_corners(welded, ON_EDGE * welded.extent)[0]


def _middle(surface: Surface, pair: np.ndarray) -> np.ndarray:
    """Middle (3,) of the smaller of two triangles."""
    corners = surface.vertices[surface.triangles[pair]]
    size = np.linalg.norm(np.ptp(corners, axis=1), axis=1)
    return corners[int(size.argmin())].mean(axis=0)
