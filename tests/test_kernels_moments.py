"""Layers of polynomials on a panel against eighty-bit quadrature, on and near its sides too."""

from __future__ import annotations

import numpy as np
import pytest
from panel_shapes import NEEDLE, SHAPES, SKEW, SQUARE, flat, turned
from reference_layers import layers

from bem.kernels.arrays import PanelArrays, bilinear, gauss_square
from bem.kernels.basis import interface_arrays, monomials, panel_basis, values
from bem.kernels.moments import ROWS, constant_moments, double_moments, moments

HEIGHTS = (0.0, 1e-9, -1e-9, 1e-6, 1e-4, -0.3)
ORDERS = np.array([[0, 0], [1, 0], [0, 1], [0, 0], [1, 0], [0, 1], [2, 0], [0, 2], [1, 1]])
"""Powers of x and y in the nine layers."""
PLAIN = np.eye(6)[None]
"""Functions that are the monomials themselves."""


def to_space(panels: PanelArrays, local: np.ndarray) -> np.ndarray:
    return panels.center[0] + local @ panels.axes[0]


def by_kernel(panels: PanelArrays, points: np.ndarray, basis: np.ndarray = PLAIN) -> np.ndarray:
    """V of f0, f1, f2 and K of f0 to f5, (9, m), at points (m, 3)."""
    work = np.empty((ROWS, len(points)))
    block = np.ascontiguousarray(points.T)[None]
    moments(0, basis, panels, block, 0, work)
    return work[[3, 10, 11, 4, 5, 6, 7, 8, 9]]


def close_points(panels: PanelArrays) -> np.ndarray:
    """Local points on, beside and above corners and sides, from 1e-9 to a third of a side."""
    corners = panels.corners[0]
    at = []
    for a, b in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        if (a == b).all():
            continue
        out = np.array([b[1] - a[1], a[0] - b[0]])
        for part in (0.0, 0.3):
            for aside in (0.0, 1e-9, -1e-5, 0.3):
                at.append(a + part * (b - a) + aside * out)
    scale = panels.radius[0]
    points = [[*xy, scale * h] for xy in at for h in HEIGHTS]
    return np.array(points)


def scales(panels: PanelArrays) -> np.ndarray:
    """(9,) size of each layer: of V the potential of the panel, of K the full angle."""
    spread = np.abs(panels.corners[0]).max(axis=0)
    whole = np.where(np.arange(9) < 3, np.sqrt(panels.area[0]), 1.0)
    return whole * np.prod(spread**ORDERS, axis=1)


@pytest.mark.parametrize("name", SHAPES)
def test_on_and_near_sides_and_corners(name: str) -> None:
    """Finite and right to rounding, over what a density of that order can give at all.

    Low over a side the angle turns with the position, which is rounded in any frame; powers
    across a needle lose the square of its aspect.
    """
    panels = interface_arrays(SHAPES[name][None])
    local = close_points(panels)
    found = by_kernel(panels, to_space(panels, local))
    ring = panels.corners[0]
    back = (to_space(panels, local) - panels.center[0]) @ panels.axes[0].T
    exact = np.array([layers(ring, x) for x in back]).T.astype(float)
    low = np.where(back[:, 2] == 0.0, np.inf, np.abs(back[:, 2])) / panels.radius[0]
    slack = (5e-8 if name in ("needle", "splinter") else 1e-11) + 1e-15 / low
    assert np.all(np.abs((found - exact) / scales(panels)[:, None]) < slack)


@pytest.mark.parametrize("name", ["square", "triangle", "skew"])
@pytest.mark.parametrize("distance", [1.5, 5.0])
def test_relative_accuracy_away_from_the_panel(name: str, distance: float) -> None:
    """Up to five radii: every layer to its own size, in general directions."""
    panels = interface_arrays(turned(SHAPES[name], 3)[None])
    directions = np.random.default_rng(1).normal(size=(20, 3))
    directions /= np.linalg.norm(directions, axis=1)[:, None]
    local = distance * panels.radius[0] * directions
    found = by_kernel(panels, to_space(panels, local))
    exact = np.array([layers(panels.corners[0], x) for x in local]).T.astype(float)
    size = np.abs(exact).max(axis=1)[:, None]
    assert np.abs((found - exact) / size).max() < 1e-13 * distance**4


def test_plain_quadrature_agrees() -> None:
    """The polar reference and the kernel, both against a product rule over the panel."""
    panels = interface_arrays(turned(SKEW, 2)[None])
    xi, eta, weight = gauss_square(40)
    at, jacobian = bilinear(panels.corners, xi, eta)
    powers = monomials(at[..., 0], at[..., 1])[0] * jacobian[0] * weight
    local = np.random.default_rng(0).normal(size=(6, 3)) + [0.0, 0.0, 1.0]
    apart = np.linalg.norm(local[:, None] - np.pad(at[0], ((0, 0), (0, 1))), axis=2)
    single = powers[:3] @ (1.0 / apart).T
    double = powers @ (local[:, 2:] / apart**3).T
    plain = np.concatenate([single, double])
    assert by_kernel(panels, to_space(panels, local)) == pytest.approx(plain, rel=1e-9, abs=1e-12)
    exact = np.array([layers(panels.corners[0], x) for x in local]).T.astype(float)
    assert exact == pytest.approx(plain, rel=1e-9, abs=1e-12)


def test_the_shorter_routines_give_the_same() -> None:
    panels = interface_arrays(turned(SKEW, 5)[None])
    basis = panel_basis(panels)
    block = np.random.default_rng(2).normal(size=(1, 3, 12))
    full, double, constant = (np.empty((ROWS, 12)) for _ in range(3))
    moments(0, basis, panels, block, 0, full)
    double_moments(0, basis, panels, block, 0, double)
    constant_moments(0, panels, block, 0, constant)
    assert double[3:10] == pytest.approx(full[3:10], rel=1e-13)
    assert constant[3:5] == pytest.approx(full[3:5], rel=1e-13)


def test_functions_are_combinations_of_monomials() -> None:
    panels = interface_arrays(turned(SKEW, 5)[None])
    basis = panel_basis(panels)
    points = np.random.default_rng(3).normal(size=(12, 3))
    plain, found = by_kernel(panels, points), by_kernel(panels, points, basis)
    assert found[:3] == pytest.approx(basis[0, :3, :3] @ plain[:3], rel=1e-12)
    assert found[3:] == pytest.approx(basis[0] @ plain[3:], rel=1e-10, abs=1e-12)


def test_sign_follows_the_normal() -> None:
    """In front the solid angle is positive, behind negative, in the plane nothing."""
    panels = interface_arrays(SQUARE[None])
    points = np.array([[0.5, 0.5, 1e-6], [0.5, 0.5, -1e-6], [0.3, 0.4, 0.0]])
    found = by_kernel(panels, points)
    assert found[3] == pytest.approx([2 * np.pi, -2 * np.pi, 0.0], abs=1e-4)
    assert not found[3:, 2].any()


@pytest.mark.parametrize("name", SHAPES)
def test_basis_is_orthonormal_in_the_mean(name: str) -> None:
    """Of a needle too, and in whatever way its corners are numbered."""
    for shift in range(4):
        panel = (
            SHAPES[name] if np.array_equal(*SHAPES[name][2:]) else np.roll(SHAPES[name], shift, 0)
        )
        panels = interface_arrays(turned(panel, 1)[None])
        basis = panel_basis(panels)
        xi, eta, weight = gauss_square(6)
        at, jacobian = bilinear(panels.corners, xi, eta)
        found = values(basis, at)[0]
        mean = found * (jacobian[0] * weight / panels.area[0])
        assert mean @ found.T == pytest.approx(np.eye(6), abs=1e-11)
        assert np.triu(basis[0], 1) == pytest.approx(np.zeros((6, 6)))
        assert basis[0, 0] == pytest.approx([1, 0, 0, 0, 0, 0])


@pytest.mark.parametrize("shift", range(4))
def test_slanting_ends_of_a_needle_do_no_harm(shift: int) -> None:
    """A trapezoid of aspect 1e4 with ends at 45 degrees: x and y stay apart."""
    panel = flat((0.0, 0.0), (1.0, 0.0), (1.0 - 1e-4, 1e-4), (1e-4, 1e-4))
    panels = interface_arrays(np.roll(panel, shift, axis=0)[None])
    xi, eta, weight = gauss_square(4)
    at, jacobian = bilinear(panels.corners, xi, eta)
    second = np.einsum("k,ka,kb->ab", jacobian[0] * weight, at[0], at[0])
    assert abs(second[0, 1]) < 0.01 * np.sqrt(second[0, 0] * second[1, 1])


def test_second_axis_follows_direction_one() -> None:
    """Whichever direction is longer, x runs along sides 0-1 and 3-2, y along the others."""
    for panel in (NEEDLE, np.roll(NEEDLE, 1, axis=0), SKEW, np.roll(SKEW, 1, axis=0)):
        panels = interface_arrays(panel[None])
        side = panels.corners[0, 1] - panels.corners[0, 0]
        other = panels.corners[0, 2] - panels.corners[0, 1]
        assert side[0] > abs(side[1]) and other[1] > abs(other[0])
