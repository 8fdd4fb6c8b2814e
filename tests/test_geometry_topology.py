"""Pieces, open edges and orientation of triangle sets."""

from __future__ import annotations

import numpy as np
import pytest
from made_bodies import ball, cube, ring, turned

from bem.geometry.topology import edges_of, open_edges, orient, pieces_of

TOLERANCE = 1e-7


def is_open(vertices: np.ndarray, triangles: np.ndarray) -> int:
    return len(open_edges(vertices, edges_of(triangles), TOLERANCE))


def scrambled(triangles: np.ndarray, seed: int) -> np.ndarray:
    """Reverse some of the triangles."""
    flip = np.random.default_rng(seed).random(len(triangles)) < 0.5
    return np.where(flip[:, None], triangles[:, ::-1], triangles)


@pytest.mark.parametrize("body", [cube(), ball(1.0), ring(2.0, 0.5), turned(ball(3.0), 2)])
def test_closed_bodies_have_no_open_edge(body):
    edges = edges_of(body.triangles)
    assert np.all(edges.uses == 2)
    assert 2 * len(edges.ends) == 3 * len(body.triangles)
    assert is_open(body.vertices, scrambled(body.triangles, 1)) == 0


def test_a_missing_triangle_leaves_three_open_edges():
    body = ball(1.0)
    open_at = open_edges(body.vertices, edges_of(body.triangles[1:]), TOLERANCE)
    ends = edges_of(body.triangles[1:]).ends[open_at]
    assert set(ends.ravel().tolist()) == set(body.triangles[0].tolist())


def cube_with_joint(height: float) -> tuple[np.ndarray, np.ndarray]:
    """Cube in which one edge (0, 1) has a corner that only one of its faces knows."""
    body = cube()
    vertices = np.concatenate([body.vertices, [[0.1, -0.5 + height, -0.5]]])
    triangles = body.triangles
    side = next(i for i, t in enumerate(triangles) if {0, 1} <= set(t.tolist()))
    far = next(v for v in triangles[side].tolist() if v not in (0, 1))
    parts = np.array([[0, 8, far], [8, 1, far]])
    return vertices, np.concatenate([np.delete(triangles, side, axis=0), parts])


def test_a_corner_on_an_edge_leaves_the_body_closed():
    assert is_open(*cube_with_joint(0.0)) == 0
    assert is_open(*cube_with_joint(0.5 * TOLERANCE)) == 0


def test_a_corner_beside_an_edge_opens_the_body():
    assert is_open(*cube_with_joint(1e-3)) == 3


def test_several_corners_on_one_edge():
    vertices, triangles = cube_with_joint(0.0)
    far = next(v for t in triangles.tolist() if {0, 8} <= set(t) for v in t if v not in (0, 8))
    rest = [t for t in triangles.tolist() if not {0, 8} <= set(t)]
    vertices = np.concatenate([vertices, [[-0.3, -0.5, -0.5]]])
    assert is_open(vertices, np.array([*rest, [0, 9, far], [9, 8, far]])) == 0


def test_a_fin_is_open_on_all_sides():
    """Where it stands on the body, three triangles meet, an odd number."""
    vertices = np.concatenate([cube().vertices, [[0.0, -2.0, -2.0]]])
    assert is_open(vertices, np.concatenate([cube().triangles, [[0, 1, 8]]])) == 3


def test_bodies_that_share_an_edge_are_closed():
    """Four triangles meet there, an even number."""
    vertices = np.concatenate([cube().vertices, cube(1.0, (0.0, -1.0, -1.0)).vertices])
    second = cube().triangles + 8
    second = np.where(second == 14, 0, np.where(second == 15, 1, second))
    assert np.array_equal(vertices[[14, 15]], vertices[[0, 1]])
    both = np.concatenate([cube().triangles, second])
    assert edges_of(both).uses.max() == 4
    assert is_open(vertices, both) == 0


def test_the_rim_of_a_sheet_is_open():
    vertices = np.array([[0.0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0]])
    assert is_open(vertices, np.array([[0, 1, 2], [0, 2, 3]])) == 4


def test_pieces_share_no_vertex():
    two = np.concatenate([cube().triangles, ball(1.0).triangles + 8])
    number, piece = pieces_of(two)
    assert number == 2
    assert set(piece[:12].tolist()).isdisjoint(piece[12:].tolist())
    assert len(set(piece[:12].tolist())) == 1
    number, _ = pieces_of(np.array([[0, 1, 2], [2, 3, 4], [7, 8, 9]]))
    assert number == 2


@pytest.mark.parametrize("body", [cube(), ball(1.0), ring(2.0, 0.5)])
@pytest.mark.parametrize("seed", range(4))
def test_orientation_is_made_uniform(body, seed):
    """Whatever was reversed: all the same up to one sign for the whole patch."""
    mixed = scrambled(body.triangles, seed)
    patch, sign = orient(mixed, edges_of(mixed))
    assert set(patch.tolist()) == {0}
    a, b, c = np.moveaxis(body.vertices[mixed], 1, 0)
    under = np.einsum("tx,tx->t", a, np.cross(b, c))
    true = np.einsum(
        "tx,tx->t",
        body.vertices[body.triangles[:, 0]],
        np.cross(body.vertices[body.triangles[:, 1]], body.vertices[body.triangles[:, 2]]),
    )
    assert abs((sign * under).sum()) == pytest.approx(abs(true.sum()))


def test_separate_bodies_are_separate_patches():
    two = np.concatenate([cube().triangles, ball(1.0).triangles + 8])
    patch, _ = orient(two, edges_of(two))
    assert set(patch[:12].tolist()) == {0}
    assert set(patch[12:].tolist()) == {1}
