"""Near pairs of the mixed formulation.

V between conductors comes from ``near_pair``, with the tests at the 16 samples. Everything else
is sampled at the target, clustered at its rim and wherever the source comes close. K is zero
between panels of one plane.
"""

from __future__ import annotations

import math

import numpy as np

from bem.compiled import njit
from bem.kernels.arrays import PanelArrays
from bem.kernels.expansion import dot
from bem.kernels.mixed_weigh import sampled, weigh_conductor
from bem.kernels.moments import ROWS, constant_moments
from bem.kernels.pairs import near_pair
from bem.kernels.rim_cuts import rim_cuts
from bem.kernels.rim_samples import rim_samples

COPLANAR = 1e-9
"""Panels whose planes differ by less than this part of the smaller radius lie in one."""
PARALLEL = 5e-13
"""One less the cosine of normals that count as parallel."""


@njit(cache=True, error_model="numpy")
def coplanar(i: int, j: int, panels: PanelArrays) -> bool:
    """Whether panels i and j lie in one plane."""
    axes, radius = panels.axes, panels.radius
    gap = panels.center[i] - panels.center[j]
    height = abs(dot(gap, axes[j, 2]))
    lean = 1.0 - abs(dot(axes[i, 2], axes[j, 2]))
    return lean < PARALLEL and height < COPLANAR * min(radius[i], radius[j])


@njit(cache=True, error_model="numpy")
def _between_conductors(i, source, setup, work, single, mutual):
    """V of two conductors: the exact integral, and the tests at the 16 samples."""
    spare = np.empty((6, 6))
    constant_moments(source, setup.panels, setup.points, i, work)
    weigh_conductor(i, setup.weights, work, single, spare)
    lower = mutual and source % setup.basis.shape[0] < i
    single[0, 0] = math.nan if lower else near_pair(i, source, setup.panels)


@njit(cache=True, error_model="numpy")
def near_mixed(i, source, setup, plain, mutual, work, single, double):
    """Tests of panel i against both layers of a near source.

    Args:
        i: target.
        source: panel or image.
        setup: the ``MixedPanels``.
        plain: ``rim_samples`` of panel i without cuts.
        mutual: whether V of conductors j < i is left NaN, to be taken from the other row.
        work: (12, 16) scratch.
        single: (6, 3) result, tests against V.
        double: (6, 6) result, tests against K.
    """
    metal = i < setup.counts[0]
    charged = source % setup.basis.shape[0] < setup.counts[0]
    flat = coplanar(i, source, setup.panels)
    if not flat or metal != charged:
        cuts = rim_cuts(i, source, setup.panels)
        whole = cuts[0].size + cuts[1].size == 4
        points, weights = plain if whole else rim_samples(i, setup, cuts)
        room = np.empty((ROWS, points.shape[2]))
        sampled(source, setup, metal, 0, points, weights, room, single, double)
    if flat:
        double[:] = 0.0
    if metal and charged:
        _between_conductors(i, source, setup, work, single, mutual)
