"""Cubic patches over triangles: points, derivatives, and what lies between patch and triangle.

A patch is a Bezier triangle with ten control points, in the order

    corners 0, 1, 2;  two along side 01, two along 12, two along 20;  the middle

with the middle one so that quadratic patches are reproduced (Vlachos, Peters, Boyd and Mitchell
2001). Points of a patch are given by barycentric coordinates. On a side they depend on the four
control points of that side alone.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

_X, _W = np.polynomial.legendre.leggauss(4)
_T, _V = 0.5 * (_X + 1.0), 0.5 * _W
_A, _B = (x.ravel() for x in np.meshgrid(_T, _T, indexing="ij"))
NODES = np.stack([1.0 - _A, _A * (1.0 - _B), _A * _B], axis=1)
"""(g, 3) barycentric coordinates of the quadrature points of a triangle."""
WEIGHTS = (np.outer(_V, _V).ravel() * _A).copy()
"""(g,) their weights; they sum to 1/2."""
SIDE_NODES, SIDE_WEIGHTS = _T, _V
"""Quadrature on [0, 1] along a side."""


def control_net(corners: np.ndarray, along: np.ndarray) -> np.ndarray:
    """(t, 10, 3) control points.

    Args:
        corners: (t, 3, 3).
        along: (t, 3, 2, 3) inner control points of the sides 01, 12, 20, in that direction.
    """
    sides = along.reshape(len(along), 6, 3)
    middle = 0.25 * sides.sum(axis=1) - corners.sum(axis=1) / 6.0
    return np.concatenate([corners, sides, middle[:, None]], axis=1)


def basis(at: np.ndarray) -> np.ndarray:
    """(..., 10) weights of the control points at barycentric coordinates (..., 3)."""
    a, b, c = np.moveaxis(at, -1, 0)
    sides = [f * 3.0 * p * q for p, q in ((a, b), (b, c), (c, a)) for f in (p, q)]
    return np.stack([a**3, b**3, c**3, *sides, 6.0 * a * b * c], axis=-1)


def slopes(at: np.ndarray) -> np.ndarray:
    """(..., 3, 10) derivatives of ``basis`` by each coordinate."""
    a, b, c = np.moveaxis(at, -1, 0)
    o = np.zeros_like(a)
    rows = [
        [3 * a * a, o, o, 6 * a * b, 3 * b * b, o, o, 3 * c * c, 6 * c * a, 6 * b * c],
        [o, 3 * b * b, o, 3 * a * a, 6 * a * b, 6 * b * c, 3 * c * c, o, o, 6 * c * a],
        [o, o, 3 * c * c, o, o, 3 * b * b, 6 * b * c, 6 * c * a, 3 * a * a, 6 * a * b],
    ]
    return np.stack([np.stack(row, axis=-1) for row in rows], axis=-2)


class Piece(NamedTuple):
    """Triangles within patches.

    Args:
        net: (n, 10, 3) control points of the patch of each.
        at: (n, 3, 3) barycentric coordinates of its corners, one row each.
        corners: (n, 3, 3) the corners as points.
    """

    net: np.ndarray
    at: np.ndarray
    corners: np.ndarray


def swept_volume(piece: Piece) -> np.ndarray:
    """(n,) volume swept on the straight way from each triangle to its piece of the patch.

    With p on the triangle, x = p + d on the patch at the same parameters a, b, it is

        integral of d . (p_a x p_b + (p_a x d_b + d_a x p_b)/2 + d_a x d_b/3) da db

    positive on the side from which the corners run counterclockwise. Neighbours agree on
    their common side, so that the volumes add up to what lies between.
    """
    at = NODES @ piece.at
    p_a, p_b = (piece.corners[:, k] - piece.corners[:, 0] for k in (1, 2))
    d = basis(at) @ piece.net - NODES @ piece.corners
    by = slopes(at) @ piece.net[:, None]
    ways = piece.at[:, 1:] - piece.at[:, :1]
    x_a, x_b = np.moveaxis(np.einsum("nwk,ngki->nwgi", ways, by), 1, 0)
    d_a, d_b = x_a - p_a[:, None], x_b - p_b[:, None]
    swept = np.cross(p_a[:, None], p_b[:, None] + 0.5 * d_b)
    swept += np.cross(d_a, 0.5 * p_b[:, None] + d_b / 3.0)
    return np.einsum("g,ngi,ngi->n", WEIGHTS, d, swept)


def area_beyond(piece: Piece, side: int) -> np.ndarray:
    """(n,) area between one side of each triangle and the patch's curve over it.

    Seen square to the triangle, positive where the curve lies outside.
    """
    first, last = side, (side + 1) % 3
    way = piece.at[:, last] - piece.at[:, first]
    at = piece.at[:, first, None] + SIDE_NODES[:, None] * way[:, None]
    chord = piece.corners[:, last] - piece.corners[:, first]
    p = piece.corners[:, first, None] + SIDE_NODES[:, None] * chord[:, None]
    d = basis(at) @ piece.net - p
    x_t = np.einsum("nk,ngki->ngi", way, slopes(at) @ piece.net[:, None])
    outward = np.cross(0.5 * (chord[:, None] + x_t), triangle_normals(piece.corners)[:, None])
    return np.einsum("g,ngi,ngi->n", SIDE_WEIGHTS, d, outward)


def triangle_normals(corners: np.ndarray) -> np.ndarray:
    """(n, 3) unit normals of triangles (n, 3, 3)."""
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return normal / np.linalg.norm(normal, axis=1, keepdims=True)


def triangle_areas(corners: np.ndarray) -> np.ndarray:
    """(n,) areas of triangles (n, 3, 3)."""
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return 0.5 * np.linalg.norm(normal, axis=1)
