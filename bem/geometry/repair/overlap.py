"""Triangles of one body that lie on one another in a plane, or pass through one another.

Panels on faces that overlap in one plane would coincide, and their charges could not be told
apart. Faces that cross at an angle do no harm; they show which pieces run into each other.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.geometry.distance import Triangle, piercing
from bem.geometry.gap import STACK, push_halves
from bem.geometry.tree import Tree, build_tree, triangle
from bem.geometry.vectors import Vector, cross, dot, minus, norm, row

COPLANAR, CROSSING = 0, 1

FEW = 200
"""Up to this many triangles all pairs are looked at."""


class Overlaps(NamedTuple):
    """Pairs of triangles of one body.

    Args:
        coplanar: (n, 2) triangles that overlap in one plane.
        crossing: (m, 2) triangles of different pieces that pass through one another.
    """

    coplanar: np.ndarray
    crossing: np.ndarray


class _Limits(NamedTuple):
    """Distance below which faces are coplanar, and depth above which they overlap."""

    flat: float
    depth: float


def find_overlaps(corners: np.ndarray, piece: np.ndarray, flat: float, depth: float) -> Overlaps:
    """Look for triangles that overlap in a plane, and for pieces that cross.

    Args:
        corners: (t, 3, 3) of the triangles, metres.
        piece: (t,) number of the piece that each belongs to.
        flat: the smaller triangle keeps this close to the plane of the larger one, metres.
        depth: triangles that overlap or pierce less deeply only touch, metres.
    """
    limits = _Limits(flat, depth)
    if len(corners) <= FEW and not _may_cross(corners, piece):
        return Overlaps(_few_coplanar(corners, limits), np.empty((0, 2), dtype=np.int64))
    tree = build_tree(corners)
    found = _search(tree, piece[tree.order], limits)
    pairs, kind = np.sort(tree.order[found[:, :2]], axis=1), found[:, 2]
    return Overlaps(pairs[kind == COPLANAR], pairs[kind == CROSSING])


def _may_cross(corners: np.ndarray, piece: np.ndarray) -> bool:
    """Whether the bounding boxes of two triangles of different pieces meet."""
    low, high = corners.min(axis=1), corners.max(axis=1)
    meet = (low[:, None] <= high[None, :]).all(axis=2)
    return bool((meet & meet.T & (piece[:, None] != piece[None, :])).any())


def _few_coplanar(corners: np.ndarray, limits: _Limits) -> np.ndarray:
    """Pairs (n, 2) that overlap in a plane, from all pairs, with nothing to be compiled."""
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    normals /= np.linalg.norm(normals, axis=1)[:, None]
    heights = np.einsum("ijkx,ix->ijk", corners[None, :] - corners[:, None, :1], normals)
    flat = np.abs(heights).max(axis=2) <= limits.flat
    i, j = np.nonzero(np.triu(flat | flat.T, 1))
    base = np.where(flat[i, j][:, None], normals[i], normals[j])
    sides = np.roll(corners, -1, axis=1) - corners
    axes = np.cross(base[:, None], np.concatenate([sides[i], sides[j]], axis=1))
    axes /= np.linalg.norm(axes, axis=2)[:, :, None]
    one, two = (np.einsum("pkx,pax->pak", corners[k], axes) for k in (i, j))
    shared = np.minimum(one.max(axis=2), two.max(axis=2)) - np.maximum(one.min(2), two.min(2))
    deep = shared.min(axis=1, initial=np.inf) > limits.depth
    return np.stack([i, j], axis=1)[deep]


@njit(cache=True)
def _off_plane(t: Triangle, other: Triangle, n: Vector) -> float:
    """Largest distance of the corners of ``other`` from the plane of ``t``."""
    a = abs(dot(minus(other[0], t[0]), n))
    b = abs(dot(minus(other[1], t[0]), n))
    c = abs(dot(minus(other[2], t[0]), n))
    return max(a, b, c)


@njit(cache=True)
def _shared_width(one: Triangle, two: Triangle, n: Vector) -> float:
    """Least overlap of two coplanar triangles across sides of the first, until one parts them."""
    least = math.inf
    for k in range(3):
        edge = minus(one[(k + 1) % 3], one[k])
        across = cross(n, edge)
        length = norm(edge)
        top = dot(minus(one[(k + 2) % 3], one[k]), across) / length
        sign = 1.0 if top >= 0.0 else -1.0
        low, high = math.inf, -math.inf
        for m in range(3):
            x = sign * dot(minus(two[m], one[k]), across) / length
            low, high = min(low, x), max(high, x)
        least = min(least, min(high, abs(top)) - max(low, 0.0))
        if least <= 0.0:
            return least
    return least


@njit(cache=True)
def coplanar_depth(one: Triangle, two: Triangle, n: Vector) -> float:
    """Width of the overlap of two triangles in the plane of the first; <= 0 if they only touch.

    By separating axes: for convex outlines in a plane the normals of their sides suffice.
    """
    least = _shared_width(one, two, n)
    return least if least <= 0.0 else min(least, _shared_width(two, one, n))


@njit(cache=True)
def _relation(tree: Tree, i: int, j: int, apart: bool, limits: _Limits) -> int:
    """How two triangles lie to each other: ``COPLANAR``, ``CROSSING``, or -1."""
    one, two = triangle(tree, i), triangle(tree, j)
    n, m = row(tree.normals, i), row(tree.normals, j)
    if _off_plane(one, two, n) <= limits.flat:
        return COPLANAR if coplanar_depth(one, two, n) > limits.depth else -1
    if _off_plane(two, one, m) <= limits.flat:
        return COPLANAR if coplanar_depth(two, one, m) > limits.depth else -1
    if apart and piercing(one, two)[0] > limits.depth:
        return CROSSING
    return -1


@njit(cache=True)
def _room(found: np.ndarray, used: int) -> np.ndarray:
    """The array itself, or a copy twice as long if it is full."""
    if used < len(found):
        return found
    longer = np.empty((2 * len(found), 3), dtype=np.int64)
    longer[:used] = found
    return longer


@njit(cache=True)
def _leaf_pairs(tree, i, j, piece, limits, found, used):
    """Add pairs of triangles of two leaves to ``found``; returns it and its length in use."""
    for k in range(tree.first[i], tree.first[i] + tree.number[i]):
        start = k + 1 if i == j else tree.first[j]
        for m in range(start, tree.first[j] + tree.number[j]):
            kind = _relation(tree, k, m, piece[k] != piece[m], limits)
            if kind >= 0:
                found = _room(found, used)
                found[used, 0], found[used, 1], found[used, 2] = k, m, kind
                used += 1
    return found, used


@njit(cache=True)
def _push_self(stack: np.ndarray, low: np.ndarray, top: int, first: int) -> int:
    """Put both children of a node, each with itself and with the other, on the stack."""
    for k, (i, j) in enumerate(((first, first), (first + 1, first + 1), (first, first + 1))):
        stack[top + k, 0], stack[top + k, 1], low[top + k] = i, j, 0.0
    return top + 3


@njit(cache=True)
def _search(tree: Tree, piece: np.ndarray, limits: _Limits) -> np.ndarray:
    """Rows (n, 3) of two triangles, in the order of the tree, and their relation."""
    stack, low = np.zeros((STACK, 2), dtype=np.int64), np.zeros(STACK)
    found = np.empty((16, 3), dtype=np.int64)
    top, used = 1, 0
    while top > 0:
        top -= 1
        i, j = stack[top, 0], stack[top, 1]
        if low[top] > limits.flat:
            continue
        if tree.child[i] < 0 and tree.child[j] < 0:
            found, used = _leaf_pairs(tree, i, j, piece, limits, found, used)
        elif i == j:
            top = _push_self(stack, low, top, tree.child[i])
        else:
            top = push_halves(tree, tree, (i, j), stack, low, top)
    return found[:used]
