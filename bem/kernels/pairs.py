"""Integrals over pairs of panels, each by the cheapest rule that is accurate enough.

    A_ij   = integral over i and j of 1/|x - y|
    T_k,ij = integral over i of test k, and over j, of 1/|x - y|

far     (distance beyond ``far`` times both radii): one expansion about the centroids, up to
        the fourth moments of both panels.
middle  A and T from the 16 samples of panel i, the potential of j exact.
near    (distance below ``near`` times both radii): A exact where a closed form or an
        almost closed one exists (parallel-sided rectangles, panels in parallel planes),
        otherwise by samples of the smaller panel clustered at its rim; T as above, so that
        all near panels are seen from the same samples and the residual is sampled
        consistently.

With grounded planes, mirror planes or flat layers the images of all panels are sources too, each
with its weight: A_ij and T_k,ij are weighted sums over the images of j.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.expansion import dot, far_pair
from bem.kernels.mixed_arrays import Images
from bem.kernels.parallel import sum_over_rows
from bem.kernels.polygons import coplanar_pair
from bem.kernels.potential import ROWS, potential
from bem.kernels.rectangles import parallel_pair, perpendicular_pair
from bem.kernels.targets import Targets

ALIGNED = 1e-7
"""Directions closer than this (sine or cosine) count as parallel or perpendicular."""
CLOSED_LOSS = 1e8
"""Closed forms lose about extent^4/(area * area) in relative accuracy; not used beyond."""
SIDES_LOSS, CROSSING_LOSS = 1e7, 1e9
"""The same for the side-pair integrals, which lose extent^2 * length * length/(area * area);
and where thin panels cross at a small distance, which samples would miss."""
KINKS = 1.0
"""Parallel panels nearer than this times the smaller radius shadow each other's samples."""


def clustered_rule(n: int, wide: bool) -> tuple[np.ndarray, np.ndarray]:
    """Gauss's rule on (-1, 1) moved toward both ends: nodes and weights (n,) each."""
    x, w = np.polynomial.legendre.leggauss(n)
    x, w = 0.5 * (x + 1.0), 0.5 * w
    if wide:
        return 2.0 * x**3 * (10.0 - 15.0 * x + 6.0 * x**2) - 1.0, 60.0 * w * (x * (1.0 - x)) ** 2
    return 2.0 * x**2 * (3.0 - 2.0 * x) - 1.0, 12.0 * w * x * (1.0 - x)


_SHORT, _SHORT_W = clustered_rule(6, False)
_LONG, _LONG_W = clustered_rule(10, True)


@njit(cache=True, error_model="numpy", fastmath={"contract", "reassoc", "nsz"})
def _collect(i, targets, work, out):
    """Sum the samples of i, left by ``potential``, as ``far_pair`` does.

    It does not call ``potential`` itself: compiled into one, the loops there stay scalar.
    """
    weights, tests = targets.weights, targets.tests
    a0, a1, a2, a3, a4 = 0.0, 0.0, 0.0, 0.0, 0.0
    for q in range(work.shape[1]):
        u = work[3, q]
        a0 += weights[i, q] * u
        a1 += tests[i, 0, q] * u
        a2 += tests[i, 1, q] * u
        a3 += tests[i, 2, q] * u
        a4 += tests[i, 3, q] * u
    out[0], out[1], out[2], out[3], out[4] = a0, a1, a2, a3, a4


@njit(cache=True, error_model="numpy")
def _clustered_points(i, panels, nodes_u, nodes_v):
    """Points (1, 3, k) of panel i at products of two sets of (node, weight); weights (k,)."""
    corners, axes, center = panels.corners[i], panels.axes[i], panels.center[i]
    n = nodes_u[0].size * nodes_v[0].size
    points, weights = np.empty((1, 3, n)), np.empty(n)
    k = 0
    for p in range(nodes_u[0].size):
        s = nodes_u[0][p]
        for q in range(nodes_v[0].size):
            t = nodes_v[0][q]
            f0, f1 = 0.25 * (1 - s) * (1 - t), 0.25 * (1 + s) * (1 - t)
            f2, f3 = 0.25 * (1 + s) * (1 + t), 0.25 * (1 - s) * (1 + t)
            u = f0 * corners[0] + f1 * corners[1] + f2 * corners[2] + f3 * corners[3]
            du = (1 - t) * (corners[1] - corners[0]) + (1 + t) * (corners[2] - corners[3])
            dv = (1 - s) * (corners[3] - corners[0]) + (1 + s) * (corners[2] - corners[1])
            for c in range(3):
                points[0, c, k] = center[c] + u[0] * axes[0, c] + u[1] * axes[1, c]
            weights[k] = nodes_u[1][p] * nodes_v[1][q] * (du[0] * dv[1] - du[1] * dv[0]) / 16.0
            k += 1
    return points, weights


@njit(cache=True, error_model="numpy")
def clustered_pair(i: int, j: int, panels: PanelArrays) -> float:
    """Double integral with samples of panel i clustered at its rim, potential of j exact."""
    side = panels.sides[i, :, 2]
    wide, tall = max(side[0], side[2]), max(side[1], side[3])
    short, long = (_SHORT, _SHORT_W), (_LONG, _LONG_W)
    nodes_u = long if wide > 6.0 * tall else short
    nodes_v = long if tall > 6.0 * wide else short
    points, weights = _clustered_points(i, panels, nodes_u, nodes_v)
    work = np.empty((ROWS, weights.size))
    potential(j, panels, points, 0, work)
    return np.sum(weights * work[3])


@njit(cache=True, error_model="numpy")
def _ends(gap, axis, half_i, half_j, diff):
    """Corner differences (2, 2) along one direction; ``gap`` is center i minus center j."""
    at = dot(gap, axis)
    for a in range(2):
        for b in range(2):
            diff[a, b] = at + (2 * a - 1) * half_i - (2 * b - 1) * half_j


@njit(cache=True, error_model="numpy")
def _parallel(i, j, panels, gap):
    axes, half = panels.axes, panels.half
    swap = abs(dot(axes[i, 0], axes[j, 0])) < 0.5
    u, v = np.empty((2, 2)), np.empty((2, 2))
    _ends(gap, axes[i, 0], half[i, 0], half[j, 1 if swap else 0], u)
    _ends(gap, axes[i, 1], half[i, 1], half[j, 0 if swap else 1], v)
    return parallel_pair(u, v, abs(dot(gap, axes[j, 2])))


@njit(cache=True, error_model="numpy")
def _perpendicular(i, j, panels, gap):
    axes, half = panels.axes, panels.half
    a = 0 if abs(dot(axes[i, 0], axes[j, 2])) < 0.5 else 1
    b = 0 if abs(dot(axes[j, 0], axes[i, 2])) < 0.5 else 1
    u, v, w = np.empty((2, 2)), np.empty(2), np.empty(2)
    _ends(gap, axes[i, a], half[i, a], half[j, b], u)
    across_i, across_j = dot(gap, axes[j, 2]), -dot(gap, axes[i, 2])
    for k in range(2):
        v[k] = across_i + (2 * k - 1) * half[i, 1 - a]
        w[k] = across_j + (2 * k - 1) * half[j, 1 - b]
    return perpendicular_pair(u, v, w)


@njit(cache=True, error_model="numpy")
def _sides_aligned(i, j, axes):
    """Whether every axis of one frame is parallel or perpendicular to every axis of the other."""
    for a in range(3):
        for b in range(3):
            c = abs(dot(axes[i, a], axes[j, b]))
            if ALIGNED < c < 1.0 - ALIGNED:
                return False
    return True


@njit(cache=True, error_model="numpy")
def near_pair(i: int, j: int, panels: PanelArrays) -> float:
    """Double integral over two near panels, or one and the same, by the best rule there is."""
    axes, half = panels.axes, panels.half
    gap = panels.center[i] - panels.center[j]
    extent = math.sqrt(dot(gap, gap)) + panels.radius[i] + panels.radius[j]
    areas = panels.area[i] * panels.area[j]
    facing = abs(dot(axes[i, 2], axes[j, 2]))
    boxes = half[i, 0] > 0.0 and half[j, 0] > 0.0 and extent**4 < CLOSED_LOSS * areas
    if boxes and _sides_aligned(i, j, axes):
        return _parallel(i, j, panels, gap) if facing > 0.5 else _perpendicular(i, j, panels, gap)
    if facing > 1.0 - ALIGNED**2 * 50.0:
        reach = extent**2 * 4.0 * panels.radius[i] * panels.radius[j]
        height = abs(dot(gap, axes[j, 2]))
        shorter = min(panels.radius[i], panels.radius[j])
        kinks = 1e-9 * shorter < height < KINKS * shorter
        if reach < (CROSSING_LOSS if kinks else SIDES_LOSS) * areas:
            return coplanar_pair(i, j, panels)
    if panels.radius[i] <= panels.radius[j]:
        return clustered_pair(i, j, panels)
    return clustered_pair(j, i, panels)


class Matrices(NamedTuple):
    """Integrals over all pairs of n panels.

    Args:
        single: (n, n) float64, A.
        tests: (4, n, n) float32, T.
    """

    single: np.ndarray
    tests: np.ndarray


@njit(cache=True, error_model="numpy")
def _copy_row(i, origin, old, new):
    """Take over the pairs of panel i with all panels that the old matrices know."""
    k = origin[i]
    for j in range(origin.size):
        if origin[j] >= 0:
            new.single[i, j] = old.single[k, origin[j]]
    for t in range(4):
        for j in range(origin.size):
            if origin[j] >= 0:
                new.tests[t, i, j] = old.tests[t, k, origin[j]]


class Sources(NamedTuple):
    """Panels and their images behind planes.

    Args:
        panels: n panels, then all n of each image in turn.
        images: weights of the images, and the layer of each panel.
        error: of the potential over that of the source itself, where images stand for layers.
    """

    panels: PanelArrays
    images: Images
    error: float


@njit(inline="always")
def _put(i, j, image, weight, out, new):
    """Let the original (image 0) start the sums over the images of panel j, others add to them."""
    if image == 0:
        new.single[i, j] = weight * out[0]
        for k in range(4):
            new.tests[k, i, j] = weight * out[k + 1]
    else:
        new.single[i, j] += weight * out[0]
        for k in range(4):
            new.tests[k, i, j] += weight * out[k + 1]


@njit(cache=True, error_model="numpy")
def _fill_row(i, sources, targets, reach, origin, new):
    panels, weight, layer = sources.panels, sources.images.weight, sources.images.layer
    work = np.empty((ROWS, targets.weights.shape[1]))
    out = np.zeros(5)
    sampled = 0
    for image in range(weight.shape[2]):
        for j in range(origin.size):
            if origin[i] >= 0 and origin[j] >= 0:
                continue
            w = weight[layer[i], layer[j], image]
            if w == 0.0 and image > 0:
                continue
            source = image * origin.size + j
            dx = panels.center[i] - panels.center[source]
            distance = math.sqrt(dot(dx, dx)) / (panels.radius[i] + panels.radius[source])
            if distance > reach[1]:
                far_pair(i, source, panels, targets, out)
            else:
                potential(source, panels, targets.points, i, work)
                _collect(i, targets, work, out)
                sampled += 1
                if distance <= reach[0]:
                    out[0] = near_pair(i, source, panels) if j >= i else math.nan
            _put(i, j, image, w, out, new)
    return sampled


TILE = 64
"""Rows and columns handled together where a matrix is read across."""


@njit(cache=True, error_model="numpy")
def mirror(single: np.ndarray) -> None:
    """Replace each NaN below the diagonal by the entry above it."""
    n = single.shape[0]
    for top in range(0, n, TILE):
        for left in range(0, top + 1, TILE):
            for i in range(top, min(top + TILE, n)):
                for j in range(left, min(left + TILE, i)):
                    if math.isnan(single[i, j]):
                        single[i, j] = single[j, i]


@njit(cache=True, nogil=True, error_model="numpy")
def fill_block(first, last, sources, targets, reach, origin, old, new):
    """Rows first to last (excluded) of ``fill``; near pairs below the diagonal stay NaN."""
    sampled = 0
    for i in range(first, last):
        if origin[i] >= 0:
            _copy_row(i, origin, old, new)
        sampled += _fill_row(i, sources, targets, reach, origin, new)
    return sampled


def fill(
    sources: Sources,
    targets: Targets,
    reach: np.ndarray,
    origin: np.ndarray,
    old: Matrices,
    new: Matrices,
) -> int:
    """Fill ``new``, taking over from ``old`` the pairs of panels that it knows.

    Near pairs are computed once and mirrored; all others have both rows, which differ by
    quadrature error only.

    Args:
        sources: n panels and their images.
        targets: samples and tests of the n panels.
        reach: (2,) ``near`` and ``far``: distances over the sum of both radii.
        origin: (n,) index of each panel in ``old``, or -1.
        old: matrices of the mesh before; of any size, even empty.
        new: filled in place.

    Returns:
        Number of pairs that were sampled against an exact potential.
    """

    def block(first: int, last: int) -> int:
        return int(fill_block(first, last, sources, targets, reach, origin, old, new))

    sampled = sum_over_rows(len(origin), block)
    mirror(new.single)
    return sampled


@njit(cache=True, error_model="numpy")
def symmetric(single: np.ndarray, radius: np.ndarray, out: np.ndarray) -> None:
    """Fill ``out`` with A, each pair taken from the row whose outer panel is smaller."""
    n = radius.size
    for top in range(0, n, TILE):
        for left in range(0, top + 1, TILE):
            for i in range(top, min(top + TILE, n)):
                for j in range(left, min(left + TILE, i + 1)):
                    value = single[i, j] if radius[i] < radius[j] else single[j, i]
                    out[i, j] = value
                    out[j, i] = value


@njit(cache=True, error_model="numpy")
def asymmetry(single: np.ndarray, radius: np.ndarray, x: np.ndarray) -> np.ndarray:
    """x^T (A - mean of both rows) x, (k, k) for x (n, k): what the choice of row decides."""
    n, k = x.shape
    product = np.zeros((n, k))
    for top in range(0, n, TILE):
        for left in range(0, top + 1, TILE):
            for i in range(top, min(top + TILE, n)):
                for j in range(left, min(left + TILE, i)):
                    half = 0.5 * (single[i, j] - single[j, i])
                    half = -half if radius[i] >= radius[j] else half
                    for a in range(k):
                        product[i, a] += half * x[j, a]
                        product[j, a] += half * x[i, a]
    return x.T @ product
