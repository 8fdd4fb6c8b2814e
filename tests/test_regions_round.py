"""Curved bodies beside flat ones in one partition: both cut, each region closed."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
import pytest
from test_regions_turned import THIRD, TOLERANCE, at, dielectric, metal, moved, skin

from bem.geometry import shapes
from bem.geometry.parts import METAL, Part
from bem.geometry.regions.measures import measures
from bem.geometry.regions.parted import parted
from bem.geometry.regions.partition import Partition, Solid

ROD = 0.09 * math.pi
BOX = dielectric(shapes.box(2.0, 2.0, 1.0))
PLATE = at(shapes.box(3.0, 3.0, 1.0), 0, 0, 1)


class Case(NamedTuple):
    """Bodies, volumes of regions, and areas between neighbours."""

    bodies: list[Solid]
    volumes: dict[int, float]
    areas: dict[tuple[int, int], float]


def on_board(area: float, hidden: float, rest: float) -> dict:
    """Areas beside a conductor on or in the top of the board, by what it hides of the top."""
    return {(METAL, 1): area, (METAL, 0): rest, (0, 1): 16.0 - hidden}


CASES = {
    "ball half sunk": Case(
        [metal(at(shapes.sphere(0.4), 0.2, 0, 0.5)), BOX],
        {1: 4.0 - 0.5 * THIRD * 0.064},
        on_board(0.32 * math.pi, 0.16 * math.pi, 0.32 * math.pi),
    ),
    "rod standing": Case(
        [metal(at(shapes.cylinder(0.3, 2.0), 0, 0, 1.5)), BOX],
        {1: 4.0},
        on_board(ROD, ROD, ROD + 1.2 * math.pi),
    ),
    "rod through": Case(
        [metal(at(shapes.cylinder(0.3, 2.0), 0.1, 0.2, 0)), BOX],
        {1: 4.0 - ROD},
        on_board(0.6 * math.pi, 2.0 * ROD, 2.0 * ROD + 0.6 * math.pi),
    ),
    "rod lying on it": Case(
        [
            metal(
                shapes.cylinder(0.3, 1.0).placed(
                    np.array([[0.0, 0, 1], [1, 0, 0], [0, 1, 0]]), np.array([0, 0, 0.8])
                )
            ),
            BOX,
        ],
        {1: 4.0},
        {(METAL, 0): 2.0 * ROD + 0.6 * math.pi, (0, 1): 16.0},
    ),
    "disc on it": Case(
        [skin(at(shapes.disc(0.3), 0, 0, 0.5)), BOX], {1: 4.0}, on_board(ROD, ROD, ROD)
    ),
    "coat on a rod on the board": Case(
        [
            metal(at(shapes.cylinder(0.3, 1.0), 0, 0, 1)),
            BOX,
            dielectric(at(shapes.cylinder(0.5, 1.0), 0, 0, 1)),
        ],
        {1: 4.0, 2: 0.16 * math.pi},
        {
            (METAL, 0): ROD,
            (METAL, 1): ROD,
            (METAL, 2): 0.6 * math.pi,
            (0, 1): 16.0 - 0.25 * math.pi,
            (0, 2): math.pi + 0.16 * math.pi,
            (1, 2): 0.16 * math.pi,
        },
    ),
    "two pins through a bead": Case(
        [
            *(metal(at(shapes.cylinder(0.1, 3.0), 0.4 * s, 0, 0), k) for k, s in ((0, -1), (1, 1))),
            dielectric(shapes.cylinder(1.0, 1.0)),
        ],
        {1: 0.98 * math.pi},
        {
            (METAL, 0): 2.0 * (0.02 + 0.4) * math.pi,
            (METAL, 1): 0.4 * math.pi,
            (0, 1): (2.0 + 2.0 - 0.04) * math.pi,
        },
    ),
    "box in the end of a cylinder": Case(
        [metal(at(shapes.box(0.3, 0.4, 0.5), 0, 0, 0.5)), dielectric(shapes.cylinder(1.0, 1.0))],
        {1: math.pi - 0.03},
        {(METAL, 0): 0.47, (METAL, 1): 0.47, (0, 1): 4.0 * math.pi - 0.12},
    ),
    "cylinder under a plate": Case(
        [metal(PLATE), dielectric(shapes.cylinder(0.5, 1.0))],
        {1: 0.25 * math.pi},
        {(METAL, 0): 30.0 - 0.25 * math.pi, (METAL, 1): 0.25 * math.pi, (0, 1): 1.25 * math.pi},
    ),
    "cylinder half under a plate": Case(
        [metal(at(PLATE, 1.5, 0, 0)), dielectric(shapes.cylinder(0.5, 1.0))],
        {1: 0.25 * math.pi},
        {
            (METAL, 0): 30.0 - 0.125 * math.pi,
            (METAL, 1): 0.125 * math.pi,
            (0, 1): 1.375 * math.pi,
        },
    ),
    "coated ball in a box": Case(
        [
            metal(shapes.sphere(0.2)),
            dielectric(shapes.box(1.0, 1.0, 1.0)),
            dielectric(shapes.sphere(0.3)),
        ],
        {1: 1.0 - THIRD * 0.027, 2: THIRD * 0.019},
        {(METAL, 2): 0.16 * math.pi, (0, 1): 6.0, (1, 2): 0.36 * math.pi},
    ),
}

each_case = pytest.mark.parametrize("case", CASES.values(), ids=CASES)


def vector_area(part: Part) -> np.ndarray:
    if part.surface.curve is not None:
        return measures(part.surface.curve).vector_area
    corners = part.surface.vertices[part.surface.triangles]
    return 0.5 * np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]).sum(axis=0)


def leak(partition: Partition) -> float:
    """Largest sum of outward vector areas around a region; zero if all are closed."""
    regions = {side for part in partition.parts for side in (part.back, part.front)}
    sums = [
        sum(((p.back == r) * 1.0 - (p.front == r)) * vector_area(p) for p in partition.parts)
        for r in regions
    ]
    return float(np.abs(sums).max())


@each_case
@pytest.mark.parametrize(("seed", "scale"), [(0, 1.0), (6, 1e-2)])
def test_volumes_areas_and_closed_regions(case: Case, seed: int, scale: float) -> None:
    bodies = moved(case.bodies, seed, scale) if seed else case.bodies
    found = parted(bodies, TOLERANCE * scale)
    volumes = {region: volume * scale**3 for region, volume in case.volumes.items()}
    areas = {pair: area * scale**2 for pair, area in case.areas.items()}
    assert found.volumes == pytest.approx(volumes, rel=1e-8)
    assert found.areas == pytest.approx(areas, rel=1e-8)
    assert leak(found) < 1e-10 * scale**2
    assert not any("facets" in note for note in found.notes)


def test_contacts_and_overlaps_are_told_once() -> None:
    found = parted(CASES["two pins through a bead"].bodies, TOLERANCE)
    about = [[name in note for name in ("conductor 1", "conductor 2")] for note in found.notes]
    assert about == [[True, False], [False, True]]
    (note,) = parted(CASES["rod standing"].bodies, TOLERANCE).notes
    assert note == "conductor 1 touches dielectric 1 over 0.2827 m^2"


def test_a_ball_at_an_edge_is_cut_by_its_facets() -> None:
    bodies = [metal(at(shapes.sphere(0.4), 1.0, 0, 0.5)), BOX]
    found = parted(bodies, TOLERANCE)
    assert leak(found) < 1e-10
    assert all(part.surface.curve is None for part in found.parts)
    assert found.volumes[1] == pytest.approx(4.0 - 0.25 * THIRD * 0.064, rel=1e-3)
    assert "facets stand for its curved surface" in found.notes[0]
