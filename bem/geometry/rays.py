"""Which points lie inside closed surfaces: parity of the faces that a ray crosses.

Faces need no orientation. A ray that comes near an edge, a corner or a face seen edge-on
is not counted but replaced by one of another direction; the majority of three decides.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.geometry.tree import Tree, triangle
from bem.geometry.vectors import Vector, corner, cross, dot, minus, norm, row

STACK = 128
UNSURE = -1
VOTES = 3
NEAR = 1e-12
"""A ray passes an edge unsurely if closer to it than this part of the distances."""


def ray_directions(number: int = 32) -> np.ndarray:
    """Spread unit vectors (number, 3) over the sphere on a golden spiral, none along an axis."""
    k = np.arange(number) + 0.5
    z = 1.0 - 2.0 * k / number
    turn = 2.399963229728653 * k + 0.7133
    r = np.sqrt(1.0 - z * z)
    return np.stack([r * np.sin(turn), z, r * np.cos(turn)], axis=1)


@njit(cache=True)
def _hits_box(tree: Tree, node: int, origin: Vector, d: Vector) -> bool:
    """Whether the ray meets the node's box, widened by rounding."""
    start, end = 0.0, math.inf
    to = minus(row(tree.center, node), origin)
    for k in range(3):
        axis = corner(tree.axes, node, k)
        middle, speed = dot(axis, to), dot(axis, d)
        half = tree.half[node, k] + NEAR * (abs(middle) + tree.half[node, k])
        if speed == 0.0:
            if abs(middle) > half:
                return False
            continue
        one, two = (middle - half) / speed, (middle + half) / speed
        start, end = max(start, min(one, two)), min(end, max(one, two))
    return start <= end


@njit(cache=True)
def _crosses(t: tuple[Vector, Vector, Vector], origin: Vector, d: Vector) -> int:
    """1 if the ray crosses the triangle, 0 if not, ``UNSURE`` near its rim."""
    a, b, c = minus(t[0], origin), minus(t[1], origin), minus(t[2], origin)
    if max(dot(a, d), dot(b, d), dot(c, d)) < 0.0:
        return 0
    u, v, w = dot(d, cross(a, b)), dot(d, cross(b, c)), dot(d, cross(c, a))
    ra, rb, rc = norm(a), norm(b), norm(c)
    near = NEAR * max(ra * rb, rb * rc, rc * ra)
    if min(u, v, w) < -near and max(u, v, w) > near:
        return 0
    if min(abs(u), abs(v), abs(w)) <= near:
        return UNSURE
    n = cross(minus(b, a), minus(c, a))
    height = dot(a, n)
    if abs(height) <= NEAR * norm(n) * max(ra, rb, rc):
        return UNSURE
    return 1 if height * dot(d, n) > 0.0 else 0


@njit(cache=True)
def _leaf_crossings(tree: Tree, node: int, counted: np.ndarray, origin: Vector, d: Vector) -> int:
    total = 0
    for k in range(tree.first[node], tree.first[node] + tree.number[node]):
        if counted[tree.order[k]]:
            hit = _crosses(triangle(tree, k), origin, d)
            if hit == UNSURE:
                return UNSURE
            total += hit
    return total


@njit(cache=True)
def _crossings(tree: Tree, counted: np.ndarray, origin: Vector, d: Vector) -> int:
    """Count the chosen triangles that a ray crosses, or ``UNSURE``."""
    stack = np.empty(STACK, dtype=np.int64)
    stack[0] = 0
    top, total = 1, 0
    while top > 0:
        top -= 1
        node = stack[top]
        if not _hits_box(tree, node, origin, d):
            continue
        if tree.child[node] < 0:
            hits = _leaf_crossings(tree, node, counted, origin, d)
            if hits == UNSURE:
                return UNSURE
            total += hits
        else:
            stack[top] = tree.child[node]
            stack[top + 1] = tree.child[node] + 1
            top += 2
    return total


@njit(cache=True)
def points_inside(
    tree: Tree, counted: np.ndarray, points: np.ndarray, directions: np.ndarray
) -> np.ndarray:
    """Whether each point lies inside the closed surface that the counted triangles form.

    Args:
        tree: the triangles.
        counted: (t,) bool, in the order of the input: which triangles close the surface.
        points: (n, 3), none of them on the surface, metres.
        directions: (m, 3) unit vectors to try in turn.

    Returns:
        (n,) bool.
    """
    inside = np.zeros(len(points), dtype=np.bool_)
    for i in range(len(points)):
        odd, votes = 0, 0
        for k in range(len(directions)):
            hits = _crossings(tree, counted, row(points, i), row(directions, k))
            if hits != UNSURE:
                votes += 1
                odd += hits % 2
            if votes == VOTES:
                break
        inside[i] = 2 * odd > votes
    return inside
