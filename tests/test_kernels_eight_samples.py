"""Eight samples stand for sixteen: moments of all test functions on panels of any form."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import NEEDLE, SHAPES, SQUARE, turned

from bem.kernels.mixed_arrays import MixedPanels, mixed_panels, no_images
from bem.kernels.mixed_samples import eight_samples


def both_kinds(panel: np.ndarray) -> MixedPanels:
    """The panel as a conductor's and as an interface."""
    return mixed_panels(np.stack([panel, panel])[None], 1, no_images(2))


def moments(setup: MixedPanels, few: bool, order: int) -> np.ndarray:
    """Moments (2, 6, m) of all tests, over the panel's size, of orders up to ``order``."""
    points, weights = setup.points, setup.weights
    if few:
        points, weights = eight_samples(setup.panels, weights)
    apart = points - setup.panels.center[:, :, None]
    local = setup.panels.axes @ apart / setup.panels.radius[:, None, None]
    powers = [(p, n - p) for n in range(order + 1) for p in range(n + 1)]
    rows = np.stack([local[:, 0] ** p * local[:, 1] ** q for p, q in powers], axis=2)
    return weights @ rows / setup.panels.area[:, None, None]


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("name", SHAPES)
def test_moments_up_to_the_second_order(name: str, seed: int) -> None:
    setup = both_kinds(turned(SHAPES[name], seed))
    assert moments(setup, True, 2) == pytest.approx(moments(setup, False, 2), abs=1e-12)


@pytest.mark.parametrize("panel", [SQUARE, NEEDLE])
def test_rectangles_have_more(panel: np.ndarray) -> None:
    """Tests of order t have all moments up to the order 5 - t."""
    setup = both_kinds(turned(panel, 1))
    for tests, order in (([0], 5), ([1, 2], 4), ([3, 4, 5], 3)):
        few, many = (moments(setup, kind, order)[:, tests] for kind in (True, False))
        assert few == pytest.approx(many, abs=1e-12)


@pytest.mark.parametrize("name", SHAPES)
def test_higher_moments_are_close(name: str) -> None:
    """The third and fourth ones, on panels that are no rectangles, and weights of no great size."""
    setup = both_kinds(turned(SHAPES[name], 2))
    few, many = moments(setup, True, 4), moments(setup, False, 4)
    assert np.abs(few - many).max() < 0.07
    weights = eight_samples(setup.panels, setup.weights)[1]
    assert np.abs(weights).sum(axis=2).max() < 2.0 * setup.panels.area[0]
