"""Which triangles of two bodies come near one another."""

from __future__ import annotations

import numpy as np

from bem.compiled import njit
from bem.geometry.distance import nearest_points
from bem.geometry.gap import STACK, push_halves
from bem.geometry.tree import Tree, triangle
from bem.geometry.vectors import dot, minus, row


@njit(cache=True)
def _room(found: np.ndarray, used: int) -> np.ndarray:
    """The array itself, or a copy twice as long if it is full."""
    if used < len(found):
        return found
    longer = np.empty((2 * len(found), 2), dtype=np.int64)
    longer[:used] = found
    return longer


@njit(cache=True)
def _clear_of(a: Tree, k: int, b: Tree, m: int) -> float:
    """Distance that the plane of triangle ``k`` of ``a`` keeps from triangle ``m`` of ``b``."""
    n, base = row(a.normals, k), triangle(a, k)[0]
    x, y, z = triangle(b, m)
    p, q, r = dot(minus(x, base), n), dot(minus(y, base), n), dot(minus(z, base), n)
    return max(min(p, q, r), -max(p, q, r))


@njit(cache=True)
def _leaf_pairs(a, i, b, j, limit, found, used):
    """Add near triangles of two leaves to ``found``; returns it and its length in use."""
    for k in range(a.first[i], a.first[i] + a.number[i]):
        for m in range(b.first[j], b.first[j] + b.number[j]):
            if _clear_of(a, k, b, m) > limit or _clear_of(b, m, a, k) > limit:
                continue
            if nearest_points(triangle(a, k), triangle(b, m))[0] <= limit * limit:
                found = _room(found, used)
                found[used, 0], found[used, 1] = a.order[k], b.order[m]
                used += 1
    return found, used


@njit(cache=True)
def near_pairs(a: Tree, b: Tree, limit: float) -> np.ndarray:
    """Pairs (n, 2) of triangles, in the order of the input, no further apart than ``limit``."""
    stack, low = np.zeros((STACK, 2), dtype=np.int64), np.zeros(STACK)
    found = np.empty((16, 2), dtype=np.int64)
    top, used = 1, 0
    while top > 0:
        top -= 1
        i, j = stack[top, 0], stack[top, 1]
        if low[top] > limit:
            continue
        if a.child[i] < 0 and b.child[j] < 0:
            found, used = _leaf_pairs(a, i, b, j, limit, found, used)
        else:
            top = push_halves(a, b, (i, j), stack, low, top)
    return found[:used]
