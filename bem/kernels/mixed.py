"""Integrals of the mixed formulation over all pairs of panels, by the cheapest accurate rule.

middle  (and far) test functions of the target at its 16 samples, both layers of the source
        exact.
near    V between conductors by ``near_pair``; all else by samples of the target clustered at
        its rim.

K between panels of one plane, or of a panel with itself, is zero.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.expansion import dot
from bem.kernels.mixed_arrays import LINEAR, QUADRATIC, TESTS, MixedMatrices, MixedPanels
from bem.kernels.mixed_reuse import take_over
from bem.kernels.moments import ROWS, constant_moments, moments
from bem.kernels.pairs import mirror, near_pair
from bem.kernels.parallel import sum_over_rows

COPLANAR = 1e-9
"""Panels whose planes differ by less than this part of the smaller radius lie in one."""
PARALLEL = 5e-13
"""The same for one less the cosine of their normals."""


@njit(cache=True, error_model="numpy")
def coplanar(i: int, j: int, panels: PanelArrays) -> bool:
    """Whether panels i and j lie in one plane."""
    axes, radius = panels.axes, panels.radius
    gap = panels.center[i] - panels.center[j]
    thin = min(radius[i], radius[j])
    facing = abs(dot(axes[i, 2], axes[j, 2]))
    return facing > 1.0 - PARALLEL and abs(dot(gap, axes[j, 2])) < COPLANAR * thin


@njit(cache=True, error_model="numpy", fastmath={"contract", "reassoc", "nsz"})
def _weigh(block, weights, work, row, out, column):
    """out[t, column] = sum over the samples of test t times one row of ``work``."""
    for t in range(weights.shape[1]):
        total = 0.0
        for q in range(work.shape[1]):
            total += weights[block, t, q] * work[row, q]
        out[t, column] = total


@njit(cache=True, error_model="numpy")
def _to_functions(basis, j, out, functions):
    """From monomials to the functions of panel j, in place, highest first."""
    for t in range(out.shape[0]):
        for f in range(functions - 1, 0, -1):
            total = 0.0
            for m in range(f + 1):
                total += basis[j, f, m] * out[t, m]
            out[t, f] = total


@njit(cache=True, error_model="numpy")
def _sampled(source, block, points, weights, setup, work, single, double):
    """Both layers of an interface, or only those of a constant, against all tests."""
    conductors, interfaces = setup.counts[0], setup.counts[1]
    j = source % (conductors + interfaces)
    if j < conductors:
        constant_moments(source, setup.panels, points, block, work)
        _weigh(block, weights, work, 3, single, 0)
        _weigh(block, weights, work, 4, double, 0)
        return
    moments(source, setup.panels, points, block, work)
    for m in range(6):
        _weigh(block, weights, work, 4 + m, double, m)
    _weigh(block, weights, work, 3, single, 0)
    _weigh(block, weights, work, 10, single, 1)
    _weigh(block, weights, work, 11, single, 2)
    _to_functions(setup.basis, j, double, 6)
    _to_functions(setup.basis, j, single, 3)


@njit(inline="always")
def _add(array, row, column, first, value):
    """Let the original start the sum over the images, others add to it."""
    if first:
        array[row, column] = value
    else:
        array[row, column] += value


@njit(cache=True, error_model="numpy")
def _put(i, j, counts, factors, first, single, double, new):
    """Store what the matrices keep of one pair; ``factors`` of V and of K."""
    metal = counts[0]
    own = 1 if i < metal else LINEAR
    tests = TESTS if i < metal else QUADRATIC
    row = i if i < metal else metal + LINEAR * (i - metal)
    test = TESTS * i if i < metal else TESTS * metal + QUADRATIC * (i - metal)
    v, k = factors
    if j < metal:
        for t in range(own):
            _add(new.single, row + t, j, first, v * single[t, 0])
            _add(new.double, row + t, j, first, k * double[t, 0])
        for t in range(tests):
            _add(new.single_tests, test + t, j, first, v * single[own + t, 0])
            _add(new.double_tests, test + t, j, first, k * double[own + t, 0])
        return
    place = LINEAR * (j - metal)
    for b in range(LINEAR):
        for t in range(own):
            _add(new.double, row + t, metal + place + b, first, k * double[t, b])
            _add(new.quadratic, row + t, place + b, first, k * double[t, LINEAR + b])
        for t in range(tests):
            _add(new.double_tests, test + t, metal + place + b, first, k * double[own + t, b])
        if i < metal:
            for t in range(tests):
                _add(new.linear, test + t, place + b, first, v * single[own + t, b])


@njit(cache=True, error_model="numpy")
def _fill_row(i, setup, reach, origin, mutual, new):
    panels, images, metal = setup.panels, setup.images, setup.counts[0]
    work = np.empty((ROWS, setup.points.shape[2]))
    single, double = np.empty((6, 3)), np.empty((6, 6))
    sampled = 0
    for image in range(images.parity.size):
        for j in range(origin.size):
            if origin[i] >= 0 and origin[j] >= 0:
                continue
            source = image * origin.size + j
            gap = panels.center[i] - panels.center[source]
            distance = math.sqrt(dot(gap, gap)) / (panels.radius[i] + panels.radius[source])
            v = images.weight[images.layer[i], images.layer[j], image]
            _sampled(source, i, setup.points, setup.weights, setup, work, single, double)
            sampled += 1
            if distance <= reach[0]:
                if i < metal and j < metal:
                    single[0, 0] = (
                        near_pair(i, source, panels) if j >= i or not mutual else math.nan
                    )
                if coplanar(i, source, panels):
                    double[:] = 0.0
            factors = (v, v * images.parity[image])
            _put(i, j, setup.counts, factors, image == 0, single, double, new)
    return sampled


@njit(cache=True, nogil=True, error_model="numpy")
def fill_block(first, last, setup, reach, origin, mutual, new):
    """Rows of the panels first to last (excluded) of ``fill_mixed``."""
    sampled = 0
    for i in range(first, last):
        sampled += _fill_row(i, setup, reach, origin, mutual, new)
    return sampled


def fill_mixed(
    setup: MixedPanels,
    reach: np.ndarray,
    origin: np.ndarray,
    old: MixedMatrices,
    new: MixedMatrices,
) -> int:
    """Fill ``new``, taking over from ``old`` the pairs of panels that it knows.

    Args:
        setup: n panels, nC conductors first, and their images.
        reach: (2,) ``near`` and ``far``: distances over the sum of both radii.
        origin: (n,) index of each panel in the mesh of ``old``, or -1.
        old: matrices of the mesh before; of any size, even empty.
        new: filled in place.

    Returns:
        Number of pairs that were sampled against exact layers.
    """

    def block(first: int, last: int) -> int:
        return int(fill_block(first, last, setup, reach, origin, mutual, new))

    weight = setup.images.weight
    mutual = np.array_equal(weight, weight.swapaxes(0, 1))

    if (origin >= 0).any():
        take_over(origin, old, new)
    sampled = sum_over_rows(len(origin), block)
    mirror(new.single[: new.single.shape[1]])
    return sampled
