"""Fine facets of a surface of revolution, for when the ordinary ones seem to touch something."""

from __future__ import annotations

import numpy as np

from bem.geometry.revolved import Revolution, Segment
from bem.geometry.surface import Surface
from bem.geometry.weld import weld

AROUND = 384
"""Facets around the axis: they stay within 3.4e-5 of the radius from the true surface."""

ALONG = 192
"""Facets along each bent piece of the profile: as fine on a half circle."""


def fine_facets(curve: Revolution) -> Surface:
    """Facets whose corners lie on the true surface."""
    levels = _levels(curve)
    points = curve.point(np.arange(AROUND) / AROUND, levels[:, None])
    grid = np.arange(len(levels) * AROUND).reshape(len(levels), AROUND)
    right = np.roll(grid, -1, axis=1)
    corners = [grid[:-1], right[:-1], right[1:], grid[1:]]
    faces = np.stack(corners, axis=-1).reshape(-1, 4)
    return weld(Surface(points.reshape(-1, 3), faces))[0]


def _levels(curve: Revolution) -> np.ndarray:
    """Parameters s of the rings of vertices."""
    parts = [1 if isinstance(piece, Segment) else ALONG for piece in curve.profile]
    steps = [k + np.arange(count) / count for k, count in enumerate(parts)]
    return np.append(np.concatenate(steps), curve.pieces)
