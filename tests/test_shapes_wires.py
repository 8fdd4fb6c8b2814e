"""Wires along a path: facets on the true surface, frames without twist, and what is refused."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from shape_measures import area, bend_of_quads, is_closed, polygon_factor, side_counts, volume

import bem
from bem.errors import UsageError
from bem.geometry.shapes.wires import AROUND
from bem.geometry.surface import Surface

ELL = [(0, 0, 0), (2, 0, 0), (2, 2, 0)]
SPACE = [(0, 0, 0), (2, 0, 0), (2, 2, 0), (2, 2, 2), (3, 3, 4)]
FRAME = [(0, 0, 0), (2, 0, 0), (2, 3, 0), (0, 3, 0), (0, 0, 0)]
SHARE = polygon_factor(AROUND)


def bend_length(bend_radius: float, degrees: float) -> float:
    """Length of the polygon through the sections of a bend that stand 15 degrees apart."""
    return 2.0 * bend_radius * math.tan(math.radians(7.5)) * degrees / 15.0


WIRES = {
    "straight square": (bem.wire([(0, 0, 0), (1, 2, 3)], side=0.1), 0.01 * math.sqrt(14.0)),
    "mitred": (bem.wire(ELL, side=0.1), 0.04),
    "mitred frame": (bem.wire(FRAME, side=0.1), 0.1),
    "mitred in space": (bem.wire(SPACE, side=0.1), None),
    "round": (bem.wire(ELL, 0.1, bend_radius=0.3), None),
    "round in space": (bem.wire(SPACE, 0.1, bend_radius=0.3), None),
    "round frame": (bem.wire(FRAME, 0.1, bend_radius=0.3), None),
    "square with bends": (bem.wire(ELL, side=0.1, bend_radius=0.2), None),
    "square in space": (bem.wire(SPACE, side=0.1, bend_radius=0.2), None),
    "bends without a straight between": (
        bem.wire([(0, 0, 0), (1, 0, 0), (1, 0.5, 0), (0, 0.5, 0)], 0.1, bend_radius=0.25),
        None,
    ),
}


@pytest.mark.parametrize(("surface", "exact"), WIRES.values(), ids=WIRES)
def test_wires_are_closed_outward_with_flat_facets(surface: Surface, exact: float | None) -> None:
    assert np.all(side_counts(surface) == 2) and is_closed(surface)
    assert bend_of_quads(surface) < 1e-14
    assert volume(surface) > 0.0
    if exact is not None:
        assert volume(surface) == pytest.approx(exact, rel=1e-12)


def test_volume_of_bends_is_that_of_pappus() -> None:
    """Area of the section times the way of its middle, from theorems on prisms and revolution."""
    rod = 4.0 - 2.0 * 0.3 + 0.3 * math.pi / 2.0
    turned = bem.wire(ELL, 0.1, bend_radius=0.3, around=200)
    assert volume(turned) == pytest.approx(0.01 * math.pi * rod, rel=2e-3)
    square = bem.wire(ELL, side=0.1, bend_radius=0.2)
    assert volume(square) == pytest.approx(0.01 * (4.0 - 0.4 + 0.1 * math.pi), rel=2e-3)


def test_straight_round_wire_knows_its_true_surface() -> None:
    start, end = np.array([1.0, -2.0, 0.5]), np.array([2.0, 1.0, 4.5])
    rod = bem.wire([start, end], radius=0.25)
    assert rod.curve is not None
    u, s = np.random.default_rng(2).random((2, 100))
    points, along = rod.curve.point(u, 1.0 + s), (end - start) / np.linalg.norm(end - start)
    off = np.linalg.norm(np.cross(points - start, along), axis=1)
    np.testing.assert_allclose(off, 0.25, rtol=1e-13)
    np.testing.assert_allclose(rod.curve.point(0.0, 0.0), start, atol=1e-14)
    np.testing.assert_allclose(rod.curve.point(0.0, 3.0), end, atol=1e-14)
    assert volume(rod) > 0.0


def test_points_in_line_are_no_corners() -> None:
    straight = bem.wire([(0, 0, 0), (0, 0, 1), (0, 0, 3)], radius=0.1)
    assert straight.curve is not None
    np.testing.assert_allclose(straight.bounds, [[-0.1, -0.1, 0.0], [0.1, 0.1, 3.0]], atol=1e-15)


def test_corners_lie_on_the_true_surface_of_a_bent_wire() -> None:
    """Each at the wire's radius from the straight parts or from the arc; ends in their planes."""
    x, y, z = (wire := bem.wire(ELL, 0.1, bend_radius=0.3)).vertices[:-2].T
    to_first = np.hypot(y, z)
    to_second = np.hypot(x - 2.0, z)
    to_arc = np.hypot(np.hypot(x - 1.7, y - 0.3) - 0.3, z)
    off = np.where(x <= 1.7 + 1e-9, to_first, np.where(y >= 0.3 - 1e-9, to_second, to_arc))
    np.testing.assert_allclose(off, 0.1, rtol=1e-12)
    np.testing.assert_allclose(wire.vertices[-2:], [(0, 0, 0), (2, 2, 0)], atol=1e-14)
    assert np.count_nonzero(x < 1e-12) == AROUND == np.count_nonzero(y > 2.0 - 1e-12)


def test_loop_without_straight_parts_is_a_torus() -> None:
    square = [(1, 1, 0), (-1, 1, 0), (-1, -1, 0), (1, -1, 0), (1, 1, 0)]
    ring = bem.wire(square, 0.2, bend_radius=1.0, around=24)
    x, y, z = ring.vertices.T
    np.testing.assert_allclose(np.hypot(np.hypot(x, y) - 1.0, z), 0.2, rtol=1e-12)
    assert len(ring.vertices) == 24 * 24
    assert np.all(side_counts(ring) == 2)


def test_square_section_keeps_its_sides_without_twist() -> None:
    """In a plane path two sides stay level; a straight one stands level and upright."""
    flat = bem.wire(ELL, side=0.1, bend_radius=0.2)
    np.testing.assert_allclose(np.unique(flat.vertices[:, 2].round(12)), [-0.05, 0.05])
    rising = bem.wire([(0, 0, 0), (3, 0, 4)], side=1.0)
    np.testing.assert_allclose(np.unique(rising.vertices[:, 1].round(12)), [-0.5, 0.5])
    upright = bem.wire([(0, 0, 0), (0, 0, 4)], side=1.0)
    np.testing.assert_allclose(upright.bounds, [[-0.5, -0.5, 0.0], [0.5, 0.5, 4.0]], atol=1e-15)


def test_bends_do_not_twist_the_section() -> None:
    """From ring to ring each corner moves along the path or about the axis of the bend alone."""
    around, wire = 16, bem.wire(SPACE, 0.1, bend_radius=0.3, around=16)
    rings = wire.vertices[:-2].reshape(-1, around, 3)
    offsets = rings - rings.mean(axis=1, keepdims=True)
    for before, after in zip(offsets, offsets[1:], strict=False):
        normals = [np.cross(ring[0], ring[4]) for ring in (before, after)]
        axis = np.cross(*normals)
        if np.linalg.norm(axis) < 1e-9:
            np.testing.assert_allclose(before, after, atol=1e-12)
        else:
            np.testing.assert_allclose((after - before) @ axis, 0.0, atol=1e-12)


def test_facets_are_neither_slivers_nor_too_many() -> None:
    long = bem.wire([(0, 0, 0), (100, 0, 0), (100, 50, 0)], 1.0, bend_radius=3.0)
    quads = long.vertices[long.faces[long.faces[:, 3] >= 0]]
    sides = np.linalg.norm(np.roll(quads, -1, axis=1) - quads, axis=2)
    assert (sides.max(axis=1) / sides.min(axis=1)).max() < 12.1
    assert len(quads) <= 1700


def test_area_of_a_mitred_wire() -> None:
    assert area(bem.wire(ELL, side=0.1)) == pytest.approx(0.4 * 4.0 + 0.02, rel=1e-12)


TWISTED = [(0, 0, 0), (3, 0, 0), (4, 2, 1), (1, 1, 3), (0, 0, 0)]
BAD_CALLS: dict[str, tuple[Callable[[], Surface], str]] = {
    "no section": (lambda: bem.wire(ELL), "wire: found neither of radius and side; give one"),
    "two sections": (lambda: bem.wire(ELL, 0.1, side=0.1), "wire: found both of radius and side"),
    "thin": (lambda: bem.wire(ELL, 0.0), "radius: found 0.0; a length must be positive"),
    "one point": (lambda: bem.wire([(0, 0, 0)], 0.1), "path: found 1 points; give at least two"),
    "no path": (lambda: bem.wire(3, 0.1), "path: found 0 points"),
    "flat point": (
        lambda: bem.wire([(0, 0, 0), (1, 1)], 0.1),
        r"path point 2: found \(1, 1\); give three numbers \(x, y, z\)",
    ),
    "twice": (
        lambda: bem.wire([(0, 0, 0), (1, 0, 0), (1, 0, 0)], 0.1),
        r"path point 3: found \(1.0, 0.0, 0.0\) twice in a row; leave one out",
    ),
    "straight back": (
        lambda: bem.wire([(0, 0, 0), (2, 0, 0), (1, 0, 0)], 0.1, bend_radius=0.2),
        "path point 2: the path goes straight back here; give it a way round",
    ),
    "sharp round wire": (
        lambda: bem.wire(ELL, 0.1),
        "bend_radius: found 0.0; a round wire with corners needs one above its radius, which is 0",
    ),
    "negative bend": (
        lambda: bem.wire(ELL, side=0.1, bend_radius=-1.0),
        "bend_radius: found -1.0; a radius must not be negative",
    ),
    "tight bend of a square wire": (
        lambda: bem.wire(ELL, side=0.3, bend_radius=0.1),
        "bend_radius: found 0.1; at path point 2 the wire reaches 0.15 inwards",
    ),
    "wide bend": (
        lambda: bem.wire(ELL, 0.1, bend_radius=3.0),
        "bend_radius: the bends between path point 1 and path point 2 take 3 of a straight part "
        "of 2; make it smaller",
    ),
    "close mitres": (
        lambda: bem.wire([(0, 0, 0), (2, 0, 0), (2, 0.1, 0), (2, 0.1, 3)], side=0.3),
        "path: a straight part is 0.2 too short for the corners at its ends",
    ),
    "crossing itself": (
        lambda: bem.wire([*ELL, (1, -1, 0)], 0.1, bend_radius=0.2),
        r"path: the wire meets itself near \(\S+, 0, 0\); keep its parts apart",
    ),
    "grazing itself": (
        lambda: bem.wire([(0, 0, 0), (2, 0, 0), (2, 1, 0), (1, 1, 0), (1, 0, 0.19)], 0.1,
                         bend_radius=0.2),
        "path: the wire meets itself near",
    ),
    "twisted loop": (
        lambda: bem.wire(TWISTED, 0.1, bend_radius=0.2),
        "path: found a loop that does not lie in a plane, in which the section comes back turned",
    ),
}  # fmt: skip


@pytest.mark.parametrize(("call", "message"), BAD_CALLS.values(), ids=BAD_CALLS)
def test_what_is_off_gives_one_clear_line(call: Callable[[], Surface], message: str) -> None:
    with pytest.raises(UsageError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)


def test_parts_may_pass_each_other_closely() -> None:
    """A hairpin whose legs leave a gap of a tenth of the wire's radius."""
    hairpin = bem.wire([(0, 0, 0), (2, 0, 0), (2, 0.21, 0), (0, 0.21, 0)], 0.1, bend_radius=0.105)
    assert is_closed(hairpin) and bend_of_quads(hairpin) < 1e-14
