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
from bem.kernels.mixed_arrays import MixedMatrices, MixedPanels
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
from bem.kernels.mixed_store import put, slot
from bem.kernels.mixed_weigh import expanded, sampled
from bem.kernels.moments import ROWS
from bem.kernels.pairs import mirror
from bem.kernels.parallel import sum_over_rows
from bem.kernels.rim_samples import UNCUT, rim_samples

DISTANT, LEAST_FAR = 8.0, 2.5
"""Where the distant tier begins, for the nearest ``far``: the error of far expansions falls with
the sixth power of the distance, that of distant ones with the fourth."""


@njit(inline="always", error_model="numpy")
def _distance(i, source, panels):
    """Distance of the centroids over the sum of both radii."""
    gap = panels.center[i] - panels.center[source]
    return math.sqrt(dot(gap, gap)) / (panels.radius[i] + panels.radius[source])


@njit(inline="always")
def _weight(i, j, image, images):
    """Factor of one image of panel j as seen from panel i; of no use where zero."""
    return images.weight[images.layer[i], images.layer[j], image]


@njit(inline="always", error_model="numpy")
def _factors(j, weight, image, images):
    """Factors of V and of K; a double layer is taken times the permittivity of its own layer."""
    home = images.layer[j]
    return weight, weight / images.weight[home, home, 0] * images.parity[image]


@njit(cache=True, error_model="numpy")
def _mark(i, image, block, lanes, setup, limit, slots, factors):
    """Slots and factors of the lanes of a block that are distant from i; whether there are any."""
    images, metal, count = setup.images, setup.counts[0], setup.basis.shape[0]
    some = False
    for k in range(LANES):
        slots[k], j = -1, lanes.source[block, k]
        if j >= 0 and _distance(i, image * count + j, setup.panels) > limit:
            weight = _weight(i, j, image, images)
            factors[0][k], factors[1][k] = _factors(j, weight, image, images)
            slots[k] = slot(j, metal) if image == 0 or weight != 0.0 else -1
            some = some or slots[k] >= 0
    return some


@njit(inline="always")
def _room(lanes):
    """Slots, factors and results of so many lanes."""
    factors = (np.zeros(lanes), np.zeros(lanes))
    return np.full(lanes, -1), factors, np.zeros((18, lanes)), np.zeros((36, lanes))


@njit(cache=True, error_model="numpy")
def _fill_distant(i, image, lanes, setup, limit, new):
    """All pairs of panel i with distant sources of one image."""
    metal = setup.counts[0]
    slots, factors, single, double = _room(LANES)
    u = scratch()
    for b in range(lanes.metal.size):
        if not _mark(i, image, b, lanes, setup, limit, slots, factors):
            continue
        if lanes.metal[b]:
            distant_conductors(i, setup.far, lanes, (image, b), u, single, double)
        else:
            distant_interfaces(i, setup.far, lanes, (image, b), i < metal, u, single, double)
        put(i, lanes.metal[b], metal, image == 0, slots, factors, single, double, new)


@njit(cache=True, error_model="numpy")
def _fill_image(i, image, setup, limits, origin, mutual, new):
    """All pairs of panel i with sources of one image that are not distant."""
    panels, images, metal = setup.panels, setup.images, i < setup.counts[0]
    work = np.empty((ROWS, setup.points.shape[2]))
    slots, factors, singles, doubles = _room(1)
    single, double = singles.reshape((6, 3)), doubles.reshape((6, 6))
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
        own = setup.counts[0]
        slots[0] = slot(j, own)
        factors[0][0], factors[1][0] = _factors(j, weight, image, images)
        put(i, j < own, own, image == 0, slots, factors, singles, doubles, new)
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
