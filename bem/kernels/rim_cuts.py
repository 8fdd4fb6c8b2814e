"""Where the samples of a panel are parted because a corner of another panel comes close.

Over a panel the layers of another one bend at the shadow of its rim, the more sharply the lower
it hovers, at its foot, and along a narrow strip on a shared side. In both directions of the
square -1 < s, t < 1 the panel is cut at the shadows of near corners, where near sides meet its
plane and, where a corner is near even for clustered samples, at three times its height beside.
"""

from __future__ import annotations

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.expansion import dot

NEAR, SHARP, VERY_SHARP = 0.7, 0.25, 0.0625
"""Heights of corners, in half sides, that lead to a cut, to more beside it, and yet more."""
BESIDE, FARTHER = 3.0, 12.0
"""How far beside, in heights."""
FEW = 4
"""Cuts, both ends among them, from which on there is no third of these."""
APART = 0.01
"""Least distance of two cuts on the square."""
MOST = 5
"""Most stretches in one direction."""
_STEPS = 4


@njit(cache=True, error_model="numpy")
def on_panel(corners, s, t):
    """Position on the panel at (s, t), and its derivatives: x, y, x_s, y_s, x_t, y_t."""
    x, y, xs, ys, xt, yt = 0.0, 0.0, 0.0, 0.0, 0.0, 0.0
    for k in range(4):
        a = 1.0 if k in (1, 2) else -1.0
        b = 1.0 if k > 1 else -1.0
        f, fs, ft = (1.0 + a * s) * (1.0 + b * t), a * (1.0 + b * t), b * (1.0 + a * s)
        x += 0.25 * f * corners[k, 0]
        y += 0.25 * f * corners[k, 1]
        xs += 0.25 * fs * corners[k, 0]
        ys += 0.25 * fs * corners[k, 1]
        xt += 0.25 * ft * corners[k, 0]
        yt += 0.25 * ft * corners[k, 1]
    return x, y, xs, ys, xt, yt


@njit(cache=True, error_model="numpy")
def _on_square(corners, at_x, at_y):
    """The (s, t) of a position in the plane, by Newton's method, never far off the square."""
    s, t = 0.0, 0.0
    for _ in range(_STEPS):
        x, y, xs, ys, xt, yt = on_panel(corners, s, t)
        full = xs * yt - ys * xt
        if full <= 0.0:
            break
        dx, dy = at_x - x, at_y - y
        s = min(max(s + (dx * yt - dy * xt) / full, -2.0), 2.0)
        t = min(max(t + (dy * xs - dx * ys) / full, -2.0), 2.0)
    return s, t


@njit(cache=True, error_model="numpy")
def _insert(cuts, count, at):
    """Number of cuts with one more, if it lies inside and apart from the others, kept sorted."""
    if count > MOST:
        return count
    for k in range(count):
        if abs(cuts[k] - at) < APART or abs(at) > 1.0:
            return count
    k = count
    while cuts[k - 1] > at:
        cuts[k] = cuts[k - 1]
        k -= 1
    cuts[k] = at
    return count + 1


@njit(cache=True, error_model="numpy")
def _add(cuts, count, at, height):
    """Number of cuts with those that one place asks for."""
    if height > NEAR:
        return count
    count = _insert(cuts, count, at)
    if 0.0 < height < SHARP:
        count = _insert(cuts, count, at - BESIDE * height)
        count = _insert(cuts, count, at + BESIDE * height)
    if 0.0 < height < VERY_SHARP and count < FEW:
        count = _insert(cuts, count, at - FARTHER * height)
        count = _insert(cuts, count, at + FARTHER * height)
    return count


@njit(cache=True, error_model="numpy")
def _seen(p, other, k, panels):
    """Corner k of another panel, in the frame of panel p."""
    x, y = panels.corners[other, k, 0], panels.corners[other, k, 1]
    axes, to, here = panels.axes[other], panels.center[other], panels.center[p]
    apart = (
        to[0] - here[0] + x * axes[0, 0] + y * axes[1, 0],
        to[1] - here[1] + x * axes[0, 1] + y * axes[1, 1],
        to[2] - here[2] + x * axes[0, 2] + y * axes[1, 2],
    )
    own = panels.axes[p]
    return dot(apart, own[0]), dot(apart, own[1]), dot(apart, own[2])


@njit(cache=True, error_model="numpy")
def _crossing(a, b):
    """Where the side from a to b meets the plane of the panel."""
    part = a[2] / (a[2] - b[2])
    return a[0] + part * (b[0] - a[0]), a[1] + part * (b[1] - a[1]), 0.0


@njit(cache=True, error_model="numpy")
def _cut_at(place, corners, half, u, v, counts):
    """Cut both directions at one place, by its distance from the panel."""
    if abs(place[2]) > NEAR * max(half[0], half[1]):
        return counts
    s, t = _on_square(corners, place[0], place[1])
    out_s, out_t = half[0] * (abs(s) - 1.0), half[1] * (abs(t) - 1.0)
    m = _add(u, counts[0], s, max(abs(place[2]), out_t) / half[0])
    n = _add(v, counts[1], t, max(abs(place[2]), out_s) / half[1])
    return m, n


@njit(cache=True, error_model="numpy")
def rim_cuts(p: int, other: int, panels: PanelArrays) -> tuple[np.ndarray, np.ndarray]:
    """Cuts of panel p for samples of the layers of another.

    Args:
        p: the panel that is sampled.
        other: the panel whose layers are.
        panels: all panels.

    Returns:
        Rising numbers from -1 to 1 for s and for t.
    """
    corners, length = panels.corners[p], panels.sides[p, :, 2]
    half = (0.25 * (length[0] + length[2]), 0.25 * (length[1] + length[3]))
    u, v = np.empty(MOST + 2), np.empty(MOST + 2)
    u[0], u[1], v[0], v[1] = -1.0, 1.0, -1.0, 1.0
    counts = (2, 2)
    for k in range(4):
        counts = _cut_at(_seen(p, other, k, panels), corners, half, u, v, counts)
    for k in range(4):
        a, b = _seen(p, other, k, panels), _seen(p, other, (k + 1) % 4, panels)
        if a[2] * b[2] < 0.0:
            counts = _cut_at(_crossing(a, b), corners, half, u, v, counts)
    return u[: counts[0]].copy(), v[: counts[1]].copy()
