"""Welding and mending: what is joined, what is dropped, what is told."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import ball, cube, faces_of, ring, soup, turned

from bem.errors import InputError
from bem.geometry.surface import Surface
from bem.geometry.weld import WELD, weld


def unwelded(corners: np.ndarray) -> Surface:
    """Surface (t triangles) in which no two triangles share a vertex."""
    return Surface(corners.reshape(-1, 3), faces_of(np.arange(3 * len(corners)).reshape(-1, 3)))


def sheet(faces: list[list[int]], points: list[list[float]]) -> Surface:
    rows = [face + [-1] * (4 - len(face)) for face in faces]
    flat = [[*point, 0.0][:3] for point in points]
    return Surface(np.array(flat, dtype=float), np.array(rows))


def test_equal_corners_become_one_vertex():
    body = turned(ball(1.0), 4)
    joined, changes = weld(unwelded(soup(body)))
    assert len(joined.vertices) == len(body.vertices)
    assert np.array_equal(soup(joined), soup(body))
    read = 3 * len(body.faces)
    assert changes == [f"{read} corners as read joined into {len(body.vertices)} vertices"]


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 2**32 - 1), st.sampled_from([1e-9, 1.0, 1e6]))
def test_corners_within_the_tolerance_are_welded_and_others_not(seed, size):
    """Wherever the body lies: no grid splits a close pair."""
    random = np.random.default_rng(seed)
    body = turned(ball(size), seed)
    corners = soup(body) + size * random.normal(size=3)
    tolerance = WELD * body.extent
    near = corners + random.uniform(-1, 1, size=corners.shape) * 0.28 * tolerance
    joined, _ = weld(unwelded(near))
    assert len(joined.vertices) == len(body.vertices)
    assert np.abs(soup(joined) - corners).max() < 1.1 * tolerance
    apart = corners + random.choice([-1.0, 1.0], size=corners.shape) * 30.0 * tolerance
    assert len(weld(unwelded(apart))[0].vertices) > 2 * len(body.vertices)


def test_welding_is_counted_with_its_tolerance():
    body = cube(1e-3)
    points = body.vertices.copy()
    points = np.concatenate([points, points[:1] + 1e-11, points[7:] - 1e-11])
    faces = body.faces.copy()
    faces[0][faces[0] == 0] = 8
    faces[11][faces[11] == 7] = 9
    joined, changes = weld(Surface(points, faces))
    assert changes == ["2 vertices welded to another closer than 0.1732 nm"]
    assert np.array_equal(joined.vertices, body.vertices)
    assert np.array_equal(joined.faces, body.faces)


def test_a_sound_body_stays_as_it_is():
    body = ring(2.0, 0.4)
    same, changes = weld(body)
    assert changes == []
    assert np.array_equal(same.vertices, body.vertices)
    assert np.array_equal(same.faces, body.faces)


def test_unused_vertices_leave_without_a_word():
    body = cube()
    more = Surface(
        np.concatenate([[[1e9, 0.0, 0.0]], body.vertices]), body.faces + (body.faces >= 0)
    )
    same, changes = weld(more)
    assert changes == []
    assert np.array_equal(same.vertices, body.vertices)
    assert np.array_equal(same.faces, body.faces)


POINTS = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0], [0.5, 0.0], [0.5, 1e-9]]


@pytest.mark.parametrize(
    ("extra", "line"),
    [
        ([0, 1, 1], "1 face without area dropped"),
        ([0, 4, 1], "1 face without area dropped"),
        ([0, 1, 5], "1 face without area dropped"),
        ([0, 1, 1, 0], "1 face without area dropped"),
        ([0, 1, 0, 2], "1 face without area dropped"),
        ([0, 4, 1, 5], "1 face without area dropped"),
        ([2, 0, 1], "1 duplicate face dropped"),
        ([1, 0, 2], "1 duplicate face dropped"),
    ],
)
def test_faces_that_carry_nothing_are_dropped(extra, line):
    mended, changes = weld(sheet([[0, 1, 2], [0, 2, 3], extra], POINTS))
    assert line in changes
    assert np.array_equal(soup(mended), soup(sheet([[0, 1, 2], [0, 2, 3]], POINTS)))


def test_duplicate_quadrilaterals_are_dropped():
    mended, changes = weld(sheet([[0, 1, 2, 3], [3, 2, 1, 0], [1, 2, 3, 0]], POINTS))
    assert changes == ["2 duplicate faces dropped"]
    assert mended.faces.tolist() == [[0, 1, 2, 3]]


def test_thin_faces_of_a_thin_body_stay():
    """Slender is not degenerate: a strip of 1 : 1e5 keeps its faces."""
    strip = sheet([[0, 1, 2], [0, 2, 3]], [[0, 0], [1, 0], [1, 1e-5], [0, 1e-5]])
    assert weld(strip)[1] == []


def area(surface: Surface) -> float:
    corners = soup(surface)
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    return 0.5 * float(np.linalg.norm(normals, axis=1).sum())


@pytest.mark.parametrize(
    ("points", "count", "expected"),
    [
        ([[0, 0], [2, 0], [2, 2], [0, 2]], 1, 4.0),
        ([[0, 0], [2, 0], [2, 2], [1.5, 0.5]], 2, 1.0),
        ([[1.5, 0.5], [0, 0], [2, 0], [2, 2]], 2, 1.0),
        ([[0, 0], [1, 0], [2, 0], [0, 2]], 2, 2.0),
        ([[0, 0, 0], [1, 0, 0], [1, 1, 1e-3], [0, 1, 0]], 2, None),
        ([[0, 0, 0], [1, 0, 0], [1, 1, 1e-7], [0, 1, 0]], 1, 1.0),
    ],
)
def test_quadrilaterals(points, count, expected):
    """Flat convex ones stay; reflex, straight and bent ones become two proper triangles."""
    for seed in (None, 1, 2):
        quad = sheet([[0, 1, 2, 3]], points)
        mended, changes = weld(quad if seed is None else turned(quad, seed))
        assert len(mended.faces) == count
        told = ["1 quadrilateral not flat or not convex split into triangles"]
        assert changes == (told if count == 2 else [])
        if expected is not None:
            assert area(mended) == pytest.approx(expected, rel=1e-6)


def test_split_quadrilaterals_keep_their_place():
    points = [[0, 0], [2, 0], [2, 2], [1.5, 0.5], [9, 0], [9, 9]]
    mended, _ = weld(sheet([[1, 4, 5], [0, 1, 2, 3], [1, 2, 5]], points))
    assert mended.faces.tolist() == [[1, 4, 5, -1], [1, 2, 3, -1], [1, 3, 0, -1], [1, 2, 5, -1]]


@pytest.mark.parametrize("repeated", [0, 1, 2, 3])
def test_a_quadrilateral_with_a_repeated_corner_is_a_triangle(repeated):
    corners = [0, 1, 2]
    corners.insert(repeated, corners[repeated % 3])
    mended, changes = weld(sheet([corners, [0, 2, 3]], POINTS))
    assert changes == ["1 triangle given with four corners reduced to three"]
    assert sorted(mended.faces[0].tolist()) == [-1, 0, 1, 2]
    assert area(mended) == pytest.approx(1.0)


def test_a_quadrilateral_whose_sides_cross_is_refused():
    bow = sheet([[0, 1, 2], [0, 2, 1, 3]], [[0, 0], [1, 0], [1, 1], [0, 1]])
    with pytest.raises(InputError) as caught:
        weld(bow)
    assert str(caught.value) == (
        "the sides of quadrilateral 2 cross each other (1 such face); "
        "list its corners around the rim"
    )


def refused(surface: Surface) -> str:
    with pytest.raises(InputError) as caught:
        weld(surface)
    return str(caught.value)


def test_nothing_left():
    flat = sheet([[0, 1, 1], [0, 4, 1]], POINTS)
    assert refused(flat) == "no face with an area is left of 2 faces; mesh it again"
    point = Surface(np.zeros((3, 3)), np.array([[0, 1, 2, -1]]))
    assert refused(point) == "no face with an area is left of 1 face; mesh it again"


def test_a_stray_vertex_far_away():
    """One bad corner must neither weld the body to a point unheard nor fill the memory."""
    corners = soup(ball(1.0, 48))
    corners[0, 0] = [1e9, 0.0, 0.0]
    assert refused(unwelded(corners)) == (
        "most vertices lie within 100 m of one another, 1e-07 of the body's size; "
        "is a stray vertex far away?"
    )


def test_numbers_that_overflow():
    with np.errstate(over="ignore"):
        assert refused(Surface(1e300 * cube().vertices, cube().faces)) == (
            "the coordinates are too large to compute with; check the unit"
        )
