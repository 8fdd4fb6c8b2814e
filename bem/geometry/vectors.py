"""Vectors of three numbers as tuples, for compiled geometry: they stay in registers."""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit

Vector = tuple[float, float, float]


@njit(cache=True)
def row(array: np.ndarray, i: int) -> Vector:
    """Row ``i`` of an (n, 3) array."""
    return array[i, 0], array[i, 1], array[i, 2]


@njit(cache=True)
def corner(array: np.ndarray, i: int, k: int) -> Vector:
    """Row ``k`` of block ``i`` in a (t, 3, 3) array, such as a corner of a triangle."""
    return array[i, k, 0], array[i, k, 1], array[i, k, 2]


@njit(cache=True)
def dot(a: Vector, b: Vector) -> float:
    """Scalar product."""
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


@njit(cache=True)
def minus(a: Vector, b: Vector) -> Vector:
    """Difference a - b."""
    return a[0] - b[0], a[1] - b[1], a[2] - b[2]


@njit(cache=True)
def along(a: Vector, s: float, d: Vector) -> Vector:
    """Point a + s d."""
    return a[0] + s * d[0], a[1] + s * d[1], a[2] + s * d[2]


@njit(cache=True)
def cross(a: Vector, b: Vector) -> Vector:
    """Vector product."""
    return (
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    )


@njit(cache=True)
def norm(a: Vector) -> float:
    """Length."""
    return math.sqrt(dot(a, a))


@njit(cache=True)
def unit(a: Vector) -> Vector:
    """Vector of length one along ``a``; zero stays zero."""
    size = norm(a)
    if size == 0.0:
        return a
    return a[0] / size, a[1] / size, a[2] / size
