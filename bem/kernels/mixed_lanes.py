"""Layers of distant panels, sixteen sources at a time.

All sources of a block lie in the lanes of the same vectors, so that nothing is loaded twice or
summed across lanes; a target has eight samples and the expansions go to the third order.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.mixed_expansion import FAST, slope, three_orders, upper_two

LANES = 16
_MOMENTS = 10
"""Moments of one function up to the third order."""
_ROWS = 12 + 6 * _MOMENTS
_SAMPLES = 8
_LAYERS = 9
"""K of f0 to f5, then V of f0, f1, f2."""


class Lanes(NamedTuple):
    """Sources in blocks, conductors first; each block has one kind.

    Args:
        data: (g, b, 72 * 16) for each image and block, with the lanes innermost: centroid, axes,
            ten moments of each of the six functions.
        source: (b, 16) index of the panel in each lane, -1 where the block is not full.
        metal: (b,) whether the block holds conductors.
    """

    data: np.ndarray
    source: np.ndarray
    metal: np.ndarray


def _blocks(indices: np.ndarray) -> np.ndarray:
    """(b, 16) indices, -1 behind the last."""
    out = np.full(-(-len(indices) // LANES) * LANES, -1)
    out[: len(indices)] = indices
    return out.reshape(-1, LANES)


def lanes_of(
    panels: PanelArrays, moments: np.ndarray, indices: np.ndarray, conductors: int
) -> Lanes:
    """Blocks of the panels ``indices`` (rising) and of their images.

    Args:
        panels: n panels and their images.
        moments: (n, 6, 15) of ``source_moments``.
        indices: (m,) panels to be taken.
        conductors: panels before this one are conductors.
    """
    metal = indices < conductors
    parts = [_blocks(indices[metal]), _blocks(indices[~metal])]
    source, count = np.concatenate(parts), len(moments)
    copies = len(panels.area) // count
    taken = np.maximum(source, 0) + count * np.arange(copies)[:, None, None]
    place = [panels.center[taken], panels.axes[taken].reshape(*taken.shape, 9)]
    shape = moments[taken % count, :, :_MOMENTS].reshape(*taken.shape, 6 * _MOMENTS)
    rows = np.concatenate([*place, shape], axis=-1).swapaxes(2, 3)
    data = np.ascontiguousarray(rows).reshape(copies, len(source), _ROWS * LANES)
    return Lanes(data, source, np.arange(len(source)) < len(parts[0]))


@njit(inline="always")
def _row(data, g, b, r, k):
    return data[g, b, r * LANES + k]


@njit(inline="always")
def _of(data, g, b, f, k):
    """The ten moments of function f in lane k."""
    r = 12 + _MOMENTS * f
    return (
        _row(data, g, b, r, k), _row(data, g, b, r + 1, k), _row(data, g, b, r + 2, k),
        _row(data, g, b, r + 3, k), _row(data, g, b, r + 4, k), _row(data, g, b, r + 5, k),
        _row(data, g, b, r + 6, k), _row(data, g, b, r + 7, k), _row(data, g, b, r + 8, k),
        _row(data, g, b, r + 9, k),
    )  # fmt: skip


@njit(inline="always")
def _along(data, g, b, axis, k, apart):
    """Component of a vector along one axis of the panel in lane k."""
    r = 3 + 3 * axis
    total = apart[0] * _row(data, g, b, r, k) + apart[1] * _row(data, g, b, r + 1, k)
    return total + apart[2] * _row(data, g, b, r + 2, k)


@njit(inline="always", error_model="numpy")
def _start(data, g, b, k, x):
    """X/r^2, Y/r^2, 1/r^2 and the coefficients c and d of order 0 at the point x."""
    apart = (
        x[0] - _row(data, g, b, 0, k),
        x[1] - _row(data, g, b, 1, k),
        x[2] - _row(data, g, b, 2, k),
    )
    w = 1.0 / (apart[0] * apart[0] + apart[1] * apart[1] + apart[2] * apart[2])
    c0 = math.sqrt(w)
    along, across = _along(data, g, b, 0, k, apart), _along(data, g, b, 1, k, apart)
    return along * w, across * w, w, c0, _along(data, g, b, 2, k, apart) * w * c0


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _constant(data, g, b, x, q, u):
    """K and V of f0 at one point."""
    for k in range(LANES):
        along, across, w, c0, d0 = _start(data, g, b, k, x)
        one = _of(data, g, b, 0, k)
        d, c = three_orders(along, across, w, d0, 2.0), three_orders(along, across, w, c0, 0.0)
        u[q, k] = one[0] * d0 + upper_two(one, d)
        u[q, 6 * LANES + k] = one[0] * c0 + upper_two(one, c)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _double(data, g, b, x, q, u):
    """K of all functions at one point."""
    for k in range(LANES):
        along, across, w, _, d0 = _start(data, g, b, k, x)
        d = three_orders(along, across, w, d0, 2.0)
        m0, m1, m2 = _of(data, g, b, 0, k), _of(data, g, b, 1, k), _of(data, g, b, 2, k)
        u[q, k] = m0[0] * d0 + upper_two(m0, d)
        u[q, LANES + k] = slope(m1, d) + upper_two(m1, d)
        u[q, 2 * LANES + k] = slope(m2, d) + upper_two(m2, d)
        u[q, 3 * LANES + k] = upper_two(_of(data, g, b, 3, k), d)
        u[q, 4 * LANES + k] = upper_two(_of(data, g, b, 4, k), d)
        u[q, 5 * LANES + k] = upper_two(_of(data, g, b, 5, k), d)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _single(data, g, b, x, q, u):
    """V of f0, f1, f2 at one point."""
    for k in range(LANES):
        along, across, w, c0, _ = _start(data, g, b, k, x)
        c = three_orders(along, across, w, c0, 0.0)
        m0, m1, m2 = _of(data, g, b, 0, k), _of(data, g, b, 1, k), _of(data, g, b, 2, k)
        u[q, 6 * LANES + k] = m0[0] * c0 + upper_two(m0, c)
        u[q, 7 * LANES + k] = slope(m1, c) + upper_two(m1, c)
        u[q, 8 * LANES + k] = slope(m2, c) + upper_two(m2, c)


@njit(cache=True, error_model="numpy", fastmath=FAST)
def _weigh(i, t, weights, layer, u, out, row):
    """Sum of one layer over the samples of test t, left in one row of ``out`` (rows, 16)."""
    w0, w1, w2, w3 = weights[i, t, 0], weights[i, t, 1], weights[i, t, 2], weights[i, t, 3]
    w4, w5, w6, w7 = weights[i, t, 4], weights[i, t, 5], weights[i, t, 6], weights[i, t, 7]
    for k in range(LANES):
        q = layer * LANES + k
        low = w0 * u[0, q] + w1 * u[1, q] + w2 * u[2, q] + w3 * u[3, q]
        high = w4 * u[4, q] + w5 * u[5, q] + w6 * u[6, q] + w7 * u[7, q]
        out[row, k] = low + high


@njit(cache=True, error_model="numpy")
def scratch():
    """Room for the layers at all samples of one block."""
    return np.empty((_SAMPLES, _LAYERS * LANES))


@njit(cache=True, error_model="numpy")
def distant_conductors(i, far, lanes, place, u, single, double):
    """A block of conductors: V and K of f0 against all tests; see ``distant_interfaces``."""
    g, b = place
    for q in range(_SAMPLES):
        x = (far.points[i, 0, q], far.points[i, 1, q], far.points[i, 2, q])
        _constant(lanes.data, g, b, x, q, u)
    for t in range(6):
        _weigh(i, t, far.weights, 0, u, double, 6 * t)
        _weigh(i, t, far.weights, 6, u, single, 3 * t)


@njit(cache=True, error_model="numpy")
def distant_interfaces(i, far, lanes, place, metal, u, single, double):
    """A block of interfaces: all tests of panel i against what ``weigh_both`` or ``_double`` sum.

    Args:
        i: target.
        far: the ``FarPanels``.
        lanes: sources.
        place: image and block.
        metal: whether the target is a conductor.
        u: ``scratch()``.
        single: (18, 16) result, row 3 t + b: test t against V of function b.
        double: (36, 16) result, row 6 t + b: test t against K of function b.
    """
    g, b = place
    for q in range(_SAMPLES):
        x = (far.points[i, 0, q], far.points[i, 1, q], far.points[i, 2, q])
        _double(lanes.data, g, b, x, q, u)
        if metal:
            _single(lanes.data, g, b, x, q, u)
    for t in range(5 if metal else 6):
        for f in range(3):
            _weigh(i, t, far.weights, f, u, double, 6 * t + f)
    for t in range(1 if metal else 3):
        for f in range(3, 6):
            _weigh(i, t, far.weights, f, u, double, 6 * t + f)
    for t in range(1, 5 if metal else 0):
        for f in range(3):
            _weigh(i, t, far.weights, 6 + f, u, single, 3 * t + f)
