"""Panel arrays, sample points, test functions and their tabulated energies."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import NEEDLE, SHAPES, SKEW, SQUARE, TRIANGLE, rectangle, turned

from bem.kernels.arrays import panel_arrays
from bem.kernels.indicator_energy import LOG2_RATIO, P1_ENERGY, P2_ENERGY, indicator_energies
from bem.kernels.rectangles import parallel_pair
from bem.kernels.targets import make_targets

STRIPS = 48


def fine_points(panel: np.ndarray, n: int = 60) -> tuple[np.ndarray, np.ndarray]:
    """Points (m, 3) and weights (m,) of a panel by a rule that knows two triangles only."""
    x, w = np.polynomial.legendre.leggauss(n)
    x, w = 0.5 * (x + 1.0), 0.5 * w
    s, t = np.repeat(x, n), np.tile(x, n)
    both = np.repeat(w, n) * np.tile(w, n) * s
    points, weights = [], []
    for a, b, c in (panel[[0, 1, 2]], panel[[0, 2, 3]]):
        points.append(a + s[:, None] * ((b - a) + t[:, None] * (c - b)))
        weights.append(both * np.linalg.norm(np.cross(b - a, c - a)))
    return np.concatenate(points), np.concatenate(weights)


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("name", SHAPES)
def test_area_centroid_and_moments(name: str, seed: int) -> None:
    panel = turned(SHAPES[name], seed)
    points, weights = fine_points(panel)
    arrays = panel_arrays(panel[None])
    center = weights @ points / weights.sum()
    apart = points - center
    moment = np.einsum("m,ma,mb->ab", weights, apart, apart) / weights.sum()
    order = ([0, 1, 2, 0, 0, 1], [0, 1, 2, 1, 2, 2])
    assert arrays.area[0] == pytest.approx(weights.sum(), rel=1e-11)
    assert arrays.center[0] == pytest.approx(center, abs=1e-12)
    assert arrays.moment[0] == pytest.approx(moment[order], abs=1e-12)
    assert arrays.radius[0] == pytest.approx(np.linalg.norm(panel - center, axis=1).max())


@pytest.mark.parametrize("name", SHAPES)
def test_frame_is_right_handed_and_holds_the_corners(name: str) -> None:
    panel = turned(SHAPES[name], 5)
    arrays = panel_arrays(panel[None])
    axes = arrays.axes[0]
    assert axes @ axes.T == pytest.approx(np.eye(3), abs=1e-14)
    assert np.linalg.det(axes) == pytest.approx(1.0)
    assert arrays.center[0] + arrays.corners[0] @ axes[:2] == pytest.approx(panel, abs=1e-14)
    step = np.roll(panel, -1, axis=0) - panel
    assert arrays.sides[0, :, 2] == pytest.approx(np.linalg.norm(step, axis=1), abs=1e-14)


def test_only_rectangles_count_as_rectangles() -> None:
    bent = SQUARE + np.array([[0, 0, 0]] * 3 + [[1e-4, 0, 0]])
    panels = panel_arrays(np.array([turned(p, 1) for p in (SQUARE, NEEDLE, SKEW, TRIANGLE, bent)]))
    assert panels.half[0] == pytest.approx([0.5, 0.5])
    assert panels.half[1] == pytest.approx([0.5, 0.5e-4])
    assert not panels.half[2:].any()


@pytest.mark.parametrize("name", SHAPES)
def test_samples_lie_inside_and_weigh_the_area(name: str) -> None:
    panel = turned(SHAPES[name], 2)
    arrays = panel_arrays(panel[None])
    targets = make_targets(arrays)
    assert targets.weights[0].sum() == pytest.approx(arrays.area[0], rel=1e-12)
    assert np.all(targets.weights > 0.0)
    local = (targets.points[0].T - arrays.center[0]) @ arrays.axes[0].T
    assert np.abs(local[:, 2]).max() < 1e-14
    along, corner = arrays.sides[0, :, :2], arrays.corners[0]
    offset = local[:, None, :2] - corner
    assert np.all(along[:, 0] * offset[..., 1] - along[:, 1] * offset[..., 0] >= -1e-15)


@pytest.mark.parametrize("name", SHAPES)
def test_test_functions_have_no_mean_and_their_moments_are_sums(name: str) -> None:
    arrays = panel_arrays(turned(SHAPES[name], 4)[None])
    targets = make_targets(arrays)
    tests, area = targets.tests[0], arrays.area[0]
    at = (targets.points[0].T - arrays.center[0]) @ arrays.axes[0, :2].T
    powers = np.stack([at[:, 0] ** 2, at[:, 1] ** 2, at[:, 0] * at[:, 1]], axis=1)
    assert tests.sum(axis=1) == pytest.approx(np.zeros(4), abs=1e-14 * area)
    assert targets.first[0] == pytest.approx(tests @ at, abs=1e-12 * area)
    assert targets.second[0] == pytest.approx(tests @ powers, abs=1e-12 * area)
    square = (tests**2 / targets.weights[0]).sum(axis=1)
    assert targets.square[0] == pytest.approx(square, rel=1e-12)


def test_tests_of_a_rectangle_are_legendre_polynomials() -> None:
    targets = make_targets(panel_arrays(rectangle((0.0, 2.0), (0.0, 0.5))[None]))
    assert targets.square[0] == pytest.approx([1 / 3, 1 / 3, 1 / 5, 1 / 5])
    gram = targets.tests[0] / targets.weights[0] @ targets.tests[0].T
    assert gram == pytest.approx(np.diag([1 / 3, 1 / 3, 1 / 5, 1 / 5]), abs=1e-15)


def strip_energy(polynomial: np.ndarray, ratio: float) -> float:
    """Energy of a function across a rectangle ``ratio`` by 1, constant on each of 48 strips."""
    cuts = np.linspace(0.0, ratio, STRIPS + 1)
    v = np.array([[0.0, -1.0], [1.0, 0.0]])
    first = np.array(
        [
            parallel_pair(np.array([[cuts[0] - cuts[k], cuts[0] - cuts[k + 1]],
                                    [cuts[1] - cuts[k], cuts[1] - cuts[k + 1]]]), v, 0.0)
            for k in range(STRIPS)
        ]
    )  # fmt: skip
    apart = np.abs(np.subtract.outer(np.arange(STRIPS), np.arange(STRIPS)))
    return float(polynomial @ first[apart] @ polynomial) / (ratio * min(ratio, 1.0))


@pytest.mark.parametrize(("degree", "table"), [(1, P1_ENERGY), (2, P2_ENERGY)])
def test_tabulated_energies_are_those_of_strips(degree: int, table: np.ndarray) -> None:
    """Means of the polynomial over each strip, closed integrals between the strips."""
    cuts = np.linspace(-1.0, 1.0, STRIPS + 1)
    primitive = 0.5 * cuts**2 if degree == 1 else 0.5 * (cuts**3 - cuts)
    means = np.diff(primitive) / np.diff(cuts)
    found = [strip_energy(means, 2.0**k) for k in LOG2_RATIO]
    assert table == pytest.approx(found, rel=5e-3)


def test_energies_scale_with_the_cube_of_length_and_follow_the_direction() -> None:
    panels = panel_arrays(np.array([rectangle((0, 4), (0, 1)), rectangle((0, 1), (0, 4))]))
    flat, tall = indicator_energies(panels, make_targets(panels))
    assert flat == pytest.approx(tall[[1, 0, 3, 2]])
    assert flat[0] > flat[1] > 0.0
    grown = panel_arrays(np.array([rectangle((0, 4e-3), (0, 1e-3))]))
    assert indicator_energies(grown, make_targets(grown))[0] == pytest.approx(1e-9 * flat)


def test_energies_beyond_the_table_grow_with_the_logarithm() -> None:
    """The next doubling adds 2 ln 2 times the mean square, as a long wire does."""
    panels = panel_arrays(np.array([rectangle((0, 2.0**k), (0, 1)) for k in (7, 8, 9)]))
    energy = indicator_energies(panels, make_targets(panels))[:, 0] / panels.area
    step = 2.0 * np.log(2.0) / 3.0
    assert np.diff(energy) == pytest.approx([step, step], rel=1e-6)


@pytest.mark.parametrize("panel", [TRIANGLE, SKEW])
def test_energies_of_other_panels_are_right_within_a_factor(panel: np.ndarray) -> None:
    """Mean sides stand for the panel: the energy stays of the size that its square implies."""
    arrays = panel_arrays(panel[None])
    targets = make_targets(arrays)
    energy = indicator_energies(arrays, targets)[0]
    assert np.all(energy > 0.2 * targets.square[0] * np.sqrt(arrays.area[0]))
    assert np.all(energy < 5.0 * targets.square[0] * np.sqrt(arrays.area[0]))
