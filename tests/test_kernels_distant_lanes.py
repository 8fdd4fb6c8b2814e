"""Distant pairs in lanes, against double quadrature of plain integrands."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import NEEDLE, SHAPES, SKEW, SQUARE, TRIANGLE, turned

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square
from bem.kernels.basis import values
from bem.kernels.mixed_arrays import MixedPanels, mixed_panels, no_images
from bem.kernels.mixed_lanes import (
    LANES,
    Lanes,
    distant_conductors,
    distant_interfaces,
    lanes_of,
    scratch,
)
from bem.kernels.mixed_samples import FarPanels, far_panels, legendre

SPLIT = 17
"""Conductors of a set: more than a block holds."""


def rule(panels: PanelArrays, j: int) -> tuple[np.ndarray, ...]:
    """Points (m, 3), weights, positions in the square and in the frame, by 12 x 12 points."""
    xi, eta, weight = gauss_square(12)
    at, jacobian = bilinear(panels.corners[j : j + 1], xi, eta)
    places = panels.center[j] + at[0] @ panels.axes[j, :2]
    return places, jacobian[0] * weight, np.stack([xi, eta]), at


def tests_of(setup: MixedPanels, i: int) -> tuple[np.ndarray, np.ndarray]:
    """Points and the six test functions times weights (6, m)."""
    points, weights, square, at = rule(setup.panels, i)
    if i >= setup.counts[0]:
        return points, values(setup.basis[i : i + 1], at)[0] * weights
    raw = legendre(*square)
    means = raw @ weights / weights.sum()
    return points, np.stack([weights, *(raw - means[:, None]) * weights, 0.0 * weights])


def exact(setup: MixedPanels, i: int, j: int) -> tuple[np.ndarray, np.ndarray]:
    """All tests of i against V of 1, f1, f2 (6, 3) and K of all functions (6, 6) of j."""
    points, tests = tests_of(setup, i)
    places, weights, _, at = rule(setup.panels, j)
    functions = values(setup.basis[j : j + 1], at)[0] * weights
    apart = points[:, None] - places
    r = np.linalg.norm(apart, axis=2)
    double = (apart @ setup.panels.axes[j, 2]) / r**3
    return tests @ (1.0 / r) @ functions[:3].T, tests @ double @ functions.T


def distant(setup: MixedPanels, far: FarPanels, lanes: Lanes, i: int, j: int) -> tuple:
    """What the lanes leave for one pair; what they do not is NaN."""
    b, k = np.argwhere(lanes.source == j)[0]
    single, double = np.full((18, LANES), np.nan), np.full((36, LANES), np.nan)
    if lanes.metal[b]:
        distant_conductors(i, far, lanes, (0, b), scratch(), single, double)
    else:
        metal = i < setup.counts[0]
        distant_interfaces(i, far, lanes, (0, b), metal, scratch(), single, double)
    return single[:, k].reshape(6, 3), double[:, k].reshape(6, 6)


def pair_errors(shapes: list[np.ndarray], distance: float, seed: int) -> tuple:
    """Largest errors (6, 3), (6, 6) over all kinds of pairs, of what is stored of them.

    Over area_i area_j / R^2 for K, over area_i area_j / R for V.
    """
    corners = np.array([turned(s, 2 * seed + k) for k, s in enumerate(shapes)])
    first = mixed_panels(corners[None], 0, no_images(2)).panels
    random = np.random.default_rng(seed).normal(size=3)
    r = distance * first.radius.sum()
    shift = r * random / np.linalg.norm(random)
    corners = corners - first.center[:, None] + np.array([np.zeros(3), shift])[:, None]
    worst = np.zeros((6, 3)), np.zeros((6, 6))
    for kinds in ((0, 1), (2, 1), (0, 3), (2, 3)):
        both = np.concatenate([corners, corners])
        setup = mixed_panels(both[None], 2, no_images(4))
        far = far_panels(setup.panels, setup.basis, setup.weights)
        lanes = lanes_of(setup.panels, far.moments, np.arange(4), 2)
        area = setup.panels.area[0] * setup.panels.area[1]
        found, true = distant(setup, far, lanes, *kinds), exact(setup, *kinds)
        for p in range(2):
            error = np.abs(found[p] - true[p]) * r ** (1 + p) / area
            np.fmax(worst[p], error, out=worst[p])
    return worst
