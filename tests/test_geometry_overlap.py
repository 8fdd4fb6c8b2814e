"""Triangles that overlap in a plane or cross, against clipping and all pairs."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from made_bodies import ball, soup, turned

from bem.geometry.distance import piercing
from bem.geometry.repair.overlap import coplanar_depth, find_overlaps


def clipped_area(one: np.ndarray, two: np.ndarray) -> float:
    """Area that two triangles (3, 2) share, by clipping (Sutherland and Hodgman 1974)."""
    polygon = [*two]
    sign = np.sign(np.linalg.det(one[1:] - one[0]))
    for k in range(3):
        start, edge = one[k], one[(k + 1) % 3] - one[k]
        side = [sign * (edge[0] * (p - start)[1] - edge[1] * (p - start)[0]) for p in polygon]
        clipped = []
        for i in range(len(polygon)):
            if side[i - 1] * side[i] < 0.0:
                part = side[i - 1] / (side[i - 1] - side[i])
                clipped.append(polygon[i - 1] + part * (polygon[i] - polygon[i - 1]))
            if side[i] >= 0.0:
                clipped.append(polygon[i])
        polygon = clipped
    pairs = zip(polygon, polygon[1:] + polygon[:1], strict=True)
    return 0.5 * abs(sum(p[0] * q[1] - p[1] * q[0] for p, q in pairs))


def tuples(corners: np.ndarray):
    return tuple(tuple(float(x) for x in corner) for corner in corners)


def test_overlap_in_a_plane_agrees_with_clipping():
    random = np.random.default_rng(5)
    overlapping = 0
    for _ in range(400):
        flat = random.uniform(size=(2, 3, 2))
        lifted = np.concatenate([flat, np.zeros((2, 3, 1))], axis=2)
        depth = coplanar_depth(tuples(lifted[0]), tuples(lifted[1]), (0.0, 0.0, 1.0))
        shared = clipped_area(flat[0], flat[1])
        if abs(depth) > 1e-9:
            assert (depth > 0.0) == (shared > 0.0)
        overlapping += shared > 0.0
    assert 50 < overlapping < 350


def test_depth_of_known_overlaps():
    one = tuples(np.array([[0.0, 0, 0], [4, 0, 0], [0, 4, 0]]))
    root = np.sqrt(2.0)
    for shift, depth in ((3.0, 1.0 / root), (0.0, 4.0 / root), (4.0, 0.0)):
        two = tuples(np.array(one) + [shift, 0.0, 0.0])
        assert coplanar_depth(one, two, (0.0, 0.0, 1.0)) == pytest.approx(depth, abs=1e-12)


def all_pairs(corners: np.ndarray, piece: np.ndarray, depth: float) -> tuple[set, set]:
    """Overlaps and crossings from every pair; all flat ones lie in planes of constant z."""
    coplanar, crossing = set(), set()
    for i, j in itertools.combinations(range(len(corners)), 2):
        if np.ptp(corners[[i, j], :, 2]) == 0.0:
            if clipped_area(corners[i, :, :2], corners[j, :, :2]) > 0.0:
                coplanar.add((i, j))
        elif piece[i] != piece[j] and piercing(tuples(corners[i]), tuples(corners[j]))[0] > depth:
            crossing.add((i, j))
    return coplanar, crossing


def test_the_search_misses_nothing():
    random = np.random.default_rng(6)
    flat = random.uniform(size=(60, 3, 3))
    flat[:, :, 2] = random.integers(0, 3, size=(60, 1))
    flat[:, :, :2] = flat[:, :1, :2] + 0.3 * flat[:, :, :2]
    bodies = [soup(turned(ball(0.5), seed)) + random.uniform(size=3) for seed in (1, 2)]
    corners = np.concatenate([flat, *bodies])
    piece = np.repeat([0, 1, 2], [60, *map(len, bodies)])
    found = find_overlaps(corners, piece, 1e-9, 1e-6)
    coplanar, crossing = all_pairs(corners, piece, 1e-6)
    assert {tuple(p) for p in found.coplanar.tolist()} == coplanar
    assert {tuple(p) for p in found.crossing.tolist()} == crossing
    assert len(coplanar) > 10 and len(crossing) > 20


@pytest.mark.parametrize("few", [0, 200])
def test_few_triangles_and_many_agree_with_all_pairs(few, monkeypatch):
    monkeypatch.setattr("bem.geometry.repair.overlap.FEW", few)
    corners = np.random.default_rng(8).uniform(size=(80, 3, 3))
    corners[:, :, 2] = np.random.default_rng(9).integers(0, 4, size=(80, 1))
    corners[:, :, :2] = corners[:, :1, :2] + 0.2 * corners[:, :, :2]
    piece = np.zeros(80, dtype=np.int64)
    found = find_overlaps(corners, piece, 1e-9, 1e-6)
    assert {tuple(p) for p in found.coplanar.tolist()} == all_pairs(corners, piece, 1e-6)[0]
    assert len(found.coplanar) > 10


def test_neighbours_on_a_body_do_not_overlap():
    corners = soup(turned(ball(1.0, 24), 7))
    found = find_overlaps(corners, np.zeros(len(corners), dtype=np.int64), 1e-7, 1e-6)
    assert len(found.coplanar) == len(found.crossing) == 0
