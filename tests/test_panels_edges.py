"""Sharp edges of curved bodies: their turns, and the crowding of charge beside them."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.integrate import quad

import bem
from bem.panels.curved import CurvedFamily
from bem.panels.edges import MOST, edge_turns, square_over_mean
from bem.panels.mesh import Mesh

RIGHT = 0.5 * math.pi
NOTCHED = [(0.0, -1.0), (2.0, -1.0), (2.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)]


@pytest.mark.parametrize("turn", [-1.0, 0.0, 0.3, RIGHT, 2.0, 2.6])
def test_factor_is_the_mean_square_over_the_squared_mean(turn: float) -> None:
    """Of a density r^-a over a panel, with a = t / (pi + t), by adaptive quadrature."""
    a = turn / (math.pi + turn)
    mean, _ = quad(lambda r: 1.0, 0.0, 1.0, weight="alg", wvar=(-a, 0.0))
    square, _ = quad(lambda r: 1.0, 0.0, 1.0, weight="alg", wvar=(-2.0 * a, 0.0))
    assert square_over_mean(np.array(turn)) == pytest.approx(square / mean**2, rel=1e-10)


def test_factor_is_four_thirds_at_a_right_angle_and_limited_at_a_fold() -> None:
    assert square_over_mean(np.array(RIGHT)) == pytest.approx(4.0 / 3.0)
    assert square_over_mean(np.array(3.14)) == MOST


@pytest.mark.parametrize(
    ("surface", "turns"),
    [
        (bem.sphere(1.0), [0.0, 0.0]),
        (bem.cylinder(1.0, 3.0), [0.0, RIGHT, RIGHT, 0.0]),
        (bem.cone(1.0, 1.0), [0.0, 0.75 * math.pi, 0.0]),
        (bem.ring(inner=1.0, outer=2.0, height=1.0), [RIGHT] * 5),
        (bem.revolve(NOTCHED), [0.0, RIGHT, RIGHT, -RIGHT, RIGHT, 0.0]),
        (bem.tube(1.0, 2.0), [0.0, 0.0]),
        (bem.torus(2.0, 1.0), [0.0, 0.0, 0.0]),
    ],
    ids=["sphere", "cylinder", "cone", "ring", "notched", "tube", "torus"],
)
def test_turns_of_edges(surface: bem.Surface, turns: list[float]) -> None:
    assert surface.curve is not None
    np.testing.assert_allclose(edge_turns(surface.curve), turns, atol=1e-6)


def test_panels_beside_an_edge_and_no_others_count_more() -> None:
    rod = bem.cylinder(1.0, 3.0).curve
    assert rod is not None
    family = CurvedFamily.start(rod)
    marked = np.arange(len(family.corners)) % 5 == 0
    for along in (0, 1):
        family, _ = family.refine(
            np.resize(marked, len(family.corners)), np.full(len(family.corners), along)
        )
    z, r = family.corners[..., 2], np.hypot(family.corners[..., 0], family.corners[..., 1])
    on_rim = (np.abs(np.abs(z) - 1.5) < 1e-12) & (np.abs(r - 1.0) < 1e-12)
    side = on_rim & np.roll(on_rim, -1, axis=1)
    side &= np.linalg.norm(np.roll(family.corners, -1, axis=1) - family.corners, axis=2) > 0.0
    np.testing.assert_allclose(family.crowding[side.any(axis=1)], 4.0 / 3.0)
    np.testing.assert_allclose(family.crowding[~side.any(axis=1)], 1.0)


def test_only_solids_are_weighted() -> None:
    rod = bem.cylinder(1.0, 3.0)
    solid, hollow = Mesh.start([rod]).faceting(), Mesh.start([rod], hollow=[0]).faceting()
    assert solid.offset.sum() > 1.05 * hollow.offset.sum() > 0.0
