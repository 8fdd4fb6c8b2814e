"""Near pairs of the mixed formulation.

V between conductors comes from ``near_pair``, with the tests at the 16 samples. Everything else
is sampled at the target, clustered at its rim; where a parallel panel is closer than its
size, more densely. If that panel is the smaller one, its own samples serve the rows of
equations, with the layers of the target taken exactly: h / |x - y|^3 is the same from both
sides, and the shadow of a small panel is too sharp for samples of a large one.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.expansion import dot
from bem.kernels.mixed_weigh import sampled, weigh_conductor
from bem.kernels.moments import ROWS, constant_moments, moments
from bem.kernels.pairs import near_pair
from bem.kernels.rim_samples import rim_samples

COPLANAR = 1e-9
"""Panels whose planes differ by less than this part of the smaller radius lie in one."""
PARALLEL = 5e-13
"""One less the cosine of normals that count as parallel."""
LEANING = 0.1
"""The same for panels that shadow each other when close."""
CLOSE = 1.0
"""Height over the smaller radius below which such panels count as close."""

APART, COATING, FACING, TOGETHER = 0, 1, 2, 3
"""Places of a pair: none of the others; close and almost parallel; close and parallel; in one
plane."""


@njit(cache=True, error_model="numpy")
def place_of(i: int, j: int, panels: PanelArrays) -> int:
    """How panels i and j lie to each other."""
    axes, radius = panels.axes, panels.radius
    gap = panels.center[i] - panels.center[j]
    thin = min(radius[i], radius[j])
    lean = 1.0 - abs(dot(axes[i, 2], axes[j, 2]))
    height = min(abs(dot(gap, axes[i, 2])), abs(dot(gap, axes[j, 2])))
    if lean > LEANING or height > CLOSE * thin:
        return APART
    if lean > PARALLEL:
        return COATING
    return TOGETHER if height < COPLANAR * thin else FACING


@njit(cache=True, error_model="numpy")
def _cross(weights, row, work, factor, out, t, functions):
    """out[t, b] = factor times the sum of function b of the source against a layer of test t."""
    for b in range(functions):
        total = 0.0
        for q in range(work.shape[1]):
            total += weights[0, b, q] * work[row, q]
        out[t, b] = factor * total


@njit(cache=True, error_model="numpy")
def _from_source(i, source, setup, single, double):
    """Rows of equations of target i from samples of a parallel source."""
    panels, metal = setup.panels, setup.counts[0]
    points, weights = rim_samples(source, setup, True)
    functions = 1 if source % setup.basis.shape[0] < metal else 6
    turn = -1.0 if dot(panels.axes[i, 2], panels.axes[source, 2]) > 0.0 else 1.0
    work = np.empty((ROWS, points.shape[2]))
    if i < metal:
        constant_moments(i, panels, points, 0, work)
        _cross(weights, 4, work, turn, double, 0, functions)
        return
    moments(i, setup.basis, panels, points, 0, work)
    for t in range(6):
        _cross(weights, 4 + t, work, turn, double, t, functions if t < 3 else min(functions, 3))
    for t in range(3):
        _cross(weights, 3 if t == 0 else 9 + t, work, 1.0, single, t, 1)


@njit(cache=True, error_model="numpy")
def _between_conductors(i, source, setup, work, single, mutual):
    """V of two conductors: the exact integral, and the tests at the 16 samples."""
    spare = np.empty((6, 6))
    constant_moments(source, setup.panels, setup.points, i, work)
    weigh_conductor(i, setup.weights, work, single, spare)
    lower = mutual and source % setup.basis.shape[0] < i
    single[0, 0] = math.nan if lower else near_pair(i, source, setup.panels)


@njit(cache=True, error_model="numpy")
def near_mixed(i, source, setup, rims, mutual, work, single, double):
    """Tests of panel i against both layers of a near source.

    Args:
        i: target.
        source: panel or image.
        setup: the ``MixedPanels``.
        rims: ``rim_samples`` of panel i, few and many.
        mutual: whether V of conductors j < i is left NaN, to be taken from the other row.
        work: (12, 16) scratch.
        single: (6, 3) result, tests against V.
        double: (6, 6) result, tests against K.
    """
    metal = setup.counts[0]
    both = i < metal and source % setup.basis.shape[0] < metal
    place = place_of(i, source, setup.panels)
    if not (both and place == TOGETHER):
        points, weights = rims[0] if place == APART else rims[1]
        room = np.empty((ROWS, points.shape[2]))
        sampled(source, setup, i < metal, 0, points, weights, room, single, double)
    if place == FACING and setup.panels.radius[source] < setup.panels.radius[i]:
        _from_source(i, source, setup, single, double)
    if place == TOGETHER:
        double[:] = 0.0
    if both:
        _between_conductors(i, source, setup, work, single, mutual)
