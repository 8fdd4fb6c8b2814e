"""Potential of a uniformly charged planar polygon, exact at any point.

    integral dA / |x - y| = sum over sides p * log((R1 + t1)/(R0 + t0)) - |d| * angle

with t the coordinates of the side's ends along it, p the in-plane distance of x from the
side's line (outward), d the height of x above the plane and the angle that under which the
polygon is seen (Wilton, Rao, Glisson, Schaubert, Al-Bundak and Butler 1984; Hess and Smith
1967). Near a side R + t cancels; it is taken from h^2 = p^2 + d^2 as h^2 / (R - t). The
angle is the argument of one complex product over the sides.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.elementary import atan2, log

TINY = 1e-290
WRAP = -1e-9
"""An angle below this has passed pi and is wrapped; one above it is rounding about zero."""

FAST = {"contract", "nsz", "arcp"}


@njit(inline="always", error_model="numpy")
def side_log(t0: float, t1: float, r0: float, r1: float, square: float) -> float:
    """log((r1 + t1)/(r0 + t0)) without cancellation; ``square`` is h^2 > 0."""
    flip = t0 + t1 < 0.0
    low = -t1 if flip else t0
    high = -t0 if flip else t1
    r_low = r1 if flip else r0
    r_high = r0 if flip else r1
    safe = r_low + abs(low)
    num = (r_high + high) * (safe if low < 0.0 else 1.0)
    return log(num / (square if low < 0.0 else safe))


ROWS = 6
"""Rows of the scratch array: x, y and height in the panel's frame, result, complex product."""


@njit(inline="always", error_model="numpy")
def _add_side(corner, side, work):
    """Add one side: its logarithm to the result, its angle to the complex product."""
    ax, ay, tx, ty, length = corner[0], corner[1], side[0], side[1], side[2]
    for k in range(work.shape[1]):
        d = work[2, k]
        dx = ax - work[0, k]
        dy = ay - work[1, k]
        t0 = dx * tx + dy * ty
        t1 = t0 + length
        p = dx * ty - dy * tx
        square = max(p * p + d * d, TINY)
        r0 = math.sqrt(t0 * t0 + square)
        r1 = math.sqrt(t1 * t1 + square)
        work[3, k] += p * side_log(t0, t1, r0, r1, square)
        c0 = square + d * r0
        c1 = square + d * r1
        re = c0 * c1 + p * p * t0 * t1
        im = p * (t1 * c0 - t0 * c1)
        old = work[4, k]
        work[4, k] = old * re - work[5, k] * im
        work[5, k] = old * im + work[5, k] * re


@njit(inline="always", error_model="numpy")
def _to_frame(j, panels, points, block, work):
    """Coordinates of the points of one block in the frame of panel j; clears the results."""
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
        work[2, k] = abs(x * n0 + y * n1 + z * n2)
        work[3, k] = 0.0
        work[4, k] = 1.0
        work[5, k] = 0.0


@njit(cache=True, error_model="numpy", fastmath=FAST)
def potential(j: int, panels: PanelArrays, points: np.ndarray, block: int, work: np.ndarray):
    """Integral of 1/|x - y| over panel j at one block of points, left in row 3 of ``work``.

    Whole arrays are passed and indexed here: making a view costs as much as ten points.

    Args:
        j: index of the panel.
        panels: all panels.
        points: (b, 3, k).
        block: which of the b blocks.
        work: (6, k) scratch; row 3 is the result.
    """
    _to_frame(j, panels, points, block, work)
    corners, sides = panels.corners, panels.sides
    for e in range(4):
        if sides[j, e, 2] > 0.0:
            corner = (corners[j, e, 0], corners[j, e, 1])
            side = (sides[j, e, 0], sides[j, e, 1], sides[j, e, 2])
            _add_side(corner, side, work)
    for k in range(work.shape[1]):
        angle = atan2(work[5, k], work[4, k])
        angle = angle + 2.0 * math.pi if angle < WRAP else angle
        work[3, k] -= work[2, k] * angle


@njit(cache=True, error_model="numpy")
def potential_of_panels(panels: PanelArrays, points: np.ndarray, density: np.ndarray) -> np.ndarray:
    """Sum over panels of density times the integral of 1/|x - y|, at points (3, m): (m,)."""
    count = points.shape[1]
    block, work = points.reshape((1, 3, count)), np.empty((ROWS, count))
    total = np.zeros(count)
    for j in range(density.size):
        potential(j, panels, block, 0, work)
        for k in range(count):
            total[k] += density[j] * work[3, k]
    return total
