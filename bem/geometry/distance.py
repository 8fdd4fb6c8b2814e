"""Exact distance between two triangles, and how deep one pierces the other.

The distance of two triangles that do not cross is reached either at a corner of one and
the nearest point of the other, or at inner points of two edges. A triangle without area
counts as the segment or point that it is.
"""

from __future__ import annotations

import math

from bem.compiled import njit
from bem.geometry.vectors import Vector, along, cross, dot, minus, norm, unit

Triangle = tuple[Vector, Vector, Vector]
Nearest = tuple[float, Vector, Vector]
"""Squared distance, the point on the first triangle, the point on the second."""

PARALLEL = 1e-14
"""Edges whose angle has a squared sine below this are left to the corners' test."""


@njit(cache=True)
def _on_segment(p: Vector, a: Vector, b: Vector) -> Vector:
    """Point of the segment from a to b nearest to p."""
    d = minus(b, a)
    length2 = dot(d, d)
    if length2 == 0.0:
        return a
    return along(a, min(max(dot(minus(p, a), d) / length2, 0.0), 1.0), d)


@njit(cache=True)
def _nearer(p: Vector, first: Vector, second: Vector) -> Vector:
    to_first, to_second = minus(p, first), minus(p, second)
    return first if dot(to_first, to_first) <= dot(to_second, to_second) else second


@njit(cache=True)
def _above(p: Vector, t: Triangle, n: Vector) -> bool:
    """Whether p lies over (or under) the triangle with normal n, rim included."""
    for k in range(3):
        a, b = t[k], t[(k + 1) % 3]
        if dot(cross(minus(b, a), minus(p, a)), n) < 0.0:
            return False
    return True


@njit(cache=True)
def on_triangle(p: Vector, t: Triangle) -> Vector:
    """Point of the triangle nearest to p."""
    n = cross(minus(t[1], t[0]), minus(t[2], t[0]))
    n2 = dot(n, n)
    if n2 > 0.0 and _above(p, t, n):
        return along(p, -dot(minus(p, t[0]), n) / n2, n)
    rim = _nearer(p, _on_segment(p, t[0], t[1]), _on_segment(p, t[1], t[2]))
    return _nearer(p, rim, _on_segment(p, t[2], t[0]))


@njit(cache=True)
def _closer(best: Nearest, p: Vector, q: Vector) -> Nearest:
    d = minus(p, q)
    d2 = dot(d, d)
    return (d2, p, q) if d2 < best[0] else best


@njit(cache=True)
def _edges(best: Nearest, a: Vector, b: Vector, c: Vector, d: Vector) -> Nearest:
    """Improve ``best`` by inner points of the segments ab and cd."""
    u, v, w = minus(b, a), minus(d, c), minus(a, c)
    uu, vv, uv = dot(u, u), dot(v, v), dot(u, v)
    det = uu * vv - uv * uv
    if det <= PARALLEL * uu * vv:
        return best
    uw, vw = dot(u, w), dot(v, w)
    s = (uv * vw - vv * uw) / det
    t = (uu * vw - uv * uw) / det
    if s <= 0.0 or s >= 1.0 or t <= 0.0 or t >= 1.0:
        return best
    return _closer(best, along(a, s, u), along(c, t, v))


@njit(cache=True)
def _clearance(p: Vector, t: Triangle, n: Vector) -> float:
    """Distance of p, in the triangle's plane with unit normal n, from its rim; < 0 outside."""
    clear = math.inf
    for k in range(3):
        edge = minus(t[(k + 1) % 3], t[k])
        clear = min(clear, dot(cross(edge, minus(p, t[k])), n) / norm(edge))
    return clear


@njit(cache=True)
def _pierced(a: Vector, b: Vector, t: Triangle, n: Vector) -> tuple[float, Vector]:
    """Depth by which the segment ab goes through the triangle, and where; zero if not."""
    from_a, from_b = dot(minus(a, t[0]), n), dot(minus(b, t[0]), n)
    if from_a * from_b >= 0.0:
        return 0.0, a
    place = along(a, from_a / (from_a - from_b), minus(b, a))
    return max(min(abs(from_a), abs(from_b), _clearance(place, t, n)), 0.0), place


@njit(cache=True)
def _through(first: Triangle, second: Triangle) -> tuple[float, Vector]:
    """Deepest piercing of ``second`` by an edge of ``first``."""
    n = unit(cross(minus(second[1], second[0]), minus(second[2], second[0])))
    deepest, where = 0.0, first[0]
    for k in range(3):
        depth, place = _pierced(first[k], first[(k + 1) % 3], second, n)
        if depth > deepest:
            deepest, where = depth, place
    return deepest, where


@njit(cache=True)
def piercing(first: Triangle, second: Triangle) -> tuple[float, Vector]:
    """Depth by which an edge of one triangle goes through the other, and where.

    The depth is how far one of them has to move so that they no longer cross: the edge's
    shorter piece along the normal of the triangle that it goes through, or the way from
    there to the triangle's rim. It is zero if the triangles do not cross.
    """
    depth, place = _through(first, second)
    other, elsewhere = _through(second, first)
    return (depth, place) if depth >= other else (other, elsewhere)


@njit(cache=True)
def nearest_points(first: Triangle, second: Triangle) -> Nearest:
    """Squared distance of two triangles and a point of each where it is reached."""
    depth, place = piercing(first, second)
    if depth > 0.0:
        return 0.0, place, place
    best = (math.inf, first[0], second[0])
    for k in range(3):
        best = _closer(best, first[k], on_triangle(first[k], second))
        best = _closer(best, on_triangle(second[k], first), second[k])
    for k in range(3):
        for m in range(3):
            best = _edges(best, first[k], first[(k + 1) % 3], second[m], second[(m + 1) % 3])
    return best
