"""Triangles that two bodies have in common, corner by corner: there is nothing to be cut there."""

from __future__ import annotations

import numpy as np

from bem.geometry.regions.facets import Facets
from bem.geometry.regions.scraps import BEFORE, BEHIND, LIES_ON


def matched(
    own: Facets, bodies: list[Facets], near: dict[int, np.ndarray], tolerance: float
) -> tuple[np.ndarray, np.ndarray]:
    """Which flat faces of a body others have too, wherever they come near.

    Args:
        own: the body.
        bodies: all bodies.
        near: per other body the pairs (n, 2) of its own and the other's triangles that are near.
        tolerance: corners closer than this coincide.

    Returns:
        (g,) bool for the flat faces, and (t, b) what each body is to each triangle.
    """
    good = np.ones(len(own.triangles), dtype=bool)
    flags = np.zeros((len(own.triangles), len(bodies)), dtype=np.int64)
    for k, pairs in near.items():
        mine, its = pairs.T
        same, linked = _compared(own.corners[mine], bodies[k].corners[its], tolerance)
        found = np.zeros(len(good), dtype=bool)
        found[mine[same]] = True
        good[mine[~linked | ~found[mine]]] = False
        flags[mine[same], k] = _flags(own.normals[mine[same]], bodies[k], its[same])
    good &= (flags == flags[own.owner]).all(axis=1)
    bad = np.bincount(own.flat.label[own.owner], ~good, own.flat.count) > 0.0
    return ~bad, flags


def _compared(one: np.ndarray, two: np.ndarray, tolerance: float) -> tuple[np.ndarray, np.ndarray]:
    """Which triangles (n, 3, 3) are the same, and which have a corner in common."""
    off = np.linalg.norm(one[:, :, None] - two[:, None], axis=3)
    close = off <= tolerance
    same = close.any(axis=1).all(axis=1) & close.any(axis=2).all(axis=1)
    return same, close.any(axis=(1, 2))


def _flags(normals: np.ndarray, other: Facets, triangles: np.ndarray) -> np.ndarray:
    """What a body is to triangles, with normals (n, 3), that it has as well."""
    ahead = np.einsum("nx,nx->n", normals, other.normals[triangles]) > 0.0
    inner = np.where(ahead, BEHIND, BEFORE)
    return LIES_ON | np.where(other.closed[triangles], inner, 0)
