"""Panels on fitted surfaces: no cracks, on the fit, bounded angles, aware of what they miss."""

from __future__ import annotations

import itertools
import math
from functools import reduce

import numpy as np
import pytest
from faceted_bodies import bowl, cylinder, disc, icosphere, rounded_box, torus, uneven_sphere
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import turned
from test_curved_panels import normals, solid_angle, unmatched

from bem.geometry.fit.fit import Fit
from bem.geometry.fit.patches import basis
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.surface import Surface
from bem.panels.fitted import FEW, FittedFamily

CLOSED = {
    "sphere": (icosphere(1), (0.1, 0.2, 0.1)),
    "uneven sphere": (uneven_sphere(60), (0.1, 0.2, 0.1)),
    "cylinder": (cylinder(16), (0.2, 0.1, 0.3)),
    "torus": (torus(16, 10), (2.1, 0.2, 0.1)),
    "rounded box": (rounded_box(3), (0.1, 0.2, 0.1)),
}
OPEN = {"disc": disc(16), "bowl": bowl(12)}

Orders = list[tuple[int, int]]
orders = st.lists(st.tuples(st.integers(0, 2**31), st.integers(0, 2)), min_size=1, max_size=5)
"""Refinements: a seed, and whether near one point in one direction, or here and there in both."""


def start(surface: Surface, seed: int = 0) -> FittedFamily:
    body = turned(surface, seed) if seed else surface
    return FittedFamily.start(Fit.of(FlatFaces.of(body), math.radians(40.0)))


def refined_once(family: FittedFamily, order: tuple[int, int]) -> FittedFamily:
    rng = np.random.default_rng(order[0])
    count = len(family.corners)
    if order[1] == 2:
        return family.refine(rng.random(count) < 0.2, rng.integers(0, 2, count))[0]
    spot = family.corners[rng.integers(count), 0]
    marked = np.any(np.all(family.corners == spot, axis=2), axis=1)
    return family.refine(marked, np.full(count, order[1]))[0]


def refined(family: FittedFamily, how: Orders) -> FittedFamily:
    return reduce(refined_once, how, family)


def areas(family: FittedFamily) -> np.ndarray:
    return np.linalg.norm(normals(family.corners), axis=1)


def volume(family: FittedFamily) -> float:
    """Between the panels and, to first order in their offsets exactly, the fit."""
    a, b, c = np.moveaxis(family.corners[:, :3], 1, 0)
    return float(np.einsum("ni,ni->", a, np.cross(b, c)) / 6.0 + family.offset @ areas(family))


def largest_angle(family: FittedFamily) -> float:
    corners = family.corners[:, :3]
    ahead = np.roll(corners, -1, axis=1) - corners
    back = np.roll(corners, 1, axis=1) - corners
    across = np.linalg.norm(np.cross(ahead, back), axis=2)
    return float(np.arctan2(across, np.einsum("nki,nki->nk", ahead, back)).max())


@pytest.mark.parametrize("name", CLOSED)
@settings(max_examples=8, deadline=None)
@given(how=orders)
def test_closed_bodies_stay_watertight(name: str, how: Orders) -> None:
    surface, inside = CLOSED[name]
    family = refined(start(surface), how)
    assert abs(solid_angle(family.corners, np.array(inside)) - 4.0 * math.pi) < 1e-11
    assert unmatched(family.corners) == []


@pytest.mark.parametrize("name", CLOSED)
@settings(max_examples=6, deadline=None)
@given(how=orders)
def test_volume_up_to_the_fit_does_not_change(name: str, how: Orders) -> None:
    """What panels lose or gain is in their offsets, to rounding."""
    family = start(CLOSED[name][0], seed=3)
    assert volume(refined(family, how)) == pytest.approx(volume(family), rel=1e-9)


def test_volumes_of_fits_approach_those_of_the_bodies() -> None:
    for make, exact in ((icosphere, 4.0 * math.pi / 3.0), (lambda n: cylinder(2**n * 6), math.tau)):
        miss = [abs(volume(start(make(n))) - exact) for n in (1, 2, 3)]
        assert miss[0] > 12.0 * miss[1] > 144.0 * miss[2]


@pytest.mark.parametrize("name", OPEN)
@settings(max_examples=8, deadline=None)
@given(how=orders)
def test_sheets_have_no_cracks_but_their_rims(name: str, how: Orders) -> None:
    family = refined(start(OPEN[name]), how)
    assert len(unmatched(family.corners)) == np.count_nonzero(family.rim_width)
    assert np.all(family.rim_width >= 0.0)


def test_area_of_a_disc_is_that_of_panels_and_rim() -> None:
    family = refined(start(disc(24), seed=5), [(1, 2), (2, 0), (3, 1), (4, 2)])
    area = areas(family)
    assert area @ (1.0 + family.rim_offset) == pytest.approx(math.pi, rel=1e-5)
    assert np.abs(family.offset).max() < 1e-12


@settings(max_examples=10, deadline=None)
@given(how=orders)
def test_corners_lie_on_the_patches(how: Orders) -> None:
    family = refined(start(torus(16, 10)), how)
    net, at = family.fit.net[family.net.facet], family.net.at
    np.testing.assert_allclose(basis(at) @ net, family.net.corners, atol=1e-12)
    assert at.sum(axis=2) == pytest.approx(1.0)
    assert np.all(at >= 0.0)


@settings(max_examples=10, deadline=None)
@given(how=orders)
def test_unchanged_panels_come_first(how: Orders) -> None:
    family = refined(start(cylinder(16)), how)
    rng = np.random.default_rng(len(how))
    count = len(family.corners)
    marked = rng.random(count) < 0.1
    finer, kept = family.refine(marked, rng.integers(0, 2, count))
    assert not marked[kept].any()
    np.testing.assert_array_equal(finer.corners[: len(kept)], family.corners[kept])
    assert finer.doubt[: len(kept)] == pytest.approx(family.doubt[kept])
    assert len(finer.corners) >= count + marked.sum()


def test_angles_stay_away_from_straight_ones() -> None:
    """However often panels at one point are cut, the same way each time."""
    for across, body in itertools.product((0, 1), (icosphere(1), torus(16, 10), rounded_box(3))):
        family = start(body)
        spot = family.corners[0, 0]
        for _ in range(12):
            marked = np.any(np.all(family.corners == spot, axis=2), axis=1)
            family, _ = family.refine(marked, np.full(len(marked), across))
        assert largest_angle(family) < math.radians(165.0)


def test_panels_at_a_crease_may_become_strips() -> None:
    """Cutting across only makes them thin along it, not small."""
    family = start(cylinder(24, 4.0))
    for _ in range(5):
        middle = family.corners[:, :3].mean(axis=1)
        side = np.hypot(middle[:, 0], middle[:, 1]) > 0.97
        near = side & (np.abs(family.corners[:, :3, 2]).max(axis=1) > 2.0 - 1e-9)
        family, _ = family.refine(near, np.ones(len(near), dtype=int))
    ahead = np.roll(family.corners[:, :3], -1, axis=1) - family.corners[:, :3]
    length = np.linalg.norm(ahead, axis=2)
    assert (length.max(axis=1) ** 2 / (2.0 * areas(family))).max() > 5.0


def test_few_facets_start_cut_in_four() -> None:
    few, many = cylinder(16), cylinder(48)
    assert len(few.faces) < FEW <= len(many.faces)
    assert len(start(few).corners) == 4 * len(few.faces)
    assert len(start(many).corners) == len(many.faces)
