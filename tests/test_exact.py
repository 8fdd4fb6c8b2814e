"""Bodies whose capacitance is known in closed form, at a tolerance of 1e-3."""

from __future__ import annotations

import numpy as np
import pytest
from reference_formulas import coaxial_line
from reference_values import BY_NAME
from scenes import check, moved, scene_of, scene_of_reference

import bem
from bem.geometry import shapes
from bem.units import EPS0

CLOSED = (
    "sphere",
    "disc",
    "concentric spheres",
    "ellipsoid 3, 2, 1",
    "two spheres in contact",
    "prolate 2 : 1",
    "prolate 10 : 1",
    "oblate 1 : 0.5",
    "torus 2, 1",
    "open hemisphere",
    "solid hemisphere",
    "two spheres, distance 3",
    "two spheres, distance 2.1",
    "spheres 1 and 0.5, distance 2",
    "two discs, gap 0.1",
    "two discs, gap 1",
)
NECK = 1e-6
"""Touching spheres are joined by a neck of a thousandth of their radius: its share of L."""


@pytest.mark.parametrize("name", CLOSED)
def test_closed_forms_at_a_thousandth(name: str) -> None:
    record = BY_NAME[name]
    slack = NECK if name == "two spheres in contact" else record.uncertainty
    check(bem.extract(scene_of_reference(record), tolerance=1e-3, threads=1), record.matrix, slack)


@pytest.mark.parametrize("name", ["sphere", "disc", "solid hemisphere"])
def test_closed_forms_at_a_ten_thousandth(name: str) -> None:
    record = BY_NAME[name]
    check(bem.extract(scene_of_reference(record), tolerance=1e-4, threads=1), record.matrix)


@pytest.mark.parametrize("radius", [1e-8, 0.3, 2e3])
def test_sphere_of_any_size_in_any_medium(radius: float) -> None:
    """C = 4 pi eps R in farad, from nanometres to kilometres, turned and shifted."""
    scene = bem.Scene(unit="m", relative_permittivity=3.9)
    ball = shapes.sphere(radius)
    scene.add_conductor("ball", moved(ball, 20.0, (radius, -3 * radius, 7 * radius)))
    result = bem.extract(scene, tolerance=1e-3, threads=1)
    exact = 4.0 * np.pi * 3.9 * EPS0 * radius
    assert abs(result.capacitance[0, 0] - exact) <= result.error[0, 0] <= 1e-3 * exact * 1.01


def spheres_in_a_shell(inner: float, outer: float) -> bem.Scene:
    return scene_of([shapes.sphere(inner), shapes.sphere(outer)], shells=(1,))


def test_screened_body_has_no_capacitance_to_the_outside() -> None:
    """Row sum of the inner sphere: zero within its own bar, which is far below C."""
    result = bem.extract(spheres_in_a_shell(0.5, 1.0), tolerance=1e-3, threads=1)
    assert abs(result.row_sum[0]) <= result.row_sum_error[0]
    assert result.row_sum_error[0] < 2e-3 * result.capacitance[0, 0]


def line(length: float) -> bem.Scene:
    """Rod of radius 1 in a closed can of radius 2."""
    return scene_of([shapes.cylinder(1.0, length), shapes.cylinder(2.0, length + 2.0)], shells=(1,))


def test_coaxial_line_as_the_slope_between_two_lengths() -> None:
    """The ends cancel in the difference of two lengths: 2 pi eps0 / ln 2 per metre."""
    short, long = (bem.extract(line(length), tolerance=3e-3, threads=1) for length in (2.0, 6.0))
    slope = (long.mutual[0, 1] - short.mutual[0, 1]) / 4.0 / EPS0
    bar = (long.error[0, 1] + short.error[0, 1]) / 4.0 / EPS0
    assert long.converged and short.converged
    assert abs(slope - coaxial_line(2.0)) <= bar
    assert bar < 0.02 * coaxial_line(2.0)
