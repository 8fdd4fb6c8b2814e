"""Faces with any number of corners: three and four stay, more are cut into triangles.

Ears are cut off one after the other (Meisters 1975), seen along the polygon's mean normal
(Newell's), so that polygons that are not convex come out right as well.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.errors import InputError
from bem.geometry.surface import NO_CORNER
from bem.geometry.wording import counted

FLAT = 1e-3
"""A polygon whose corners leave its mean plane by more than this part of its size is refused."""

STRAIGHT = 1e-12
"""A corner whose triangle has less than this part of its side squared is no corner."""


class Polygons(NamedTuple):
    """Faces as a file lists them.

    Args:
        corners: (c,) int64 corners of all faces, face after face.
        sizes: (f,) int64 number of corners of each face.
    """

    corners: np.ndarray
    sizes: np.ndarray


class Cut(NamedTuple):
    """Faces made of polygons.

    Args:
        faces: (g, 4) int64; a triangle has -1 last.
        source: (g,) the polygon that each comes from, rising.
        changes: one line for each kind of change.
    """

    faces: np.ndarray
    source: np.ndarray
    changes: tuple[str, ...]


def cut_polygons(vertices: np.ndarray, polygons: Polygons) -> Cut:
    """Faces of polygons, in their order.

    Args:
        vertices: (v, 3) float64.
        polygons: the faces.

    Raises:
        InputError: a face has fewer than three corners or one out of range, or a polygon is
            bent or crosses itself.
    """
    _check(len(vertices), polygons)
    sizes, first = polygons.sizes, np.cumsum(polygons.sizes) - polygons.sizes
    large = np.flatnonzero(sizes > 4)
    count = np.where(sizes > 4, sizes - 2, 1)
    source = np.repeat(np.arange(len(sizes)), count)
    faces = np.full((len(source), 4), NO_CORNER, dtype=np.int64)
    start = np.cumsum(count) - count
    for size in (3, 4):
        rows = np.flatnonzero(sizes == size)
        faces[start[rows], :size] = polygons.corners[first[rows, None] + np.arange(size)]
    for row in large:
        corners = polygons.corners[first[row] : first[row] + sizes[row]]
        faces[start[row] : start[row] + count[row], :3] = corners[
            _ears(vertices[corners], int(row))
        ]
    lines = [f"{counted(len(large), 'polygon')} with more than four corners cut into triangles"]
    return Cut(faces, source, tuple(lines[: len(large)]))


def _check(vertices: int, polygons: Polygons) -> None:
    if len(polygons.sizes) and polygons.sizes.min() < 3:
        raise InputError(
            f"face {int(polygons.sizes.argmin()) + 1} has {counted(polygons.sizes.min(), 'corner')}"
            ", needs at least 3; export it again"
        )
    corners = polygons.corners
    if len(corners) and (corners.min() < 0 or corners.max() >= vertices):
        raise InputError(f"a face uses a corner beyond the {vertices:,} listed; mesh it again")


def _ears(points: np.ndarray, number: int) -> np.ndarray:
    """Triangles (n - 2, 3) of the corners (n, 3) of polygon ``number``."""
    flat = _in_plane(points, number)
    if _crosses_itself(flat):
        raise _crossed(points, number)
    ring = list(range(len(points)))
    ears: list[list[int]] = []
    k: int | None = 0
    while len(ring) > 3:
        k = _next_ear(flat, ring, (k or 0) + 1)
        if k is None:
            raise _crossed(points, number)
        ears.append([ring[k - 1], ring[k], ring[(k + 1) % len(ring)]])
        del ring[k]
    return np.array([*ears, ring])


def _crossed(points: np.ndarray, number: int) -> InputError:
    return InputError(
        f"the sides of face {number + 1}, a polygon with {len(points)} corners, cross each other; "
        "export it as triangles"
    )


def _crosses_itself(flat: np.ndarray) -> bool:
    """Whether any two sides of a polygon (n, 2) cross at inner points."""
    after = np.roll(flat, -1, axis=0)
    for start, stop in zip(flat, after, strict=True):
        d, others = stop - start, after - flat
        here = _sides_of(d, flat - start) * _sides_of(d, after - start)
        there = _sides_of(others, start - flat) * _sides_of(others, stop - flat)
        if ((here < 0) & (there < 0)).any():
            return True
    return False


def _sides_of(d: np.ndarray, to: np.ndarray) -> np.ndarray:
    """On which side of the direction ``d`` the vectors ``to`` point: -1, 0 or 1."""
    area2 = d[..., 0] * to[..., 1] - d[..., 1] * to[..., 0]
    size = np.linalg.norm(d, axis=-1) * np.linalg.norm(to, axis=-1)
    return np.sign(area2) * (np.abs(area2) > STRAIGHT * size)


def _in_plane(points: np.ndarray, number: int) -> np.ndarray:
    """Corners (n, 2) in the polygon's mean plane, running counterclockwise."""
    off = points - points.mean(axis=0)
    normal = np.cross(off, np.roll(off, -1, axis=0)).sum(axis=0)
    size = float(np.abs(off).max())
    length = float(np.linalg.norm(normal))
    if not length > 0.0:
        return off[:, :2]
    normal /= length
    if np.abs(off @ normal).max() > FLAT * size:
        raise InputError(
            f"face {number + 1}, a polygon with {len(points)} corners, is not flat; "
            "export it as triangles"
        )
    across = np.cross(normal, np.eye(3)[np.abs(normal).argmin()])
    across /= np.linalg.norm(across)
    return np.stack([off @ across, off @ np.cross(normal, across)], axis=1)


def _next_ear(flat: np.ndarray, ring: list[int], start: int) -> int | None:
    """Place in the ring of the next corner that can be cut off, or None.

    Corners on a straight side come last, so that no triangle has a corner on its side.
    """
    straight = None
    for k in ((start + step) % len(ring) for step in range(len(ring))):
        corner = flat[[ring[k - 1], ring[k], ring[(k + 1) % len(ring)]]]
        turn = _turn(corner)
        if turn > 0 and not _holds_any(corner, flat[ring]):
            return k
        if turn == 0 and straight is None:
            straight = k
    return straight


def _turn(t: np.ndarray) -> int:
    """1 if the triangle (3, 2) runs counterclockwise, 0 if it has no area, else -1."""
    sides = np.roll(t, -1, axis=0) - t
    area2 = float(sides[0, 0] * sides[1, 1] - sides[0, 1] * sides[1, 0])
    return int(np.sign(area2)) * (abs(area2) > STRAIGHT * float((sides**2).sum(axis=1).max()))


def _holds_any(t: np.ndarray, points: np.ndarray) -> bool:
    """Whether any of the points but its own corners lies in the triangle or on its rim."""
    own = (points[:, None] == t[None]).all(axis=2).any(axis=1)
    sides = np.roll(t, -1, axis=0) - t
    inside = (_sides_of(sides, points[:, None] - t[None]) >= 0).all(axis=1)
    return bool((inside & ~own).any())
