"""Shapes: their facets, their true surfaces, and what is said of arguments that are off."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from shape_measures import area, side_counts, volume

from bem.errors import UsageError
from bem.geometry import shapes
from bem.geometry.revolved import Revolution
from bem.geometry.shapes.round import ArcTo
from bem.geometry.surface import Surface

WASHER = [(1.0, -0.5), (2.0, -0.5), (2.0, 0.5), (1.0, 0.5), (1.0, -0.5)]
LENS = [(0.0, -0.5), ArcTo((2.0, 0.0), (0.0, 0.5))]

SOLIDS = {
    "sphere": (shapes.sphere(2.0), 32.0 * math.pi / 3.0),
    "spheroid": (shapes.spheroid(1.0, 3.0), 4.0 * math.pi),
    "ellipsoid": (shapes.ellipsoid(1.0, 2.0, 3.0), 8.0 * math.pi),
    "cylinder": (shapes.cylinder(1.0, 3.0), 3.0 * math.pi),
    "hemisphere": (shapes.hemisphere(1.0), 2.0 * math.pi / 3.0),
    "torus": (shapes.torus(3.0, 1.0), 6.0 * math.pi**2),
    "washer": (shapes.revolve(WASHER), 3.0 * math.pi),
    "washer, other way round": (shapes.revolve(WASHER[::-1]), 3.0 * math.pi),
    "cone": (shapes.cone(1.0, 2.0), 2.0 * math.pi / 3.0),
    "frustum": (shapes.cone(2.0, 3.0, top_radius=1.0), 7.0 * math.pi),
    "funnel": (shapes.cone(1.0, 3.0, top_radius=2.0), 7.0 * math.pi),
    "ring of round section": (shapes.ring(3.0, 1.0), 6.0 * math.pi**2),
    "ring of rectangular section": (shapes.ring(inner=1.0, outer=2.0, height=2.0), 6.0 * math.pi),
}

SHEETS = {
    "disc": (shapes.disc(2.0), 4.0 * math.pi),
    "annulus": (shapes.annulus(1.0, 2.0), 3.0 * math.pi),
    "tube": (shapes.tube(1.0, 3.0), 6.0 * math.pi),
    "bowl": (shapes.bowl(1.0), 2.0 * math.pi),
}

CURVES = {name: surface.curve for name, (surface, _) in (SOLIDS | SHEETS).items()}

each_curve = pytest.mark.parametrize("curve", CURVES.values(), ids=CURVES)


def parameters(curve: Revolution) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(5)
    return rng.random(200), rng.random(200) * curve.pieces


@pytest.mark.parametrize(("surface", "exact"), SOLIDS.values(), ids=SOLIDS)
def test_facets_of_a_solid_are_closed_outward_and_inscribed(surface: Surface, exact: float) -> None:
    assert np.all(side_counts(surface) == 2)
    assert 0.985 * exact < volume(surface) < exact


@pytest.mark.parametrize(("surface", "exact"), SHEETS.values(), ids=SHEETS)
def test_facets_of_a_sheet_have_its_area_and_an_open_rim(surface: Surface, exact: float) -> None:
    assert area(surface) == pytest.approx(exact, rel=4e-3)
    assert set(side_counts(surface)) == {1, 2}


def test_box_and_plate_are_where_they_should_be() -> None:
    box = shapes.box(1.0, 2.0, 3.0, center=(5.0, 6.0, 7.0))
    assert box.bounds.tolist() == [[4.5, 5.0, 5.5], [5.5, 7.0, 8.5]]
    assert volume(box) == pytest.approx(6.0)
    assert np.all(side_counts(box) == 2)
    plate = shapes.plate(1.0, 2.0, center=(0.0, 0.0, 3.0))
    assert plate.bounds.tolist() == [[-0.5, -1.0, 3.0], [0.5, 1.0, 3.0]]
    assert box.curve is None
    assert plate.curve is None


def test_cone_stands_on_its_base_about_the_origin() -> None:
    assert shapes.cone(2.0, 3.0).bounds.tolist() == [[-2.0, -2.0, -1.5], [2.0, 2.0, 1.5]]
    at_top = shapes.cone(2.0, 3.0, top_radius=1.0).vertices
    assert np.hypot(*at_top[at_top[:, 2] == 1.5][:, :2].T).max() == pytest.approx(1.0)


@each_curve
def test_equal_parameters_give_equal_points_in_any_company(curve: Revolution) -> None:
    u, s = parameters(curve)
    together = curve.point(u, s)
    assert np.array_equal(together[::3], curve.point(u[::3], s[::3]))
    alone = [curve.point(a, b) for a, b in zip(u[:20], s[:20], strict=True)]
    assert np.array_equal(together[:20], alone)


@each_curve
def test_surface_closes_around_the_axis_and_at_its_poles(curve: Revolution) -> None:
    u, s = parameters(curve)
    assert np.array_equal(curve.point(0.0, s), curve.point(1.0, s))
    for end, on_axis in zip((0.0, float(curve.pieces)), curve.poles, strict=True):
        assert (np.ptp(curve.point(u, end), axis=0).max() == 0.0) == on_axis
    if curve.loops:
        assert np.array_equal(curve.point(u, 0.0), curve.point(u, float(curve.pieces)))


@each_curve
def test_pieces_meet_exactly(curve: Revolution) -> None:
    for before, after in zip(curve.profile, curve.profile[1:], strict=False):
        assert before.end == after.start
        assert np.array_equal(before.at(np.array(1.0)), after.at(np.array(0.0)))


@each_curve
def test_four_points_of_a_parameter_rectangle_are_coplanar(curve: Revolution) -> None:
    u, s = parameters(curve)
    k = np.floor(s)
    other = k + np.random.default_rng(6).random(len(s))
    a, b, c, d = (
        curve.point(x, y) for x, y in ((u, s), (u + 0.1, s), (u + 0.1, other), (u, other))
    )
    six_volumes = np.einsum("ij,ij->i", np.cross(b - a, c - a), d - a)
    assert np.abs(six_volumes).max() < 1e-13


@each_curve
def test_derivatives_and_normals_agree_with_differences(curve: Revolution) -> None:
    u, s = parameters(curve)
    s = np.floor(s) + 0.05 + 0.9 * (s - np.floor(s))
    frame, h = curve.frame(u, s), 1e-5
    by_u = (curve.point(u + h, s) - curve.point(u - h, s)) / (2.0 * h)
    by_s = (curve.point(u, s + h) - curve.point(u, s - h)) / (2.0 * h)
    np.testing.assert_allclose(frame.by_u, by_u, atol=1e-6)
    np.testing.assert_allclose(frame.by_s, by_s, atol=1e-6)
    across = np.cross(by_u, by_s)
    across /= np.linalg.norm(across, axis=1, keepdims=True)
    np.testing.assert_allclose(curve.normal(u, s), across, atol=1e-6)


@pytest.mark.parametrize(
    "matrix",
    [np.diag([2.0, 3.0, 0.5]), np.array([[0.0, -2.0, 0.0], [2.0, 0.0, 0.0], [0.0, 0.0, 2.0]])],
    ids=["stretched", "turned"],
)
@each_curve
def test_placing_moves_every_point(curve: Revolution, matrix: np.ndarray) -> None:
    u, s = parameters(curve)
    shift = np.array([1.0, -2.0, 3.0])
    moved = curve.placed(matrix, shift)
    np.testing.assert_allclose(
        moved.point(u, s), curve.point(u, s) @ matrix.T + shift, rtol=1e-14, atol=1e-14
    )


def test_mirror_image_is_the_same_surface_with_outward_normals() -> None:
    curve = CURVES["cylinder"].placed(np.diag([1.0, 1.0, -1.0]), np.zeros(3))
    u, s = parameters(curve)
    assert np.all(np.einsum("ij,ij->i", curve.normal(u, s), curve.point(u, s)) > 0.0)
    assert np.linalg.det(curve.matrix) > 0.0


def test_placing_a_shape_takes_its_true_surface_along() -> None:
    ball = shapes.sphere(2.0).placed(0.001 * np.eye(3), np.array([0.0, 0.0, 1.0]))
    points = ball.curve.point(np.linspace(0.0, 1.0, 9), np.linspace(0.0, 1.0, 9))
    np.testing.assert_allclose(np.linalg.norm(points - [0.0, 0.0, 1.0], axis=1), 0.002, rtol=1e-13)


def test_profile_points_almost_on_the_axis_or_closed_count_as_such() -> None:
    tiny = math.cos(math.pi / 2)
    assert shapes.revolve([(tiny, -1.0), ArcTo((1.0, 0.0), (-tiny, 1.0))]).curve.poles == (
        True,
        True,
    )
    almost = [*WASHER[:-1], (1.0, -0.5 + 1e-16)]
    assert shapes.revolve(almost).curve.loops


def test_arc_longer_than_half_a_circle_keeps_to_its_way() -> None:
    flask = shapes.revolve([(0.5, -math.sqrt(0.75)), ArcTo((1.0, 0.0), (0.0, 1.0))])
    points = flask.curve.point(0.0, np.linspace(0.0, 1.0, 11))
    np.testing.assert_allclose(np.linalg.norm(points, axis=1), 1.0, rtol=1e-14)
    assert flask.curve.free_rims == (True, False)


BAD_CALLS: dict[str, tuple[Callable[[], Surface], str]] = {
    "zero": (lambda: shapes.sphere(0.0), "radius: found 0.0; a length must be positive"),
    "negative": (lambda: shapes.box(1.0, -2.0, 1.0), "ly: found -2.0; a length must be positive"),
    "not finite": (lambda: shapes.disc(math.inf), "radius: found inf; give a finite number"),
    "not a number": (lambda: shapes.disc("wide"), "radius: found 'wide'; give a finite number"),
    "wide hole": (lambda: shapes.annulus(2.0, 1.0), "inner: found 2.0; it must be below outer"),
    "thick ring": (lambda: shapes.torus(1.0, 1.0), "minor: found 1.0; it must be below major"),
    "flag": (lambda: shapes.sphere(True), "radius: found True; give a finite number"),
    "half a ring": (lambda: shapes.ring(2.0), "ring: found major; give major and minor, or inner"),
    "two rings": (
        lambda: shapes.ring(2.0, 1.0, inner=1.0),
        "ring: found major, minor, inner; give major and minor, or inner, outer and height",
    ),
    "no ring": (lambda: shapes.ring(), "ring: found no sizes"),
    "ring inside out": (
        lambda: shapes.ring(inner=2.0, outer=1.0, height=1.0),
        "inner: found 2.0; it must be below outer",
    ),
    "cone through its tip": (
        lambda: shapes.cone(1.0, 1.0, -0.5),
        "top_radius: found -0.5; a radius must not be negative",
    ),
    "flat center": (lambda: shapes.plate(1.0, 1.0, (0.0, 0.0)), "center: found .* three numbers"),
    "lost center": (
        lambda: shapes.box(1.0, 1.0, 1.0, (0.0, math.nan, 0.0)),
        "center: found nan; give a finite number",
    ),
    "one point": (lambda: shapes.revolve([(0.0, 0.0)]), "profile: found 1 points; give at least"),
    "no list": (lambda: shapes.revolve(3.0), "profile: found 0 points"),
    "arc first": (lambda: shapes.revolve([LENS[1], (1.0, 0.0)]), "start with a point"),
    "text": (lambda: shapes.revolve([(1.0, 0.0), "end"]), "profile point 2: found 'end'"),
    "three numbers": (lambda: shapes.revolve([(1.0, 0.0), (1.0, 2.0, 3.0)]), "two numbers"),
    "left of axis": (lambda: shapes.revolve([(1.0, 0.0), (-1.0, 1.0)]), "found r = -1.0"),
    "twice": (lambda: shapes.revolve([(1.0, 0.0), (1.0, 0.0)]), "twice in a row"),
    "circle in one": (
        lambda: shapes.revolve([(2.0, 0.0), ArcTo((1.0, 0.0), (2.0, 0.0))]),
        "a full circle as two arcs",
    ),
    "straight arc": (
        lambda: shapes.revolve([(1.0, 0.0), ArcTo((1.0, 1.0), (1.0, 2.0))]),
        "in line; give a straight step",
    ),
    "on the axis amid": (
        lambda: shapes.revolve([(1.0, 0.0), (0.0, 1.0), (1.0, 2.0)]),
        "profile point 2: found on the axis",
    ),
    "along the axis": (lambda: shapes.revolve([(0.0, 0.0), (0.0, 1.0)]), "reaches r = 0"),
    "arc over the axis": (
        lambda: shapes.revolve([(0.5, 0.0), ArcTo((0.0, 0.5), (0.5, 1.0))]),
        "profile point 2: the way there reaches r = 0",
    ),
    "crossing": (
        lambda: shapes.revolve([(1.0, 0.0), (2.0, 0.0), (2.0, 1.0), (1.5, -1.0)]),
        "profile: found touching or crossing itself near",
    ),
    "turning back": (
        lambda: shapes.revolve([(1.0, 0.0), (3.0, 0.0), (2.0, 0.0)]),
        "profile: found touching or crossing itself near",
    ),
    "two facets": (lambda: shapes.revolve(WASHER, around=2), "around: found 2; give a whole"),
}


@pytest.mark.parametrize(("call", "message"), BAD_CALLS.values(), ids=BAD_CALLS)
def test_arguments_that_are_off_give_one_clear_line(
    call: Callable[[], Surface], message: str
) -> None:
    with pytest.raises(UsageError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
