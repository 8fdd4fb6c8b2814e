"""Single and double layers of a panel's polynomials, exact at any point.

    V[p](x) = integral of p(y) / |x - y| dA
    K[p](x) = integral of p(y) h / |x - y|^3 dA, the derivative of 1/|x - y| along the normal at y

with h the signed height of x above the plane and p one of 1, x, y, xx, yy, xy in the panel's
frame. With u = y - x in the plane, t the direction of a side, m its outward normal, p the
distance of its line, f the integral of 1/r along it and D the difference of r at its ends,

    h * int u / r^3     = -h * sum m f
    h * int u_x u_x/r^3 =  h * sum t_x (t_x p f - t_y D) - h^2 omega
    h * int u_x u_y/r^3 =  h * sum t_y (t_x p f - t_y D)
    int u / r           =  sum m * int r ds

by the divergence theorem in the plane; omega, the signed solid angle, and f are those of
the potential (Wilton, Rao, Glisson, Schaubert, Al-Bundak and Butler 1984; for polynomials
Graglia 1993, from memory).
"""

from __future__ import annotations

import math

from bem.compiled import njit
from bem.kernels.elementary import atan2
from bem.kernels.potential import FAST, TINY, WRAP, side_log

ROWS = 12
"""Rows of the scratch array."""
SINGLE, DOUBLE, SLOPES = 3, 4, 10
"""Rows of the results: V[f0]; K of f0 to f5; V of f1 and f2."""


@njit(inline="always", error_model="numpy")
def _to_frame(j, panels, points, block, work):
    """Coordinates of the points of one block in the frame of panel j; clears the sums."""
    axes, center = panels.axes, panels.center
    a0, a1, a2 = axes[j, 0, 0], axes[j, 0, 1], axes[j, 0, 2]
    b0, b1, b2 = axes[j, 1, 0], axes[j, 1, 1], axes[j, 1, 2]
    n0, n1, n2 = axes[j, 2, 0], axes[j, 2, 1], axes[j, 2, 2]
    c0, c1, c2 = center[j, 0], center[j, 1], center[j, 2]
    for k in range(work.shape[1]):
        x = points[block, 0, k] - c0
        y = points[block, 1, k] - c1
        z = points[block, 2, k] - c2
        work[0, k] = x * a0 + y * a1 + z * a2
        work[1, k] = x * b0 + y * b1 + z * b2
        work[2, k] = x * n0 + y * n1 + z * n2
        work[4, k] = 1.0
    for row in (3, 5, 6, 7, 8, 9, 10, 11):
        for k in range(work.shape[1]):
            work[row, k] = 0.0


@njit(inline="always", error_model="numpy")
def _add_side(corner, side, work, order):
    """Add one side to the sums that order 0 (V, K of 1), 1 (K of all) or 2 (all) needs."""
    ax, ay, tx, ty, length = corner[0], corner[1], side[0], side[1], side[2]
    for k in range(work.shape[1]):
        d = abs(work[2, k])
        dx = ax - work[0, k]
        dy = ay - work[1, k]
        t0 = dx * tx + dy * ty
        t1 = t0 + length
        p = dx * ty - dy * tx
        square = max(p * p + d * d, TINY)
        r0 = math.sqrt(t0 * t0 + square)
        r1 = math.sqrt(t1 * t1 + square)
        f = side_log(t0, t1, r0, r1, square)
        work[3, k] += p * f
        c0 = square + d * r0
        c1 = square + d * r1
        re = c0 * c1 + p * p * t0 * t1
        im = p * (t1 * c0 - t0 * c1)
        old = work[4, k]
        work[4, k] = old * re - work[5, k] * im
        work[5, k] = old * im + work[5, k] * re
        if order > 0:
            drop = length * (t0 + t1) / (r0 + r1)
            bend = tx * p * f - ty * drop
            work[6, k] += ty * f
            work[7, k] -= tx * f
            work[8, k] += tx * bend
            work[9, k] += ty * bend
            if order > 1:
                q = 0.5 * (length * r1 + t0 * drop + square * f)
                work[10, k] += ty * q
                work[11, k] -= tx * q


@njit(inline="always", error_model="numpy")
def _all_sides(j, panels, points, block, work, order):
    """The sums over all sides of panel j."""
    _to_frame(j, panels, points, block, work)
    corners, sides = panels.corners, panels.sides
    for e in range(4):
        if sides[j, e, 2] > 0.0:
            corner = (corners[j, e, 0], corners[j, e, 1])
            side = (sides[j, e, 0], sides[j, e, 1], sides[j, e, 2])
            _add_side(corner, side, work, order)


@njit(inline="always", error_model="numpy")
def _solid_angle(work, k):
    """Positive in front of the panel, negative behind, zero in its plane."""
    angle = atan2(work[5, k], work[4, k])
    angle = angle + 2.0 * math.pi if angle < WRAP else angle
    angle = angle if work[2, k] > 0.0 else -angle
    return angle if work[2, k] != 0.0 else 0.0


@njit(inline="always", error_model="numpy")
def _finish(work):
    """From the sums to V[1] in row 3 and K of the monomials in rows 4 to 9."""
    for k in range(work.shape[1]):
        omega = _solid_angle(work, k)
        x, y, h = work[0, k], work[1, k], work[2, k]
        gx, gy = h * work[6, k], h * work[7, k]
        flat = h * h * omega
        kx, ky = x * omega - gx, y * omega - gy
        xx, yy, xy = work[8, k], work[3, k] - work[8, k], work[9, k]
        work[3, k] -= h * omega
        work[4, k], work[5, k], work[6, k] = omega, kx, ky
        work[7, k] = h * xx - flat + x * (kx - gx)
        work[8, k] = h * yy - flat + y * (ky - gy)
        work[9, k] = h * xy + x * ky - y * gx


@njit(inline="always", error_model="numpy")
def _combine(basis, j, work):
    """From K of the monomials to K of the functions of panel j."""
    b10, b11 = basis[j, 1, 0], basis[j, 1, 1]
    b20, b21, b22 = basis[j, 2, 0], basis[j, 2, 1], basis[j, 2, 2]
    b30, b31, b32, b33 = basis[j, 3, 0], basis[j, 3, 1], basis[j, 3, 2], basis[j, 3, 3]
    b40, b41, b42, b43 = basis[j, 4, 0], basis[j, 4, 1], basis[j, 4, 2], basis[j, 4, 3]
    b50, b51, b52, b53 = basis[j, 5, 0], basis[j, 5, 1], basis[j, 5, 2], basis[j, 5, 3]
    b44, b54, b55 = basis[j, 4, 4], basis[j, 5, 4], basis[j, 5, 5]
    for k in range(work.shape[1]):
        one, x, y, xx, yy = work[4, k], work[5, k], work[6, k], work[7, k], work[8, k]
        work[5, k] = b10 * one + b11 * x
        work[6, k] = b20 * one + b21 * x + b22 * y
        work[7, k] = b30 * one + b31 * x + b32 * y + b33 * xx
        work[8, k] = b40 * one + b41 * x + b42 * y + b43 * xx + b44 * yy
        last = b50 * one + b51 * x + b52 * y + b53 * xx + b54 * yy
        work[9, k] = last + b55 * work[9, k]


@njit(inline="always", error_model="numpy")
def _combine_single(basis, j, work):
    """V of f1 and f2 from the sums for int u / r and from V[1]."""
    b10, b11 = basis[j, 1, 0], basis[j, 1, 1]
    b20, b21, b22 = basis[j, 2, 0], basis[j, 2, 1], basis[j, 2, 2]
    for k in range(work.shape[1]):
        one = work[3, k]
        x = work[10, k] + work[0, k] * one
        y = work[11, k] + work[1, k] * one
        work[10, k] = b10 * one + b11 * x
        work[11, k] = b20 * one + b21 * x + b22 * y


@njit(cache=True, error_model="numpy", fastmath=FAST)
def constant_moments(j, panels, points, block, work):
    """V[1] in row 3 and K[1] in row 4 of ``work``, arguments as of ``moments``."""
    _all_sides(j, panels, points, block, work, 0)
    for k in range(work.shape[1]):
        omega = _solid_angle(work, k)
        work[3, k] -= work[2, k] * omega
        work[4, k] = omega


@njit(cache=True, error_model="numpy", fastmath=FAST)
def double_moments(j, basis, panels, points, block, work):
    """V[1] in row 3, K of the six functions in rows 4 to 9, arguments as of ``moments``."""
    _all_sides(j, panels, points, block, work, 1)
    _finish(work)
    _combine(basis, j % basis.shape[0], work)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def moments(j, basis, panels, points, block, work):
    """Layers of the functions of panel j at one block of points.

    Args:
        j: index of the panel, or of an image of it.
        basis: (n, 6, 6) functions of the n panels, alike on their images.
        panels: n panels and their images.
        points: (b, 3, k).
        block: which of the b blocks.
        work: (12, k) scratch; row 3 gets V[1], rows 4 to 9 K of f0 to f5, rows 10 and 11
            V of f1 and f2.
    """
    _all_sides(j, panels, points, block, work, 2)
    _finish(work)
    _combine(basis, j % basis.shape[0], work)
    _combine_single(basis, j % basis.shape[0], work)
