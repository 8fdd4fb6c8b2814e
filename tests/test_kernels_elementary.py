"""The logarithm and arctangent of the kernels against the library's."""

from __future__ import annotations

import math

import numpy as np
import pytest
from numba import njit

from bem.kernels import elementary

ULP = 2.3e-16


@njit
def logs(x: np.ndarray) -> np.ndarray:
    out = np.empty_like(x)
    for k in range(x.size):
        out[k] = elementary.log(x[k])
    return out


@njit
def angles(y: np.ndarray, x: np.ndarray) -> np.ndarray:
    out = np.empty_like(x)
    for k in range(x.size):
        out[k] = elementary.atan2(y[k], x[k])
    return out


def test_logarithm_over_all_magnitudes() -> None:
    """Relative to the result, or absolute near 1 where the result vanishes."""
    random = np.random.default_rng(1)
    x = np.concatenate([10.0 ** random.uniform(-300, 300, 5000), random.uniform(0.5, 2.0, 5000)])
    exact = np.array([math.log(v) for v in x])
    assert np.all(np.abs(logs(x) - exact) <= 4 * ULP * np.maximum(np.abs(exact), 0.25))


def test_logarithm_keeps_its_digits_close_to_one() -> None:
    x = 1.0 + np.concatenate(
        [10.0 ** np.linspace(-15, -1, 200), -(10.0 ** np.linspace(-15, -1, 200))]
    )
    exact = np.array([math.log(v) for v in x])
    assert logs(x) == pytest.approx(exact, rel=4 * ULP, abs=0.0)


def test_angle_in_all_quadrants() -> None:
    random = np.random.default_rng(2)
    turn = random.uniform(-math.pi, math.pi, 8000)
    size = 10.0 ** random.uniform(-140, 140, 8000)
    y, x = size * np.sin(turn), size * np.cos(turn)
    exact = np.array([math.atan2(a, b) for a, b in zip(y, x, strict=True)])
    assert angles(y, x) == pytest.approx(exact, rel=4 * ULP, abs=0.0)


@pytest.mark.parametrize("size", [1e-200, 1.0, 1e200])
def test_angle_on_axes_and_diagonals(size: float) -> None:
    steps = [(0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, 1), (-1, 0), (-1, -1)]
    y, x = size * np.array(steps, dtype=float).T
    assert angles(y, x) == pytest.approx([math.atan2(a, b) for a, b in steps], rel=ULP)


def test_angle_of_the_origin_is_zero() -> None:
    assert angles(np.zeros(1), np.zeros(1))[0] == 0.0
