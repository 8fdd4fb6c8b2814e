"""Conductors that touch dielectrics, against finite elements that share nothing with bem.

Values and their doubt are in ``dielectric_values``; ``benchmarks/dielectric_elements.py`` computes
them again, and ``test_dielectric_values`` confirms some by another library.
"""

from __future__ import annotations

import zlib

import pytest
from dielectric_scenes import (
    bars_meet,
    rough_box,
    scene_of_record,
    solve,
    turned_by,
    with_dielectrics,
)
from dielectric_values import BY_ELEMENTS, BY_NAME
from scenes import check

from bem.geometry import shapes

FLAT = [r.name for r in BY_ELEMENTS if r.conductors[0].kind in ("box", "plate")]
FLAT.remove("square sheet on a block, er 1000")  # its bar is a little short (bench_bars.py)


@pytest.mark.parametrize("name", FLAT)
def test_blocks(name: str) -> None:
    record = BY_NAME[name]
    check(solve(scene_of_record(record)), record.matrix, record.uncertainty)


TURNED = (
    "box standing on a wider block, er 10",
    "cube half sunk in a block, er 4",
    "slab flush between two plates, er 10",
)


@pytest.mark.parametrize("name", TURNED)
def test_turned_by_a_random_angle(name: str) -> None:
    record = BY_NAME[name]
    place = turned_by(zlib.crc32(name.encode()))
    check(solve(scene_of_record(record, place)), record.matrix, record.uncertainty)


def test_box_on_a_block_with_meshes_that_do_not_match() -> None:
    """Irregular triangles on both sides of the contact, and of all other faces."""
    record = BY_NAME["box standing on a wider block, er 10"]
    metal = rough_box((1.0, 1.0, 0.5), (0.0, 0.0, 0.25), 3, seed=1)
    block = rough_box((2.0, 2.0, 0.5), (0.0, 0.0, -0.25), 4, seed=2)
    result = solve(with_dielectrics([metal], [(block, 10.0)]))
    check(result, record.matrix, record.uncertainty)
    bars_meet(result, solve(scene_of_record(record)))


def test_slab_between_plates_with_meshes_that_do_not_match() -> None:
    record = BY_NAME["slab flush between two plates, er 10"]
    place = turned_by(5)
    high = place(rough_box((1.0, 1.0, 0.1), (0.0, 0.0, 0.15), 2, seed=3))
    low = place(rough_box((1.0, 1.0, 0.1), (0.0, 0.0, -0.15), 3, seed=4))
    slab = place(shapes.box(1.0, 1.0, 0.2))
    check(solve(with_dielectrics([high, low], [(slab, 10.0)])), record.matrix, record.uncertainty)
