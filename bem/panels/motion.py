"""How the surface of a conductor goes over into that of its counterpart in another scene.

    still     the same surface
    affine    x -> matrix x + shift: moved, turned, scaled or stretched as a whole
    by faces  each flat face by an affine map of its own; where a flat face goes by none, each
              triangle does, and the panels must keep to the triangles
    curve     a body of revolution with a profile of the same kinds of pieces: points keep
              their parameters

Faces are matched in the order in which they are listed, or, where the same flat faces were
cut into triangles in another way, by their outlines.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy.spatial import cKDTree

from bem.geometry.fit.fit import fit_of
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.revolved import Arc, Piece, Revolution
from bem.geometry.surface import NO_CORNER, Surface
from bem.panels.planar import Owner, Patch, patches_of, planar_patches

FIT = 1e-9
"""Vertices may miss a map by this part of the body's size, and by the rounding of both files."""
SNAP = 1e-9
"""A map this near to one that turns nothing counts as that."""
SAME = 1e-12
"""Vertices that miss a map by no more than this part of the body's size are the same drawing."""
LARGEST_SWEEP = 2.0
"""Arcs whose angles differ by more than this factor are of different kinds."""


@dataclass(frozen=True)
class Affine:
    """x -> matrix x + shift."""

    matrix: np.ndarray
    shift: np.ndarray

    def __call__(self, points: np.ndarray) -> np.ndarray:
        """Images (..., 3) of points (..., 3)."""
        return points @ self.matrix.T + self.shift

    @property
    def still(self) -> bool:
        """Whether nothing moves."""
        return bool((self.matrix == np.eye(3)).all() and not self.shift.any())


@dataclass(frozen=True)
class ByFaces:
    """Each flat face by the map of its own.

    Args:
        patches: (f,) the flat faces.
        maps: (f,) theirs.
        loose: the faces are the triangles of the body, as ``loosened`` leaves them.
    """

    patches: tuple[Patch, ...]
    maps: tuple[Affine, ...]
    loose: bool

    still = False


@dataclass(frozen=True)
class Recurved:
    """Points of a surface of revolution keep their parameters on ``curve``."""

    curve: Revolution
    still: bool


Motion = Affine | ByFaces | Recurved
"""One of the ways in which panels go over."""

STILL = Affine(np.eye(3), np.zeros(3))


def motion_of(before: Surface, after: Surface) -> Motion | None:
    """The motion that takes one surface to the other, or None if none of these kinds does."""
    if before.curve is not None and after.curve is not None:
        return _recurved(before.curve, after.curve)
    if before.curve is not None or after.curve is not None:
        return None
    if bool(before.smooth) != bool(after.smooth) or before.crease != after.crease:
        return None
    slack = FIT * max(before.extent, after.extent) + 3.0 * (before.rounding + after.rounding)
    if np.array_equal(before.faces, after.faces):
        whole = _fitted(before.vertices, after.vertices, slack)
        if before.smooth:
            return whole
        return whole or _by_faces(before, after, slack) or _by_triangles(before, after, slack)
    return _by_outlines(before, after, slack)


def redrawn(before: Surface, after: Surface, motion: Motion | None) -> bool:
    """Whether the numbers of both were rounded each in its own way.

    A body that is placed elsewhere is the same drawing: what rounding did to it moves along.
    """
    if np.array_equal(before.vertices, after.vertices):
        return False
    if not isinstance(motion, Affine) or before.vertices.shape != after.vertices.shape:
        return True
    off = np.abs(motion(before.vertices) - after.vertices).max()
    return bool(off > SAME * max(before.extent, after.extent))


def _recurved(before: Revolution, after: Revolution) -> Recurved | None:
    alike = (
        before.pieces == after.pieces
        and before.loops == after.loops
        and before.poles == after.poles
        and (before.turn, before.cut, before.joined) == (after.turn, after.cut, after.joined)
        and all(map(_alike, before.profile, after.profile))
    )
    if not alike:
        return None
    still = (
        before.profile == after.profile
        and np.array_equal(before.matrix, after.matrix)
        and np.array_equal(before.shift, after.shift)
    )
    return Recurved(after, still)


def _alike(a: Piece, b: Piece) -> bool:
    """Whether two pieces are both straight, or arcs that turn about as far the same way."""
    if isinstance(a, Arc) and isinstance(b, Arc):
        return 1.0 / LARGEST_SWEEP <= b.sweep / a.sweep <= LARGEST_SWEEP
    return type(a) is type(b)


def _fitted(points: np.ndarray, images: np.ndarray, slack: float) -> Affine | None:
    """The simplest affine map that takes points (v, 3) to their images within ``slack``."""
    moved = images - points
    shift = moved.mean(axis=0)
    shift = np.where(np.abs(shift) <= slack, 0.0, shift)
    if np.abs(moved - shift).max() <= slack:
        return Affine(np.eye(3), shift)
    center = points.mean(axis=0)
    part = np.linalg.lstsq(points - center, moved - moved.mean(axis=0), rcond=1e-9)[0].T
    for matrix in (_snapped(part, points, slack), np.eye(3) + part):
        found = Affine(matrix, images.mean(axis=0) - matrix @ center)
        if np.abs(found(points) - images).max() <= slack:
            return found
    return None


def _snapped(part: np.ndarray, points: np.ndarray, slack: float) -> np.ndarray:
    """The map with entries that move nothing by more than ``slack`` left out."""
    size = np.ptp(points, axis=0).max()
    return np.eye(3) + np.where(np.abs(part) * size <= 2.0 * slack + SNAP * size, 0.0, part)


def loosened(surface: Surface) -> Surface:
    """The triangles of a surface with corners of their own, so that none are joined."""
    corners = surface.vertices[surface.triangles].reshape(-1, 3)
    rows = np.arange(len(corners)).reshape(-1, 3)
    return replace(
        surface,
        vertices=corners,
        faces=np.concatenate([rows, np.full((len(rows), 1), NO_CORNER)], axis=1),
    )


def _by_triangles(before: Surface, after: Surface, slack: float) -> ByFaces | None:
    """A map for each triangle, unless the facets may stand for a curve: it would be lost."""
    if before.smooth is None and fit_of(before, FlatFaces.of(before)) is not None:
        return None
    found = _by_faces(loosened(before), loosened(after), slack)
    return found and replace(found, loose=True)


def _by_faces(before: Surface, after: Surface, slack: float) -> ByFaces | None:
    """A map for each flat face, if there is one for all of them."""
    flat = FlatFaces.of(before)
    patches = patches_of(flat, Owner.whole(0))
    maps = []
    for label in range(flat.count):
        used = np.unique(flat.corners[flat.label == label])
        found = _fitted(flat.vertices[used], after.vertices[used], slack)
        if found is None:
            return None
        maps.append(found)
    return ByFaces(tuple(patches), tuple(maps), loose=False)


def _outline(surface: Surface) -> tuple[np.ndarray, np.ndarray]:
    """Corners (c, 3) of all flat faces, and the segments (e, 2) between them that bound these."""
    patches = planar_patches(surface, 0)
    ends = np.concatenate([patch.lift(patch.edges).reshape(-1, 3) for patch in patches])
    near = cKDTree(ends).query_ball_point(ends, 1e-6 * surface.extent)
    first = np.array([min(group) for group in near])
    keep, where = np.unique(first, return_inverse=True)
    return ends[keep], np.sort(where.reshape(-1, 2), axis=1)


def _by_outlines(before: Surface, after: Surface, slack: float) -> Affine | None:
    """Shift and stretch along the axes that takes one body's outlines to the other's."""
    (points, edges), (others, their_edges) = _outline(before), _outline(after)
    if len(points) != len(others) or len(edges) != len(their_edges):
        return None
    size, their_size = np.ptp(points, axis=0), np.ptp(others, axis=0)
    stretch = np.where(size > slack, their_size / np.maximum(size, slack), 1.0)
    guess = (points - points.min(axis=0)) * stretch + others.min(axis=0)
    away, match = cKDTree(others).query(guess)
    if away.max() > 10.0 * slack + 1e-6 * after.extent or len(np.unique(match)) < len(match):
        return None
    mine = np.unique(np.sort(match[edges], axis=1), axis=0)
    if not np.array_equal(mine, np.unique(their_edges, axis=0)):
        return None
    return _fitted(points, others[match], 10.0 * slack)
