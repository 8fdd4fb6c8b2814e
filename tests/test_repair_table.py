"""The table of damages in the guide for contributors: what is repaired, left or refused.

A repaired body has the area, the volume and, within the bars, the capacitance of the sound one.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from pathlib import Path

import damages
import numpy as np
import pytest
from damages import BODIES, box, joined
from made_bodies import cube, soup, stl_binary, stl_text, turned

import bem
from bem.errors import InputError
from bem.geometry.surface import Surface
from bem.scene.inspect import BodyReport, inspect
from bem.scene.scene import Scene

TOLERANCE = 1e-2

REPAIRED: list[tuple[str, Callable[[Surface], Surface], str]] = [
    ("facets rounded one by one", damages.cracked, "vertices on open seams welded, largest move"),
    ("missing facet", damages.without_a_facet, "1 small hole filled, the largest"),
    ("duplicate facets", damages.with_copies, "5 duplicate faces dropped"),
    ("opposite facets", damages.with_turned_copies, "5 duplicate faces dropped"),
    (
        "corner on the edge of a neighbour",
        damages.with_a_corner_on_an_edge,
        "1 corner on edges of neighbours (T-junctions) joined",
    ),
    ("facets without area", damages.with_slivers, "2 faces without area dropped"),
    ("patch on a facet", damages.with_a_patch, "2 triangles overlapping in one plane cut and kept"),
    ("pin through a face", damages.with_a_pin, "2 pieces that overlap or touch united"),
    ("some normals flipped", damages.with_flipped_normals, ""),
    ("stray unused vertex", damages.with_an_unused_vertex, ""),
]


def scene_of(surface: Surface) -> Scene:
    return Scene("mm").add_conductor("a", surface)


def look(surface: Surface) -> BodyReport:
    return inspect(scene_of(surface)).bodies[0]


def capacitance(surface: Surface) -> tuple[float, float]:
    result = bem.extract(scene_of(surface), tolerance=TOLERANCE, threads=1)
    return float(result.capacitance[0, 0]), float(result.error[0, 0])


@cache
def sound(name: str) -> tuple[BodyReport, tuple[float, float]]:
    return look(BODIES[name]), capacitance(BODIES[name])


def assert_same(surface: Surface, name: str, line: str, size: float = 1e-4) -> None:
    report, (value, bar) = look(surface), capacitance(surface)
    expected, (true, true_bar) = sound(name)
    assert report.closed and report.pieces == expected.pieces
    assert report.area == pytest.approx(expected.area, rel=size)
    assert report.volume == pytest.approx(expected.volume, rel=size)
    assert any(line in change for change in report.changes) or not (line or report.changes)
    assert abs(value - true) <= bar + true_bar


@pytest.mark.parametrize("name", BODIES)
@pytest.mark.parametrize(
    ("damage", "line"), [row[1:] for row in REPAIRED], ids=[r[0] for r in REPAIRED]
)
def test_repaired(name, damage, line):
    assert_same(damage(BODIES[name]), name, line, 2e-3 if damage is damages.with_a_pin else 1e-4)


def test_an_inner_wall_of_one_facet_each():
    line = "2 faces inside the solid dropped"
    assert_same(damages.with_an_inner_wall(BODIES["ball"]), "ball", line)


def test_two_halves_with_a_wall_each():
    """The walls match: as a duplicate one goes, and the other since metal is on both sides."""
    halves = joined(
        box((-0.5, -0.5, -0.5), (0.1, 0.5, 0.5)), box((0.1, -0.5, -0.5), (0.5, 0.5, 0.5))
    )
    assert_same(halves, "cube", "2 faces inside the solid dropped")
    assert "2 duplicate faces dropped" in look(halves).changes


@pytest.mark.parametrize(
    ("seed", "line"),
    [
        (None, "2 pieces that overlap or touch united"),
        (4, "2 faces inside the solid dropped"),
    ],
)
def test_boxes_glued_along_part_of_a_face(seed, line):
    """No edges of the two walls match; turned, single precision makes them miss each other."""
    boxes = joined(box((0, 0, 0), (2, 0.5, 1)), box((0, 0.5, 0), (0.5, 1.5, 1)))
    if seed is not None:
        boxes = turned(boxes, seed)
        boxes = Surface(boxes.vertices.astype(np.float32).astype(float), boxes.faces)
    assert_same(boxes, "bracket", line)


@pytest.mark.parametrize("name", BODIES)
def test_quadrilaterals_that_are_bent(name):
    """One that is bent or not convex is split along the better diagonal."""
    report = look(damages.of_quadrilaterals(BODIES[name]))
    assert report.closed
    assert any("not flat or not convex split into triangles" in line for line in report.changes)
    size = 1e-12 if name == "cube" else 2e-2
    assert report.volume == pytest.approx(sound(name)[0].volume, rel=size)


@pytest.mark.parametrize("name", BODIES)
def test_text_with_four_digits(tmp_path, name):
    """Rounded all alike: corners of neighbours stay equal, whatever the shape."""
    path = tmp_path / "body.stl"
    path.write_text(stl_text({"": np.round(soup(turned(BODIES[name], 3)), 4)}))
    report = inspect(Scene("mm").add_conductor("a", mesh=path)).bodies[0]
    assert report.closed
    assert report.volume == pytest.approx(sound(name)[0].volume, rel=1e-3)


# left as they are, with a word where the body may be meant otherwise


@pytest.mark.parametrize(
    ("surface", "note"),
    [
        (Surface(cube().vertices, cube().faces[1:]), "is almost closed: 3 open edges"),
        (damages.cracked(BODIES["ball"], 1e-3), "falls apart into 224 single triangles: they miss"),
        (joined(cube(), damages.rectangle((0.6, 0.5), (0.7, 0.7), 0.5)), ""),
    ],
    ids=["large facet missing", "wide seams", "stray facet"],
)
def test_left_as_sheets(surface, note):
    found = inspect(scene_of(surface))
    assert not found.bodies[0].closed
    assert found.bodies[0].changes == ()
    assert any(note in line for line in found.warnings) or not (note or found.warnings)


# refused


def test_a_corner_far_away_is_refused():
    with pytest.raises(InputError, match="is a stray vertex far away"):
        scene_of(damages.with_a_corner_far_away(BODIES["ball"]))


@pytest.mark.parametrize("kind", ["binary", "text"])
def test_a_truncated_file_is_refused(tmp_path: Path, kind):
    path = tmp_path / "body.stl"
    corners = soup(BODIES["cube"])
    whole = stl_binary(corners) if kind == "binary" else stl_text({"": corners}).encode()
    path.write_bytes(whole[: len(whole) // 2])
    with pytest.raises(InputError, match="export it again"):
        Scene("mm").add_conductor("a", mesh=path)


def test_crossed_quadrilaterals_are_refused():
    bow = Surface(cube().vertices, np.array([[0, 1, 2, 3], [0, 2, 6, 4], [1, 3, 7, 5]]))
    with pytest.raises(InputError, match="list its corners around the rim"):
        scene_of(bow)
