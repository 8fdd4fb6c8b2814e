"""Distant pairs in lanes, against double quadrature of plain integrands."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import NEEDLE, SKEW, SQUARE, TRIANGLE, turned

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


def weighted_tests(setup: MixedPanels, i: int) -> tuple[np.ndarray, np.ndarray]:
    """Points and the six test functions times weights (6, m)."""
    points, weights, square, at = rule(setup.panels, i)
    if i >= setup.counts[0]:
        return points, values(setup.basis[i : i + 1], at)[0] * weights
    raw = legendre(*square)
    means = raw @ weights / weights.sum()
    return points, np.stack([weights, *(raw - means[:, None]) * weights, 0.0 * weights])


def exact(setup: MixedPanels, i: int, j: int) -> tuple[np.ndarray, np.ndarray]:
    """All tests of i against V of 1, f1, f2 (6, 3) and K of all functions (6, 6) of j."""
    points, tests = weighted_tests(setup, i)
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


def row_errors(worst: tuple) -> tuple[float, float]:
    """Of the constant's row against f0, and of everything."""
    single, double = worst
    return max(single[0, 0], double[0, 0]), max(single.max(), double.max())


PAIRS = {
    "squares": [SQUARE, SQUARE],
    "skew": [SKEW, TRIANGLE],
    "needles": [NEEDLE, 0.7 * NEEDLE],
}


@pytest.mark.parametrize("seed", range(2))
@pytest.mark.parametrize("name", PAIRS)
def test_pairs_where_the_tier_begins(name: str, seed: int) -> None:
    """Eight times the sum of the radii away, all kinds of panels, all that is stored."""
    plain, all_rows = row_errors(pair_errors(PAIRS[name], 8.0, seed))
    assert plain < 5e-6 and all_rows < 3e-5


@pytest.mark.parametrize("seed", range(2))
def test_small_panels_and_large(seed: int) -> None:
    """The whole distance counts for one panel's size alone."""
    assert row_errors(pair_errors([SQUARE, 0.05 * SQUARE], 8.0, seed))[1] < 6e-5
    assert row_errors(pair_errors([0.05 * SQUARE, SQUARE], 8.0, seed))[1] < 2e-4


@pytest.mark.parametrize("name", PAIRS)
def test_errors_fall_with_the_third_power_at_least(name: str) -> None:
    """The fourth where both panels are rectangles."""
    near, distant = (pair_errors(PAIRS[name], d, 1) for d in (8.0, 16.0))
    fall = 7.5 if name == "skew" else 13.0
    for a, b in zip(near, distant, strict=True):
        assert b.max() < a.max() / fall


def test_lanes_hold_every_panel_once_and_kinds_apart() -> None:
    corners = np.array([turned(SQUARE, k) + 4.0 * k for k in range(SPLIT + 5)])
    setup = mixed_panels(corners[None], SPLIT, no_images(len(corners)))
    chosen = np.array([0, 3, 4, 16, 17, 20])
    for indices in (np.arange(SPLIT + 5), chosen, np.array([], dtype=int)):
        lanes = lanes_of(setup.panels, setup.far.moments, indices, SPLIT)
        assert np.array_equal(np.sort(lanes.source[lanes.source >= 0]), indices)
        assert np.all((lanes.source < SPLIT) == (lanes.metal[:, None] | (lanes.source < 0)))
        assert lanes.data.shape[:2] == (1, len(lanes.source))
