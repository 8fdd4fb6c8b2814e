"""Lines that triangles of other bodies draw on a flat face: where they cross it or lie in it."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

STEEP = 0.7
"""Planes whose normals have a smaller cosine are never taken for one."""
MARGIN = 10.0
"""Lines are cut off this many tolerances outside the face."""


class Frame(NamedTuple):
    """A plane with coordinates in it.

    Args:
        origin: (3,).
        axes: (3, 3) rows: two in-plane directions and the normal.
    """

    origin: np.ndarray
    axes: np.ndarray

    def local(self, points: np.ndarray) -> np.ndarray:
        """Coordinates (..., 3) of points, the height over the plane last."""
        return (points - self.origin) @ self.axes.T

    def lift(self, xy: np.ndarray) -> np.ndarray:
        """Points (..., 3) of the plane."""
        return self.origin + xy @ self.axes[:2]


def frame_of(origin: np.ndarray, normal: np.ndarray, sides: np.ndarray) -> Frame:
    """Frame whose first axis runs along the longest of the segments (s, 2, 3)."""
    step = sides[:, 1] - sides[:, 0]
    along = step[np.argmax(np.linalg.norm(step, axis=1))]
    along = along - normal * (along @ normal)
    along /= np.linalg.norm(along)
    return Frame(origin, np.stack([along, np.cross(normal, along), normal]))


def box_of(xy: np.ndarray) -> np.ndarray:
    """Lowest and highest coordinates (..., 2, 2) of points (..., n, 2)."""
    return np.stack([xy.min(axis=-2), xy.max(axis=-2)], axis=-2)


def lies_in_plane(local: np.ndarray, box: np.ndarray, tolerance: float) -> np.ndarray:
    """Which triangles lie in the plane as far as they are over a face.

    The plane of each is looked at where its bounding box and that of the face overlap: further
    off, rounding alone may part two planes that were meant to be one.

    Args:
        local: (k, 3, 3) corners in the frame of the plane.
        box: (2, 2) lowest and highest in-plane coordinates of the face.
        tolerance: heights below this count as none.
    """
    heights = np.abs(local[..., 2]).max(axis=1)
    return (heights <= tolerance) | (_tallest(local, box) <= tolerance)


def _tallest(local: np.ndarray, box: np.ndarray) -> np.ndarray:
    """Largest height (k,) of the planes of triangles over the overlap with a box."""
    normal = np.cross(local[:, 1] - local[:, 0], local[:, 2] - local[:, 0])
    normal /= np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None]
    own = box_of(local[..., :2])
    shared = np.stack([np.maximum(own[:, 0], box[0]), np.minimum(own[:, 1], box[1])], axis=1)
    level = np.abs(normal[:, 2]) >= STEEP
    slope = normal[:, :2] / np.where(level, normal[:, 2], 1.0)[:, None]
    reach = shared - local[:, :1, :2]
    rise = -(reach * slope[:, None])
    heights = local[:, 0, 2, None, None] + rise[:, :, None, 0] + rise[:, None, :, 1]
    return np.where(level, np.abs(heights).max(axis=(1, 2)), np.inf)


def crossings(local: np.ndarray, tolerance: float) -> np.ndarray:
    """Segments (s, 2, 2) where triangles (k, 3, 3), given in the frame, meet the plane.

    A corner lies on the plane if the triangle's own plane meets it nearer than the tolerance.
    A triangle with one such corner and no side through the plane leaves nothing.
    """
    height = np.where(_on_plane(local, tolerance), 0.0, local[..., 2])
    after, point = np.roll(height, -1, axis=1), np.roll(local[..., :2], -1, axis=1)
    through = height * after < 0.0
    part = np.where(through, height, 0.0) / np.where(through, height - after, 1.0)
    pierced = local[..., :2] + part[..., None] * (point - local[..., :2])
    ends = np.concatenate([local[..., :2], pierced], axis=1)
    meets = np.concatenate([height == 0.0, through], axis=1)
    two = meets.sum(axis=1) == 2
    return ends[two][meets[two]].reshape(-1, 2, 2)


def _on_plane(local: np.ndarray, tolerance: float) -> np.ndarray:
    """Which corners (k, 3) lie within half the tolerance of where both planes meet."""
    normal = np.cross(local[:, 1] - local[:, 0], local[:, 2] - local[:, 0])
    slope = np.linalg.norm(normal[:, :2], axis=1) / np.linalg.norm(normal, axis=1)
    return np.abs(local[..., 2]) <= 0.5 * tolerance * slope[:, None]


def clipped_segments(segments: np.ndarray, box: np.ndarray, tolerance: float) -> np.ndarray:
    """Segments (s, 2, 2) as far as they run in a box, or a little outside (Liang, Barsky 1984)."""
    wide = box + np.array([[-MARGIN], [MARGIN]]) * tolerance
    start, step = segments[:, 0], segments[:, 1] - segments[:, 0]
    moves = np.abs(step) > 0.0
    safe = np.where(moves, step, 1.0)
    one, two = (wide[0] - start) / safe, (wide[1] - start) / safe
    still = (start >= wide[0]) & (start <= wide[1])
    first = np.where(moves, np.minimum(one, two), np.where(still, -np.inf, np.inf)).max(axis=1)
    last = np.where(moves, np.maximum(one, two), np.inf).min(axis=1)
    first, last = np.maximum(first, 0.0), np.minimum(last, 1.0)
    kept = first < last
    ends = np.stack([first, last], axis=1)[kept]
    moved = start[kept][:, None] + ends[..., None] * step[kept][:, None]
    whole = (ends == [0.0, 1.0])[..., None]
    return np.where(whole, segments[kept], moved)


def outside_of(segments: np.ndarray, sides: np.ndarray, tolerance: float) -> np.ndarray:
    """Which segments (s, 2, 2) lie outside a convex outline or along its sides (k, 2, 2)."""
    middle = sides.reshape(-1, 2).mean(axis=0)
    step = sides[:, 1] - sides[:, 0]
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1)
    normal /= np.linalg.norm(normal, axis=1)[:, None]
    level = np.einsum("kx,kx->k", sides[:, 0] - middle, normal)
    out = np.where(level < 0.0, -1.0, 1.0)
    inward = out * (level - (segments - middle) @ normal.T)
    return (inward <= tolerance).all(axis=1).any(axis=1)
