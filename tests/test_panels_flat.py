"""Flat faces: patches and outlines, division into trapezoids, walls, grading, refinement."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import CUBE_QUADS, cube, cube_vertices, soup
from scenes import meshed_box, meshed_plate, moved, slivers, tidy

from bem.geometry import shapes
from bem.geometry.surface import Surface
from bem.panels.align import align_patches
from bem.panels.arrangement import trapezoids
from bem.panels.facing import FacingTable
from bem.panels.flat import FlatFamily
from bem.panels.mesh import Mesh
from bem.panels.planar import planar_patches
from bem.panels.split import mean_sides, split


def area_of(corners: np.ndarray) -> np.ndarray:
    """Areas of planar quadrilaterals (n, 4, 2 or 3)."""
    first, second = corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]
    if corners.shape[-1] == 2:
        return 0.5 * np.abs(first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0])
    return 0.5 * np.linalg.norm(np.cross(first, second), axis=1)


def is_convex(corners: np.ndarray, slack: float = 1e-12) -> bool:
    """Whether every quadrilateral (n, 4, 3) turns one way only."""
    step = np.roll(corners, -1, axis=1) - corners
    turn = np.cross(step, np.roll(step, -1, axis=1))
    normal = np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    return bool(np.all(np.einsum("nkc,nc->nk", turn, normal) >= -slack))


def polygon(points: list[tuple[float, float]], holes: tuple = ()) -> np.ndarray:
    """Segments (n, 2, 2) of an outline and its holes."""
    rings = [np.array(ring, dtype=float) for ring in (points, *holes)]
    return np.concatenate([np.stack([r, np.roll(r, -1, axis=0)], axis=1) for r in rings])


ELL = [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)]
SQUARE_RING = [(0, 0), (3, 0), (3, 3), (0, 3)]
HOLE = [(1, 1), (2, 1), (2, 2), (1, 2)]
STAR = [(0, 0), (2, 0.5), (4, 0), (3.5, 2), (4, 4), (2, 3.5), (0, 4), (0.5, 2)]
DIAMOND = [(1.5, 0.5), (2.5, 1.5), (1.5, 2.5), (0.5, 1.5)]


MESHES = {
    "12 triangles": cube(),
    "6 quadrilaterals": Surface(cube_vertices(), CUBE_QUADS),
    "irregular": meshed_box(4, jitter=0.3, seed=1),
    "fine": meshed_box(6),
    "slivers": slivers(30),
}


@pytest.mark.parametrize("name", MESHES)
@pytest.mark.parametrize("rounded", [False, True])
def test_any_mesh_of_a_cube_has_six_faces(name: str, rounded: bool) -> None:
    """However it is meshed and turned, and after rounding to single precision."""
    surface = MESHES[name]
    if rounded:
        surface = moved(surface)
        surface = Surface(surface.vertices.astype(np.float32).astype(float), surface.faces)
    patches = planar_patches(surface, 3)
    assert len(patches) == 6
    assert all(p.conductor == 3 and len(p.edges) == 4 for p in patches)
    areas = [abs(shoelace(p.edges)) for p in patches]
    assert areas == pytest.approx(np.ones(6), rel=1e-6)


def shoelace(edges: np.ndarray) -> float:
    """Area inside unordered segments that bound a convex region."""
    points = np.unique(edges.reshape(-1, 2).round(9), axis=0)
    middle = points.mean(axis=0)
    ring = points[np.argsort(np.arctan2(*(points - middle).T[::-1]))]
    after = np.roll(ring, -1, axis=0)
    return 0.5 * float(np.sum(ring[:, 0] * after[:, 1] - ring[:, 1] * after[:, 0]))


@pytest.mark.parametrize("pieces", [1, 2, 7])
def test_any_mesh_of_a_plate_is_one_face(pieces: int) -> None:
    patches = planar_patches(meshed_plate(pieces, jitter=0.3 if pieces > 2 else 0.0), 0)
    assert len(patches) == 1
    assert len(patches[0].edges) == 4
    assert patches[0].size == pytest.approx(np.sqrt(2.0))


def test_orientation_of_single_faces_is_irrelevant() -> None:
    faces = cube().faces.copy()
    flipped = faces.copy()
    flipped[::2, :3] = faces[::2, [0, 2, 1]]
    patches = planar_patches(Surface(cube().vertices, flipped), 0)
    assert len(patches) == 6
    assert all(len(p.edges) == 4 for p in patches)


def test_plate_with_a_hole_keeps_both_outlines() -> None:
    """Eight squares around a missing one: eight edges, and panels of the area left."""
    plate = meshed_plate(3)
    middles = soup(plate).mean(axis=1)[:, :2]
    inside = np.all(np.abs(middles) < 1 / 6, axis=1)
    holed = Surface(plate.vertices, plate.faces[~inside])
    patches = planar_patches(holed, 0)
    assert len(patches) == 1
    assert len(patches[0].edges) == 8
    corners = FlatFamily.start(patches).corners
    assert area_of(corners).sum() == pytest.approx(8 / 9)
    assert not np.any(np.all(np.abs(corners.mean(axis=1)[:, :2]) < 0.16, axis=1))


def test_bent_quadrilaterals_become_triangles() -> None:
    vertices = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0.1], [0, 1, 0]], dtype=float)
    patches = planar_patches(Surface(vertices, np.array([[0, 1, 2, 3]])), 0)
    assert len(patches) == 2


def test_a_gently_curved_strip_is_not_one_face() -> None:
    """Neighbours within the flatness tolerance of each other, but the whole is bent."""
    turn = np.linspace(0.0, 0.4, 400)
    arc = np.stack([np.sin(turn), 0.0 * turn, 1.0 - np.cos(turn)], axis=1)
    points = np.concatenate([arc, arc + (0.0, 1.0, 0.0)])
    n = len(turn)
    quads = [[k, k + 1, n + k + 1, n + k] for k in range(n - 1)]
    patches = planar_patches(Surface(points, np.array(quads)), 0)
    assert len(patches) > 100
    assert sum(area_of(p.faces).sum() for p in patches) == pytest.approx(0.4, rel=1e-5)


def test_rounded_faces_share_directions_after_alignment() -> None:
    """Axes of a turned and rounded box are exactly parallel or perpendicular."""
    surface = moved(cube())
    rounded = Surface(surface.vertices.astype(np.float32).astype(float), surface.faces)
    patches = align_patches(planar_patches(rounded, 0), rounded.extent)
    normals = np.array([p.axes[2] for p in patches])
    cosines = np.abs(normals @ normals.T)
    assert np.all((cosines < 1e-6) | (cosines > 1.0 - 1e-12))


REGIONS = {
    "square": (polygon(SQUARE_RING), 9.0),
    "ell": (polygon(ELL), 3.0),
    "hole": (polygon(SQUARE_RING, (HOLE,)), 8.0),
    "diamond hole": (polygon(SQUARE_RING, (DIAMOND,)), 7.0),
    "star": (polygon(STAR), 12.0),
}


@pytest.mark.parametrize("degrees", [0.0, 17.0, 45.0, 90.0])
@pytest.mark.parametrize("name", REGIONS)
def test_trapezoids_fill_the_region(name: str, degrees: float) -> None:
    """Areas add up, corners run around convexly, the parallel sides are level."""
    walls, area = REGIONS[name]
    angle = np.radians(degrees)
    turn = np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    pieces = np.array(trapezoids(walls @ turn, np.ones(len(walls), dtype=bool), 1e-9))
    assert area_of(pieces).sum() == pytest.approx(area, rel=1e-7)
    assert np.all(pieces[:, 0, 1] == pieces[:, 1, 1])
    assert np.all(pieces[:, 2, 1] == pieces[:, 3, 1])
    assert np.all(pieces[:, 1, 0] >= pieces[:, 0, 0] - 1e-12)
    assert np.all(pieces[:, 2, 0] >= pieces[:, 3, 0] - 1e-12)


@pytest.mark.parametrize(("name", "fewest"), [("square", 1), ("ell", 2), ("hole", 4)])
def test_trapezoids_are_few(name: str, fewest: int) -> None:
    walls = REGIONS[name][0]
    assert len(trapezoids(walls, np.ones(len(walls), dtype=bool), 1e-9)) == fewest


@given(st.integers(0, 10**6), st.integers(1, 6))
@settings(max_examples=40, deadline=None, derandomize=True)
def test_dividing_walls_change_no_area(seed: int, count: int) -> None:
    """Segments across a region divide it, whatever they cross, and no piece spans one."""
    random = np.random.default_rng(seed)
    outline = polygon(SQUARE_RING, (HOLE,))
    inner = random.uniform(-0.5, 3.5, (count, 2, 2))
    walls = np.concatenate([outline, inner])
    marks = np.arange(len(walls)) < len(outline)
    pieces = np.array(trapezoids(walls, marks, 1e-9))
    assert area_of(pieces).sum() == pytest.approx(8.0, rel=1e-6)
    for a, b in inner:
        points = a + np.linspace(0.01, 0.99, 25)[:, None] * (b - a)
        assert not np.any(deep_inside(pieces, points))


def deep_inside(pieces: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Which points lie well inside one of the convex pieces."""
    step = np.roll(pieces, -1, axis=1) - pieces
    length = np.maximum(np.linalg.norm(step, axis=2), 1e-300)
    offset = points[:, None, None] - pieces
    depth = (step[..., 0] * offset[..., 1] - step[..., 1] * offset[..., 0]) / length
    return (depth > 1e-6).all(axis=2).any(axis=1)


@given(st.integers(0, 10**6), st.sampled_from([0, 1]), st.floats(0.05, 0.95))
@settings(max_examples=30, deadline=None, derandomize=True)
def test_splitting_keeps_area_plane_and_order(seed: int, across: int, part: float) -> None:
    random = np.random.default_rng(seed)
    flat = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0]], dtype=float)
    flat[:, :2] += random.uniform(-0.2, 0.2, (4, 2))
    both = split(flat[None], np.array([across]), np.array([part]))
    assert sum(area_of(half)[0] for half in both) == pytest.approx(area_of(flat[None])[0])
    assert is_convex(np.concatenate(both))
    assert np.array_equal(both[0][0, 0], flat[0])
    assert np.array_equal(both[1][0, 2], flat[2])
    shorter = mean_sides(both[0])[0, across] < mean_sides(flat[None])[0, across]
    assert shorter


def test_halving_a_triangle_across_its_collapsed_side() -> None:
    triangle = np.array([[[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 1, 0]]], dtype=float)
    for across in (0, 1):
        both = split(triangle, np.array([across]), np.array([0.5]))
        assert sum(area_of(half)[0] for half in both) == pytest.approx(0.5)


def plates(gap: float, shift: float = 0.0) -> list[Surface]:
    upper = shapes.plate(1.0, 1.0).placed(np.eye(3), np.array([shift, 0.0, gap]))
    return [shapes.plate(1.0, 1.0), upper]


@pytest.mark.parametrize("gap", [0.1, 0.01, 0.001])
@pytest.mark.parametrize("shift", [0.0, 0.5])
def test_panels_at_the_rims_are_about_as_small_as_the_gap(gap: float, shift: float) -> None:
    """At the rims that face the other plate, and on both sides of each shadow's rim."""
    corners = Mesh.start(plates(gap, shift)).corners
    depth = np.ptp(corners[..., 0], axis=1)
    for rim in (-0.5 + shift, 0.5):
        touching = np.any(np.abs(corners[..., 0] - rim) < 1e-9, axis=1)
        assert touching.any()
        assert depth[touching].max() <= 1.6 * gap + 1e-9
    assert depth.min() > 0.2 * gap
    assert area_of(corners).sum() == pytest.approx(2.0)


def test_grading_stays_cheap() -> None:
    """Panels grow away from the rim: their number rises with the logarithm of the gap."""
    counts = [len(Mesh.start(plates(gap)).corners) for gap in (1e-2, 1e-3, 1e-4)]
    assert counts[2] < 800
    assert counts[2] - counts[1] < 2.0 * (counts[1] - counts[0]) + 50


def test_nothing_is_graded_where_nothing_faces() -> None:
    """Far plates, plates side by side, and one plate alone start alike."""
    alone = len(Mesh.start([shapes.plate(1.0, 1.0)]).corners)
    for shift in ([0.0, 0.0, 3.0], [1.2, 0.0, 0.0]):
        beside = shapes.plate(1.0, 1.0).placed(np.eye(3), np.array(shift))
        assert len(Mesh.start([shapes.plate(1.0, 1.0), beside]).corners) == 2 * alone


def test_the_faces_of_one_body_do_not_face_each_other() -> None:
    """A thin slab has its own metal between its faces."""
    slab = Mesh.start([shapes.box(1.0, 1.0, 0.01)]).corners
    wide = area_of(slab) > 0.02
    assert mean_sides(slab[wide]).min() > 0.1


def test_metal_hides_what_lies_behind_it() -> None:
    """The larger one of three stacked plates keeps the outer ones from seeing each other."""
    patches = [
        p
        for k, (side, z) in enumerate(((0.8, 0.0), (1.0, 0.01), (0.6, 0.03)))
        for p in planar_patches(shapes.plate(side, side, (0.0, 0.0, z)), k)
    ]
    table = FacingTable.of(patches)
    shadows = [table.walls(k).gap[~table.walls(k).outline] for k in range(3)]
    assert [len(gap) for gap in shadows] == [4, 8, 4]
    assert shadows[0] == pytest.approx([0.01] * 4)
    assert np.sort(shadows[1]) == pytest.approx([0.01] * 4 + [0.02] * 4)
    assert shadows[2] == pytest.approx([0.02] * 4)


def test_walls_carry_the_gap_that_acts_there() -> None:
    """Of two plates offset by half, the rim under the other and the shadow's rim feel the gap."""
    patches = [p for k, s in enumerate(plates(0.01, 0.5)) for p in planar_patches(s, k)]
    walls = FacingTable.of(patches).walls(0)
    assert walls.outline.sum() == 4
    assert len(walls.ends) == 8
    assert np.all(walls.gap[~walls.outline] == pytest.approx(0.01))
    level = patches[0].lift(walls.ends.mean(axis=1))[:, 0]
    far_rim = walls.outline & (np.abs(level + 0.5) < 1e-9)
    assert np.isinf(walls.gap[far_rim]).all()


@pytest.mark.parametrize("name", MESHES)
def test_the_start_covers_the_body(name: str) -> None:
    corners = Mesh.start([MESHES[name]]).corners
    assert area_of(corners).sum() == pytest.approx(6.0)
    assert is_convex(corners)
    assert np.abs(np.abs(corners).max(axis=2) - 0.5).max() < 1e-9


@pytest.mark.parametrize("faces", [cube(), Surface(cube_vertices(), CUBE_QUADS)])
def test_every_face_starts_with_two_panels_each_way(faces: Surface) -> None:
    assert len(Mesh.start([faces]).corners) >= 24


def test_a_needle_of_a_triangle_is_not_cut_into_three() -> None:
    triangle = tidy([(0, 0, 0), (1, 0, 0), (0.5, 0.01, 0)], [(0, 1, 2)])
    corners = Mesh.start([triangle]).corners
    assert area_of(corners).sum() == pytest.approx(0.005)
    assert is_convex(corners)


@given(st.lists(st.integers(0, 10**6), min_size=1, max_size=4))
@settings(max_examples=15, deadline=None, derandomize=True)
def test_refinement_keeps_area_owners_and_the_memory_of_old_panels(seeds: list[int]) -> None:
    """Unmarked panels are found again by ``origin``, unchanged; halves have no origin."""
    mesh = Mesh.start([cube(), shapes.plate(1.0, 1.0, (0.0, 0.0, 0.7)), shapes.disc(0.5)])
    flat = mesh.conductor < 2
    whole = [area_of(mesh.corners[mesh.conductor == k]).sum() for k in range(2)]
    for seed in seeds:
        random = np.random.default_rng(seed)
        count = len(mesh.conductor)
        marked, across = random.random(count) < 0.2, random.integers(0, 2, count)
        finer, origin = mesh.refine(marked, across)
        known = origin >= 0
        assert np.array_equal(finer.corners[known], mesh.corners[origin[known]])
        assert np.array_equal(finer.conductor[known], mesh.conductor[origin[known]])
        assert not np.any(marked[origin[known]])
        assert len(np.unique(origin[known])) == known.sum()
        flat = finer.conductor < 2
        assert flat.sum() == (mesh.conductor < 2).sum() + marked[mesh.conductor < 2].sum()
        mesh = finer
    after = [area_of(mesh.corners[mesh.conductor == k]).sum() for k in range(2)]
    assert after == pytest.approx(whole, rel=1e-12)


def test_marked_panels_are_halved_in_the_chosen_direction() -> None:
    mesh = Mesh.start([shapes.plate(1.0, 1.0)])
    marked = np.zeros(len(mesh.conductor), dtype=bool)
    marked[1] = True
    for across in (0, 1):
        finer, origin = mesh.refine(marked, np.full(len(marked), across))
        halves = finer.corners[origin < 0]
        whole = mean_sides(mesh.corners[[1]])[0]
        assert len(halves) == 2
        assert mean_sides(halves)[:, across] == pytest.approx([whole[across] / 2] * 2)
        assert mean_sides(halves)[:, 1 - across] == pytest.approx([whole[1 - across]] * 2)


def test_flat_panels_lie_on_the_true_surface() -> None:
    flat = Mesh.start([cube()]).faceting()
    assert flat.exact
    assert not flat.sheet.any()
    curved = Mesh.start([cube(), shapes.sphere(1.0), shapes.disc(2.0)], hollow=[1]).faceting()
    assert not curved.exact


def test_hollow_and_open_bodies_have_two_sides() -> None:
    surfaces = [shapes.sphere(0.5), shapes.sphere(1.0), shapes.disc(2.0)]
    mesh = Mesh.start(surfaces, hollow=[1])
    count = len(mesh.conductor)
    finer, _ = mesh.refine(np.ones(count, dtype=bool), np.zeros(count, dtype=int))
    for each in (mesh, finer):
        sheet = each.faceting().sheet
        assert [bool(sheet[each.conductor == k].all()) for k in range(3)] == [False, True, True]
        assert not sheet[each.conductor == 0].any()
