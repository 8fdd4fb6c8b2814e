"""Closed double integrals of 1/|x - y| over two rectangles whose sides are parallel.

Integrating 1/R twice along each shared direction leaves an antiderivative that is summed
over the corner differences with alternating signs (for partial potential coefficients:
Ruehli and Brennan, IEEE Trans. Microwave Theory Tech. 21, 76 (1973), from memory; both
antiderivatives are checked against quadrature in the tests).
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.elementary import atan2, log

TINY = 1e-290
"""Guards logarithms whose factor vanishes."""


@njit(inline="always", error_model="numpy")
def _asinh_ratio(u: float, r: float, square: float) -> float:
    """asinh(u / sqrt(square)) where r = sqrt(u^2 + square); odd in u."""
    size = log((abs(u) + r) / math.sqrt(max(square, TINY)) + TINY)
    return -size if u < 0.0 else size


@njit(inline="always", error_model="numpy")
def parallel_term(u: float, v: float, w: float) -> float:
    """F with d^4 F / (du^2 dv^2) = 1/R, even in u, v and w."""
    uu, vv, ww = u * u, v * v, w * w
    r = math.sqrt(uu + vv + ww)
    logs = 0.5 * (vv - ww) * u * _asinh_ratio(u, r, vv + ww)
    logs += 0.5 * (uu - ww) * v * _asinh_ratio(v, r, uu + ww)
    return logs - (uu + vv - 2.0 * ww) * r / 6.0 - u * v * w * atan2(u * v, w * r)


@njit(inline="always", error_model="numpy")
def perpendicular_term(u: float, v: float, w: float) -> float:
    """G with d^4 G / (du^2 dv dw) = 1/R, even in u, odd in v and in w."""
    uu, vv, ww = u * u, v * v, w * w
    r = math.sqrt(uu + vv + ww)
    au, av, aw = abs(u), abs(v), abs(w)
    logs = (uu / 2.0 - ww / 6.0) * aw * _asinh_ratio(av, r, uu + ww)
    logs += (uu / 2.0 - vv / 6.0) * av * _asinh_ratio(aw, r, uu + vv)
    logs += au * av * aw * _asinh_ratio(au, r, vv + ww)
    angles = uu * au / 6.0 * atan2(av * aw, au * r)
    angles += au * vv / 2.0 * atan2(au * aw, av * r)
    angles += au * ww / 2.0 * atan2(au * av, aw * r)
    size = logs - av * aw * r / 3.0 - angles
    return -size if v * w < 0.0 else size


@njit(cache=True, error_model="numpy", fastmath={"contract", "nsz"})
def parallel_pair(u: np.ndarray, v: np.ndarray, w: float) -> float:
    """Double integral over two parallel rectangles with parallel sides.

    Args:
        u: (2, 2) corner differences along the first direction, [end of one, end of other].
        v: (2, 2) the same along the second direction.
        w: distance of the two planes.
    """
    total = 0.0
    for k in range(16):
        a, b, c, d = k & 1, (k >> 1) & 1, (k >> 2) & 1, k >> 3
        sign = 1.0 - 2.0 * ((a + b + c + d) & 1)
        total += sign * parallel_term(abs(u[a, b]), abs(v[c, d]), w)
    return total


@njit(cache=True, error_model="numpy", fastmath={"contract", "nsz"})
def perpendicular_pair(u: np.ndarray, v: np.ndarray, w: np.ndarray) -> float:
    """Double integral over two perpendicular rectangles that share one direction of sides.

    Args:
        u: (2, 2) corner differences along the shared direction.
        v: (2,) ends of the first rectangle across it, from the second one's plane.
        w: (2,) ends of the second rectangle across it, from the first one's plane.
    """
    total = 0.0
    for k in range(16):
        a, b, c, d = k & 1, (k >> 1) & 1, (k >> 2) & 1, k >> 3
        sign = 2.0 * ((a + b + c + d) & 1) - 1.0
        total += sign * perpendicular_term(u[a, b], v[c], w[d])
    return total
