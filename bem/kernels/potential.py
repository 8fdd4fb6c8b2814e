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
from numba import njit

from bem.kernels.arrays import PanelArrays
from bem.kernels.elementary import atan2, log

TINY = 1e-290
_WRAP = -1e-9
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


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _add_side(ax, ay, tx, ty, length, local, work):
    """Add one side: its logarithm to row 0 of ``work``, its angle to rows 1 and 2."""
    for k in range(local.shape[1]):
        d = abs(local[2, k])
        dx = ax - local[0, k]
        dy = ay - local[1, k]
        t0 = dx * tx + dy * ty
        t1 = t0 + length
        p = dx * ty - dy * tx
        square = max(p * p + d * d, TINY)
        r0 = math.sqrt(t0 * t0 + square)
        r1 = math.sqrt(t1 * t1 + square)
        work[0, k] += p * side_log(t0, t1, r0, r1, square)
        c0 = square + d * r0
        c1 = square + d * r1
        re = c0 * c1 + p * p * t0 * t1
        im = p * (t1 * c0 - t0 * c1)
        old = work[1, k]
        work[1, k] = old * re - work[2, k] * im
        work[2, k] = old * im + work[2, k] * re


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _to_frame(j, panels, points, local):
    """Coordinates of ``points`` (3, k) in the frame of panel j."""
    axes = panels.axes
    for k in range(points.shape[1]):
        x = points[0, k] - panels.center[j, 0]
        y = points[1, k] - panels.center[j, 1]
        z = points[2, k] - panels.center[j, 2]
        local[0, k] = x * axes[j, 0, 0] + y * axes[j, 0, 1] + z * axes[j, 0, 2]
        local[1, k] = x * axes[j, 1, 0] + y * axes[j, 1, 1] + z * axes[j, 1, 2]
        local[2, k] = x * axes[j, 2, 0] + y * axes[j, 2, 1] + z * axes[j, 2, 2]


@njit(cache=True, error_model="numpy", fastmath=FAST)
def potential(j: int, panels: PanelArrays, points: np.ndarray, local: np.ndarray, work: np.ndarray):
    """Integral of 1/|x - y| over panel j at ``points`` (3, k), left in row 0 of ``work``.

    Args:
        j: index of the panel.
        panels: all panels.
        points: (3, k).
        local: (3, k) scratch.
        work: (3, k) scratch; row 0 is the result.
    """
    _to_frame(j, panels, points, local)
    for k in range(points.shape[1]):
        work[0, k] = 0.0
        work[1, k] = 1.0
        work[2, k] = 0.0
    corners, sides = panels.corners, panels.sides
    for e in range(4):
        if sides[j, e, 2] > 0.0:
            _add_side(
                corners[j, e, 0], corners[j, e, 1], sides[j, e, 0], sides[j, e, 1], sides[j, e, 2],
                local, work,
            )  # fmt: skip
    for k in range(points.shape[1]):
        angle = atan2(work[2, k], work[1, k])
        angle = angle + 2.0 * math.pi if angle < _WRAP else angle
        work[0, k] -= abs(local[2, k]) * angle


@njit(cache=True, error_model="numpy")
def potential_of_panels(panels: PanelArrays, points: np.ndarray, density: np.ndarray) -> np.ndarray:
    """Sum over panels of density times the integral of 1/|x - y|, at points (3, m): (m,)."""
    local, work = np.empty(points.shape), np.empty(points.shape)
    total = np.zeros(points.shape[1])
    for j in range(density.size):
        potential(j, panels, points, local, work)
        for k in range(points.shape[1]):
            total[k] += density[j] * work[0, k]
    return total
