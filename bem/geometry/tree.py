"""A tree of turned boxes over triangles, for exact gaps and for rays.

Each node's box follows the largest triangle in it: that makes the boxes of flat and of
gently curved patches thin, so that two parallel surfaces are told apart high up in the
tree however they are turned.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.geometry.vectors import Vector, corner, cross, dot, minus, norm, row, unit

LEAF = 4
"""Most triangles in a leaf."""


class Tree(NamedTuple):
    """Boxes over t triangles; node 0 holds all, children lie behind their parents.

    Args:
        corners: (t, 3, 3) corners in the order of the tree, metres.
        normals: (t, 3) unit normals, zero for a triangle without area.
        order: (t,) place of each triangle in the input.
        center: (k, 3) centres of the boxes.
        axes: (k, 3, 3) their unit axes, as rows.
        half: (k, 3) their half lengths.
        size: (k,) half the diagonals.
        first: (k,) first triangle of the node.
        number: (k,) number of triangles of the node.
        child: (k,) first child (the other is next to it), -1 for a leaf.
    """

    corners: np.ndarray
    normals: np.ndarray
    order: np.ndarray
    center: np.ndarray
    axes: np.ndarray
    half: np.ndarray
    size: np.ndarray
    first: np.ndarray
    number: np.ndarray
    child: np.ndarray


@njit(cache=True)
def _swap(order: np.ndarray, i: int, j: int) -> None:
    order[i], order[j] = order[j], order[i]


@njit(cache=True)
def _halve(order: np.ndarray, key: np.ndarray, axis: int, low: int, high: int) -> int:
    """Reorder [low, high) so that the smaller half by ``key[:, axis]`` comes first (Hoare 1961)."""
    middle = (low + high) // 2
    i, j = low, high - 1
    while i < j:
        pivot = key[order[(i + j) // 2], axis]
        a, b = i, j
        while a <= b:
            while key[order[a], axis] < pivot:
                a += 1
            while key[order[b], axis] > pivot:
                b -= 1
            if a <= b:
                _swap(order, a, b)
                a += 1
                b -= 1
        if middle <= b:
            j = b
        elif middle >= a:
            i = a
        else:
            break
    return middle


@njit(cache=True)
def _widest(middles: np.ndarray, order: np.ndarray, first: int, count: int) -> int:
    """Coordinate in which the midpoints of a node's triangles spread most."""
    best, axis = -1.0, 0
    for k in range(3):
        low = high = middles[order[first], k]
        for i in range(first, first + count):
            low = min(low, middles[order[i], k])
            high = max(high, middles[order[i], k])
        if high - low > best:
            best, axis = high - low, k
    return axis


@njit(cache=True)
def _set_node(nodes: np.ndarray, node: int, first: int, end: int) -> None:
    """Make a node without children over the triangles from ``first`` to before ``end``."""
    nodes[node, 0] = first
    nodes[node, 1] = end - first
    nodes[node, 2] = -1


@njit(cache=True)
def _split(middles: np.ndarray, order: np.ndarray, nodes: np.ndarray) -> int:
    """Fill ``nodes`` (first, count, child) from the root down; returns their number."""
    _set_node(nodes, 0, 0, len(order))
    used, node = 1, 0
    while node < used:
        first, count = nodes[node, 0], nodes[node, 1]
        if count > LEAF:
            axis = _widest(middles, order, first, count)
            middle = _halve(order, middles, axis, first, first + count)
            nodes[node, 2] = used
            _set_node(nodes, used, first, middle)
            _set_node(nodes, used + 1, middle, first + count)
            used += 2
        node += 1
    return used


@njit(cache=True)
def _frame(corners: np.ndarray, i: int) -> tuple[Vector, Vector, Vector]:
    """Axes along the normal and the shortest edge of triangle ``i``, and the third one."""
    a, b, c = corner(corners, i, 0), corner(corners, i, 1), corner(corners, i, 2)
    u, v, w = minus(b, a), minus(c, b), minus(a, c)
    n = unit(cross(u, v))
    if dot(n, n) == 0.0:
        return (1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)
    if norm(v) < norm(u):
        u = v
    if norm(w) < norm(u):
        u = w
    second = unit(u)
    return n, second, unit(cross(n, second))


@njit(cache=True)
def _largest(area: np.ndarray, first: int, count: int) -> int:
    best = first
    for i in range(first, first + count):
        if area[i] > area[best]:
            best = i
    return best


@njit(cache=True)
def _range_along(tree: Tree, node: int, axis: Vector) -> tuple[float, float]:
    """Lowest and highest coordinate of a node's corners along ``axis``."""
    low, high = np.inf, -np.inf
    for i in range(tree.first[node], tree.first[node] + tree.number[node]):
        for k in range(3):
            x = dot(corner(tree.corners, i, k), axis)
            low, high = min(low, x), max(high, x)
    return low, high


@njit(cache=True)
def _fit(tree: Tree, node: int, area: np.ndarray) -> None:
    """Set the box of ``node``."""
    frame = _frame(tree.corners, _largest(area, tree.first[node], tree.number[node]))
    for k in range(3):
        low, high = _range_along(tree, node, frame[k])
        tree.half[node, k] = 0.5 * (high - low)
        middle = 0.5 * (high + low)
        for m in range(3):
            tree.axes[node, k, m] = frame[k][m]
            tree.center[node, m] += middle * frame[k][m]
    tree.size[node] = norm(row(tree.half, node))


@njit(cache=True)
def _fit_all(tree: Tree, area: np.ndarray) -> None:
    for node in range(len(tree.first)):
        _fit(tree, node, area)


def build_tree(corners: np.ndarray) -> Tree:
    """Tree over triangles.

    Args:
        corners: (t, 3, 3) float64 with t >= 1, metres.
    """
    corners = np.ascontiguousarray(corners, dtype=np.float64)
    order = np.arange(len(corners))
    nodes = np.empty((2 * len(corners) + 1, 3), dtype=np.int64)
    used = _split(corners.mean(axis=1), order, nodes)
    corners = corners[order]
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    size = np.linalg.norm(normals, axis=1)
    first, count, child = np.ascontiguousarray(nodes[:used].T)
    tree = Tree(
        corners=corners,
        normals=normals / np.where(size > 0.0, size, 1.0)[:, None],
        order=order,
        center=np.zeros((used, 3)),
        axes=np.empty((used, 3, 3)),
        half=np.empty((used, 3)),
        size=np.empty(used),
        first=first,
        number=count,
        child=child,
    )
    _fit_all(tree, size)
    return tree


@njit(cache=True)
def _short_of(tree: Tree, node: int, other: Tree, far: int, d: Vector) -> float:
    """Squared distance of two boxes seen in the frame of ``node`` (a lower bound)."""
    total = 0.0
    for k in range(3):
        axis = corner(tree.axes, node, k)
        gap = abs(dot(axis, d)) - tree.half[node, k]
        for m in range(3):
            gap -= abs(dot(axis, corner(other.axes, far, m))) * other.half[far, m]
        if gap > 0.0:
            total += gap * gap
    return total


@njit(cache=True)
def box_gap(a: Tree, i: int, b: Tree, j: int) -> float:
    """Lower bound of the distance between node ``i`` of ``a`` and node ``j`` of ``b``."""
    d = minus(row(a.center, i), row(b.center, j))
    return math.sqrt(max(_short_of(a, i, b, j, d), _short_of(b, j, a, i, d)))


@njit(cache=True)
def triangle(tree: Tree, i: int) -> tuple[Vector, Vector, Vector]:
    """Corners of triangle ``i`` of the tree's order."""
    return corner(tree.corners, i, 0), corner(tree.corners, i, 1), corner(tree.corners, i, 2)
