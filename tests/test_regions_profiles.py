"""Pieces of profiles: what lies inside, how near points are, where two profiles meet."""

from __future__ import annotations

import math

import numpy as np
import pytest

from bem.geometry import shapes
from bem.geometry.regions.chains import chains, stretches
from bem.geometry.regions.coaxial import centre_of, seen_by, with_axis
from bem.geometry.regions.contact import contact
from bem.geometry.regions.inside import inside, inside_curve
from bem.geometry.regions.measures import measures
from bem.geometry.regions.meridian import cut_up, distance, holds, moved, parameter
from bem.geometry.revolved import Arc, Piece, Revolution, Segment, arc_through
from bem.geometry.shapes.round import ArcTo
from bem.geometry.surface import Surface

MOON = [(0.0, -1.0), ArcTo((1.0, 0.0), (0.2, 0.95)), (0.2, 0.5), ArcTo((0.6, 0.0), (0.0, -0.5))]
CLOSED = {
    "sphere": shapes.sphere(1.0),
    "torus": shapes.torus(1.0, 0.3),
    "cone": shapes.cone(1.0, 2.0),
    "washer": shapes.ring(inner=0.5, outer=1.0, height=0.7),
    "hollow": shapes.revolve(MOON),
}
PIECES = {
    "segment": Segment((0.2, -0.3), (1.1, 0.8)),
    "arc": arc_through((0.0, -1.0), (1.0, 0.0), (0.0, 1.0)),
    "long arc": arc_through((1.0, 0.1), (0.3, 0.0), (1.0, -0.1)),
    "clockwise": arc_through((0.5, 0.5), (0.8, 0.4), (0.9, 0.0)),
}

each_piece = pytest.mark.parametrize("piece", PIECES.values(), ids=PIECES)


def cloud(count: int = 400) -> np.ndarray:
    return np.random.default_rng(7).uniform([0.0, -1.3], [1.5, 1.3], size=(count, 2))


def line_of(piece: Piece, count: int) -> np.ndarray:
    return piece.at(np.linspace(0.0, 1.0, count))


@pytest.mark.parametrize("surface", CLOSED.values(), ids=CLOSED)
def test_inside_is_what_a_fine_polygon_says(surface: Surface) -> None:
    profile = surface.curve.profile
    line = np.concatenate([line_of(piece, 400) for piece in profile])
    mirror = line[::-1] * [-1.0, 1.0]
    loop = line if surface.curve.loops else np.concatenate([line, mirror])
    points = cloud()
    a, b = loop, np.roll(loop, -1, axis=0)
    y = points[:, 1:]
    spans = (a[:, 1] > y) != (b[:, 1] > y)
    with np.errstate(divide="ignore", invalid="ignore"):
        x = a[:, 0] + (y - a[:, 1]) * (b[:, 0] - a[:, 0]) / (b[:, 1] - a[:, 1])
    expected = (spans & (x > points[:, :1])).sum(axis=1) % 2 == 1
    off = np.min([distance(piece, points) for piece in profile], axis=0) > 1e-4
    assert off.sum() > 300 and expected.sum() > 20
    np.testing.assert_array_equal(holds(profile, points)[off], expected[off])


@pytest.mark.parametrize("surface", CLOSED.values(), ids=CLOSED)
def test_inside_agrees_with_rays_through_facets(surface: Surface) -> None:
    points = np.random.default_rng(3).uniform(-1.2, 1.2, size=(300, 3))
    faceted = Surface(surface.vertices, surface.faces)
    differ = inside_curve(surface.curve, points) != inside(faceted, points)
    assert np.count_nonzero(differ) < 6


def test_points_of_the_axis_lie_inside_too() -> None:
    points = np.array([[0.0, 0.0, 0.3], [0.0, 0.0, 1.2]])
    assert inside(shapes.sphere(1.0), points).tolist() == [True, False]


@each_piece
def test_distances_are_those_of_a_fine_polygon(piece: Piece) -> None:
    points = cloud()
    line = line_of(piece, 4001)
    expected = np.linalg.norm(points[:, None] - line, axis=2).min(axis=1)
    np.testing.assert_allclose(distance(piece, points), expected, atol=2e-4)


@each_piece
def test_parts_of_a_piece_make_up_the_whole(piece: Piece) -> None:
    cuts = [0.0, 0.21, 0.8, 1.0]
    parts = cut_up(piece, cuts)
    assert [part.start for part in parts[1:]] == [part.end for part in parts[:-1]]
    t = np.linspace(0.0, 1.0, 11)
    for part, low, high in zip(parts, cuts[:-1], cuts[1:], strict=True):
        np.testing.assert_allclose(part.at(t), piece.at(low + (high - low) * t), atol=1e-14)
    np.testing.assert_allclose(parameter(piece, parts[0].at(np.ones(1))), [0.21], atol=1e-14)


@each_piece
@pytest.mark.parametrize("along", [2.0, -2.0])
def test_moved_pieces(piece: Piece, along: float) -> None:
    t = np.linspace(0.0, 1.0, 11)
    expected = piece.at(t) * [2.0, along] + [0.0, 0.7]
    np.testing.assert_allclose(moved(piece, 2.0, along, 0.7).at(t), expected, atol=1e-14)


def test_crossings_lie_on_both_profiles() -> None:
    ball, rod = shapes.sphere(1.0).curve.profile, shapes.cylinder(0.6, 3.0).curve.profile
    found = contact(ball, rod, 1e-9)
    assert len(found.touching) == 0
    z = np.array([float(ball[0].at(np.array(s))[1]) for s in found.cuts])
    np.testing.assert_allclose(z, [-0.8, 0.8], atol=1e-12)
    assert contact(rod, ball, 1e-9).cuts == pytest.approx([1.0 + 0.7 / 3.0, 1.0 + 2.3 / 3.0])


def test_faces_in_one_plane_coincide_as_far_as_both_reach() -> None:
    low = shapes.cylinder(1.0, 2.0).curve.profile
    high = tuple(moved(p, 1.0, 1.0, 1.5) for p in shapes.cylinder(0.4, 1.0).curve.profile)
    found = contact(low, high, 1e-9)
    assert found.cuts == pytest.approx([2.6])
    assert found.touching == pytest.approx(np.array([[2.6, 3.0]]))
    found = contact(high, low, 1e-9)
    assert len(found.cuts) == 0
    assert found.touching.tolist() == [[0.0, 1.0]]


@pytest.mark.parametrize("depth", [-5e-7, 0.0, 5e-7])
def test_curves_that_only_touch_are_not_cut(depth: float) -> None:
    wire = shapes.torus(1.0, 0.2).curve.profile
    tube = (Segment((1.2 - depth, -1.0), (1.2 - depth, 1.0)),)
    for own, other in ((wire, tube), (tube, wire)):
        found = contact(own, other, 1e-6)
        assert len(found.touching) == 0
        assert all(abs(s - 0.5) < 1e-12 for s in found.cuts)


def test_stretches_that_were_cut_for_nothing_are_one_piece_again() -> None:
    curve = shapes.torus(1.0, 0.2).curve
    line = stretches(curve, np.array([0.3, 0.3 + 1e-9, 1.4]), 1e-8)
    assert [stretch.high for stretch in line] == [0.3, 1.0, 1.4, 2.0]
    ((_, whole),) = chains(curve, line, [(0, 1)] * 4)
    assert whole.profile == curve.profile and whole.loops
    (_, one), (_, other) = chains(curve, line, [(0, 1), (0, 2), (0, 2), (0, 1)])
    assert one.joined == other.joined == (True, True)
    total = measures(one).volume + measures(other).volume
    assert total == pytest.approx(measures(curve).volume, rel=1e-12)


def test_an_ellipsoid_with_another_axis_is_the_same_ellipsoid() -> None:
    ball = shapes.ellipsoid(1.0, 2.0, 3.0).placed(np.eye(3), np.array([0.3, 0.2, 0.1])).curve
    other = with_axis(ball, np.array([1.0, 2.0, -1.0]))
    u, s = np.random.default_rng(2).random((2, 50))
    local = (other.point(u, s) - [0.3, 0.2, 0.1]) / [1.0, 2.0, 3.0]
    np.testing.assert_allclose(np.linalg.norm(local, axis=1), 1.0, atol=1e-13)
    np.testing.assert_allclose(centre_of(other), [0.3, 0.2, 0.1], atol=1e-15)
    ring = other.point(np.arange(8) / 8.0, 0.3) @ [1.0, 2.0, -1.0]
    assert np.ptp(ring) < 1e-13


def test_what_shares_the_axis() -> None:
    rod = shapes.cylinder(1.0, 2.0).placed(2.0 * np.eye(3), np.zeros(3)).curve
    ball = shapes.sphere(1.0)
    aside = ball.placed(np.eye(3), np.array([0.1, 0.0, 0.0])).curve
    above = ball.placed(np.eye(3), np.array([0.0, 0.0, 1.0])).curve
    assert seen_by(rod, aside, 1e-6) is None
    (arc,) = seen_by(rod, above, 1e-6)
    assert isinstance(arc, Arc) and arc.radius == pytest.approx(0.5)
    assert arc.centre == pytest.approx((0.0, 0.5))
    tilted = Revolution(rod.profile, rod.matrix @ turned_about_x(1e-3), rod.shift)
    assert seen_by(rod, tilted, 1e-6) is None
    upside_down = Revolution(rod.profile, rod.matrix @ np.diag([1, -1, -1]), rod.shift)
    assert len(seen_by(rod, upside_down, 1e-6)) == 3


def turned_about_x(angle: float) -> np.ndarray:
    c, s = math.cos(angle), math.sin(angle)
    return np.array([[1, 0, 0], [0, c, -s], [0, s, c]])


@pytest.mark.parametrize("name", ["sphere", "ellipsoid", "torus", "cylinder"])
def test_measures_are_those_of_the_formulas(name: str) -> None:
    surface, volume = {
        "sphere": (shapes.sphere(2.0), 32.0 * math.pi / 3.0),
        "ellipsoid": (shapes.ellipsoid(1.0, 2.0, 3.0), 8.0 * math.pi),
        "torus": (shapes.torus(3.0, 1.0), 6.0 * math.pi**2),
        "cylinder": (shapes.cylinder(1.0, 3.0), 3.0 * math.pi),
    }[name]
    found = measures(surface.placed(turned_about_x(0.4), np.ones(3)).curve)
    assert found.volume == pytest.approx(volume, rel=1e-12)
    np.testing.assert_allclose(found.vector_area, 0.0, atol=1e-12)
