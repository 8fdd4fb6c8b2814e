"""Layers of polynomials on a distant panel: expansions about its centroid.

With (X, Y, Z) the position of x in the frame of the panel and r its distance from the centroid,

    1/|x - y|   = sum c_pq y1^p y2^q,      Z/|x - y|^3 = sum d_pq y1^p y2^q,
    n r^2 c_pq = (2n - 1) (X c_p-1,q + Y c_p,q-1) - (n - 1) (c_p-2,q + c_p,q-2),   n = p + q,
    n r^2 d_pq = (2n + 1) (X d_p-1,q + Y d_p,q-1) - (n + 1) (d_p-2,q + d_p,q-2),

the recurrences of the polynomials of Legendre and of Gegenbauer (1874). Layers of a function are
these sums over its moments, to the fourth order here and to the third in ``mixed_lanes``.
"""

from __future__ import annotations

import math

from bem.compiled import njit

ORDER = 4
POWERS = [(n - q, q) for n in range(ORDER + 1) for q in range(n + 1)]
"""Powers of both coordinates, by rising order: 1, x, y, xx, xy, yy, xxx, ..."""
FAST = {"contract", "reassoc", "nsz", "arcp"}


@njit(inline="always")
def _second(x, y, up, down, c0, first):
    return (
        up * x * first[0] - down * c0,
        up * (x * first[1] + y * first[0]),
        up * y * first[1] - down * c0,
    )


@njit(inline="always")
def _third(x, y, up, down, first, second):
    return (
        up * x * second[0] - down * first[0],
        up * (x * second[1] + y * second[0]) - down * first[1],
        up * (x * second[2] + y * second[1]) - down * first[0],
        up * y * second[2] - down * first[1],
    )


@njit(inline="always")
def _fourth(x, y, up, down, second, third):
    return (
        up * x * third[0] - down * second[0],
        up * (x * third[1] + y * third[0]) - down * second[1],
        up * (x * third[2] + y * third[1]) - down * (second[0] + second[2]),
        up * (x * third[3] + y * third[2]) - down * second[1],
        up * y * third[3] - down * second[2],
    )


@njit(inline="always")
def three_orders(x, y, w, c0, kind):
    """Orders 1 to 3 above c0; x and y are divided by r^2, w = 1/r^2; kind 0: c, 2: d."""
    first = ((1 + kind) * x * c0, (1 + kind) * y * c0)
    second = _second(x, y, (3 + kind) / 2.0, (1 + kind) * w / 2.0, c0, first)
    return first, second, _third(x, y, (5 + kind) / 3.0, (2 + kind) * w / 3.0, first, second)


@njit(inline="always")
def _four_orders(x, y, w, c0, kind):
    first, second, third = three_orders(x, y, w, c0, kind)
    fourth = _fourth(x, y, (7 + kind) / 4.0, (3 + kind) * w / 4.0, second, third)
    return first, second, third, fourth


@njit(inline="always")
def upper_two(m, c):
    """Part of the orders 2 and 3; ``m`` the moments of one function, ``c`` coefficients."""
    _, second, third = c[:3]
    total = m[3] * second[0] + m[4] * second[1] + m[5] * second[2]
    total += m[6] * third[0] + m[7] * third[1]
    return total + m[8] * third[2] + m[9] * third[3]


@njit(inline="always")
def slope(m, c):
    """Part of the order 1."""
    return m[1] * c[0][0] + m[2] * c[0][1]


@njit(inline="always")
def _upper(m, c):
    """Part of the orders 2 to 4."""
    fourth = c[3]
    total = m[10] * fourth[0] + m[11] * fourth[1] + m[12] * fourth[2]
    return upper_two(m, c) + total + m[13] * fourth[3] + m[14] * fourth[4]


@njit(inline="always")
def _of(m, j, b):
    """The 15 moments of function b of panel j, as numbers."""
    return (
        m[j, b, 0], m[j, b, 1], m[j, b, 2], m[j, b, 3], m[j, b, 4],
        m[j, b, 5], m[j, b, 6], m[j, b, 7], m[j, b, 8], m[j, b, 9],
        m[j, b, 10], m[j, b, 11], m[j, b, 12], m[j, b, 13], m[j, b, 14],
    )  # fmt: skip


@njit(inline="always", error_model="numpy")
def _start(j, panels, points, block, k):
    """From one point: X/r^2, Y/r^2, 1/r^2 and the coefficients c and d of order 0."""
    axes, center = panels.axes, panels.center
    x = points[block, 0, k] - center[j, 0]
    y = points[block, 1, k] - center[j, 1]
    z = points[block, 2, k] - center[j, 2]
    w = 1.0 / (x * x + y * y + z * z)
    c0 = math.sqrt(w)
    along = x * axes[j, 0, 0] + y * axes[j, 0, 1] + z * axes[j, 0, 2]
    across = x * axes[j, 1, 0] + y * axes[j, 1, 1] + z * axes[j, 1, 2]
    height = x * axes[j, 2, 0] + y * axes[j, 2, 1] + z * axes[j, 2, 2]
    return along * w, across * w, w, c0, height * w * c0


@njit(cache=True, error_model="numpy", fastmath=FAST)
def far_constant(j, moments, panels, points, block, work):
    """V[1] in row 3 and K[1] in row 4 of ``work``; arguments as of ``far_double``."""
    one = _of(moments, j % moments.shape[0], 0)
    for k in range(work.shape[1]):
        x, y, w, c0, d0 = _start(j, panels, points, block, k)
        work[3, k] = one[0] * c0 + _upper(one, _four_orders(x, y, w, c0, 0.0))
        work[4, k] = one[0] * d0 + _upper(one, _four_orders(x, y, w, d0, 2.0))


@njit(cache=True, error_model="numpy", fastmath=FAST)
def far_single(j, moments, panels, points, block, work):
    """V of 1, f1, f2 in rows 3, 10, 11 of ``work``; arguments as of ``far_double``."""
    s = j % moments.shape[0]
    m0, m1, m2 = _of(moments, s, 0), _of(moments, s, 1), _of(moments, s, 2)
    for k in range(work.shape[1]):
        x, y, w, c0, _ = _start(j, panels, points, block, k)
        c = _four_orders(x, y, w, c0, 0.0)
        work[3, k] = m0[0] * c0 + _upper(m0, c)
        work[10, k] = slope(m1, c) + _upper(m1, c)
        work[11, k] = slope(m2, c) + _upper(m2, c)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def far_double(j, moments, panels, points, block, work):
    """K of the six functions of panel j at one block of points.

    Args:
        j: index of the panel, or of an image of it.
        moments: (n, 6, 15) of ``source_moments``.
        panels: n panels and their images.
        points: (b, 3, k).
        block: which of the b blocks.
        work: (12, k) scratch; rows 4 to 9 get the result.
    """
    s = j % moments.shape[0]
    m0, m1, m2 = _of(moments, s, 0), _of(moments, s, 1), _of(moments, s, 2)
    m3, m4, m5 = _of(moments, s, 3), _of(moments, s, 4), _of(moments, s, 5)
    for k in range(work.shape[1]):
        x, y, w, _, d0 = _start(j, panels, points, block, k)
        d = _four_orders(x, y, w, d0, 2.0)
        work[4, k] = m0[0] * d0 + _upper(m0, d)
        work[5, k] = slope(m1, d) + _upper(m1, d)
        work[6, k] = slope(m2, d) + _upper(m2, d)
        work[7, k], work[8, k], work[9, k] = _upper(m3, d), _upper(m4, d), _upper(m5, d)
