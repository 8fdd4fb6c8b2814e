"""Potential of a polygon against sixty digits, on and near its edges and corners."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from panel_shapes import SHAPES, SQUARE, turned
from reference_integrals import exact_potential, frame, potential

from bem.kernels.arrays import panel_arrays
from bem.kernels.potential import potential_of_panels

CLOSE = 10.0 ** np.arange(-4, -17, -2.0)
SIZES = (1e-9, 1.0, 1e3)
ACCURACY = {"square": 2e-13, "triangle": 2e-13, "skew": 2e-13, "needle": 1e-10, "splinter": 1e-9}
"""Relative. Coordinates are rounded to 1e-12 of the width of a needle of aspect 1e4, and the
two long sides of a splinter cancel once more."""
LEAST_ANGLE = 1e-10
"""Relative error where a point hovers so low over a panel that the solid angle rounds to 2 pi."""


def by_kernel(panel: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Potential of one panel by the kernel, points (m, 3)."""
    return potential_of_panels(
        panel_arrays(panel[None]), np.ascontiguousarray(points.T), np.ones(1)
    )


def off_by(panel: np.ndarray, points: np.ndarray) -> float:
    """Largest relative error over the points."""
    exact = np.array([exact_potential(panel, x) for x in points])
    return float(np.max(np.abs(by_kernel(panel, points) / exact - 1.0)))


def around(place: np.ndarray, directions: list[np.ndarray], length: float) -> np.ndarray:
    """Give a place and the points at the distances ``CLOSE`` times ``length`` from it."""
    offsets = CLOSE[:, None, None] * length * np.array(directions)
    return np.concatenate([place[None], place + offsets.reshape(-1, 3)])


def close_points(panel: np.ndarray) -> np.ndarray:
    """Points on and near the first end and a third of every side."""
    ring, normal = frame(panel)
    places = []
    for a, b in zip(ring, np.roll(ring, -1, axis=0), strict=True):
        length = np.linalg.norm(b - a)
        along = (b - a) / length
        out = np.cross(along, normal)
        directions = [out, -out, normal, along, 0.6 * out - 0.8 * normal]
        for part in (0.0, 1 / 3):
            places.append(around(a + part * (b - a), directions, length))
    return np.concatenate(places)


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("name", SHAPES)
def test_on_and_near_edges_and_corners(name: str, size: float) -> None:
    """From 1e-4 to 1e-16 of the side away, inside, outside, above and along."""
    panel = size * SHAPES[name]
    assert off_by(panel, close_points(panel)) < ACCURACY[name]


@pytest.mark.parametrize("name", SHAPES)
def test_turned_panels_near_edges(name: str) -> None:
    panel = turned(SHAPES[name], 3)
    assert off_by(panel, close_points(panel)) < ACCURACY[name]


@pytest.mark.parametrize("name", SHAPES)
def test_in_the_plane_and_above(name: str) -> None:
    random = np.random.default_rng(4)
    low, high = SHAPES[name].min(axis=0), SHAPES[name].max(axis=0)
    points = low + (high - low) * random.uniform(-1.0, 2.0, (60, 3))
    points[20:40, 2] = 10.0 ** random.uniform(-12, 1, 20)
    assert off_by(SHAPES[name], points) < max(LEAST_ANGLE, ACCURACY[name])


@pytest.mark.parametrize("distance", [10.0, 1e3, 1e6])
def test_far_away_it_loses_only_rounding(distance: float) -> None:
    """The sides cancel: what is left loses the square of the distance in panel sizes."""
    direction = np.array([0.48, 0.6, 0.64])
    point = SQUARE.mean(axis=0) + distance * direction
    assert off_by(SQUARE, point[None]) < 5e-16 * distance**2


@given(
    st.tuples(*[st.floats(-3, 3)] * 3),
    st.sampled_from(sorted(SHAPES)),
    st.integers(0, 100),
)
@settings(max_examples=60, deadline=None, derandomize=True)
def test_anywhere(place: tuple[float, float, float], name: str, seed: int) -> None:
    panel = turned(SHAPES[name], seed)
    assert off_by(panel, np.array([place])) < 10 * ACCURACY[name]


def test_orientation_and_first_corner_change_nothing() -> None:
    points = close_points(SHAPES["skew"])
    forward = by_kernel(SHAPES["skew"], points)
    backward = by_kernel(SHAPES["skew"][::-1], points)
    rolled = by_kernel(np.roll(SHAPES["skew"], 2, axis=0), points)
    assert backward == pytest.approx(forward, rel=1e-13)
    assert rolled == pytest.approx(forward, rel=1e-13)


def test_both_sides_of_the_plane_agree() -> None:
    points = np.random.default_rng(5).uniform(-1, 2, (50, 3))
    assert by_kernel(SQUARE, points) == pytest.approx(
        by_kernel(SQUARE, points * [1, 1, -1]), rel=1e-14
    )


def test_density_weighs_each_panel() -> None:
    """Several panels at once: the sum over panels of density times potential."""
    panels = np.array([turned(p, k) for k, p in enumerate(SHAPES.values())])
    points = np.random.default_rng(6).uniform(-1, 1, (20, 3))
    density = np.array([1.0, -2.0, 0.5, 3.0, -1.5])
    total = potential_of_panels(panel_arrays(panels), np.ascontiguousarray(points.T), density)
    each = np.array([potential(p, points) for p in panels])
    assert total == pytest.approx(density @ each, rel=1e-11)


def test_halves_add_up_to_the_whole() -> None:
    points = np.random.default_rng(7).uniform(-1, 2, (50, 3))
    left = SQUARE * (0.5, 1.0, 1.0)
    right = left + (0.5, 0.0, 0.0)
    assert by_kernel(left, points) + by_kernel(right, points) == pytest.approx(
        by_kernel(SQUARE, points)
    )
