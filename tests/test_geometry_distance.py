"""Exact distances: compiled kernels against slow twins that enumerate or integrate."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import ball, cube, ring, soup, turned

from bem.geometry.distance import nearest_points, on_triangle, piercing
from bem.geometry.gap import deepest_crossing, smallest_gap
from bem.geometry.rays import points_inside, ray_directions
from bem.geometry.tree import LEAF, box_gap, build_tree

SETS = settings(max_examples=60, deadline=None)
SUBSETS = [s for n in (1, 2, 3) for s in itertools.combinations(range(3), n)]


def tuples(triangle: np.ndarray):
    return tuple(tuple(corner) for corner in triangle.tolist())


def slow_distance(first: np.ndarray, second: np.ndarray) -> float:
    """Least distance over all pairs of corner, edge and face where the plumb lies inside both."""
    best = math.inf
    for one, two in itertools.product(SUBSETS, SUBSETS):
        p, q = first[list(one)], second[list(two)]
        spans = np.concatenate([p[1:] - p[0], -(q[1:] - q[0])])
        solution = np.linalg.lstsq(spans.T, q[0] - p[0], rcond=None)[0] if len(spans) else []
        s, t = solution[: len(one) - 1], solution[len(one) - 1 :]
        if any(min([*w, 1.0 - sum(w)], default=1.0) < -1e-12 for w in (s, t)):
            continue
        gap = p[0] + s @ (p[1:] - p[0]) - q[0] - t @ (q[1:] - q[0])
        best = min(best, float(np.linalg.norm(gap)))
    return best


def slow_gap(first: np.ndarray, second: np.ndarray) -> float:
    return min(slow_distance(a, b) for a in first for b in second)


def slow_depth(first: np.ndarray, second: np.ndarray) -> float:
    """Deepest piercing, edge by edge, from heights over planes and rims."""
    best = 0.0
    for edges, face in ((first, second), (second, first)):
        n = np.cross(face[1] - face[0], face[2] - face[0])
        if not n.any():
            continue
        n = n / np.linalg.norm(n)
        for k in range(3):
            a, b = edges[k], edges[(k + 1) % 3]
            ha, hb = (a - face[0]) @ n, (b - face[0]) @ n
            if ha * hb >= 0.0:
                continue
            p = a + ha / (ha - hb) * (b - a)
            rims = np.roll(face, -1, axis=0) - face
            inward = np.cross(n, rims) / np.linalg.norm(rims, axis=1)[:, None]
            clear = np.einsum("kx,kx->k", p - face, inward).min()
            best = max(best, min(abs(ha), abs(hb), clear))
    return best


def slow_inside(corners: np.ndarray, points: np.ndarray) -> np.ndarray:
    """Winding number by solid angles (Van Oosterom & Strackee 1983); needs outward faces."""
    a, b, c = (corners[None, :, k] - points[:, None] for k in range(3))
    la, lb, lc = (np.linalg.norm(x, axis=2) for x in (a, b, c))
    top = np.einsum("ptx,ptx->pt", a, np.cross(b, c))
    bottom = (
        la * lb * lc
        + np.einsum("ptx,ptx->pt", a, b) * lc
        + np.einsum("ptx,ptx->pt", b, c) * la
        + np.einsum("ptx,ptx->pt", c, a) * lb
    )
    return np.abs(2.0 * np.arctan2(top, bottom).sum(axis=1)) > 2.0 * np.pi


lattice = st.lists(st.integers(-2, 2), min_size=18, max_size=18)
seeds = st.integers(0, 2**32 - 1)


@SETS
@given(lattice)
def test_distance_of_lattice_triangles(numbers):
    """Shared corners, common planes, crossings and triangles without area are all exact."""
    first, second = np.array(numbers, dtype=float).reshape(2, 3, 3)
    found = math.sqrt(nearest_points(tuples(first), tuples(second))[0])
    assert found == pytest.approx(slow_distance(first, second), abs=1e-9)


@SETS
@given(seeds)
def test_distance_of_random_triangles(seed):
    random = np.random.default_rng(seed)
    first = random.normal(size=(3, 3)) * 10.0 ** random.uniform(-3, 3)
    second = random.normal(size=(3, 3)) + random.normal(size=3) * 3.0
    d2, here, there = nearest_points(tuples(first), tuples(second))
    scale = max(np.abs(first).max(), np.abs(second).max())
    assert math.sqrt(d2) == pytest.approx(slow_distance(first, second), abs=1e-12 * scale)
    assert math.dist(here, there) == pytest.approx(math.sqrt(d2), abs=1e-12 * scale)


@SETS
@given(seeds)
def test_nearest_points_lie_on_the_triangles(seed):
    random = np.random.default_rng(seed)
    first, second = random.normal(size=(2, 3, 3))
    _, here, there = nearest_points(tuples(first), tuples(second))
    for point, triangle in ((here, first), (there, second)):
        assert math.dist(on_triangle(point, tuples(triangle)), point) < 1e-12


@pytest.mark.parametrize("slenderness", [1e-3, 1e-6, 1e-9])
def test_distance_of_needles(slenderness):
    """Two crossed needles a height apart are that height apart."""
    one = np.array([[-1.0, 0.0, 0.0], [1.0, 0.0, 0.0], [0.0, slenderness, 0.0]])
    two = np.array([[0.1, -1.0, 0.25], [0.1, 1.0, 0.25], [0.1 + slenderness, 0.0, 0.25]])
    assert math.sqrt(nearest_points(tuples(one), tuples(two))[0]) == pytest.approx(0.25, rel=1e-14)


@SETS
@given(lattice)
def test_piercing_depth(numbers):
    first, second = np.array(numbers, dtype=float).reshape(2, 3, 3)
    depth, _ = piercing(tuples(first), tuples(second))
    assert depth == pytest.approx(slow_depth(first, second), abs=1e-12)


@settings(max_examples=25, deadline=None)
@given(seeds)
def test_gap_of_random_sets(seed):
    """Branch and bound finds what trying all pairs finds."""
    random = np.random.default_rng(seed)
    sizes = random.integers(1, 14, size=2)
    first, second = (
        random.normal(size=(n, 1, 3)) + 0.3 * random.normal(size=(n, 3, 3)) for n in sizes
    )
    second += random.normal(size=3) * random.choice([0.0, 2.0])
    gap = smallest_gap(build_tree(first), build_tree(second))
    assert gap.distance == pytest.approx(slow_gap(first, second), abs=1e-12)
    assert math.dist(gap.here, gap.there) == pytest.approx(gap.distance, abs=1e-12)


@pytest.mark.parametrize("seed", range(6))
def test_gap_of_bodies_is_that_of_the_best_pair(seed):
    """The tree over hundreds of triangles prunes nothing that matters."""
    random = np.random.default_rng(seed)
    first = soup(turned(ball(1.0, 16), seed))
    second = soup(turned(ring(2.0, 0.3), seed + 50)) + random.normal(size=3)
    one, two = build_tree(first), build_tree(second)
    pairs = itertools.product(map(tuples, first), map(tuples, second))
    best = min(nearest_points(a, b)[0] for a, b in pairs)
    assert smallest_gap(one, two).distance == pytest.approx(math.sqrt(best), rel=1e-12)


@pytest.mark.parametrize("gap", [1.0, 1e-3, 1e-6])
def test_gap_of_parallel_plates_in_any_direction(gap):
    """Where all pairs tie, the gap is still exact."""
    x, y = np.meshgrid(np.arange(30.0), np.arange(30.0), indexing="ij")
    low = np.stack([x, y, 0.0 * x], axis=-1)
    corner = [low[:-1, :-1], low[1:, :-1], low[1:, 1:], low[:-1, 1:]]
    plate = np.concatenate([np.stack(c, -2).reshape(-1, 3, 3) for c in (corner[:3], corner[1:])])
    normal = np.array([0.3, -0.5, 0.8]) / math.sqrt(0.98)
    turn = np.linalg.qr(np.column_stack([normal, np.eye(3)[:, :2]]))[0][:, [1, 2, 0]]
    below = plate @ turn.T
    above = (plate + [0.37, 0.21, gap]) @ turn.T
    found = smallest_gap(build_tree(below), build_tree(above))
    assert found.distance == pytest.approx(gap, abs=1e-13)


def test_gap_beyond_the_limit_is_infinite():
    one, two = build_tree(soup(cube())), build_tree(soup(cube(center=(3.0, 0.0, 0.0))))
    assert smallest_gap(one, two, limit=1.9).distance == math.inf
    assert smallest_gap(one, two, limit=2.1).distance == 2.0


def test_crossing_depth_of_two_cubes():
    """Cubes that overlap by a tenth at a corner have to move by a tenth."""
    one, two = build_tree(soup(cube())), build_tree(soup(cube(center=(0.9, 0.9, 0.9))))
    depth, place = deepest_crossing(one, two, math.inf)
    assert depth == pytest.approx(0.1)
    assert np.all(np.abs(np.array(place) - 0.45) <= 0.05 + 1e-12)


def test_faces_in_contact_do_not_cross():
    one, two = build_tree(soup(cube())), build_tree(soup(cube(center=(1.0, 0.25, 0.125))))
    assert smallest_gap(one, two).distance == 0.0
    assert deepest_crossing(one, two, 1.0)[0] == 0.0


def box_corners(tree, node: int) -> np.ndarray:
    signs = np.array(list(itertools.product([-1.0, 1.0], repeat=3)))
    return tree.center[node] + (signs * tree.half[node]) @ tree.axes[node]


@pytest.mark.parametrize("body", [ball(1.0, 16), ring(2.0, 0.3), turned(cube(), 3)])
def test_tree_holds_every_triangle_in_its_boxes(body):
    corners = soup(body)
    tree = build_tree(corners)
    assert np.array_equal(np.sort(tree.order), np.arange(len(corners)))
    assert np.array_equal(tree.corners, corners[tree.order])
    leaves = np.flatnonzero(tree.child < 0)
    assert tree.number[leaves].max() <= LEAF
    assert tree.number[leaves].sum() == len(corners)
    for node in range(len(tree.first)):
        own = tree.corners[tree.first[node] : tree.first[node] + tree.number[node]]
        off = np.abs((own.reshape(-1, 3) - tree.center[node]) @ tree.axes[node].T)
        assert np.all(off <= tree.half[node] + 1e-12)
        assert tree.size[node] == pytest.approx(np.linalg.norm(tree.half[node]))
        assert np.allclose(tree.axes[node] @ tree.axes[node].T, np.eye(3), atol=1e-12)


@SETS
@given(seeds)
def test_box_gap_is_a_lower_bound(seed):
    """Never above the distance of the triangles, and exact for facing flat patches."""
    random = np.random.default_rng(seed)
    first, second = random.normal(size=(2, 3, 3, 3))
    second += random.normal(size=3) * 4.0
    low = box_gap(build_tree(first), 0, build_tree(second), 0)
    assert low <= slow_gap(first, second) + 1e-12
    flat = np.array([[[0.0, 0.0, 0.0], [1.0, 0.0, 0.0], [0.0, 1.0, 0.0]]])
    assert box_gap(build_tree(flat), 0, build_tree(flat + [0.2, 0.1, 0.7]), 0) == pytest.approx(0.7)


@pytest.mark.parametrize("body", [cube(), ball(1.0), turned(ring(1.0, 0.4), 7)])
def test_points_inside_by_rays_and_by_solid_angle(body):
    """Also for points in line with corners, edges and faces; orientation plays no part."""
    corners = soup(body)
    random = np.random.default_rng(5)
    middle = corners.mean(axis=1)
    aligned = np.concatenate([corners.reshape(-1, 3), middle])
    shrunk = [factor * aligned[:60] for factor in (0.5, 0.9, 1.1)]
    points = np.concatenate([random.uniform(-1.5, 1.5, size=(200, 3)), *shrunk, np.zeros((1, 3))])
    expected = slow_inside(corners, points)
    assert 10 < expected.sum() < len(points) - 10
    flipped = corners.copy()
    flip = random.random(len(corners)) < 0.5
    flipped[flip] = corners[flip][:, ::-1]
    counted = np.ones(len(corners), dtype=bool)
    found = points_inside(build_tree(flipped), counted, points, ray_directions())
    assert np.array_equal(found, expected)


def test_only_counted_triangles_enclose():
    one, two = soup(cube()), soup(cube(center=(3.0, 0.0, 0.0)))
    tree = build_tree(np.concatenate([one, two]))
    counted = np.arange(24) < 12
    points = np.array([[0.1, 0.2, 0.3], [3.1, 0.2, 0.3]])
    assert points_inside(tree, counted, points, ray_directions()).tolist() == [True, False]
