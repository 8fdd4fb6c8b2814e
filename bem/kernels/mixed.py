"""Integrals of the mixed formulation over all pairs of panels, by the cheapest accurate rule.

near     by the rules of ``mixed_near``; K between panels of one plane is zero.
middle   test functions of the target at its 16 samples, both layers of the source exact.
far      the same samples, layers expanded to the fourth order.
distant  eight samples, layers expanded to the third order, sixteen sources at a time.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.expansion import dot
from bem.kernels.mixed_arrays import LINEAR, QUADRATIC, TESTS, MixedMatrices, MixedPanels
from bem.kernels.mixed_lanes import (
    LANES,
    Lanes,
    distant_conductors,
    distant_interfaces,
    lanes_of,
    scratch,
)
from bem.kernels.mixed_near import near_mixed
from bem.kernels.mixed_reuse import take_over
from bem.kernels.mixed_weigh import expanded, sampled
from bem.kernels.moments import ROWS
from bem.kernels.pairs import mirror
from bem.kernels.parallel import sum_over_rows
from bem.kernels.rim_samples import UNCUT, rim_samples

DISTANT, LEAST_FAR = 8.0, 2.5
"""Where the distant tier begins, for the nearest ``far``: the error of far expansions falls with
the sixth power of the distance, that of distant ones with the fourth."""


@njit(inline="always")
def _add(array, row, column, first, value):
    """Let the original start the sum over the images, others add to it."""
    if first:
        array[row, column] = value
    else:
        array[row, column] += value


@njit(cache=True, error_model="numpy")
def _put(i, j, lane, counts, factors, first, single, double, new):
    """Store what the matrices keep of one pair; ``factors`` of V and of K.

    Row 3 t + b of ``single`` and 6 t + b of ``double`` hold test t against function b.
    """
    metal = counts[0]
    own = 1 if i < metal else LINEAR
    tests = TESTS if i < metal else QUADRATIC
    row = i if i < metal else metal + LINEAR * (i - metal)
    test = TESTS * i if i < metal else TESTS * metal + QUADRATIC * (i - metal)
    v, k = factors
    if j < metal:
        for t in range(own):
            _add(new.single, row + t, j, first, v * single[3 * t, lane])
            _add(new.double, row + t, j, first, k * double[6 * t, lane])
        for t in range(tests):
            _add(new.single_tests, test + t, j, first, v * single[3 * (own + t), lane])
            _add(new.double_tests, test + t, j, first, k * double[6 * (own + t), lane])
        return
    place = LINEAR * (j - metal)
    for b in range(LINEAR):
        for t in range(own):
            _add(new.double, row + t, metal + place + b, first, k * double[6 * t + b, lane])
            _add(new.quadratic, row + t, place + b, first, k * double[6 * t + LINEAR + b, lane])
        for t in range(tests):
            _add(
                new.double_tests,
                test + t,
                metal + place + b,
                first,
                k * double[6 * (own + t) + b, lane],
            )
        if i < metal:
            for t in range(tests):
                _add(new.linear, test + t, place + b, first, v * single[3 * (own + t) + b, lane])


@njit(inline="always", error_model="numpy")
def _distance(i, source, panels):
    """Distance of the centroids over the sum of both radii."""
    gap = panels.center[i] - panels.center[source]
    return math.sqrt(dot(gap, gap)) / (panels.radius[i] + panels.radius[source])


@njit(inline="always")
def _weight(i, j, image, images):
    """Factor of one image of panel j as seen from panel i; of no use where zero."""
    return images.weight[images.layer[i], images.layer[j], image]


@njit(cache=True, error_model="numpy")
def _mark(i, image, block, lanes, setup, limit, wanted):
    """Mark the lanes of a block that are distant from i; whether there are any."""
    wanted[:] = False
    for k in range(LANES):
        j = lanes.source[block, k]
        if j >= 0 and (image == 0 or _weight(i, j, image, setup.images) != 0.0):
            wanted[k] = _distance(i, image * setup.basis.shape[0] + j, setup.panels) > limit
    return wanted.any()


@njit(cache=True, error_model="numpy")
def _fill_distant(i, image, lanes, setup, limit, new):
    """All pairs of panel i with distant sources of one image."""
    metal, images = i < setup.counts[0], setup.images
    single, double = np.zeros((18, LANES)), np.zeros((36, LANES))
    u, wanted = scratch(), np.empty(LANES, dtype=np.bool_)
    for b in range(lanes.metal.size):
        if not _mark(i, image, b, lanes, setup, limit, wanted):
            continue
        place = (image, b)
        if lanes.metal[b]:
            distant_conductors(i, setup.far, lanes, place, u, single, double)
        else:
            distant_interfaces(i, setup.far, lanes, place, metal, u, single, double)
        for k in range(LANES):
            if wanted[k]:
                j = lanes.source[b, k]
                weight = _weight(i, j, image, images)
                factors = (weight, weight * images.parity[image])
                _put(i, j, k, setup.counts, factors, image == 0, single, double, new)


@njit(cache=True, error_model="numpy")
def _fill_image(i, image, setup, limits, origin, mutual, new):
    """All pairs of panel i with sources of one image that are not distant."""
    panels, images, metal = setup.panels, setup.images, i < setup.counts[0]
    work = np.empty((ROWS, setup.points.shape[2]))
    single, double = np.zeros((6, 3)), np.zeros((6, 6))
    rows = (single.reshape((18, 1)), double.reshape((36, 1)))
    plain = rim_samples(i, setup, (UNCUT, UNCUT))
    count = 0
    for j in range(origin.size):
        weight, source = _weight(i, j, image, images), image * origin.size + j
        distance = _distance(i, source, panels)
        known = origin[i] >= 0 and origin[j] >= 0
        if known or distance > limits[2] or (weight == 0.0 and image > 0):
            continue
        if distance > limits[1]:
            expanded(source, setup, metal, i, work, single, double)
        elif distance > limits[0]:
            points, weights = setup.points, setup.weights
            sampled(source, setup, metal, i, points, weights, work, single, double)
        else:
            near_mixed(i, source, setup, plain, mutual, work, single, double)
        count += distance <= limits[1]
        factors = (weight, weight * images.parity[image])
        _put(i, j, 0, setup.counts, factors, image == 0, rows[0], rows[1], new)
    return count


@njit(cache=True, nogil=True, error_model="numpy")
def fill_block(first, last, setup, limits, lanes, origin, mutual, new):
    """Rows of the panels first to last (excluded) of ``fill_mixed``.

    ``lanes`` holds all panels for rows of new ones, and the new panels for rows of others.
    """
    count = 0
    for i in range(first, last):
        for image in range(setup.images.parity.size):
            sources = lanes[1] if origin[i] >= 0 else lanes[0]
            _fill_distant(i, image, sources, setup, limits[2], new)
            count += _fill_image(i, image, setup, limits, origin, mutual, new)
    return count


def all_limits(reach: np.ndarray) -> np.ndarray:
    """(3,) ``near``, ``far`` and ``distant``, where both expansions are about as good.

    Args:
        reach: (2,) ``near`` and ``far``: distances over the sum of both radii.
    """
    distant = DISTANT * (reach[1] / LEAST_FAR) ** 1.5
    return np.array([*reach, max(distant, *reach)])


def blocks_of(setup: MixedPanels, indices: np.ndarray) -> Lanes:
    """Panels ``indices`` (m,), rising, and their images as sources of the distant tier."""
    return lanes_of(setup.panels, setup.far.moments, indices, setup.counts[0])


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
        return int(fill_block(first, last, setup, limits, lanes, origin, mutual, new))

    weight, limits = setup.images.weight, all_limits(reach)
    mutual = np.array_equal(weight, weight.swapaxes(0, 1))
    lanes = tuple(blocks_of(setup, j) for j in (np.arange(len(origin)), np.flatnonzero(origin < 0)))

    if (origin >= 0).any():
        take_over(origin, old, new)
    sampled = sum_over_rows(len(origin), block)
    mirror(new.single[: new.single.shape[1]])
    return sampled
