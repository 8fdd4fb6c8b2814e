"""Facets that stand for a curved body where it cuts flat faces: rings with the right area."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from bem.geometry.regions.chains import Stretch
from bem.geometry.revolved import Revolution
from bem.geometry.surface import NO_CORNER, Surface

AROUND = 32
"""Corners of the polygons that stand for circles."""
_TURN = 2.0 * np.pi / AROUND
WIDER = float(np.sqrt(_TURN / np.sin(_TURN)))
"""How much wider than the circle a polygon of the same area is."""


def stand_in(curve: Revolution, line: Sequence[Stretch]) -> tuple[Surface, np.ndarray]:
    """Facets with corners on rings of the right area, and a ring at every cut.

    Args:
        curve: the whole surface.
        line: its stretches.

    Returns:
        The facets, and the stretch (f,) that each belongs to.
    """
    levels, owner = [0.0], []
    for number, stretch in enumerate(line):
        count = max(1, int(np.ceil(_bend(curve, stretch) / _TURN - 1e-9)))
        levels += (stretch.low + (stretch.high - stretch.low) * _steps(count)).tolist()
        owner += [number] * count
    wide = Revolution(curve.profile, curve.matrix * [WIDER, WIDER, 1.0], curve.shift)
    points = wide.point(np.arange(AROUND) / AROUND, np.array(levels)[:, None])
    return _woven(points, curve), np.repeat(owner, AROUND)


def _bend(curve: Revolution, stretch: Stretch) -> float:
    return curve.profile[stretch.piece].bend * (stretch.high - stretch.low)


def _steps(count: int) -> np.ndarray:
    return np.arange(1, count + 1) / count


def _woven(points: np.ndarray, curve: Revolution) -> Surface:
    """Quadrilaterals between rings (n, m, 3) of points, triangles at a pole."""
    index = np.arange(points.shape[0] * points.shape[1]).reshape(points.shape[:2])
    if curve.loops:
        index[-1] = index[0]
    for end, on_axis in zip((0, -1), curve.poles, strict=True):
        if on_axis:
            index[end] = index[end, 0]
    low, high = index[:-1], index[1:]
    corners = [low, np.roll(low, -1, axis=1), np.roll(high, -1, axis=1), high]
    faces = np.stack(corners, axis=-1).reshape(-1, 4)
    from_pole = faces[:, 0] == faces[:, 1]
    faces[from_pole] = faces[from_pole][:, [1, 2, 3, 3]]
    faces[faces[:, 2] == faces[:, 3], 3] = NO_CORNER
    return _compact(points.reshape(-1, 3), faces)


def _compact(points: np.ndarray, faces: np.ndarray) -> Surface:
    """Surface without the points that no face uses."""
    used = np.unique(faces[faces >= 0])
    new = np.full(len(points) + 1, NO_CORNER)
    new[used] = np.arange(len(used))
    return Surface(points[used], new[faces])
