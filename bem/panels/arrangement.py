"""Trapezoids between walls: a planar region cut by segments, as convex quadrilaterals.

Walls are segments in the plane. Those marked as outline bound the region (even-odd rule);
the others only divide it. Levels are drawn through every end and crossing; between two
levels the walls do not cross, and neighbours bound a trapezoid. Trapezoids that continue
each other between the same two walls are joined.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass
class _Open:
    """A trapezoid that still grows upward between two walls."""

    walls: tuple[int, int]
    bottom: float
    top: float


def _crossing_levels(walls: np.ndarray, tolerance: float) -> np.ndarray:
    """Second coordinates of all proper crossings of walls (n, 2, 2)."""
    a, d = walls[:, 0], walls[:, 1] - walls[:, 0]
    cross = d[:, None, 0] * d[None, :, 1] - d[:, None, 1] * d[None, :, 0]
    gap = a[None, :] - a[:, None]
    length = np.linalg.norm(d, axis=1)
    steep = np.abs(cross) > 1e-9 * length[:, None] * length[None, :]
    safe = np.where(steep, cross, 1.0)
    s = (gap[..., 0] * d[None, :, 1] - gap[..., 1] * d[None, :, 0]) / safe
    t = (gap[..., 0] * d[:, None, 1] - gap[..., 1] * d[:, None, 0]) / safe
    slack = tolerance / np.maximum(length, 1e-300)
    inside = (s > slack[:, None]) & (s < 1 - slack[:, None]) & (t > slack) & (t < 1 - slack)
    i, j = np.nonzero(steep & inside)
    return a[i, 1] + s[i, j] * d[i, 1]


def _levels(walls: np.ndarray, tolerance: float) -> np.ndarray:
    values = np.concatenate([walls[:, :, 1].ravel(), _crossing_levels(walls, tolerance)])
    values = np.sort(values)
    new = np.concatenate([[True], np.diff(values) > tolerance])
    return values[new]


def _reach(walls: np.ndarray, wall: int, level: float) -> float:
    """First coordinate of a wall at a level."""
    (x0, y0), (x1, y1) = walls[wall]
    t = min(max((level - y0) / (y1 - y0), 0.0), 1.0)
    return float(x0 + t * (x1 - x0))


def _slab(walls: np.ndarray, outline: np.ndarray, low: float, high: float) -> list[tuple[int, int]]:
    """Pairs of neighbouring walls with the region between them, in one slab."""
    middle = 0.5 * (low + high)
    bottom, top = walls[:, :, 1].min(axis=1), walls[:, :, 1].max(axis=1)
    active = np.flatnonzero((bottom < middle) & (top > middle))
    at = np.array([_reach(walls, k, middle) for k in active.tolist()])
    order = active[np.lexsort((outline[active], at))]
    pairs, inside = [], False
    for left, right in zip(order[:-1].tolist(), order[1:].tolist(), strict=True):
        inside ^= bool(outline[left])
        if inside:
            pairs.append((left, right))
    return pairs


def _is_floor(walls: np.ndarray, flat: np.ndarray, level: float, span, tolerance: float) -> bool:
    """Whether a level wall covers part of the span at this level."""
    here = flat & (np.abs(walls[:, 0, 1] - level) <= tolerance)
    low = walls[here][:, :, 0].min(axis=1, initial=np.inf)
    high = walls[here][:, :, 0].max(axis=1, initial=-np.inf)
    return bool(np.any((low < span[1] - tolerance) & (high > span[0] + tolerance)))


def trapezoids(walls: np.ndarray, outline: np.ndarray, tolerance: float) -> list[np.ndarray]:
    """Divide the region into trapezoids whose parallel sides run along the first axis.

    Args:
        walls: (n, 2, 2) segments.
        outline: (n,) bool, those that bound the region.
        tolerance: lengths below this are rounding.

    Returns:
        Corners (4, 2) of each: lower left, lower right, upper right, upper left.
    """
    levels = _levels(walls, tolerance)
    rise = np.abs(walls[:, 1, 1] - walls[:, 0, 1])
    flat = rise <= tolerance
    growing: dict[tuple[int, int], _Open] = {}
    done: list[_Open] = []
    steep = np.where(flat[:, None, None], np.nan, walls)
    for low, high in zip(levels[:-1], levels[1:], strict=True):
        fresh: dict[tuple[int, int], _Open] = {}
        for pair in _slab(steep, outline, low, high):
            span = (_reach(walls, pair[0], low), _reach(walls, pair[1], low))
            old = growing.pop(pair, None)
            if old is not None and not _is_floor(walls, flat, low, span, tolerance):
                old.top = high
                fresh[pair] = old
            else:
                done += [old] if old is not None else []
                fresh[pair] = _Open(pair, low, high)
        done += growing.values()
        growing = fresh
    done += growing.values()
    corners = [_corners(walls, piece) for piece in done]
    return [c for c in corners if _thickness(c) > tolerance]


def _corners(walls: np.ndarray, piece: _Open) -> np.ndarray:
    left, right = piece.walls
    return np.array(
        [
            [_reach(walls, left, piece.bottom), piece.bottom],
            [_reach(walls, right, piece.bottom), piece.bottom],
            [_reach(walls, right, piece.top), piece.top],
            [_reach(walls, left, piece.top), piece.top],
        ]
    )


def _thickness(c: np.ndarray) -> float:
    width = 0.5 * (c[1, 0] - c[0, 0] + c[2, 0] - c[3, 0])
    return float(min(width, c[2, 1] - c[1, 1]))
