"""Expanded layers of distant panels, against the quadrature of plain integrands."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import SHAPES, SKEW, TRIANGLE, turned

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square, panel_arrays
from bem.kernels.basis import interface_arrays, panel_basis, values
from bem.kernels.mixed_expansion import POWERS, far_constant, far_double, far_single
from bem.kernels.mixed_samples import source_moments

SINGLE, DOUBLE = [3, 10, 11], [4, 5, 6, 7, 8, 9]
"""Rows of the results."""


def quadrature(panels: PanelArrays, j: int, points: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """V of 1, f1, f2 (3, m) and K of all six functions (6, m) at points (m, 3), by many points."""
    xi, eta, weight = gauss_square(20)
    at, jacobian = bilinear(panels.corners[j : j + 1], xi, eta)
    functions = values(panel_basis(panels)[j : j + 1], at)[0] * (jacobian[0] * weight)
    places = panels.center[j] + at[0] @ panels.axes[j, :2]
    apart = points[:, None] - places
    r = np.linalg.norm(apart, axis=2)
    return functions[:3] @ (1.0 / r).T, functions @ (apart @ panels.axes[j, 2] / r**3).T


def directions(seed: int) -> np.ndarray:
    """Sixteen random unit vectors (16, 3)."""
    random = np.random.default_rng(seed).normal(size=(16, 3))
    return random / np.linalg.norm(random, axis=1)[:, None]


def expanded(panels: PanelArrays, j: int, points: np.ndarray) -> np.ndarray:
    """All rows that the expansions leave, (12, m)."""
    moments = source_moments(panels, panel_basis(panels))
    block = np.ascontiguousarray(points.T)[None]
    work = np.full((12, len(points)), np.nan)
    far_double(j, moments, panels, block, 0, work)
    far_single(j, moments, panels, block, 0, work)
    return work


def errors(panel: np.ndarray, distance: float, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Largest errors of V (3,) and K (6,) over area/distance and area/distance^2."""
    panels = interface_arrays(turned(panel, seed)[None])
    r = distance * panels.radius[0]
    points = panels.center[0] + r * directions(seed)
    v, k = quadrature(panels, 0, points)
    work = expanded(panels, 0, points)
    off_v, off_k = np.abs(work[SINGLE] - v), np.abs(work[DOUBLE] - k)
    area = panels.area[0]
    return off_v.max(axis=1) * r / area, off_k.max(axis=1) * r**2 / area


@pytest.mark.parametrize("name", SHAPES)
def test_moments_are_those_of_a_finer_rule(name: str) -> None:
    panels = interface_arrays(turned(SHAPES[name], 3)[None])
    basis = panel_basis(panels)
    xi, eta, weight = gauss_square(9)
    at, jacobian = bilinear(panels.corners, xi, eta)
    scale = np.abs(at[0]).max(axis=0)
    found = source_moments(panels, basis)[0]
    functions = values(basis, at)[0] * (jacobian[0] * weight)
    for m, (p, q) in enumerate(POWERS):
        size = panels.area[0] * scale[0] ** p * scale[1] ** q
        exact = functions @ (at[0, :, 0] ** p * at[0, :, 1] ** q)
        assert found[:, m] == pytest.approx(exact, rel=1e-9, abs=1e-10 * size)


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("name", SHAPES)
def test_layers_where_expansions_begin(name: str, seed: int) -> None:
    """Five radii away, as between equal panels at 2.5 times the sum of their radii."""
    v, k = errors(SHAPES[name], 5.0, seed)
    assert v[0] < 1e-5 and k[0] < 5e-5
    assert v.max() < 8e-5 and k.max() < 4e-4


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("name", SHAPES)
def test_errors_fall_with_the_fifth_power(name: str, seed: int) -> None:
    """Of a panel symmetric about its centroid, with the sixth where the function is even."""
    near, middle, distant = (errors(SHAPES[name], d, seed) for d in (5.0, 10.0, 20.0))
    for a, b, c in zip(near, middle, distant, strict=True):
        assert np.all(b < a / 22.0 + 1e-12) and np.all(c < b / 25.0 + 1e-12)
        if name == "square":
            assert b[0] < a[0] / 50.0 and c[0] < b[0] / 56.0


def test_constant_layers_alone() -> None:
    panels = panel_arrays(np.array([turned(SKEW, 1), turned(TRIANGLE, 2)]))
    moments = source_moments(panels, panel_basis(panels))
    for j in range(2):
        points = panels.center[j] + 7.0 * directions(j)
        full, work = expanded(panels, j, points), np.zeros((12, 16))
        far_constant(j, moments, panels, np.ascontiguousarray(points.T)[None], 0, work)
        assert work[3:5] == pytest.approx(full[3:5], rel=1e-13)


def test_double_layer_is_exactly_zero_in_the_plane_and_odd_across_it() -> None:
    panels = interface_arrays(SKEW[None])
    above, level = directions(3) * 8.0 + panels.center[0], directions(3) * 8.0 + panels.center[0]
    level[:, 2] = 0.0
    below = above * (1.0, 1.0, -1.0)
    assert not expanded(panels, 0, level)[DOUBLE].any()
    assert np.array_equal(expanded(panels, 0, below)[DOUBLE], -expanded(panels, 0, above)[DOUBLE])
    front = above[:, 2] > 0.0
    assert np.array_equal(expanded(panels, 0, above)[4] > 0.0, front)
