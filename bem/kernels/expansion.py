"""Expansion of the integral over two far panels about both centroids.

With d the difference of two points, one on each panel, less that of the centroids x, the
mean of 1/|x + d| follows from the moments of d up to the fourth: those of each panel, and
the products of their second moments.
"""

from __future__ import annotations

import math

from bem.compiled import njit


@njit(inline="always")
def dot(a, b):
    """Inner product of two vectors of three."""
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


@njit(inline="always", error_model="numpy")
def _own_moments(h, x, y, v2):
    """Third and fourth order terms of one panel's moments ``h`` toward (x, y), over R^-1.

    With T the moment tensor, the derivatives of 1/R give (15/6) T3[xxx] and (9/6) tr T3[x],
    (105/24) T4[xxxx], (90/24) tr T4[xx] and (9/24) tr tr T4, with powers of v2 = 1/R^2.
    """
    xx, xy, yy = x * x, x * y, y * y
    cube = h[0] * x * xx + 3.0 * h[1] * xx * y + 3.0 * h[2] * x * yy + h[3] * y * yy
    slope = (h[0] + h[2]) * x + (h[1] + h[3]) * y
    fourth = h[4] * xx * xx + 4.0 * h[5] * xx * xy + 6.0 * h[6] * xx * yy
    fourth += 4.0 * h[7] * xy * yy + h[8] * yy * yy
    bend = (h[4] + h[6]) * xx + 2.0 * (h[5] + h[7]) * xy + (h[6] + h[8]) * yy
    trace = h[4] + 2.0 * h[6] + h[8]
    odd = v2 * v2 * (1.5 * slope - 2.5 * v2 * cube)
    even = v2 * v2 * (0.375 * trace - v2 * (3.75 * bend - 4.375 * v2 * fourth))
    return odd, even


@njit(inline="always", error_model="numpy")
def _times(m, x, y, z):
    """Product of a symmetric tensor (xx, yy, zz, xy, xz, yz) with a vector."""
    return (
        m[0] * x + m[3] * y + m[4] * z,
        m[3] * x + m[1] * y + m[5] * z,
        m[4] * x + m[5] * y + m[2] * z,
    )


@njit(inline="always", error_model="numpy")
def _mixed_moments(a, b, ax, bx, x, v2):
    """Fourth order term of the second moments a and b of both panels, over R^-1."""
    full_a, full_b, both = dot(x, ax), dot(x, bx), dot(ax, bx)
    trace_a, trace_b = a[0] + a[1] + a[2], b[0] + b[1] + b[2]
    product = a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
    product += 2.0 * (a[3] * b[3] + a[4] * b[4] + a[5] * b[5])
    bend = trace_a * full_b + trace_b * full_a + 4.0 * both
    trace = 2.0 * trace_a * trace_b + 4.0 * product
    return v2 * v2 * (0.375 * trace - v2 * (3.75 * bend - 26.25 * v2 * full_a * full_b))


@njit(cache=True, error_model="numpy", fastmath={"contract", "reassoc", "nsz"})
def far_pair(i, j, panels, targets, out):
    """Expansion about both centroids; out[0] is A_ij, out[1:] the tests on i.

    A goes to the fourth order of the panels' sizes over their distance, the tests to the
    second order beyond their own.
    """
    c, axes = panels.center, panels.axes
    x = (c[i, 0] - c[j, 0], c[i, 1] - c[j, 1], c[i, 2] - c[j, 2])
    r2 = dot(x, x)
    v1 = 1.0 / math.sqrt(r2)
    v2 = 1.0 / r2
    v3 = v1 * v2
    v5 = v3 * v2
    a, b = panels.moment[i], panels.moment[j]
    ax, bx = _times(a, x[0], x[1], x[2]), _times(b, x[0], x[1], x[2])
    m = (ax[0] + bx[0], ax[1] + bx[1], ax[2] + bx[2])
    trace = a[0] + a[1] + a[2] + b[0] + b[1] + b[2]
    full = dot(x, m)
    x1, x2 = dot(x, axes[i, 0]), dot(x, axes[i, 1])
    odd_i, even_i = _own_moments(panels.higher[i], x1, x2, v2)
    odd_j, even_j = _own_moments(panels.higher[j], dot(x, axes[j, 0]), dot(x, axes[j, 1]), v2)
    series = 1.0 + 0.5 * v2 * (3.0 * full * v2 - trace) + odd_i - odd_j + even_i + even_j
    series += _mixed_moments(a, b, ax, bx, x, v2)
    area = panels.area[j]
    out[0] = panels.area[i] * area * v1 * series
    radial = -v3 + 1.5 * v5 * (trace - 5.0 * full * v2)
    g1 = radial * x1 + 3.0 * v5 * dot(m, axes[i, 0])
    g2 = radial * x2 + 3.0 * v5 * dot(m, axes[i, 1])
    h11, h22, h12 = 3.0 * x1 * x1 * v5 - v3, 3.0 * x2 * x2 * v5 - v3, 3.0 * x1 * x2 * v5
    first, second = targets.first, targets.second
    for k in range(4):
        slope = first[i, k, 0] * g1 + first[i, k, 1] * g2
        bend = second[i, k, 0] * h11 + second[i, k, 1] * h22 + 2.0 * second[i, k, 2] * h12
        out[k + 1] = area * (slope + 0.5 * bend)
