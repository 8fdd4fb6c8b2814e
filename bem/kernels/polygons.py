"""Double integral of 1/|x - y| over two polygons in parallel planes, to near rounding.

The divergence theorem, applied in both planes, leaves line integrals over pairs of sides:

    A = - sum over sides e of one, f of the other (n_e . n_f) * int_e int_f (R - w log(w + R))

with w the distance of the planes. The inner integral is closed; the outer one is Gauss
quadrature on stretches cut where the other side's line or ends project, and clustered
toward the cuts, where the integrand has weak kinks.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.elementary import atan2, log
from bem.kernels.potential import TINY, side_log

_GAUSS, _WEIGHT = np.polynomial.legendre.leggauss(12)
_x = 0.5 * (_GAUSS + 1.0)
NODES = _x * _x * (3.0 - 2.0 * _x)
WEIGHTS = 0.5 * _WEIGHT * 6.0 * _x * (1.0 - _x)


@njit(inline="always", error_model="numpy")
def _primitive(t: float, p: float, w: float) -> float:
    """Part of the inner antiderivative that needs no logarithm in t + R."""
    r = math.sqrt(t * t + p * p + w * w)
    angle = atan2(t * abs(p), p * p + w * (w + r))
    return 0.5 * t * r - w * (t * log(w + r + TINY) - t) - w * abs(p) * angle


@njit(inline="always", error_model="numpy")
def line_integral(t0: float, t1: float, p: float, w: float) -> float:
    """Integral of R - w log(w + R) over t0 < t < t1, R^2 = t^2 + p^2 + w^2."""
    square = max(p * p + w * w, TINY)
    r0 = math.sqrt(t0 * t0 + square)
    r1 = math.sqrt(t1 * t1 + square)
    grow = (0.5 * square - w * w) * side_log(t0, t1, r0, r1, square)
    return grow + _primitive(t1, p, w) - _primitive(t0, p, w)


@njit(cache=True, error_model="numpy")
def _stretch(a, b, start, step, line, w):
    """Outer integral over the stretch a < s < b of the side start + s * step."""
    total = 0.0
    for q in range(NODES.size):
        s = a + (b - a) * NODES[q]
        dx = line[0] - (start[0] + s * step[0])
        dy = line[1] - (start[1] + s * step[1])
        t0 = dx * line[2] + dy * line[3]
        p = dx * line[3] - dy * line[2]
        total += WEIGHTS[q] * line_integral(t0, t0 + line[4], p, w)
    return total * (b - a)


@njit(cache=True, error_model="numpy")
def _cuts(start, step, line, cuts):
    """Fill ``cuts`` with 0, 1 and where the side meets the other's line and its ends' normals."""
    cuts[0], cuts[1] = 0.0, 1.0
    n = 2
    dx, dy = start[0] - line[0], start[1] - line[1]
    along = step[0] * line[2] + step[1] * line[3]
    across = step[0] * line[3] - step[1] * line[2]
    level = dx * line[3] - dy * line[2]
    if abs(across) > 1e-12 * line[4]:
        n = _add_cut(-level / across, cuts, n)
    if abs(along) > 1e-12 * line[4]:
        reach = dx * line[2] + dy * line[3]
        n = _add_cut(-reach / along, cuts, n)
        n = _add_cut((line[4] - reach) / along, cuts, n)
    return n


@njit(cache=True, error_model="numpy")
def _add_cut(s, cuts, n):
    """Insert s in order between the ends 0 and 1."""
    if not 1e-9 < s < 1.0 - 1e-9:
        return n
    k = n
    while cuts[k - 1] > s:
        cuts[k] = cuts[k - 1]
        k -= 1
    cuts[k] = s
    return n + 1


@njit(cache=True, error_model="numpy")
def _side_pair(start, step, line, w, cuts):
    n = _cuts(start, step, line, cuts)
    total = 0.0
    for k in range(n - 1):
        if cuts[k + 1] - cuts[k] > 1e-9:
            total += _stretch(cuts[k], cuts[k + 1], start, step, line, w)
    return total


@njit(cache=True, error_model="numpy")
def coplanar_pair(i: int, j: int, panels: PanelArrays) -> float:
    """Double integral over panels i and j, whose planes are parallel (or the same)."""
    axes, center, corners, sides = panels.axes, panels.center, panels.corners, panels.sides
    gap = center[i] - center[j]
    w = abs(np.dot(gap, axes[j, 2]))
    turn = np.empty((2, 2))
    shift = np.empty(2)
    for a in range(2):
        shift[a] = np.dot(gap, axes[j, a])
        for b in range(2):
            turn[a, b] = np.dot(axes[j, a], axes[i, b])
    handed = turn[0, 0] * turn[1, 1] - turn[0, 1] * turn[1, 0]
    start, step, line, cuts = np.empty(2), np.empty(2), np.empty(5), np.empty(5)
    total = 0.0
    for e in range(4):
        length = sides[i, e, 2]
        if length == 0.0:
            continue
        for a in range(2):
            start[a] = shift[a] + turn[a, 0] * corners[i, e, 0] + turn[a, 1] * corners[i, e, 1]
            step[a] = length * (turn[a, 0] * sides[i, e, 0] + turn[a, 1] * sides[i, e, 1])
        for f in range(4):
            if sides[j, f, 2] == 0.0:
                continue
            line[0], line[1] = corners[j, f, 0], corners[j, f, 1]
            line[2], line[3], line[4] = sides[j, f, 0], sides[j, f, 1], sides[j, f, 2]
            facing = step[0] * line[2] + step[1] * line[3]
            if facing != 0.0:
                total -= facing * _side_pair(start, step, line, w, cuts)
    return total if handed > 0.0 else -total
