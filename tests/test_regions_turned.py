"""Curved bodies in the partition of space: regions, cuts and true surfaces."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
import pytest

from bem.errors import GeometryError
from bem.geometry import shapes
from bem.geometry.parts import INTERFACE, METAL, Part
from bem.geometry.planes import Plane
from bem.geometry.regions.measures import measures
from bem.geometry.regions.partition import Solid
from bem.geometry.regions.plane_cut import cut_at_plane
from bem.geometry.regions.turned import Turned, turned
from bem.geometry.surface import Surface

TOLERANCE = 1e-6
THIRD = 4.0 * math.pi / 3.0


def at(surface: Surface, *shift: float) -> Surface:
    return surface.placed(np.eye(3), np.array(shift))


def metal(surface: Surface, conductor: int = 0) -> Solid:
    return Solid(surface, "metal", conductor)


def skin(surface: Surface) -> Solid:
    return Solid(surface, "skin", 0)


def dielectric(surface: Surface) -> Solid:
    return Solid(surface, "dielectric")


class Case(NamedTuple):
    """Bodies, the (conductor, back, front, body) of each part, and volumes of the regions."""

    bodies: list[Solid]
    parts: list[tuple[int, int, int, int]]
    volumes: dict[int, float]


M, N = METAL, INTERFACE
CASES = {
    "coated sphere": Case(
        [metal(shapes.sphere(1.0)), dielectric(shapes.sphere(1.5))],
        [(0, M, 1, 0), (N, 1, 0, 1)],
        {1: THIRD * 2.375},
    ),
    "two coats": Case(
        [metal(shapes.sphere(1.0)), dielectric(shapes.sphere(2.0)), dielectric(shapes.sphere(1.5))],
        [(0, M, 2, 0), (N, 1, 0, 1), (N, 2, 1, 2)],
        {1: THIRD * 4.625, 2: THIRD * 2.375},
    ),
    "shell on a ball": Case(
        [skin(shapes.sphere(1.0)), dielectric(shapes.sphere(1.0))],
        [(0, 1, 0, 0)],
        {1: THIRD},
    ),
    "metal fills a ball": Case(
        [metal(shapes.sphere(1.0)), dielectric(shapes.sphere(1.0))], [(0, M, 0, 0)], {}
    ),
    "one ball twice": Case(
        [dielectric(shapes.sphere(1.0)), dielectric(shapes.sphere(1.0))],
        [(N, 2, 0, 0)],
        {2: THIRD},
    ),
    "rod cast in": Case(
        [metal(at(shapes.cylinder(0.3, 2.0), 0, 0, 0.5)), dielectric(shapes.cylinder(1.0, 1.5))],
        [(0, M, 1, 0), (0, M, 0, 0), (N, 1, 0, 1)],
        {1: math.pi * (1.5 - 0.09 * 1.25)},
    ),
    "coat flush with both ends": Case(
        [metal(shapes.cylinder(0.3, 2.0)), dielectric(shapes.cylinder(0.5, 2.0))],
        [(0, M, 0, 0), (0, M, 1, 0), (0, M, 0, 0), (N, 1, 0, 1)],
        {1: math.pi * 0.32},
    ),
    "coat flush with one end": Case(
        [metal(at(shapes.cylinder(0.3, 1.5), 0, 0, 0.25)), dielectric(shapes.cylinder(0.5, 2.0))],
        [(0, M, 1, 0), (0, M, 0, 0), (N, 1, 0, 1)],
        {1: math.pi * (0.5 - 0.09 * 1.5)},
    ),
    "ball half in a cylinder": Case(
        [metal(at(shapes.sphere(0.4), 0, 0, 0.5)), dielectric(shapes.cylinder(1.0, 1.0))],
        [(0, M, 1, 0), (0, M, 0, 0), (N, 1, 0, 1)],
        {1: math.pi - 0.5 * THIRD * 0.064},
    ),
    "ball on a cylinder": Case(
        [metal(at(shapes.sphere(0.4), 0, 0, 0.9)), dielectric(shapes.cylinder(1.0, 1.0))],
        [(0, M, 0, 0), (N, 1, 0, 1)],
        {1: math.pi},
    ),
    "stacked cylinders": Case(
        [dielectric(shapes.cylinder(1.0, 1.0)), dielectric(at(shapes.cylinder(0.6, 1.0), 0, 0, 1))],
        [(N, 1, 0, 0), (N, 1, 2, 0), (N, 2, 0, 1)],
        {1: math.pi, 2: 0.36 * math.pi},
    ),
    "balls that overlap": Case(
        [dielectric(shapes.sphere(1.0)), dielectric(at(shapes.sphere(1.0), 1, 0, 0))],
        [(N, 1, 0, 0), (N, 2, 0, 1), (N, 2, 1, 1)],
        {1: THIRD - math.pi * 5.0 / 12.0, 2: THIRD},
    ),
    "torus halfway in": Case(
        [metal(shapes.torus(1.0, 0.2)), dielectric(shapes.cylinder(1.0, 1.0))],
        [(0, M, 1, 0), (0, M, 0, 0), (N, 1, 0, 1), (N, 1, 0, 1)],
        {1: math.pi - 0.04 * math.pi**2 + THIRD * 0.008},
    ),
    "torus that touches from inside": Case(
        [metal(shapes.torus(1.0, 0.2)), dielectric(shapes.cylinder(1.2, 1.0))],
        [(0, M, 1, 0), (N, 1, 0, 1)],
        {1: 1.44 * math.pi - 2.0 * math.pi**2 * 0.04},
    ),
    "cone in a cylinder": Case(
        [metal(shapes.cone(0.5, 1.0)), dielectric(shapes.cylinder(0.5, 1.0))],
        [(0, M, 0, 0), (0, M, 1, 0), (N, 1, 0, 1)],
        {1: math.pi / 6.0},
    ),
    "ball eccentric in a ball": Case(
        [metal(at(shapes.sphere(0.3), 0.2, 0.1, 0.0)), dielectric(shapes.sphere(1.0))],
        [(0, M, 1, 0), (N, 1, 0, 1)],
        {1: THIRD * 0.973},
    ),
    "cylinders that touch along a line": Case(
        [dielectric(shapes.cylinder(0.5, 1.0)), dielectric(at(shapes.cylinder(0.5, 1.0), 1, 0, 0))],
        [(N, 1, 0, 0), (N, 2, 0, 1)],
        {1: 0.25 * math.pi, 2: 0.25 * math.pi},
    ),
    "disc amid a ball": Case(
        [skin(shapes.disc(2.0)), dielectric(shapes.sphere(1.0))],
        [(0, 1, 1, 0), (0, 0, 0, 0), (N, 1, 0, 1)],
        {1: THIRD},
    ),
}

each_case = pytest.mark.parametrize("case", CASES.values(), ids=CASES)


def turn(seed: int) -> np.ndarray:
    q, r = np.linalg.qr(np.random.default_rng(seed).normal(size=(3, 3)))
    return q * np.sign(np.diag(r)) * np.sign(np.linalg.det(q * np.sign(np.diag(r))))


def moved(bodies: list[Solid], seed: int, scale: float) -> list[Solid]:
    """Bodies turned and scaled together, each with rounding of its own."""
    rng = np.random.default_rng(seed)
    matrix, shift = scale * turn(seed), scale * rng.normal(size=3)
    out = []
    for body in bodies:
        noise = 1e-12 * scale * rng.normal(size=3)
        out.append(Solid(body.surface.placed(matrix, shift + noise), body.kind, body.conductor))
    return out


def signatures(parts: list[Part]) -> list[tuple[int, int, int, int]]:
    return [(part.conductor, part.back, part.front, part.body) for part in parts]


def leak(parts: list[Part], region: int) -> float:
    """Size of the sum of outward vector areas of a region's boundary."""
    total = np.zeros(3)
    for part in parts:
        sign = (part.back == region) - (part.front == region)
        total += sign * measures(part.surface.curve).vector_area
    return float(np.linalg.norm(total))


def volumes_of(parts: list[Part]) -> dict[int, float]:
    """Volume of each dielectric region, by the divergence theorem."""
    volumes: dict[int, float] = {}
    for part in parts:
        for region, sign in ((part.back, 1.0), (part.front, -1.0)):
            if region > 0:
                volume = sign * measures(part.surface.curve).volume
                volumes[region] = volumes.get(region, 0.0) + volume
    return volumes


def check(found: Turned, case: Case, scale: float) -> None:
    assert sorted(signatures(found.parts)) == sorted(case.parts)
    expected = {region: scale**3 * volume for region, volume in case.volumes.items()}
    assert volumes_of(found.parts) == pytest.approx(expected, rel=1e-8)
    for region in (METAL, *case.volumes):
        assert leak(found.parts, region) < 1e-9 * scale**2
    assert all(covered.all() for covered in found.covered.values())
    assert all(part.surface.curve is not None for part in found.parts)


@each_case
def test_regions_volumes_and_closed_boundaries(case: Case) -> None:
    check(turned(case.bodies, TOLERANCE), case, 1.0)


@each_case
@pytest.mark.parametrize(("seed", "scale"), [(1, 1e-3), (2, 40.0)])
def test_the_same_turned_scaled_and_rounded(case: Case, seed: int, scale: float) -> None:
    check(turned(moved(case.bodies, seed, scale), scale * TOLERANCE), case, scale)


@pytest.mark.parametrize("radius", [1.0 - 0.8e-6, 1.0 + 0.8e-6])
def test_radii_equal_within_the_tolerance_coincide(radius: float) -> None:
    bodies = [skin(shapes.sphere(radius)), dielectric(shapes.sphere(1.0))]
    assert signatures(turned(bodies, TOLERANCE).parts) == [(0, 1, 0, 0)]
    bodies = [metal(shapes.cylinder(radius, 1.0)), dielectric(shapes.cylinder(1.0, 2.0))]
    found = turned(bodies, TOLERANCE)
    assert sorted(signatures(found.parts)) == [(N, 1, 0, 1), (N, 1, 0, 1), *SLEEVED]


SLEEVED = [(0, M, 0, 0), (0, M, 1, 0), (0, M, 1, 0)]


@pytest.mark.parametrize("radius", [1.0 - 3e-6, 1.0 + 3e-6])
def test_radii_further_apart_leave_a_film(radius: float) -> None:
    bodies = [skin(shapes.sphere(radius)), dielectric(shapes.sphere(1.0))]
    side = 1 if radius < 1.0 else 0
    expected = [(0, side, side, 0), (N, 1, 0, 1)]
    assert signatures(turned(bodies, TOLERANCE).parts) == expected


@pytest.mark.parametrize("depth", [-1e-9, 0.0, 1e-12, 5e-7])
@pytest.mark.parametrize("top", [shapes.box(2.0, 2.0, 1.0), shapes.cylinder(1.0, 1.0)])
def test_a_ball_that_touches_a_face_is_not_cut(top: Surface, depth: float) -> None:
    ball = at(shapes.sphere(0.4), 0, 0, 0.9 - depth)
    found = turned([metal(ball), dielectric(top)], TOLERANCE)
    assert (0, 1) in found.apart
    (part, *_) = found.parts
    assert part.surface is ball and (part.back, part.front) == (METAL, 0)


def test_a_ball_that_dips_deeper_than_the_tolerance_is_cut() -> None:
    ball = at(shapes.sphere(0.4), 0, 0, 0.9 - 1e-4)
    found = turned([metal(ball), dielectric(shapes.cylinder(1.0, 1.0))], TOLERANCE)
    assert (0, M, 1, 0) in signatures(found.parts)


def test_conductors_do_not_cut_each_other() -> None:
    bodies = [metal(shapes.sphere(1.0)), metal(at(shapes.sphere(1.0), 3, 0, 0), 1)]
    found = turned([*bodies, dielectric(shapes.sphere(0.5))], TOLERANCE)
    assert (0, 1) in found.apart
    assert signatures(found.parts) == [(0, M, 0, 0), (1, M, 0, 1)]


def test_overlaps_and_contacts_are_told_and_nested_bodies_are_not() -> None:
    assert turned(CASES["stacked cylinders"].bodies, TOLERANCE).notes == [
        "dielectric 1 touches dielectric 2 over 1.131 m^2"
    ]
    assert turned(CASES["two coats"].bodies, TOLERANCE).notes == []
    assert turned(CASES["balls that overlap"].bodies, TOLERANCE).notes == [
        "dielectric 1 overlaps dielectric 2: there dielectric 2 counts"
    ]
    assert turned(CASES["ball half in a cylinder"].bodies, TOLERANCE).notes == [
        "dielectric 1 overlaps conductor 1: there conductor 1 counts"
    ]


BOARD = dielectric(shapes.box(2.0, 2.0, 1.0))
ON_BOARD = {
    "rod on it": (at(shapes.cylinder(0.3, 2.0), 0, 0, 1.5), [(0, M, 0, 0), (0, M, 1, 0)]),
    "rod sunk in": (at(shapes.cylinder(0.3, 2.0), 0, 0, 1.0), [(0, M, 0, 0), (0, M, 1, 0)]),
    "rod through it": (
        at(shapes.cylinder(0.3, 2.0), 0.1, 0, 0),
        [(0, M, 0, 0), (0, M, 0, 0), (0, M, 1, 0)],
    ),
    "ball half sunk": (at(shapes.sphere(0.4), 0.2, 0, 0.5), [(0, M, 0, 0), (0, M, 1, 0)]),
    "ellipsoid half sunk": (
        at(shapes.ellipsoid(0.2, 0.3, 0.4), 0.2, 0, 0.5),
        [(0, M, 0, 0), (0, M, 1, 0)],
    ),
    "ball inscribed in the side": (at(shapes.sphere(0.5), 1, 0, 0), [(0, M, 0, 0), (0, M, 1, 0)]),
    "rod inscribed in the top": (
        at(shapes.cylinder(1.0, 1.0), 0, 0, 1.0),
        [(0, M, 0, 0), (0, M, 1, 0)],
    ),
}


@pytest.mark.parametrize(("body", "expected"), ON_BOARD.values(), ids=ON_BOARD)
@pytest.mark.parametrize("seed", [3, 4])
def test_round_conductors_on_a_board(
    body: Surface, expected: list[tuple[int, int, int, int]], seed: int
) -> None:
    found = turned(moved([metal(body), BOARD], seed, 0.1), 0.1 * TOLERANCE)
    assert sorted(signatures(found.parts)) == expected
    assert leak(found.parts, METAL) < 1e-11
    assert not any(any(part.surface.curve.free_rims) for part in found.parts)
    assert found.apart == set()


def test_a_disc_on_a_board_keeps_its_free_rim() -> None:
    found = turned([skin(at(shapes.disc(0.3), 0, 0, 0.5)), BOARD], TOLERANCE)
    assert signatures(found.parts) == [(0, 0, 1, 0)]
    assert found.parts[0].surface.curve.free_rims == (False, True)


def test_a_disc_that_leaves_a_ball_goes_on_there() -> None:
    inner, outer = (
        part.surface.curve for part in turned(CASES["disc amid a ball"].bodies, TOLERANCE).parts[:2]
    )
    assert inner.free_rims == (False, False)
    assert outer.free_rims == (False, True)


def test_pins_through_a_bead_leave_its_ends_to_the_flat_partition() -> None:
    pins = [metal(at(shapes.cylinder(0.1, 3.0), 0.4 * s, 0, 0), k) for k, s in enumerate((-1, 1))]
    found = turned([*pins, dielectric(shapes.cylinder(1.0, 1.0))], TOLERANCE)
    assert found.covered[2].sum() * 3 == len(found.covered[2])
    assert found.apart == {(0, 1)}
    assert signatures([part for part in found.parts if part.body == 2]) == [(N, 1, 0, 2)]


ACROSS = {
    "rod lying half sunk": [metal(shapes.cylinder(0.3, 2.0).placed(turn(0), np.zeros(3))), BOARD],
    "ball at an edge": [metal(at(shapes.sphere(0.4), 1.0, 0, 0.5)), BOARD],
    "box in the side": [metal(at(shapes.box(0.3, 0.3, 0.3), 1, 0, 0))],
    "balls in a corner": [
        dielectric(shapes.sphere(0.5)),
        dielectric(at(shapes.sphere(0.5), 0.5, 0, 0)),
        dielectric(at(shapes.sphere(0.5), 0, 0.5, 0)),
    ],
}
ACROSS["box in the side"].append(dielectric(shapes.cylinder(1.0, 1.0)))


@pytest.mark.parametrize("bodies", ACROSS.values(), ids=ACROSS)
def test_bodies_cut_across_lose_their_curve_and_say_so(bodies: list[Solid]) -> None:
    found = turned(bodies, TOLERANCE)
    curved = [k for k, body in enumerate(bodies) if body.surface.curve is not None]
    assert [part.body for part in found.parts] == []
    assert len(found.notes) == len(curved)
    assert all("facets" in note for note in found.notes)
    assert all(found.stand_ins[k].curve is None for k in curved)
    assert not any(found.covered[k].any() for k in curved)
    assert found.apart == set()


def test_stand_ins_have_the_area_of_the_circle() -> None:
    found = turned([metal(at(shapes.sphere(0.4), 0, 0, 0.5)), BOARD], TOLERANCE)
    facets = found.stand_ins[0]
    ring = facets.vertices[np.abs(facets.vertices[:, 2] - 0.5) < 1e-12]
    x, y = ring[np.argsort(np.arctan2(ring[:, 1], ring[:, 0]))][:, :2].T
    area = 0.5 * abs(np.sum(x * np.roll(y, -1) - y * np.roll(x, -1)))
    assert area == pytest.approx(math.pi * 0.16, rel=1e-12)


CUT = {
    "sphere": (shapes.sphere(1.0), 2),
    "ellipsoid": (shapes.ellipsoid(1.0, 2.0, 3.0), 2),
    "cylinder": (shapes.cylinder(1.0, 2.0), 2),
    "torus": (shapes.torus(1.0, 0.3), 2),
    "tube": (shapes.tube(1.0, 1.0), 2),
    "dumb-bell": (shapes.revolve([(0, -2), (1, -1), (0.5, 0.0), (1, 1), (0, 2)]), 2),
    "funnel sheet": (shapes.revolve([(0.1, 1), (0.5, -1), (1, 1), (1.5, -1)]), 4),
}


@pytest.mark.parametrize(("surface", "count"), CUT.values(), ids=CUT)
def test_parts_on_both_sides_of_a_plane(surface: Surface, count: int) -> None:
    parts = cut_at_plane(surface, Plane(2, 0.2))
    assert len(parts) == count
    heights = [part.bounds[:, 2] - 0.2 for part in parts]
    assert all(low > -1e-12 or high < 1e-12 for low, high in heights)
    total = sum(measures(part.curve).vector_area for part in parts)
    assert total == pytest.approx(measures(surface.curve).vector_area, abs=1e-12)
    assert all(any(part.curve.joined) for part in parts)


def test_planes_that_only_touch_cut_nothing() -> None:
    for surface in (shapes.sphere(1.0), shapes.cylinder(1.0, 2.0), shapes.disc(1.0)):
        top = float(surface.bounds[1, 2])
        assert cut_at_plane(surface, Plane(2, top)) == [surface]


def test_an_ellipsoid_may_be_cut_by_any_plane_but_a_cylinder_may_not() -> None:
    assert len(cut_at_plane(shapes.ellipsoid(1.0, 2.0, 3.0), Plane(0, 0.5))) == 2
    with pytest.raises(GeometryError, match="otherwise than across its axis"):
        cut_at_plane(shapes.cylinder(1.0, 2.0), Plane(0, 0.5))
