"""Panels on curved surfaces: no cracks, on the surface, graded, aware of what they miss."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Callable
from functools import reduce

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bem.geometry import shapes
from bem.geometry.revolved import Revolution
from bem.panels.curved import CurvedFamily

AXIS = np.array([1.0, 2.0, -0.5]) / math.sqrt(5.25)
SKEW = np.array([[0.0, -AXIS[2], AXIS[1]], [AXIS[2], 0.0, -AXIS[0]], [-AXIS[1], AXIS[0], 0.0]])
TURN = np.eye(3) + math.sin(1.0) * SKEW + (1.0 - math.cos(1.0)) * SKEW @ SKEW
SHIFT = np.array([0.3, -0.2, 0.7])

CLOSED = {
    "sphere": (shapes.sphere(1.0), 4.0 * math.pi / 3.0),
    "cylinder": (shapes.cylinder(1.0, 2.0), 2.0 * math.pi),
    "torus": (shapes.torus(2.0, 1.0), 4.0 * math.pi**2),
    "ellipsoid": (shapes.ellipsoid(3.0, 2.0, 1.0), 8.0 * math.pi),
    "hemisphere": (shapes.hemisphere(1.0), 2.0 * math.pi / 3.0),
}
OPEN = {
    "disc": (shapes.disc(1.0), math.pi),
    "annulus": (shapes.annulus(0.5, 1.0), 0.75 * math.pi),
    "elliptic disc": (shapes.disc(1.0).placed(np.diag([2.0, 1.0, 1.0]), SHIFT), 2.0 * math.pi),
}
INSIDE = {"torus": np.array([2.1, 0.2, 0.1]), "hemisphere": np.array([0.0, 0.1, -0.4])}

HOW_FAR_OFF: dict[str, Callable[[np.ndarray], np.ndarray]] = {
    "sphere": lambda x: np.linalg.norm(x, axis=-1) - 1.0,
    "cylinder": lambda x: np.maximum(np.hypot(x[..., 0], x[..., 1]), np.abs(x[..., 2])) - 1.0,
    "torus": lambda x: np.hypot(np.hypot(x[..., 0], x[..., 1]) - 2.0, x[..., 2]) - 1.0,
    "ellipsoid": lambda x: np.linalg.norm(x / [3.0, 2.0, 1.0], axis=-1) - 1.0,
}

Orders = list[tuple[int, int]]
orders = st.lists(st.tuples(st.integers(0, 2**31), st.integers(0, 2)), min_size=1, max_size=6)
"""Refinements: a seed, and whether all over in both directions, or near one point in one."""


def start(name: str, placed: bool = False) -> CurvedFamily:
    curve = (CLOSED | OPEN)[name][0].curve
    return CurvedFamily.start(curve.placed(TURN, SHIFT) if placed else curve)


def refined_once(family: CurvedFamily, order: tuple[int, int]) -> CurvedFamily:
    rng = np.random.default_rng(order[0])
    count = len(family.corners)
    if order[1] == 2:
        return family.refine(rng.random(count) < 0.25, rng.integers(0, 2, count))[0]
    spot = family.corners[rng.integers(count), 0]
    marked = np.any(np.all(family.corners == spot, axis=2), axis=1)
    return family.refine(marked, np.full(count, order[1]))[0]


def refined(family: CurvedFamily, how: Orders) -> CurvedFamily:
    return reduce(refined_once, how, family)


def uniform(family: CurvedFamily, rounds: int) -> CurvedFamily:
    for _ in range(rounds):
        for along in (0, 1):
            count = len(family.corners)
            family, _ = family.refine(np.ones(count, dtype=bool), np.full(count, along))
    return family


def normals(corners: np.ndarray) -> np.ndarray:
    """Area vectors."""
    return 0.5 * np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])


def areas(family: CurvedFamily) -> np.ndarray:
    return np.linalg.norm(normals(family.corners), axis=1)


def triangles(corners: np.ndarray) -> np.ndarray:
    return np.concatenate([corners[:, [0, 1, 2]], corners[:, [0, 2, 3]]])


def solid_angle(corners: np.ndarray, point: np.ndarray) -> float:
    """Sum over triangles (van Oosterom and Strackee 1983)."""
    a, b, c = np.moveaxis(triangles(corners) - point, 1, 0)
    ra, rb, rc = (np.linalg.norm(v, axis=1) for v in (a, b, c))
    over = np.einsum("ij,ij->i", a, np.cross(b, c))
    ab, bc, ca = (np.einsum("ij,ij->i", p, q) for p, q in ((a, b), (b, c), (c, a)))
    under = ra * rb * rc + ab * rc + bc * ra + ca * rb
    return float(np.sum(2.0 * np.arctan2(over, under)))


def volume(family: CurvedFamily) -> float:
    a, b, c = np.moveaxis(triangles(family.corners), 1, 0)
    return float(np.einsum("ij,ij->", a, np.cross(b, c))) / 6.0


def sides(corners: np.ndarray) -> Counter:
    """Directed sides of all panels by the exact coordinates of their ends."""
    found: Counter = Counter()
    for panel in corners + 0.0:
        ends = [tuple(corner) for corner in panel]
        pairs = zip(ends, ends[1:] + ends[:1], strict=True)
        found.update((a, b) for a, b in pairs if a != b)
    return found


def unmatched(corners: np.ndarray) -> list:
    """Sides that are not the side of exactly one neighbour, run through the other way."""
    found = sides(corners)
    return [(a, b) for (a, b), n in found.items() if n != 1 or found[(b, a)] != 1]


@pytest.mark.parametrize("name", CLOSED)
@settings(max_examples=12, deadline=None)
@given(how=orders)
def test_closed_bodies_stay_watertight(name: str, how: Orders) -> None:
    family = refined(start(name, placed=True), how)
    point = TURN @ INSIDE.get(name, np.array([0.1, 0.2, 0.1])) + SHIFT
    assert abs(solid_angle(family.corners, point) - 4.0 * math.pi) < 1e-12
    assert unmatched(family.corners) == []


@pytest.mark.parametrize("name", OPEN)
@settings(max_examples=8, deadline=None)
@given(how=orders)
def test_sheets_have_no_cracks_but_their_rims(name: str, how: Orders) -> None:
    family = refined(start(name), how)
    lonely = unmatched(family.corners)
    assert len(lonely) == np.count_nonzero(family.rim_width)
    assert np.all(family.rim_width >= 0.0)


@pytest.mark.parametrize("name", HOW_FAR_OFF)
@settings(max_examples=10, deadline=None)
@given(how=orders)
def test_every_corner_lies_on_the_true_surface(name: str, how: Orders) -> None:
    family = refined(start(name), how)
    assert (
        np.abs(HOW_FAR_OFF[name](family.corners)).max() < 1e-15 * np.abs(family.corners).max() * 4
    )


@pytest.mark.parametrize("name", CLOSED | OPEN)
@settings(max_examples=10, deadline=None)
@given(how=orders)
def test_panels_are_planar_convex_and_face_outward(name: str, how: Orders) -> None:
    family = refined(start(name, placed=True), how)
    corners, curve = family.corners, family.grid.surface
    unit = normals(corners) / areas(family)[:, None]
    size = np.linalg.norm(corners - np.roll(corners, 1, axis=1), axis=2).max(axis=1)
    lift = np.einsum("ij,ij->i", unit, corners[:, 3] - corners[:, 0])
    assert np.abs(lift).max() <= 1e-12 * size.max()
    assert np.all(np.abs(lift) <= 1e-12 * size)
    step = np.roll(corners, -1, axis=1) - corners
    turns = np.einsum("nki,ni->nk", np.cross(np.roll(step, 1, axis=1), step), unit)
    assert turns.min() > -1e-12 * size.max() ** 2
    box = family.box[family.leaf]
    u, s = (box[:, 0] + box[:, 1]) // 2, (box[:, 2] + box[:, 3]) // 2
    outward = curve.normal(u / family.grid.period, family.grid.along(s))
    assert np.einsum("ij,ij->i", outward, unit).min() > 0.6


@pytest.mark.parametrize("name", CLOSED | OPEN)
@settings(max_examples=10, deadline=None)
@given(how=orders, mark=st.integers(0, 2**31))
def test_unchanged_panels_come_first_and_are_named(name: str, how: Orders, mark: int) -> None:
    family = refined(start(name), how)
    count = len(family.corners)
    marked = np.zeros(count, dtype=bool)
    marked[mark % count] = True
    finer, kept = family.refine(marked, np.zeros(count, dtype=int))
    assert np.all(np.diff(kept) > 0)
    assert not np.any(marked[kept])
    for field in ("corners", "offset", "rim_offset", "rim_width"):
        assert np.array_equal(getattr(finer, field)[: len(kept)], getattr(family, field)[kept])


def test_refining_one_panel_leaves_those_far_from_it_alone() -> None:
    family = uniform(start("sphere"), 1)
    marked = np.arange(len(family.corners)) == 40
    _, kept = family.refine(marked, np.zeros(len(marked), dtype=int))
    touched = np.setdiff1d(np.arange(len(marked)), kept)
    spots = {corner.tobytes() for corner in family.corners[40]}
    assert 40 in touched
    for k in touched:
        assert not spots.isdisjoint(corner.tobytes() for corner in family.corners[k])


def test_nothing_marked_changes_nothing() -> None:
    family = refined(start("torus"), [(1, 2), (2, 0), (3, 2)])
    count = len(family.corners)
    same, kept = family.refine(np.zeros(count, dtype=bool), np.ones(count, dtype=int))
    assert np.array_equal(same.corners, family.corners)
    assert np.array_equal(kept, np.arange(count))


@pytest.mark.parametrize("along", [0, 1])
def test_a_marked_panel_is_halved_along_the_side_asked_for(along: int) -> None:
    family = CurvedFamily.start(shapes.tube(1.0, 4.0).curve)
    marked = np.zeros(len(family.corners), dtype=bool)
    marked[5] = True
    finer, kept = family.refine(marked, np.full(len(marked), along))
    a, b, c, _ = family.corners[5]
    ends = (a, b) if along == 0 else (b, c)
    fresh = {tuple(p.round(12)) for p in finer.corners.reshape(-1, 3)}
    fresh -= {tuple(p.round(12)) for p in family.corners.reshape(-1, 3)}
    assert len(fresh) == 2
    middle = 0.5 * (ends[0] + ends[1])
    if along == 0:
        middle[:2] /= np.hypot(*middle[:2])
    assert tuple(middle.round(12)) in fresh
    assert len(kept) < len(family.corners)


@pytest.mark.parametrize("along", [0, 1])
def test_marked_triangles_lead_to_finer_leaves_in_the_direction_asked(along: int) -> None:
    family = refined(start("sphere"), [(1, 2)])
    triangle = np.all(family.corners[:, 2] == family.corners[:, 3], axis=1)
    inner = triangle & (family.pattern[family.leaf] > 0) & (family.pattern[family.leaf] < 16)
    index = int(np.flatnonzero(inner)[0])
    marked = np.arange(len(inner)) == index
    finer, _ = family.refine(marked, np.full(len(inner), along))
    box = family.box[family.leaf[index]]
    low, high = (0, 1) if along == 0 else (2, 3)
    within = np.all(finer.box[:, ::2] >= box[::2], axis=1) & np.all(
        finer.box[:, 1::2] <= box[1::2], axis=1
    )
    assert np.all(np.ptp(finer.box[within][:, [low, high]], axis=1) < box[high] - box[low])


@pytest.mark.parametrize("name", CLOSED)
def test_offsets_add_up_to_the_volume_that_panels_miss(name: str) -> None:
    """Panels fill the body to second order in their size, with their offsets to sixth."""
    surface, exact = CLOSED[name]
    bare, full = [], []
    for rounds in range(3):
        family = uniform(CurvedFamily.start(surface.curve), rounds)
        bare.append(1.0 - volume(family) / exact)
        full.append(bare[-1] - float(areas(family) @ family.offset) / exact)
    assert bare[0] > 3.0 * bare[1] > 9.0 * bare[2] > 0.0
    assert abs(full[0]) < 1e-4
    assert abs(full[0]) > 40.0 * abs(full[1]) > 1600.0 * abs(full[2])


@settings(max_examples=12, deadline=None)
@given(how=orders)
def test_offsets_add_up_after_any_refinement(how: Orders) -> None:
    for name in ("sphere", "ellipsoid"):
        family = refined(start(name), how)
        exact = CLOSED[name][1]
        assert volume(family) + areas(family) @ family.offset == pytest.approx(exact, rel=1e-4)


def mean_height_over(corners: np.ndarray) -> float:
    """Mean distance from a panel to the unit sphere about the origin, along the panel's normal."""
    nodes, weights = np.polynomial.legendre.leggauss(12)
    a, b = np.meshgrid(0.5 * nodes + 0.5, 0.5 * nodes + 0.5, indexing="ij")
    p = np.stack([(1 - a) * (1 - b), a * (1 - b), a * b, (1 - a) * b], axis=-1) @ corners
    by_a = (1 - b)[..., None] * (corners[1] - corners[0]) + b[..., None] * (corners[2] - corners[3])
    by_b = (1 - a)[..., None] * (corners[3] - corners[0]) + a[..., None] * (corners[2] - corners[1])
    weight = np.linalg.norm(np.cross(by_a, by_b), axis=-1) * np.outer(weights, weights)
    unit = normals(corners[None])[0]
    unit = unit / np.linalg.norm(unit)
    height = p @ unit
    rise = np.sqrt(1.0 - np.sum(p * p, axis=-1) + height**2) - height
    return float(np.sum(weight * rise) / np.sum(weight))


def test_offset_is_the_mean_distance_to_second_order() -> None:
    errors = []
    for rounds in range(4):
        family = uniform(start("sphere"), rounds)
        true = np.array([mean_height_over(c) for c in family.corners])
        errors.append(np.abs(family.offset / true - 1.0).max())
    assert errors[0] < 0.1
    assert np.all(np.array(errors[:-1]) > 3.0 * np.array(errors[1:]))


def test_offset_is_signed_by_the_normal() -> None:
    assert np.all(CurvedFamily.start(shapes.bowl(1.0).curve).offset > 0.0)
    waist = shapes.revolve([(2.0, -1.0), shapes.ArcTo((1.0, 0.0), (2.0, 1.0))])
    assert np.all(CurvedFamily.start(waist.curve, around=64).offset < 0.0)


def test_flat_faces_have_no_offset() -> None:
    family = uniform(start("cylinder"), 1)
    cap = np.ptp(family.corners[..., 2], axis=1) == 0.0
    assert np.abs(family.offset[cap]).max() < 1e-16
    assert np.all(family.offset[~cap] > 1e-3)


@pytest.mark.parametrize("name", OPEN)
@settings(max_examples=8, deadline=None)
@given(how=orders)
def test_rim_offsets_add_up_to_the_area_that_panels_miss(name: str, how: Orders) -> None:
    exact = OPEN[name][1]
    family = refined(start(name), how)
    area = areas(family)
    assert np.abs(family.offset).max() < 1e-15
    assert area.sum() + area @ family.rim_offset == pytest.approx(exact, rel=3e-6)


def test_rim_offset_is_two_thirds_of_the_sagitta() -> None:
    family = uniform(start("annulus"), 3)
    outer = family.rim_offset > 0.0
    inner = family.rim_offset < 0.0
    angle = 2.0 * math.pi / 64
    for radius, which, sign in ((1.0, outer, 1.0), (0.5, inner, -1.0)):
        assert np.count_nonzero(which) == 64
        sagitta, chord = radius * (1.0 - math.cos(angle / 2)), 2.0 * radius * math.sin(angle / 2)
        beyond = (family.rim_offset * areas(family))[which]
        np.testing.assert_allclose(beyond, sign * 2.0 / 3.0 * sagitta * chord, rtol=1e-3)
        width = math.cos(angle / 2) * 0.5 / 16
        np.testing.assert_allclose(family.rim_width[which], width, rtol=1e-12)
    assert np.all(family.rim_width[~(outer | inner)] == 0.0)


def test_rim_of_a_tube_moves_with_its_panels_only() -> None:
    family = CurvedFamily.start(shapes.tube(1.0, 2.0).curve)
    assert np.count_nonzero(family.rim_width) == 16
    assert np.abs(family.rim_offset).max() < 1e-15


def near_rim(family: CurvedFamily) -> np.ndarray:
    """Panels of a unit cylinder of length 2 with a corner on the upper edge."""
    on_edge = (family.corners[..., 2] == 1.0) & (
        np.abs(np.hypot(family.corners[..., 0], family.corners[..., 1]) - 1.0) < 1e-12
    )
    return on_edge.any(axis=1)


def test_grading_towards_an_edge_adds_strips_and_nothing_else() -> None:
    family = start("cylinder")
    for _ in range(16):
        before = len(family.corners)
        family, _ = family.refine(near_rim(family), np.ones(before, dtype=int))
        assert len(family.corners) == before + 16
    depth = np.linalg.norm(family.corners[:, 1] - family.corners[:, 2], axis=1).min()
    assert depth < 1e-5
    assert unmatched(family.corners) == []


def test_grading_towards_one_point_of_an_edge_stays_local() -> None:
    family, spot = start("cylinder"), np.array([1.0, 0.0, 1.0])
    for k in range(20):
        marked = np.any(np.all(family.corners == spot, axis=2), axis=1)
        family, _ = family.refine(marked, np.full(len(marked), k % 2))
    assert len(family.corners) < 400
    size = np.linalg.norm(family.corners - np.roll(family.corners, 1, axis=1), axis=2).max(axis=1)
    assert size.min() < 2e-3
    assert abs(solid_angle(family.corners, np.zeros(3)) - 4.0 * math.pi) < 1e-12


def test_thin_strips_get_no_points_that_would_stand_out_of_them() -> None:
    """Beside a finer ring, a strip thinner than the bulge of its sides is cut like the ring."""
    family = start("cylinder")
    for _ in range(8):
        family, _ = family.refine(near_rim(family), np.ones(len(family.corners), dtype=int))
    marked = near_rim(family)
    marked &= np.arange(len(marked)) == np.flatnonzero(marked)[0]
    family, _ = family.refine(marked, np.zeros(len(marked), dtype=int))
    unit = normals(family.corners) / areas(family)[:, None]
    middle = family.corners.mean(axis=1)
    upright = np.abs(unit[:, 2])
    on_cap = np.abs(np.abs(middle[:, 2]) - 1.0) < 1e-12
    np.testing.assert_allclose(upright[on_cap], 1.0, atol=1e-12)
    assert upright[~on_cap].max() < 0.3


def test_refinement_ends_where_leaves_are_as_small_as_they_can_be() -> None:
    family, spot = start("sphere"), np.array([1.0, 0.0, 0.0])
    for k in range(70):
        marked = np.any(np.all(family.corners == spot, axis=2), axis=1)
        family, kept = family.refine(marked, np.full(len(marked), k % 2))
    assert len(kept) == len(family.corners)
    assert np.all(areas(family) > 0.0)
    assert abs(solid_angle(family.corners, np.zeros(3)) - 4.0 * math.pi) < 1e-12


@pytest.mark.parametrize("name", CLOSED | OPEN)
def test_starting_panels_are_few_and_compact(name: str) -> None:
    family = start(name)
    assert 16 <= len(family.corners) <= 64
    side = np.linalg.norm(family.corners - np.roll(family.corners, 1, axis=1), axis=2)
    assert np.all(side.max(axis=1) ** 2 < 10.0 * areas(family))


def test_starting_mesh_suits_slender_bodies() -> None:
    ring = CurvedFamily.start(shapes.torus(1.0, 0.01).curve)
    coin = CurvedFamily.start(shapes.cylinder(1.0, 0.001).curve)
    rod = CurvedFamily.start(shapes.cylinder(0.001, 1.0).curve)
    assert (ring.grid.around, coin.grid.around, rod.grid.around) == (32, 8, 8)
    assert max(len(f.corners) for f in (ring, coin, rod)) <= 200


def test_counts_of_the_starting_mesh_can_be_chosen() -> None:
    family = CurvedFamily.start(shapes.cylinder(1.0, 2.0).curve, around=12, along=(2, 5, 3))
    assert len(family.corners) == 12 * 10
    assert unmatched(family.corners) == []


def test_family_scales_with_its_surface() -> None:
    curve: Revolution = shapes.disc(1.0).curve
    small = CurvedFamily.start(curve.placed(1e-6 * np.eye(3), np.zeros(3)))
    large = CurvedFamily.start(curve)
    np.testing.assert_allclose(small.rim_offset, large.rim_offset, rtol=1e-12, atol=1e-15)
    np.testing.assert_allclose(small.rim_width, 1e-6 * large.rim_width, rtol=1e-12, atol=1e-20)
