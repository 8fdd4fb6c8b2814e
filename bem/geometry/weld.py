"""Welding: corners that coincide become one vertex, and faces that carry nothing go.

The tolerance is ``WELD`` times the diagonal of the body's bounding box. Vertices closer
than that become one (so do chains of such vertices); the one listed first keeps its
place. Faces thinner than that have no area as far as the solution can tell, and leave;
so do second copies of a face with the same corners in any order. Nothing else moves, and
the order of vertices and faces stays. Every change is counted and reported.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from bem.errors import InputError
from bem.geometry.quads import mend_quads, thickness
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.wording import counted, metre_text

WELD = 1e-7
"""Default welding tolerance, as a part of the diagonal of the bounding box."""

CROWD = 100
"""More close pairs than this per vertex mean that the tolerance is out of proportion."""


def weld(surface: Surface, relative: float = WELD) -> tuple[Surface, list[str]]:
    """Join coinciding vertices and drop faces without area and duplicates.

    Args:
        surface: faces as read.
        relative: tolerance as a part of the diagonal of the bounding box.

    Returns:
        The surface, and one line for each kind of change.

    Raises:
        InputError: no face is left, the vertices crowd together, or numbers overflow.
    """
    surface = _compact(surface)
    with np.errstate(over="ignore"):
        tolerance = relative * float(np.linalg.norm(np.ptp(surface.vertices, axis=0)))
    if not np.isfinite(tolerance):
        raise InputError("the coordinates are too large to compute with; check the unit")
    joined, changes = _join(surface, tolerance)
    faces, mended = _mend_faces(joined, tolerance)
    changes += mended
    if len(faces) == 0:
        raise InputError(
            f"no face with an area is left of {counted(len(surface.faces), 'face')}; mesh it again"
        )
    return _compact(replace(joined, faces=faces)), changes


def _compact(surface: Surface) -> Surface:
    """Leave out unused vertices."""
    used = np.zeros(len(surface.vertices) + 1, dtype=bool)
    used[surface.faces] = True
    used[-1] = False
    place = np.append(np.cumsum(used[:-1]) - 1, NO_CORNER)
    return replace(surface, vertices=surface.vertices[used[:-1]], faces=place[surface.faces])


def _join(surface: Surface, tolerance: float) -> tuple[Surface, list[str]]:
    keep, label = _same(surface.vertices)
    near_keep, near_label = near_groups(surface.vertices[keep], tolerance)
    changes = []
    if len(keep) < len(surface.vertices):
        left = counted(len(keep), "vertex", "vertices")
        changes.append(f"{counted(len(surface.vertices), 'corner')} as read joined into {left}")
    if len(near_keep) < len(keep):
        lost = counted(len(keep) - len(near_keep), "vertex", "vertices")
        changes.append(f"{lost} welded to another closer than {metre_text(tolerance)}")
    where = np.append(near_label[label], NO_CORNER)
    joined = replace(
        surface, vertices=surface.vertices[keep][near_keep], faces=where[surface.faces]
    )
    return joined, changes


def _relabel(first: np.ndarray, group: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Renumber groups by their first members.

    Args:
        first: (g,) lowest member of each group.
        group: (n,) group of each member.

    Returns:
        (g,) the lowest members in rising order, and (n,) the place of each member's group.
    """
    order = np.argsort(first)
    rank = np.empty(len(order), dtype=np.int64)
    rank[order] = np.arange(len(order))
    return first[order], rank[group]


def _same(points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Find groups of equal points, as ``_relabel`` returns them."""
    order = np.lexsort(points.T)
    moved = points[order]
    starts = np.append(True, (moved[1:] != moved[:-1]).any(axis=1))
    group = np.empty(len(points), dtype=np.int64)
    group[order] = np.cumsum(starts) - 1
    return _relabel(order[starts], group)


def near_groups(points: np.ndarray, tolerance: float) -> tuple[np.ndarray, np.ndarray]:
    """Find groups of points linked by short distances.

    Args:
        points: (n, 3) metres.
        tolerance: points this close are linked, metres.

    Returns:
        (g,) the lowest members of the groups in rising order, and (n,) the place there of
        each point's group.

    Raises:
        InputError: most points are linked to many others.
    """
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    tree = cKDTree(points)
    if tree.count_neighbors(tree, tolerance) > CROWD * len(points):
        raise InputError(
            f"most vertices lie within {metre_text(tolerance)} of one another, "
            f"{tolerance / np.linalg.norm(np.ptp(points, axis=0)):.0e} of the body's size; "
            "is a stray vertex far away?"
        )
    pairs = tree.query_pairs(tolerance, output_type="ndarray")
    if len(pairs) == 0:
        return np.arange(len(points)), np.arange(len(points))
    links = coo_array((np.ones(len(pairs)), pairs.T), shape=(len(points), len(points)))
    number, group = connected_components(links, directed=False)
    first = np.full(number, len(points))
    np.minimum.at(first, group, np.arange(len(points)))
    return _relabel(first, group)


def _mend_faces(surface: Surface, tolerance: float) -> tuple[np.ndarray, list[str]]:
    faces, changes = mend_quads(surface.vertices, surface.faces, tolerance)
    thick = thickness(surface.vertices, faces) > tolerance
    if not thick.all():
        changes.append(f"{counted(int((~thick).sum()), 'face')} without area dropped")
    faces = faces[thick]
    single = _first_copies(faces)
    if not single.all():
        lost = int((~single).sum())
        changes.append(f"{counted(lost, 'duplicate face')} dropped")
    return faces[single], changes


def _first_copies(faces: np.ndarray) -> np.ndarray:
    """Which (f,) faces have no earlier copy with the same corners in any order."""
    corners = np.sort(faces, axis=1)
    order = np.lexsort(corners.T)
    moved = corners[order]
    first = np.ones(len(faces), dtype=bool)
    first[order[1:]] = (moved[1:] != moved[:-1]).any(axis=1)
    return first
