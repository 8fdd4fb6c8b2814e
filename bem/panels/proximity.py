"""Panels that are too large to notice a small neighbour.

A panel samples the potential at points about a third of its size apart. A much smaller
body closer than that goes unseen, and so does the charge that it induces.
"""

from __future__ import annotations

import numpy as np

from bem.kernels.arrays import PanelArrays, panel_arrays
from bem.panels.split import mean_sides

TOO_LARGE = 3.0
"""A panel is too large if it exceeds this times the distance to, and the size of, a feature."""
BLOCK = 512


def crowded(
    corners: np.ndarray, body: np.ndarray, feature: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Panels that are too large beside a small feature of another body.

    Args:
        corners: (n, 4, 3).
        body: (n,) body of each panel.
        feature: (n,) size of the face or body that each panel lies on.

    Returns:
        (n,) bool, which to halve, and (n,) 0 or 1, across which direction.
    """
    sides = mean_sides(corners)
    size = sides.max(axis=1)
    marked = np.zeros(len(size), dtype=bool)
    if len(np.unique(body)) > 1:
        panels = panel_arrays(corners)
        small = np.flatnonzero(feature * TOO_LARGE < size.max())
        for start in range(0, len(small), BLOCK):
            block = small[start : start + BLOCK]
            marked |= _seen_by(block, panels, size, body, feature[block])
    return marked, sides.argmax(axis=1)


def _seen_by(
    small: np.ndarray,
    panels: PanelArrays,
    size: np.ndarray,
    body: np.ndarray,
    feature: np.ndarray,
) -> np.ndarray:
    """Panels that are too large for one of the panels ``small`` of another body."""
    apart = np.linalg.norm(panels.center[:, None] - panels.center[small], axis=2)
    limit = size[:, None] / TOO_LARGE
    near = (apart - panels.radius[:, None] < limit) & (feature < limit)
    near &= body[:, None] != body[small]
    large, which = np.nonzero(near)
    distance = _distance(large, panels.center[small[which]], panels)
    marked = np.zeros(len(size), dtype=bool)
    marked[large[distance < limit[large, 0]]] = True
    return marked


def _distance(panel: np.ndarray, points: np.ndarray, panels: PanelArrays) -> np.ndarray:
    """Distance (m,) of points (m, 3) to the box around each panel in its own frame."""
    local = np.einsum("mac,mc->ma", panels.axes[panel], points - panels.center[panel])
    low, high = panels.corners[panel].min(axis=1), panels.corners[panel].max(axis=1)
    beyond = np.maximum(np.maximum(low - local[:, :2], local[:, :2] - high), 0.0)
    return np.sqrt((beyond**2).sum(axis=1) + local[:, 2] ** 2)
