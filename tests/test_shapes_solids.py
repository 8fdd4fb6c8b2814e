"""Solids joined, cut and intersected: exact volumes and areas, and what is refused."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from made_bodies import faces_of
from shape_measures import area, is_closed, side_counts, volume

import bem
from bem.errors import UsageError
from bem.geometry.flat_faces import FlatFaces
from bem.geometry.surface import Surface
from bem.geometry.topology import pieces_of
from bem.scene.placing import rotation


def block(low: tuple[float, float, float], high: tuple[float, float, float]) -> Surface:
    """Box between two corners."""
    middle = 0.5 * np.add(low, high)
    return bem.box(*np.subtract(high, low), center=tuple(middle))


UNIT = block((0, 0, 0), (1, 1, 1))
ACROSS = block((0.5, 0.2, 0.5), (2.0, 0.9, 1.5))
HOLLOW = bem.difference([UNIT, block((0.2, 0.2, 0.2), (0.8, 0.8, 0.8))])
BAR = block((-1, 0.4, 0.4), (2, 0.6, 0.6))

BOXES = {
    "overlap": (bem.union([UNIT, ACROSS]), 1.875, 10.6),
    "common": (bem.intersection([UNIT, ACROSS]), 0.175, 1.9),
    "cut": (bem.difference([UNIT, ACROSS]), 0.825, 6.5),
    "side by side": (bem.union([UNIT, block((1, 0, 0), (2, 1, 1))]), 2.0, 10.0),
    "side by side but for rounding": (
        bem.union([block((0, 0, 0), (0.3, 1, 1)), block((0.1 + 0.2, 0, 0), (2, 1, 1))]),
        2.0,
        10.0,
    ),
    "part of a face": (bem.union([UNIT, block((1, 0.25, 0.25), (2, 0.75, 0.75))]), 1.25, 8.0),
    "apart": (bem.union([UNIT, block((2, 0, 0), (3, 1, 1))]), 2.0, 12.0),
    "inside the other": (bem.union([UNIT, block((0.2, 0.2, 0.2), (0.8, 0.8, 0.8))]), 1.0, 6.0),
    "cavity": (HOLLOW, 0.784, 8.16),
    "cavity kept": (bem.union([HOLLOW, block((1, 0, 0), (2, 1, 1))]), 1.784, 12.16),
    "three": (bem.union([UNIT, BAR, block((0.4, -1, 0.4), (0.6, 2, 0.6))]), 1.16, 9.2),
    "hole through": (bem.difference([UNIT, BAR]), 0.96, 6.0 - 0.08 + 0.8),
    "nanometres": (
        bem.union([block((0, 0, 0), (1e-9,) * 3), block((1e-9, 0, 0), (2e-9, 1e-9, 1e-9))]),
        2e-27,
        1e-17,
    ),
}  # fmt: skip


@pytest.mark.parametrize(("solid", "inside", "outside"), BOXES.values(), ids=BOXES)
def test_boxes_have_exact_volumes_and_areas(solid: Surface, inside: float, outside: float) -> None:
    assert volume(solid) == pytest.approx(inside, rel=1e-9, abs=0.0)
    assert area(solid) == pytest.approx(outside, rel=1e-9, abs=0.0)
    assert np.all(side_counts(solid) == 2) and is_closed(solid)


def test_boxes_side_by_side_have_the_faces_of_one() -> None:
    assert FlatFaces.of(BOXES["side by side"][0]).count == 6
    assert FlatFaces.of(BOXES["overlap"][0]).count == 12
    assert pieces_of(BOXES["apart"][0].triangles)[0] == 2


def test_turned_together_nothing_changes() -> None:
    turn = rotation((0.3, -1.1, 0.7), 37.0)
    placed = [body.placed(turn, np.array([0.1, 0.2, 0.3])) for body in (UNIT, ACROSS)]
    solid = bem.union(placed)
    assert volume(solid) == pytest.approx(1.875, rel=1e-9)
    assert FlatFaces.of(solid).count == 12


def test_orientation_of_faces_does_not_matter() -> None:
    """Every other triangle of the one body turned over, all of the other."""
    triangles = UNIT.triangles.copy()
    triangles[::2] = triangles[::2, ::-1]
    shuffled = Surface(UNIT.vertices, faces_of(triangles))
    inverted = Surface(ACROSS.vertices, faces_of(ACROSS.triangles[:, ::-1]))
    assert volume(bem.union([shuffled, inverted])) == pytest.approx(1.875, rel=1e-9)
    assert volume(bem.difference([shuffled, inverted])) == pytest.approx(0.825, rel=1e-9)


def lens(height: float) -> float:
    """Volume common to two unit balls, of two caps of ``height`` (Archimedes)."""
    return 2.0 * math.pi * height**2 * (3.0 - height) / 3.0


def test_balls_come_near_to_their_formula_with_facets() -> None:
    balls = [bem.sphere(1.0), bem.sphere(1.0).placed(np.eye(3), np.array([1.0, 0.0, 0.0]))]
    whole = 8.0 * math.pi / 3.0 - lens(0.5)
    for around in (24, 48, 96):
        joined = bem.union(balls, around=around)
        short = 1.0 - volume(joined) / whole
        assert 0.0 < short < 16.0 / around**2
        assert np.all(side_counts(joined) == 2)
        common = bem.intersection(balls, around=around)
        assert volume(joined) + volume(common) == pytest.approx(
            2.0 * volume(bem.revolve([(0, -1), bem.ArcTo((1, 0), (0, 1))], around)), rel=2e-3
        )


@pytest.mark.parametrize("around", [16, 96])
def test_slanted_round_bodies_stay_closed(around: int) -> None:
    """No gap and no sliver where facets cut each other at odd angles."""
    across = rotation((1.0, 0.2, 0.0), 63.0)
    stub = bem.cylinder(0.3, 2.0).placed(across, np.array([0.1, 0.4, 0.1]))
    for body in (bem.union, bem.difference):
        solid = body([bem.cylinder(0.5, 3.0), bem.torus(0.5, 0.2), stub], around=around)
        assert np.all(side_counts(solid) == 2) and is_closed(solid)


BAD_CALLS: dict[str, tuple[Callable[[], Surface], str]] = {
    "one": (lambda: bem.union([UNIT]), "union: found 1 bodies; give a list of at least two"),
    "no list": (lambda: bem.difference(UNIT), "difference: found 0 bodies; give a list"),
    "no body": (lambda: bem.union([UNIT, 3]), r"of\[1\]: found int; give a Surface such as"),
    "sheet": (
        lambda: bem.union([UNIT, bem.plate(1.0, 1.0)]),
        r"of\[1\]: is no closed solid \(4 sides without exactly two faces\); give closed bodies",
    ),
    "round sheet": (lambda: bem.union([bem.disc(1.0), UNIT]), r"of\[0\]: is no closed solid"),
    "nothing left": (
        lambda: bem.difference([UNIT, bem.box(5.0, 5.0, 5.0)]),
        "difference: nothing is left of the bodies; check their places and sizes",
    ),
    "nothing common": (
        lambda: bem.intersection([UNIT, block((5, 5, 5), (6, 6, 6))]),
        "intersection: nothing is left of the bodies",
    ),
    "empty": (
        lambda: bem.union([UNIT, Surface(np.zeros((3, 3)), np.array([[0, 1, 2, -1]]))]),
        r"of\[1\]: no face with an area is left",
    ),
    "facets": (lambda: bem.union([UNIT, UNIT], around=2), "around: found 2; give a whole number"),
}  # fmt: skip


@pytest.mark.parametrize(("call", "message"), BAD_CALLS.values(), ids=BAD_CALLS)
def test_what_is_off_gives_one_clear_line(call: Callable[[], Surface], message: str) -> None:
    with pytest.raises(UsageError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
