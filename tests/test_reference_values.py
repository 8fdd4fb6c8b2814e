"""The digits of the reference table follow from formulas and methods outside the package."""

from __future__ import annotations

import math

import numpy as np
import pytest
import reference_formulas as formulas
from reference_revolved import Generator, revolved_capacitance
from reference_values import BY_NAME, LEFT_OUT, PER_LENGTH, REFERENCES, Reference

PINHOLE = 1e-3


def line(*points: tuple[float, float]) -> Generator:
    return Generator(points)


def can(half_length: float, middle: float = 0.0) -> Generator:
    low, high = middle - half_length, middle + half_length
    return line((PINHOLE, low), (1.0, low), (1.0, high), (PINHOLE, high))


CLOSED_FORMS: dict[str, float | np.ndarray] = {
    "sphere": 1.0,
    "disc": formulas.disc(1.0),
    "concentric spheres": formulas.concentric_spheres(1.0, 2.0),
    "ellipsoid 3, 2, 1": formulas.ellipsoid(3.0, 2.0, 1.0),
    "two spheres in contact": formulas.spheres_in_contact(1.0),
    "prolate 2 : 1": formulas.prolate_spheroid(2.0, 1.0),
    "prolate 10 : 1": formulas.prolate_spheroid(10.0, 1.0),
    "oblate 1 : 0.5": formulas.oblate_spheroid(1.0, 0.5),
    "torus 2, 1": formulas.torus(2.0, 1.0),
    "open hemisphere": formulas.bowl(1.0, math.pi / 2),
    "solid hemisphere": formulas.solid_hemisphere(1.0),
    "two spheres, distance 3": formulas.two_spheres(1.0, 1.0, 3.0),
    "two spheres, distance 2.1": formulas.two_spheres(1.0, 1.0, 2.1),
    "spheres 1 and 0.5, distance 2": formulas.two_spheres(1.0, 0.5, 2.0),
    "two discs, gap 0.1": formulas.two_discs(0.1),
    "two discs, gap 1": formulas.two_discs(1.0),
}

REVOLVED = {
    "disc": [line((PINHOLE, 0.0), (1.0, 0.0))],
    "open tube, half length 1": [line((1.0, -1.0), (1.0, 1.0))],
    "annulus 0.5, 1": [line((0.5, 0.0), (1.0, 0.0))],
    "two discs, gap 1": [line((PINHOLE, z), (1.0, z)) for z in (0.0, 1.0)],
    "guard ring": [
        line((PINHOLE, 0.5), (1.0, 0.5)),
        line((1.1, 0.5), (2.0, 0.5)),
        line((PINHOLE, 0.0), (2.0, 0.0)),
    ],
    "solid cylinder, half length 0.25": [can(0.25)],
    "solid cylinder, half length 1": [can(1.0)],
    "solid cylinder, half length 4": [can(4.0)],
    "two thick discs": [can(0.1, 0.35), can(0.1, -0.35)],
}

VOLUMES = {
    "unit cube": 1.0,
    "solid hemisphere": 2.0 * math.pi / 3.0,
    "torus 2, 1": 4.0 * math.pi**2,
    "ellipsoid 3, 2, 1": 8.0 * math.pi,
    "solid cylinder, half length 0.25": math.pi * 0.5,
    "solid cylinder, half length 1": math.pi * 2.0,
    "solid cylinder, half length 4": math.pi * 8.0,
}

HALF_MEAN_WIDTHS = {
    "unit cube": formulas.box_half_mean_width((1.0, 1.0, 1.0)),
    "unit square": formulas.box_half_mean_width((1.0, 1.0, 0.0)),
    "rectangle 1 x 2": formulas.box_half_mean_width((1.0, 2.0, 0.0)),
    "disc": formulas.cylinder_half_mean_width(1.0, 0.0),
    "solid cylinder, half length 0.25": formulas.cylinder_half_mean_width(1.0, 0.25),
    "solid cylinder, half length 1": formulas.cylinder_half_mean_width(1.0, 1.0),
    "solid cylinder, half length 4": formulas.cylinder_half_mean_width(1.0, 4.0),
}

NESTED = (
    ("annulus 0.5, 1", "disc"),
    ("disc", "oblate 1 : 0.5"),
    ("disc", "solid hemisphere"),
    ("open hemisphere", "solid hemisphere"),
    ("solid hemisphere", "sphere"),
    ("unit square", "unit cube"),
    ("unit square", "rectangle 1 x 2"),
    ("open tube, half length 1", "solid cylinder, half length 1"),
    ("solid cylinder, half length 0.25", "solid cylinder, half length 1"),
    ("sphere", "two spheres in contact"),
    ("oblate 1 : 0.5", "sphere"),
)


def by_name(name: str) -> float:
    return BY_NAME[name].exact[0][0]


@pytest.mark.parametrize("name", CLOSED_FORMS)
def test_closed_forms_give_the_digits(name: str) -> None:
    """Printed digits are those of the formula, to the last one but rounding."""
    record = BY_NAME[name]
    assert np.all(np.abs(record.matrix - CLOSED_FORMS[name]) <= record.uncertainty)


@pytest.mark.parametrize("name", REVOLVED)
def test_bodies_of_revolution_by_a_second_method(name: str) -> None:
    """A spectral method confirms the computed values to their last digits."""
    found = revolved_capacitance(REVOLVED[name])
    assert np.all(np.abs(found - BY_NAME[name].matrix) <= 1e-9)


def test_more_digits_of_the_cube_lie_in_the_published_interval() -> None:
    published = BY_NAME["unit cube, published"]
    assert abs(by_name("unit cube") - published.exact[0][0]) < published.uncertainty


@pytest.mark.parametrize("name", VOLUMES)
def test_no_body_beats_the_sphere_of_equal_volume(name: str) -> None:
    assert by_name(name) > formulas.volume_radius(VOLUMES[name])


@pytest.mark.parametrize(("name", "area"), [("unit square", 1.0), ("rectangle 1 x 2", 2.0)])
def test_no_plate_beats_the_disc_of_equal_area(name: str, area: float) -> None:
    assert by_name(name) > formulas.plate_bound(area)


@pytest.mark.parametrize("name", HALF_MEAN_WIDTHS)
def test_convex_bodies_stay_below_half_their_mean_width(name: str) -> None:
    assert by_name(name) < HALF_MEAN_WIDTHS[name]


@pytest.mark.parametrize(("inner", "outer"), NESTED)
def test_a_body_inside_another_has_less(inner: str, outer: str) -> None:
    assert by_name(inner) < by_name(outer)


@pytest.mark.parametrize("half_length", [0.25, 1.0, 4.0])
def test_solid_cylinders_agree_with_the_fit(half_length: float) -> None:
    value = by_name(f"solid cylinder, half length {half_length:g}")
    assert abs(formulas.cylinder_fit(1.0, half_length) / value - 1.0) < 6e-3


@pytest.mark.parametrize(("gap", "shortfall"), [(0.1, 8e-3), (0.01, 1.8e-4)])
def test_small_gap_formula_falls_short_of_the_integral_equation(
    gap: float, shortfall: float
) -> None:
    own, mutual = formulas.two_discs(gap, nodes=1500 if gap < 0.05 else 400)[0]
    low = 1.0 - formulas.two_discs_kirchhoff(gap) / (0.5 * (own - mutual))
    assert low == pytest.approx(shortfall, rel=0.05)


@pytest.mark.parametrize("height", [1.1, 2.0])
def test_sphere_over_a_plane_from_its_mirrored_pair(height: float) -> None:
    own, mutual = formulas.two_spheres(1.0, 1.0, 2.0 * height)[0]
    known = by_name(f"sphere over a plane, height {height:g}")
    assert own - mutual == pytest.approx(known, rel=3e-13)


def test_per_length_values_follow_from_their_formulas() -> None:
    computed = {
        "two wires": formulas.two_wires(1.0, 4.0),
        "coaxial line": formulas.coaxial_line(2.0),
        "wire over a plane": formulas.wire_over_plane(2.0),
        "cross-capacitance of quarter shells": formulas.cross_capacitance(),
    }
    known = {x.name: x.exact for x in PER_LENGTH if x.mark != "N"}
    assert computed == pytest.approx(known, rel=1e-13)


def test_wire_over_a_plane_is_twice_two_wires() -> None:
    assert formulas.wire_over_plane(2.0) == pytest.approx(2.0 * formulas.two_wires(1.0, 4.0))


def test_shielded_strip_by_conformal_map() -> None:
    assert formulas.shielded_strip(1.0) == pytest.approx(5.76448992428047, rel=1e-13)


@pytest.mark.parametrize("record", REFERENCES, ids=lambda record: record.name)
def test_every_record_is_a_possible_maxwell_matrix(record: Reference) -> None:
    """Symmetric, positive definite, off-diagonal entries and row sums with the right sign."""
    matrix = record.matrix
    assert matrix.shape == (len(record.bodies),) * 2
    assert np.array_equal(matrix, matrix.T)
    assert np.linalg.eigvalsh(matrix)[0] > 0
    assert np.all(matrix[~np.eye(len(matrix), dtype=bool)] < 0)
    assert np.all(matrix.sum(axis=1) >= 0)
    assert 0 < record.uncertainty < 1e-5
    assert record.mark in "TPMN" and record.source


def test_names_are_unique_and_omissions_have_reasons() -> None:
    assert len(BY_NAME) == len(REFERENCES)
    assert all(entry.name and entry.reason for entry in LEFT_OUT)
