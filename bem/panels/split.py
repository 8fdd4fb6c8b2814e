"""Cutting of quadrilaterals across one of their two directions."""

from __future__ import annotations

import numpy as np


def split(
    corners: np.ndarray, across: np.ndarray, part: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Cut each quadrilateral in two.

    Args:
        corners: (n, 4, 3).
        across: (n,) 0 cuts sides 0-1 and 3-2, 1 cuts sides 1-2 and 0-3.
        part: (n,) where, as a part of the cut sides, from corner 0.

    Returns:
        The piece that holds corner 0 and the other one, (n, 4, 3) each; both keep the
        directions and the corner order of the whole.
    """
    first = (np.asarray(across) == 0)[:, None]
    t = np.asarray(part, dtype=float)[:, None]
    c0, c1, c2, c3 = (corners[:, k] for k in range(4))
    low = c0 + t * (np.where(first, c1, c3) - c0)
    far_start = np.where(first, c3, c1)
    high = far_start + t * (c2 - far_start)
    near = np.stack([c0, np.where(first, low, c1), high, np.where(first, c3, low)], axis=1)
    rest = np.stack([low, np.where(first, c1, high), c2, np.where(first, high, c3)], axis=1)
    return near, rest


def split_sides(
    values: np.ndarray, across: np.ndarray, inner: float
) -> tuple[np.ndarray, np.ndarray]:
    """What is known of the sides (n, 4) of quadrilaterals, for both pieces of each.

    Args:
        values: of the whole ones.
        across: (n,) as in ``split``.
        inner: value of the new sides between the pieces.
    """
    near, rest = values.copy(), values.copy()
    rows = np.arange(len(values))
    near[rows, np.where(across == 0, 1, 2)] = inner
    rest[rows, np.where(across == 0, 3, 0)] = inner
    return near, rest


def mean_sides(corners: np.ndarray) -> np.ndarray:
    """(n, 2) mean lengths along sides 0-1/3-2 and along sides 1-2/0-3."""
    length = np.linalg.norm(np.roll(corners, -1, axis=1) - corners, axis=2)
    return 0.5 * np.stack([length[:, 0] + length[:, 2], length[:, 1] + length[:, 3]], axis=1)
