"""Sheets and prisms with any outline and holes: their facets, and what is refused."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from shape_measures import area, is_closed, polygon_factor, side_counts, volume

import bem
from bem.errors import UsageError
from bem.geometry.shapes.outlines import AROUND
from bem.geometry.shapes.steps import ArcTo
from bem.geometry.surface import Surface

SQUARE = [(0.0, 0.0), (4.0, 0.0), (4.0, 4.0), (0.0, 4.0)]
NOTCHED = [(0, 0), (4, 0), (4, 4), (3, 4), (2, 1), (1, 4), (0, 4)]
CIRCLE = [(2.0, 0.0), ArcTo((0.0, 2.0), (-2.0, 0.0)), ArcTo((0.0, -2.0), (2.0, 0.0))]
SLOT = [(0, 0), (2, 0), ArcTo((3, 1), (2, 2)), (0, 2), ArcTo((-1, 1), (0, 0))]
ROUND = {"center": (1.0, 1.0), "radius": 0.5}
TRIANGLE = [(2.0, 2.0), (3.0, 2.0), (3.0, 3.0)]
SHARE = polygon_factor(AROUND)

REGIONS = {
    "square": (SQUARE, [], 16.0, 16.0),
    "clockwise": (SQUARE[::-1], [TRIANGLE[::-1]], 15.5, 16.0 + 2.0 + math.sqrt(2.0)),
    "closed by hand": ([*SQUARE, SQUARE[0]], [], 16.0, 16.0),
    "notched": (NOTCHED, [], 13.0, 14.0 + 2.0 * math.sqrt(10.0)),
    "holes": (SQUARE, [ROUND, TRIANGLE], 15.5 - 0.25 * math.pi * SHARE, None),
    "circle": (CIRCLE, [], 4.0 * math.pi * SHARE, None),
    "slot": (SLOT, [], 4.0 + math.pi * SHARE, None),
    "island ring": (CIRCLE, [{"center": (0, 0), "radius": 1}], 3.0 * math.pi * SHARE, None),
}
each_region = pytest.mark.parametrize(
    ("outline", "holes", "inside", "rim"), REGIONS.values(), ids=REGIONS
)


def rim_length(surface: Surface) -> float:
    """Length of the sides that belong to one face only."""
    ends = surface.triangles[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2)
    sides, uses = np.unique(np.sort(ends, axis=1), axis=0, return_counts=True)
    a, b = np.moveaxis(surface.vertices[sides[uses == 1]], 1, 0)
    return float(np.linalg.norm(b - a, axis=1).sum())


@each_region
def test_sheet_has_the_area_and_the_rim_of_its_outlines(outline, holes, inside, rim) -> None:
    sheet = bem.sheet(outline, holes)
    assert area(sheet) == pytest.approx(inside, rel=1e-12)
    assert np.all(sheet.vertices[:, 2] == 0.0)
    assert set(side_counts(sheet)) <= {1, 2}
    if rim is not None:
        assert rim_length(sheet) == pytest.approx(rim, rel=1e-12)


@each_region
def test_prism_is_closed_outward_and_has_its_volume_and_area(outline, holes, inside, rim) -> None:
    prism = bem.extrude(outline, 0.5, holes)
    assert np.all(side_counts(prism) == 2) and is_closed(prism)
    assert volume(prism) == pytest.approx(0.5 * inside, rel=1e-12)
    walls = 0.5 * rim_length(bem.sheet(outline, holes))
    assert area(prism) == pytest.approx(2.0 * inside + walls, rel=1e-12)
    assert prism.bounds[:, 2].tolist() == [0.0, 0.5]


def test_corners_of_round_parts_lie_on_their_circles() -> None:
    plate = bem.plate(4.0, 4.0, (5.0, 6.0, 7.0), [ROUND], around=30)
    offset = plate.vertices[4:] - np.array([6.0, 7.0, 7.0])
    np.testing.assert_allclose(np.linalg.norm(offset, axis=1), 0.5, rtol=1e-14)
    assert len(offset) == 30
    turns = np.linalg.norm(bem.sheet(SLOT).vertices[:, :2] - [2.0, 1.0], axis=1)
    assert np.count_nonzero(np.abs(turns - 1.0) < 1e-14) == AROUND // 2 + 1


def test_plate_counts_its_holes_from_its_center() -> None:
    holes = [ROUND | {"center": (1.0, 0.5)}, [(-1.0, -1.0), (-0.5, -1.0), (-0.5, -0.5)]]
    plate = bem.plate(4.0, 3.0, (5.0, 6.0, 7.0), holes)
    assert area(plate) == pytest.approx(12.0 - 0.25 * math.pi * SHARE - 0.125, rel=1e-12)
    assert plate.bounds.tolist() == [[3.0, 4.5, 7.0], [7.0, 7.5, 7.0]]


def test_hundreds_of_holes() -> None:
    grid = [{"center": (i + 0.5, j + 0.5), "radius": 0.4} for i in range(20) for j in range(10)]
    sheet = bem.sheet([(0, 0), (20, 0), (20, 10), (0, 10)], grid, around=12)
    assert area(sheet) == pytest.approx(200.0 * (1.0 - 0.16 * math.pi * polygon_factor(12)))


def plate_with(*holes: object) -> Callable[[], Surface]:
    return lambda: bem.plate(4.0, 4.0, holes=list(holes))


CENTRAL = {"center": (0.0, 0.0), "radius": 1.0}
BAD_CALLS: dict[str, tuple[Callable[[], Surface], str]] = {
    "one point": (lambda: bem.sheet([(0, 0)]), "outline: found 1 points; give at least two"),
    "no area": (lambda: bem.sheet([(0, 0), (1, 1)]), "outline: found touching or crossing itself"),
    "crossing": (
        lambda: bem.sheet([(0, 0), (1, 1), (1, 0), (0, 1)]),
        "outline: found touching or crossing itself near x = 1, y = 0; give an outline that",
    ),
    "back to the start": (
        lambda: bem.sheet([(0, 0), (2, 0), (2, 2), (1, 0)]),
        "outline: found touching or crossing itself near x = ",
    ),
    "not finite": (
        lambda: bem.sheet([(0, 0), (1, math.nan), (1, 1)]),
        "outline point 2: found nan; give a finite number",
    ),
    "three numbers": (
        lambda: bem.sheet([(0, 0), (1, 0), (1, 1, 1)]),
        r"outline point 3: found \(1, 1, 1\); give two numbers \(x, y\) or an ArcTo",
    ),
    "twice": (lambda: bem.sheet([(0, 0), (1, 0), (1, 0)]), "outline point 3: .* twice in a row"),
    "flat": (lambda: bem.extrude(SQUARE, 0.0), "height: found 0.0; a length must be positive"),
    "few facets": (lambda: bem.sheet(SQUARE, around=2), "around: found 2; give a whole number"),
    "no list": (lambda: bem.sheet(SQUARE, CENTRAL), "holes: found .*; give a list of them"),
    "odd hole": (
        plate_with({"centre": (0, 0), "radius": 1}),
        r"holes\[0\]: found centre, radius; give center and radius, or a list of points",
    ),
    "no hole": (plate_with({}), r"holes\[0\]: found nothing; give center and radius"),
    "negative hole": (
        plate_with(CENTRAL | {"radius": -1.0}),
        r"holes\[0\].radius: found -1.0; a length must be positive",
    ),
    "hole in space": (
        plate_with(CENTRAL | {"center": (0, 0, 0)}),
        r"holes\[0\].center: found \(0, 0, 0\); give two numbers \(x, y\)",
    ),
    "hole over the rim": (
        plate_with(CENTRAL, {"center": (1.7, 0.0), "radius": 0.5}),
        r"holes\[1\]: reaches the outline or lies outside near x = \S+, y = \S+; keep it inside",
    ),
    "hole at the rim": (
        plate_with([(2.0, 0.0), (1.0, 1.0), (1.0, -1.0)]),
        r"holes\[0\]: reaches the outline or lies outside",
    ),
    "hole outside": (
        plate_with({"center": (7.0, 0.0), "radius": 0.5}),
        r"holes\[0\]: reaches the outline or lies outside near x = 7.5, y = 0; keep it inside",
    ),
    "hole around all": (
        plate_with({"center": (0.0, 0.0), "radius": 9.0}),
        r"holes\[0\]: reaches the outline or lies outside near x = 9, y = 0",
    ),
    "holes that meet": (
        plate_with(CENTRAL, {"center": (1.0, 0.0), "radius": 0.5}),
        r"holes\[1\]: meets holes\[0\] near x = \S+, y = \S+; keep holes apart or join them",
    ),
    "hole in a hole": (
        plate_with(CENTRAL, {"center": (0.1, 0.0), "radius": 0.1}),
        r"holes\[1\]: meets holes\[0\] near x = 0.2, y = 0",
    ),
    "hole around a hole": (
        plate_with({"center": (0.1, 0.0), "radius": 0.1}, CENTRAL),
        r"holes\[1\]: meets holes\[0\] near x = 0.2, y = 0",
    ),
    "crossed hole": (
        plate_with([(0, 0), (1, 1), (1, 0), (0, 1)]),
        r"holes\[0\]: found touching or crossing itself near x = 1, y = 0",
    ),
}


@pytest.mark.parametrize(("call", "message"), BAD_CALLS.values(), ids=BAD_CALLS)
def test_what_is_off_gives_one_clear_line(call: Callable[[], Surface], message: str) -> None:
    with pytest.raises(UsageError, match=message) as caught:
        call()
    assert "\n" not in str(caught.value)
