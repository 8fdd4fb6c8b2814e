"""Integrals of 1/|x - y| over planar convex polygons, slow and independent of the package.

The potential of a polygon is the textbook sum over its sides (Wilton, Rao, Glisson,
Schaubert, Al-Bundak and Butler 1984), in its plain form: once with many digits, once in
double precision. The double integral over two polygons is a tanh-sinh rule over the outer
one, cut where the inner one's plane and the upright planes through its sides meet it.
"""

from __future__ import annotations

import mpmath as mp
import numpy as np

DIGITS = 60
_STEP, _REACH = 0.1, 3.1
_TINY = 1e-290


def frame(corners: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Distinct corners (k, 3) of a panel (4, 3), and its unit normal."""
    keep = [k for k in range(4) if not np.array_equal(corners[k], corners[k - 1])]
    points = corners[keep]
    normal = np.cross(corners[2] - corners[0], corners[3] - corners[1])
    return points, normal / np.linalg.norm(normal)


def exact_potential(corners: np.ndarray, point: np.ndarray) -> float:
    """Integral over the panel (4, 3) of 1/|point - y|, with ``DIGITS`` digits inside."""
    with mp.workdps(DIGITS):
        ring = [mp.matrix(c.tolist()) for c in frame(corners)[0]]
        x = mp.matrix(point.tolist())
        normal = _cross(ring[1] - ring[0], ring[2] - ring[1])
        normal /= mp.norm(normal)
        height = abs(_dot(x - ring[0], normal))
        sides = zip(ring, ring[1:] + ring[:1], strict=True)
        return float(mp.fsum(_side(a - x, b - x, normal, height) for a, b in sides))


def _side(a: mp.matrix, b: mp.matrix, normal: mp.matrix, height: mp.mpf) -> mp.mpf:
    """Part of one side from a to b, both seen from the point."""
    along = (b - a) / mp.norm(b - a)
    p = _dot(a, _cross(along, normal))
    t0, t1 = _dot(a, along), _dot(b, along)
    square = p**2 + height**2
    if square == 0 or p == 0:
        return mp.mpf(0)
    r0, r1 = mp.sqrt(t0**2 + square), mp.sqrt(t1**2 + square)
    logarithm = mp.asinh(t1 / mp.sqrt(square)) - mp.asinh(t0 / mp.sqrt(square))
    angle = mp.atan(p * t1 / (square + height * r1)) - mp.atan(p * t0 / (square + height * r0))
    return p * logarithm - height * angle


def _dot(a: mp.matrix, b: mp.matrix) -> mp.mpf:
    return mp.fsum(a[k] * b[k] for k in range(3))


def _cross(a: mp.matrix, b: mp.matrix) -> mp.matrix:
    turn = ((1, 2), (2, 0), (0, 1))
    return mp.matrix([a[i] * b[j] - a[j] * b[i] for i, j in turn])


def potential(corners: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Integral over the panel (4, 3) of 1/|x - y| at points (m, 3), in double precision."""
    ring, normal = frame(corners)
    height = np.abs((points - ring[0]) @ normal)
    total = np.zeros(len(points))
    for a, b in zip(ring, np.roll(ring, -1, axis=0), strict=True):
        along = (b - a) / np.linalg.norm(b - a)
        p = (a - points) @ np.cross(along, normal)
        t0, t1 = (a - points) @ along, (b - points) @ along
        square = np.maximum(p**2 + height**2, _TINY)
        root = np.sqrt(square)
        total += p * (np.arcsinh(t1 / root) - np.arcsinh(t0 / root))
        for t, sign in ((t1, 1.0), (t0, -1.0)):
            r = np.sqrt(t**2 + square)
            total -= sign * height * np.arctan2(p * t, square + height * r)
    return total


def _cut(ring: np.ndarray, origin: np.ndarray, normal: np.ndarray) -> list[np.ndarray]:
    """Parts of a convex polygon (k, 3) on both sides of a plane."""
    level = (ring - origin) @ normal
    slack = 1e-12 * np.abs(ring - ring[0]).max()
    if level.min() >= -slack or level.max() <= slack:
        return [ring]
    parts = []
    for side in (level, -level):
        part = []
        for k in range(len(ring)):
            here, after = side[k - 1], side[k]
            if here * after < 0.0:
                part.append(ring[k - 1] + here / (here - after) * (ring[k] - ring[k - 1]))
            if after >= 0.0:
                part.append(ring[k])
        parts.append(np.array(part))
    return parts


def _pieces(outer: np.ndarray, inner: np.ndarray) -> list[np.ndarray]:
    """Triangles (3, 3) of the outer panel within which the inner one's potential is smooth."""
    ring, normal = frame(inner)
    pieces = _cut(frame(outer)[0], ring[0], normal)
    for a, b in zip(ring, np.roll(ring, -1, axis=0), strict=True):
        across = np.cross(normal, b - a)
        across /= np.linalg.norm(across)
        pieces = [part for piece in pieces for part in _cut(piece, a, across)]
    fans = [[p[[0, k, k + 1]] for k in range(1, len(p) - 1)] for p in pieces]
    return [triangle for fan in fans for triangle in fan]


def _tanh_sinh() -> tuple[np.ndarray, np.ndarray]:
    """Nodes and weights on (0, 1) for integrands that are rough at both ends."""
    s = np.arange(-_REACH, _REACH + 0.5 * _STEP, _STEP)
    inside = 0.5 * np.pi * np.sinh(s)
    weights = 0.25 * np.pi * np.cosh(s) / np.cosh(inside) ** 2
    return 0.5 * (1.0 + np.tanh(inside)), _STEP * weights


def pair_integral(outer: np.ndarray, inner: np.ndarray) -> float:
    """Double integral of 1/|x - y| over two panels (4, 3) that do not cross; about 1e-11."""
    u, weight = _tanh_sinh()
    s, t = np.repeat(u, len(u)), np.tile(u, len(u))
    both = np.repeat(weight, len(u)) * np.tile(weight, len(u)) * s
    total = 0.0
    for a, b, c in _pieces(outer, inner):
        points = a + s[:, None] * ((b - a) + t[:, None] * (c - b))
        doubled = np.linalg.norm(np.cross(b - a, c - a))
        total += doubled * float(both @ potential(inner, points))
    return total
