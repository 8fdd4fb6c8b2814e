"""Vertices on both sides of an open seam become one, at wider tolerances than a weld.

Some exporters round the corners of each facet by themselves, so that neighbours miss each
other by more than the weld. Only vertices on open edges move; and only if that is far less
than the height of the faces there, so that nothing collapses and no true feature goes.
"""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from bem.errors import InputError
from bem.geometry.quads import thickness
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.topology import edges_of
from bem.geometry.weld import near_groups

ROOM = 4.0
"""The lowest face at a seam must be this many times higher than the tolerance."""


class Seams(NamedTuple):
    """A surface with its seams welded.

    Args:
        surface: the new faces.
        vertices: number of vertices that went.
        move: the largest way that one of them moved, metres.
    """

    surface: Surface
    vertices: int
    move: float


def weld_seams(surface: Surface, tolerance: float) -> Seams:
    """Join vertices on open edges that lie close to one another.

    Args:
        surface: welded faces.
        tolerance: vertices this close are joined, metres.

    Returns:
        The new surface, whose ``rounding`` covers the moves; or the old one and no vertices,
        if there are none to join or the tolerance is not small beside the faces there.
    """
    edges = edges_of(surface.triangles)
    rim = np.unique(edges.ends[edges.uses % 2 == 1])
    unchanged = Seams(surface, 0, 0.0)
    if len(rim) == 0 or _lowest_face(surface, rim) < ROOM * tolerance:
        return unchanged
    try:
        keep, group = near_groups(surface.vertices[rim], tolerance)
    except InputError:
        return unchanged
    goal = rim[keep[group]]
    move = float(np.linalg.norm(surface.vertices[goal] - surface.vertices[rim], axis=1).max())
    if len(keep) == len(rim) or move > 2.0 * tolerance:
        return unchanged
    faces = _renamed(surface, rim, goal)
    if _collapsed(faces):
        return unchanged
    rounding = max(surface.rounding, move)
    return Seams(replace(surface, faces=faces, rounding=rounding), len(rim) - len(keep), move)


def _lowest_face(surface: Surface, rim: np.ndarray) -> float:
    at_rim = np.isin(surface.faces, rim).any(axis=1)
    return float(thickness(surface.vertices, surface.faces[at_rim]).min())


def _renamed(surface: Surface, old: np.ndarray, new: np.ndarray) -> np.ndarray:
    """Faces (f, 4) with vertices ``old`` replaced by ``new``."""
    name = np.append(np.arange(len(surface.vertices)), NO_CORNER)
    name[old] = new
    return name[surface.faces]


def _collapsed(faces: np.ndarray) -> bool:
    """Whether two corners of some face are one vertex."""
    return bool((np.diff(np.sort(faces, axis=1), axis=1) == 0).any())
