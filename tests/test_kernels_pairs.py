"""Double integrals over two panels against an independent quadrature."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from panel_shapes import (
    NEEDLE,
    SHAPES,
    SKEW,
    SPLINTER,
    SQUARE,
    TRIANGLE,
    flat,
    in_plane,
    rectangle,
    turned,
    upright,
)
from reference_integrals import pair_integral

from bem.kernels.arrays import PanelArrays, panel_arrays
from bem.kernels.pairs import clustered_pair, near_pair
from bem.kernels.polygons import coplanar_pair, line_integral
from bem.kernels.rectangles import parallel_pair, perpendicular_pair
from bem.scene.placing import rotation

Rule = Callable[[int, int, PanelArrays], float]

CLOSED = 1e-11
SIDES = 2e-8
"""The side-pair rule: closed inner integrals, quadrature along the other side."""
SAMPLED = 1e-4
"""Samples clustered at the rim, for panels that are not in parallel planes."""


def off_by(rule: Rule, first: np.ndarray, second: np.ndarray) -> float:
    """Larger relative error of a rule in either order of the panels."""
    panels = panel_arrays(np.array([first, second]))
    exact = pair_integral(first, second)
    return max(abs(rule(0, 1, panels) / exact - 1.0), abs(rule(1, 0, panels) / exact - 1.0))


def test_square_with_itself_has_the_known_value() -> None:
    """4 ln(1 + sqrt 2) + 4 (1 - sqrt 2) / 3, also what the quadrature of these tests gives."""
    exact = 4.0 * math.log(1.0 + math.sqrt(2.0)) + 4.0 * (1.0 - math.sqrt(2.0)) / 3.0
    panels = panel_arrays(np.array([SQUARE]))
    assert near_pair(0, 0, panels) == pytest.approx(exact, rel=1e-14)
    assert pair_integral(SQUARE, SQUARE) == pytest.approx(exact, rel=1e-13)


SPANS = {
    "apart": (1.4, 2.1),
    "touching": (1.0, 1.8),
    "overlapping": (0.4, 1.3),
    "inside": (0.2, 0.7),
    "equal": (0.0, 1.0),
    "around": (-0.5, 1.6),
}


@pytest.mark.parametrize("height", [1e-3, 0.1, 1.0])
@pytest.mark.parametrize(("u", "v"), list(itertools.combinations_with_replacement(SPANS, 2)))
def test_parallel_rectangles(u: str, v: str, height: float) -> None:
    """All relative positions in projection, at three distances of the planes."""
    assert off_by(near_pair, SQUARE, rectangle(SPANS[u], SPANS[v], height)) < CLOSED


@pytest.mark.parametrize(("u", "v"), list(itertools.product(("apart", "touching"), SPANS)))
def test_rectangles_in_one_plane(u: str, v: str) -> None:
    """Side by side, sharing a side or a part of one or a corner, and apart."""
    assert off_by(near_pair, SQUARE, rectangle(SPANS[u], SPANS[v])) < CLOSED


@pytest.mark.parametrize("aside", [0.0, 1.0, 0.35, -0.2])
@pytest.mark.parametrize("lift", [0.0, 1e-3, 0.3])
@pytest.mark.parametrize("u", SPANS)
def test_perpendicular_rectangles(u: str, lift: float, aside: float) -> None:
    """Standing on an edge, on the middle and beside, touching or lifted."""
    assert off_by(near_pair, SQUARE, upright(SPANS[u], (lift, lift + 1.3), aside)) < CLOSED


@pytest.mark.parametrize("standing", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_turned_rectangles(seed: int, standing: bool) -> None:
    """The closed forms do not care how the pair lies in space or which side comes first."""
    other = upright((0.3, 1.2), (0.0, 0.8)) if standing else rectangle((0.3, 1.2), (0.4, 0.9), 0.2)
    other = np.roll(other, seed, axis=0)
    assert off_by(near_pair, turned(SQUARE, seed), turned(other, seed)) < CLOSED


@pytest.mark.parametrize("size", [1e-9, 1e3])
def test_pairs_grow_as_the_cube_of_length(size: float) -> None:
    pair = np.array([SQUARE, upright((0.0, 1.0), (0.0, 1.0))])
    value = near_pair(0, 1, panel_arrays(pair))
    scaled = near_pair(0, 1, panel_arrays(size * pair))
    assert scaled == pytest.approx(size**3 * value, rel=1e-12)


@pytest.mark.parametrize("aspect", [10.0, 100.0, 1000.0])
def test_needles_side_by_side_facing_and_alone(aspect: float) -> None:
    width = 1.0 / aspect
    needle = rectangle((0.0, 1.0), (0.0, width))
    beside = rectangle((0.0, 1.0), (width, 2.0 * width))
    for other in (needle, beside, needle + (0.0, 0.0, width)):
        assert off_by(near_pair, needle, other) < 1e-13 * aspect**2


def test_needle_of_aspect_ten_thousand() -> None:
    """Beyond the reach of the closed form the sampled rule takes over."""
    assert off_by(near_pair, NEEDLE, NEEDLE) < SAMPLED
    assert off_by(near_pair, NEEDLE, NEEDLE + (0.0, 1e-4, 0.0)) < SAMPLED
    assert math.isfinite(near_pair(0, 0, panel_arrays(np.array([SPLINTER]))))


@given(
    st.tuples(*[st.floats(-1.5, 1.5)] * 2),
    st.tuples(*[st.floats(0.05, 2.0)] * 2),
    st.one_of(st.just(0.0), st.floats(1e-6, 2.0)),
)
@settings(max_examples=60, deadline=None, derandomize=True)
def test_parallel_form_is_the_quadrature_anywhere(
    low: tuple[float, float], size: tuple[float, float], height: float
) -> None:
    """Even where rectangles of one plane overlap, the closed form is the integral."""
    u, v = ((low[k], low[k] + size[k]) for k in range(2))
    ends = [np.array([[0.0 - s[0], 0.0 - s[1]], [1.0 - s[0], 1.0 - s[1]]]) for s in (u, v)]
    exact = pair_integral(SQUARE, rectangle(u, v, height))
    assert parallel_pair(ends[0], ends[1], height) == pytest.approx(exact, rel=1e-9)


@given(
    st.floats(-1.5, 1.5),
    st.floats(0.1, 2.0),
    st.sampled_from([0.0, -0.3, -1.0, 0.4]),
    st.floats(0.0, 1.0),
)
@settings(max_examples=40, deadline=None, derandomize=True)
def test_perpendicular_form_is_the_quadrature_anywhere(
    low: float, size: float, aside: float, lift: float
) -> None:
    ends = np.array([[0.0 - low, 0.0 - low - size], [1.0 - low, 1.0 - low - size]])
    v, w = np.array([0.0, 1.0]) + aside, np.array([lift, lift + 0.7])
    exact = pair_integral(SQUARE, upright((low, low + size), (lift, lift + 0.7), -aside))
    assert perpendicular_pair(ends, v, w) == pytest.approx(exact, rel=1e-9)


@pytest.mark.parametrize(
    ("t0", "t1", "p", "w"),
    [
        (0.0, 1.0, 0.5, 0.3),
        (-0.4, 0.7, 0.0, 0.2),
        (-0.4, 0.7, 0.2, 0.0),
        (0.1, 0.9, 0.0, 0.0),
        (-2.0, -0.5, -0.3, 1e-3),
        (-1.0, 2.0, 1e-9, 1e-6),
    ],
)
def test_line_integral_against_quadrature(t0: float, t1: float, p: float, w: float) -> None:
    """Integral of R - w log(w + R) along one side, by mpmath with thirty digits."""

    def integrand(t: mp.mpf) -> mp.mpf:
        r = mp.sqrt(t * t + mp.mpf(p) ** 2 + mp.mpf(w) ** 2)
        return r - (w * mp.log(w + r) if w else 0)

    with mp.workdps(30):
        stops = sorted({t0, t1} | ({0.0} if t0 < 0.0 < t1 else set()))
        exact = float(mp.quad(integrand, stops))
    assert line_integral(t0, t1, p, w) == pytest.approx(exact, rel=1e-12)


PLACES = {
    "side by side": (1.3, -0.2, 0.0),
    "across a corner": (1.25, 0.85, 0.0),
    "close above": (0.1, 0.05, 1e-3),
    "shifted above": (0.4, 0.3, 0.05),
    "above": (0.0, 0.0, 0.3),
    "far above": (0.0, 0.0, 2.0),
}


@pytest.mark.parametrize("degrees", [0.0, 5.0, 33.0, 90.0, 180.0])
@pytest.mark.parametrize("place", PLACES)
@pytest.mark.parametrize("name", ["triangle", "skew", "square"])
def test_polygons_in_parallel_planes(name: str, place: str, degrees: float) -> None:
    """Triangles and quadrilaterals turned against each other, over and beside one another."""
    other = SHAPES[name] - SHAPES[name].mean(axis=0)
    other = in_plane(other, degrees) + SKEW.mean(axis=0)
    beside = np.array(PLACES[place]) * (1.0 if PLACES[place][2] else 1.4)
    assert off_by(coplanar_pair, SKEW, other + beside) < SIDES


@pytest.mark.parametrize("name", ["triangle", "skew", "square"])
def test_polygon_with_itself_and_its_mirror(name: str) -> None:
    panel = SHAPES[name]
    assert off_by(coplanar_pair, panel, panel) < SIDES
    mirrored = panel[[2, 1, 0, 0]] if name == "triangle" else panel[::-1]
    assert off_by(coplanar_pair, panel, mirrored + (0.0, 0.0, 0.1)) < SIDES


def test_polygons_that_share_a_side() -> None:
    mirrored = TRIANGLE @ np.diag([1.0, -1.0, 1.0])
    turn = rotation((0.0, 0.0, 1.0), 2.0 * math.degrees(math.atan2(0.1, 1.0)))
    assert off_by(coplanar_pair, TRIANGLE, mirrored @ turn.T) < SIDES


def test_side_pairs_agree_with_the_closed_form() -> None:
    for other in (SQUARE, SQUARE + (1.0, 0.3, 0.0), SQUARE + (0.2, 0.3, 0.05)):
        panels = panel_arrays(np.array([SQUARE, other]))
        closed = near_pair(0, 1, panels)
        assert coplanar_pair(0, 1, panels) == pytest.approx(closed, rel=SIDES)


@pytest.mark.parametrize("seed", range(3))
def test_parallel_polygons_are_recognised_wherever_they_lie(seed: int) -> None:
    """Turned in space, the near rule still gives the accuracy of the side-pair rule."""
    other = in_plane(TRIANGLE, 20.0) + (0.3, 0.2, 0.05)
    assert off_by(near_pair, turned(SKEW, seed), turned(other, seed)) < SIDES


@pytest.mark.parametrize("degrees", [20.0, 60.0, 90.0, 135.0])
@pytest.mark.parametrize("name", ["triangle", "skew", "square"])
def test_panels_that_share_an_edge_at_an_angle(name: str, degrees: float) -> None:
    """Two facets of a bent surface: the sampled rule, good to its stated accuracy."""
    hinged = SHAPES[name] * (1.0, -1.0, 1.0)
    if name != "square":
        low, high = SHAPES[name][:2]
        along = (high - low) / np.linalg.norm(high - low)
        hinged = 2.0 * np.outer(SHAPES[name] @ along, along) - SHAPES[name]
        turn = rotation(tuple(along.tolist()), degrees)
    else:
        turn = rotation((1.0, 0.0, 0.0), degrees)
    assert off_by(near_pair, SHAPES[name], hinged @ turn.T) < SAMPLED


@pytest.mark.parametrize("lean", [10.0, 45.0, 80.0])
def test_panels_near_each_other_at_an_angle(lean: float) -> None:
    other = 0.6 * TRIANGLE @ rotation((1.0, 0.3, 0.0), lean).T + (0.2, 0.1, 0.15)
    assert off_by(near_pair, SQUARE, other) < 10 * SAMPLED


@pytest.mark.parametrize("gap", [0.0, 0.1, 0.5])
def test_clustered_samples_beside_a_panel(gap: float) -> None:
    """Beside the panel, touching or not, samples clustered at the rim suffice."""
    beside = flat((1.0 + gap, 0.0), (1.8 + gap, 0.2), (1.9 + gap, 0.9), (1.0 + gap, 0.8))
    assert off_by(clustered_pair, SQUARE, beside) < (SAMPLED if gap else 5 * SAMPLED)


@given(st.integers(0, 10**6), st.integers(3, 4), st.integers(3, 4))
@settings(max_examples=25, deadline=None, derandomize=True)
def test_pairs_are_positive_and_symmetric(seed: int, first: int, second: int) -> None:
    """Cauchy and Schwarz: A_12^2 < A_11 A_22; both orders agree as far as sampling."""
    random = np.random.default_rng(seed)
    pair = [SKEW if k == 4 else TRIANGLE for k in (first, second)]
    pair[1] = turned(pair[1], seed) + random.uniform(1.0, 1.5, 3)
    panels = panel_arrays(np.array(pair))
    mutual = near_pair(0, 1, panels)
    assert near_pair(1, 0, panels) == pytest.approx(mutual, rel=SAMPLED)
    assert 0.0 < mutual**2 < near_pair(0, 0, panels) * near_pair(1, 1, panels)
