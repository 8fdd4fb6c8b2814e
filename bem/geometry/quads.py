"""Quadrilaterals: flat convex ones stay, all others become triangles."""

from __future__ import annotations

import numpy as np

from bem.errors import InputError
from bem.geometry.surface import NO_CORNER
from bem.geometry.wording import counted

FLAT = 1e-6
"""A quadrilateral is flat if its corners keep to a plane within this part of its size."""


def mend_quads(
    vertices: np.ndarray, faces: np.ndarray, tolerance: float
) -> tuple[np.ndarray, list[str]]:
    """Turn quadrilaterals that are not flat and convex into triangles, in place.

    Args:
        vertices: (v, 3) metres.
        faces: (f, 4) corners, -1 last in a triangle.
        tolerance: a corner counts as straight if nearer to its diagonal than this, metres.

    Returns:
        (g, 4) faces in the same order, and a line for each kind of change.

    Raises:
        InputError: the sides of a quadrilateral cross.
    """
    faces, merged = _with_repeated_corner(faces)
    quads = np.flatnonzero(faces[:, 3] != NO_CORNER)
    corners = vertices[faces[quads]]
    area, height = _corner_areas(corners)
    thin = np.abs(height).max(axis=1, initial=0.0) <= tolerance
    fits = (height.min(axis=1, initial=np.inf) > tolerance) & _flat(corners)
    split = quads[~fits & ~thin]
    parts = _halves(faces[split], area[~fits & ~thin], split)
    changes = []
    if merged:
        changes.append(f"{counted(merged, 'triangle')} given with four corners reduced to three")
    if len(split):
        changes.append(
            f"{counted(len(split), 'quadrilateral')} not flat or not convex split into triangles"
        )
    return _replaced(faces, split, parts), changes


def thickness(vertices: np.ndarray, faces: np.ndarray) -> np.ndarray:
    """Smallest height of each triangle; for a quadrilateral the largest of its halves'.

    Args:
        vertices: (v, 3) metres.
        faces: (f, 4) corners, -1 last in a triangle.

    Returns:
        (f,) metres.
    """
    result = _heights(vertices[faces[:, :3]])
    quad = faces[:, 3] != NO_CORNER
    halves = [_heights(vertices[faces[quad][:, k]]) for k in ([0, 2, 3], [1, 2, 3], [0, 1, 3])]
    result[quad] = np.max([result[quad], *halves], axis=0)
    return result


def triangle_owners(faces: np.ndarray) -> np.ndarray:
    """Face (t,) of each row of ``Surface.triangles``."""
    quads = np.flatnonzero(faces[:, 3] != NO_CORNER)
    return np.concatenate([np.flatnonzero(faces[:, 3] == NO_CORNER), quads, quads])


def _heights(corners: np.ndarray) -> np.ndarray:
    sides = np.roll(corners, -1, axis=1) - corners
    area2 = np.linalg.norm(np.cross(sides[:, 0], sides[:, 1]), axis=1)
    longest = np.linalg.norm(sides, axis=2).max(axis=1, initial=0.0)
    return np.divide(area2, longest, out=np.zeros(len(area2)), where=longest > 0.0)


def _with_repeated_corner(faces: np.ndarray) -> tuple[np.ndarray, int]:
    """Quadrilaterals with three distinct corners as triangles, and their number.

    One whose opposite corners coincide has no area, and becomes a point.
    """
    quad = faces[:, 3] != NO_CORNER
    equal = (faces == np.roll(faces, -1, axis=1)) & quad[:, None]
    folded = quad & ((faces[:, 0] == faces[:, 2]) | (faces[:, 1] == faces[:, 3]))
    triangle = (equal.sum(axis=1) == 1) & ~folded
    point = folded | (equal.sum(axis=1) > 1)
    result = faces.copy()
    result[triangle, :3] = faces[triangle][~equal[triangle]].reshape(-1, 3)
    result[point, :3] = faces[point, :1]
    result[triangle | point, 3] = NO_CORNER
    return result, int(triangle.sum())


def _corner_areas(corners: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Twice the signed area that each corner spans with its neighbours, and its height.

    The sign is that of the largest of the four; the height is over the diagonal.

    Args:
        corners: (q, 4, 3) metres.

    Returns:
        (q, 4) m^2 and (q, 4) m.
    """
    after = np.roll(corners, -1, axis=1) - corners
    before = corners - np.roll(corners, 1, axis=1)
    turn = np.cross(before, after)
    size = np.linalg.norm(turn, axis=2)
    main = turn[np.arange(len(turn)), size.argmax(axis=1)] if len(turn) else turn[:, 0]
    main = main / np.maximum(np.linalg.norm(main, axis=1), np.finfo(float).tiny)[:, None]
    area = np.einsum("qkx,qx->qk", turn, main)
    diagonal = np.linalg.norm(before + after, axis=2)
    return area, area / np.maximum(diagonal, np.finfo(float).tiny)


def _flat(corners: np.ndarray) -> np.ndarray:
    across = corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]
    normal = np.cross(*across)
    size = np.linalg.norm(across, axis=2).max(axis=0, initial=0.0)
    bend = np.abs(np.einsum("qx,qx->q", corners[:, 1] - corners[:, 0], normal))
    return bend <= FLAT * size * np.linalg.norm(normal, axis=1)


def _halves(quads: np.ndarray, area: np.ndarray, number: np.ndarray) -> np.ndarray:
    """Two triangles (q, 2, 4) for each quadrilateral, along the better diagonal."""
    cut_02 = np.minimum(area[:, 1], area[:, 3])
    cut_13 = np.minimum(area[:, 0], area[:, 2])
    crossed = np.maximum(cut_02, cut_13) < 0.0
    if crossed.any():
        raise InputError(
            f"the sides of quadrilateral {number[crossed][0] + 1} cross each other "
            f"({counted(int(crossed.sum()), 'such face')}); list its corners around the rim"
        )
    one = np.array([[0, 1, 2, 0], [0, 2, 3, 0]])
    two = np.array([[1, 2, 3, 0], [1, 3, 0, 0]])
    pick = np.where((cut_02 >= cut_13)[:, None, None], one, two)
    parts = np.take_along_axis(quads[:, None, :], pick, axis=2)
    parts[:, :, 3] = NO_CORNER
    return parts


def _replaced(faces: np.ndarray, split: np.ndarray, parts: np.ndarray) -> np.ndarray:
    """Faces with each of those in ``split`` replaced by its two parts."""
    number = np.ones(len(faces), dtype=np.int64)
    number[split] = 2
    result = np.repeat(faces, number, axis=0)
    second = np.cumsum(number)[split] - 1
    result[second - 1], result[second] = parts[:, 0], parts[:, 1]
    return result
