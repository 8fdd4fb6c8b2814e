"""Exact smallest gap between two sets of triangles, and whether they cross.

Both trees are walked together, nearest boxes first; a pair of boxes is left out once its
distance cannot beat the best pair of triangles found so far (branch and bound).
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.geometry.distance import Triangle, nearest_points, piercing
from bem.geometry.tree import Tree, box_gap, triangle
from bem.geometry.vectors import Vector, dot, minus, row

STACK = 512
"""Room for pairs of nodes: the depths of both trees together stay below 100."""

ROUNDING = 1e-15
"""Box distances are trusted to this part of the coordinates that they come from."""


class Gap(NamedTuple):
    """Smallest distance between two sets of triangles.

    Args:
        distance: metres; infinity if it exceeds the limit of the search.
        here: the point on the first set.
        there: the point on the second set.
    """

    distance: float
    here: Vector
    there: Vector


@njit(cache=True)
def _over_plane(t: Triangle, other: Triangle, n: Vector) -> float:
    """Distance that the plane of ``t`` (unit normal n) keeps from ``other``."""
    a = dot(minus(other[0], t[0]), n)
    b = dot(minus(other[1], t[0]), n)
    c = dot(minus(other[2], t[0]), n)
    return max(min(a, b, c), -max(a, b, c), 0.0)


@njit(cache=True)
def _leaf_gap(a: Tree, i: int, b: Tree, j: int, best: Gap) -> Gap:
    """Improve ``best`` by the triangles of two leaves."""
    for k in range(a.first[i], a.first[i] + a.number[i]):
        one = triangle(a, k)
        for m in range(b.first[j], b.first[j] + b.number[j]):
            two = triangle(b, m)
            if _over_plane(one, two, row(a.normals, k)) >= best.distance:
                continue
            if _over_plane(two, one, row(b.normals, m)) >= best.distance:
                continue
            d2, here, there = nearest_points(one, two)
            if math.sqrt(d2) < best.distance:
                best = Gap(math.sqrt(d2), here, there)
    return best


@njit(cache=True)
def _splits_first(a: Tree, i: int, b: Tree, j: int) -> bool:
    if a.child[i] < 0 or b.child[j] < 0:
        return b.child[j] < 0
    return a.size[i] >= b.size[j]


@njit(cache=True)
def _halves(a: Tree, i: int, b: Tree, j: int) -> tuple[int, int, int, int]:
    """Two pairs of nodes that together make up the pair (i, j)."""
    if _splits_first(a, i, b, j):
        return a.child[i], j, a.child[i] + 1, j
    return i, b.child[j], i, b.child[j] + 1


@njit(cache=True)
def _push(stack: np.ndarray, low: np.ndarray, top: int, pair: tuple[int, int, float]) -> int:
    stack[top, 0], stack[top, 1], low[top] = pair
    return top + 1


@njit(cache=True)
def push_halves(
    a: Tree, b: Tree, pair: tuple[int, int], stack: np.ndarray, low: np.ndarray, top: int
) -> int:
    """Put the two halves of a pair on the stack, the nearer one on top."""
    i, j, k, m = _halves(a, pair[0], b, pair[1])
    one, two = box_gap(a, i, b, j), box_gap(a, k, b, m)
    if one <= two:
        top = _push(stack, low, top, (k, m, two))
        return _push(stack, low, top, (i, j, one))
    top = _push(stack, low, top, (i, j, one))
    return _push(stack, low, top, (k, m, two))


@njit(cache=True)
def _search(a: Tree, b: Tree, limit: float, enough: float, slack: float) -> Gap:
    stack = np.zeros((STACK, 2), dtype=np.int64)
    low = np.zeros(STACK)
    best = Gap(math.inf, (0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
    top, bound = 1, limit
    while top > 0 and best.distance > enough:
        top -= 1
        i, j = stack[top, 0], stack[top, 1]
        if low[top] > 0.0 and low[top] > bound * (1.0 - 1e-12) - slack:
            continue
        if a.child[i] < 0 and b.child[j] < 0:
            best = _leaf_gap(a, i, b, j, best)
            bound = min(bound, best.distance)
        else:
            top = push_halves(a, b, (i, j), stack, low, top)
    return best


def smallest_gap(a: Tree, b: Tree, limit: float = math.inf, enough: float = 0.0) -> Gap:
    """Smallest distance between the triangles of two trees.

    Exact to rounding (1e-12 of the distance plus 1e-15 of the size of the pair); zero if
    triangles cross.

    Args:
        a: the first set.
        b: the second set.
        limit: larger distances are not looked for, metres.
        enough: stop at the first pair of triangles this close, metres; 0 for exactness.
    """
    apart = float(np.linalg.norm(a.center[0] - b.center[0]))
    slack = ROUNDING * (apart + a.size[0] + b.size[0])
    best = Gap(*_search(a, b, limit, enough, slack))
    return best if best.distance <= limit else best._replace(distance=math.inf)


@njit(cache=True)
def _leaf_depth(
    a: Tree, i: int, b: Tree, j: int, best: tuple[float, Vector]
) -> tuple[float, Vector]:
    for k in range(a.first[i], a.first[i] + a.number[i]):
        for m in range(b.first[j], b.first[j] + b.number[j]):
            depth, place = piercing(triangle(a, k), triangle(b, m))
            if depth > best[0]:
                best = (depth, place)
    return best


@njit(cache=True)
def deepest_crossing(a: Tree, b: Tree, enough: float) -> tuple[float, Vector]:
    """Depth by which triangles of two trees pierce one another, and where.

    Zero if none do. The search stops at the first depth above ``enough`` (metres).
    """
    stack = np.zeros((STACK, 2), dtype=np.int64)
    low = np.zeros(STACK)
    best = (0.0, (0.0, 0.0, 0.0))
    top = 1
    while top > 0 and best[0] <= enough:
        top -= 1
        i, j = stack[top, 0], stack[top, 1]
        if low[top] > 0.0:
            continue
        if a.child[i] < 0 and b.child[j] < 0:
            best = _leaf_depth(a, i, b, j, best)
        else:
            top = push_halves(a, b, (i, j), stack, low, top)
    return best
