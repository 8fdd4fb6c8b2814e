"""Integrals of the mixed formulation over all pairs of panels, by the cheapest accurate rule.

middle  (and far) test functions of the target at its 16 samples, both layers of the source
        exact.
near    by the rules of ``mixed_near``; K between panels of one plane is zero.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.expansion import dot
from bem.kernels.mixed_arrays import LINEAR, QUADRATIC, TESTS, MixedMatrices, MixedPanels
from bem.kernels.mixed_near import near_mixed
from bem.kernels.mixed_reuse import take_over
from bem.kernels.mixed_weigh import sampled
from bem.kernels.moments import ROWS
from bem.kernels.pairs import mirror
from bem.kernels.parallel import sum_over_rows
from bem.kernels.rim_samples import rim_samples


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
    panels, images, metal = setup.panels, setup.images, i < setup.counts[0]
    work = np.empty((ROWS, setup.points.shape[2]))
    single, double = np.zeros((6, 3)), np.zeros((6, 6))
    rims = (rim_samples(i, setup, False), rim_samples(i, setup, True))
    count = 0
    for image in range(images.parity.size):
        for j in range(origin.size):
            weight = images.weight[images.layer[i], images.layer[j], image]
            if (origin[i] >= 0 and origin[j] >= 0) or (weight == 0.0 and image > 0):
                continue
            source = image * origin.size + j
            gap = panels.center[i] - panels.center[source]
            distance = math.sqrt(dot(gap, gap)) / (panels.radius[i] + panels.radius[source])
            if distance <= reach[0]:
                near_mixed(i, source, setup, rims, mutual, work, single, double)
            else:
                points, weights = setup.points, setup.weights
                sampled(source, setup, metal, i, points, weights, work, single, double)
            count += 1
            factors = (weight, weight * images.parity[image])
            _put(i, j, setup.counts, factors, image == 0, single, double, new)
    return count


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
