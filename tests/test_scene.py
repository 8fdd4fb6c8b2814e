"""Scenes in Python: units, placement, and every refusal."""

from __future__ import annotations

import hashlib

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_bodies import cube, soup, stl_text, write_cube

import bem
from bem.errors import BemError, InputError, UsageError
from bem.geometry.surface import Surface
from bem.scene.scene import Place, Scene, Source, rotation
from bem.units import METRES_PER


def refused(kind, call) -> str:
    with pytest.raises(kind) as caught:
        call()
    message = str(caught.value)
    assert "\n" not in message
    return message


@pytest.mark.parametrize("unit", METRES_PER)
def test_shapes_are_in_the_unit_of_the_scene(unit):
    scene = Scene(unit).add_conductor("a", bem.box(1, 2, 3))
    metres = METRES_PER[unit]
    assert scene.conductors[0].surface.bounds == pytest.approx(
        metres * np.array([[-0.5, -1, -1.5], [0.5, 1, 1.5]]), rel=1e-15
    )
    assert scene.conductors[0].source == Source(None, None, unit)


@pytest.mark.parametrize(("scene_unit", "file_unit"), [("mm", None), ("mm", "in"), ("um", "m")])
def test_meshes_are_in_their_own_unit_or_the_scene_s(tmp_path, scene_unit, file_unit):
    """The shift stays in the unit of the scene."""
    path = write_cube(tmp_path / "cube.stl", 2.0)
    place = Place(shift=(10.0, 0.0, 0.0), scale=0.5)
    scene = Scene(scene_unit).add_conductor("a", mesh=path, place=place, unit=file_unit)
    low, high = scene.conductors[0].surface.bounds
    assert high - low == pytest.approx(METRES_PER[file_unit or scene_unit])
    assert 0.5 * (low + high) == pytest.approx([10.0 * METRES_PER[scene_unit], 0.0, 0.0])
    source = scene.conductors[0].source
    assert source.file == str(path)
    assert source.unit == (file_unit or scene_unit)
    assert source.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert source.changes == ("36 corners as read joined into 8 vertices",)


def test_scaled_then_turned_then_shifted():
    place = Place(shift=(0.0, 0.0, 5.0), turn_axis=(0, 0, 2), turn_degrees=90.0, scale=3.0)
    scene = Scene("m").add_conductor("a", bem.box(2, 4, 6, center=(1, 2, 3)), place=place)
    assert scene.conductors[0].surface.bounds.tolist() == [[-12, 0, 5], [0, 6, 23]]


def test_a_round_shape_keeps_its_true_surface_when_placed():
    place = Place(shift=(1.0, 2.0, 3.0), scale=2.0)
    scene = Scene("mm").add_conductor("a", bem.sphere(1.0), place=place)
    curve = scene.conductors[0].surface.curve
    points = curve.point(np.linspace(0, 1, 7), np.linspace(0.1, 0.9, 7))
    assert np.linalg.norm(points - [1e-3, 2e-3, 3e-3], axis=1) == pytest.approx(2e-3)


def test_parts_and_relative_names(tmp_path):
    (tmp_path / "two.stl").write_text(stl_text({"rod": soup(cube()), "can": soup(cube(3.0))}))
    scene = Scene("cm", folder=tmp_path).add_conductor(
        "a", mesh="two.stl", part="can", body="shell"
    )
    conductor = scene.conductors[0]
    assert conductor.surface.extent == pytest.approx(0.03 * 3**0.5)
    assert (conductor.source.file, conductor.source.part) == ("two.stl", "can")
    assert conductor.body == "shell"


def test_arrays_of_a_shape_are_welded():
    corners = soup(cube())
    triangles = np.arange(36).reshape(-1, 3)
    loose = Surface(corners.reshape(-1, 3), np.column_stack([triangles, np.full(12, -1)]))
    scene = Scene("mm").add_conductor("a", loose)
    assert len(scene.conductors[0].surface.vertices) == 8
    assert scene.conductors[0].source.changes == ("36 corners as read joined into 8 vertices",)


def test_the_scene_itself():
    assert Scene("mm").relative_permittivity == 1.0
    assert refused(UsageError, lambda: Scene("milli")) == (
        "unit: found 'milli' (did you mean 'mil'?); allowed are m, cm, mm, um, nm, in, mil"
    )
    for value, found in ((0.0, "0.0"), (-2, "-2")):
        assert refused(InputError, lambda value=value: Scene("mm", value)) == (
            f"relative_permittivity: found {found}, needs a number above 0"
        )
    assert refused(InputError, lambda: Scene("mm", float("nan"))) == (
        'relative_permittivity: found "nan", needs a finite number'
    )
    assert refused(InputError, lambda: Scene("mm", True)) == (
        "relative_permittivity: found true, needs a number"
    )


BOX = cube()
GOOD = {"name": "rod", "shape": BOX}
QUAD = Surface(np.zeros((4, 3)), np.array([[0, 1, 2, 3]]))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"name": ""}, 'conductor 1 (""): name: found "", needs text that is not blank'),
        ({"name": "  "}, 'conductor 1 ("  "): name: found "  ", needs text that is not blank'),
        ({"name": 3}, "conductor 1: name: found 3, needs text that is not blank"),
        ({"name": "a\tb"}, 'conductor 1 ("a\tb"): name: found "a\\tb", '
         "needs printable text on one line"),
        ({"body": "hollow"}, 'conductor 1 ("rod"): body: found "hollow"; '
         'allowed are "solid", "shell"'),
        ({"place": (1, 2, 3)}, 'conductor 1 ("rod"): place: found [1, 2, 3], needs a Place'),
        ({"place": Place(scale=0.0)}, 'conductor 1 ("rod"): place.scale: found 0.0, '
         "needs a number above 0"),
        ({"place": Place(scale="2")}, 'conductor 1 ("rod"): place.scale: found "2", '
         "needs a number"),
        ({"place": Place(shift=(1, 2))}, 'conductor 1 ("rod"): place.shift: found [1, 2], '
         "needs three numbers"),
        ({"place": Place(shift=7)}, 'conductor 1 ("rod"): place.shift: found 7, '
         "needs three numbers"),
        ({"place": Place(shift=(1, "x", 2))}, 'conductor 1 ("rod"): place.shift[1]: found "x", '
         "needs a number"),
        ({"place": Place(shift=(1, 2, float("inf")))}, 'conductor 1 ("rod"): place.shift[2]: '
         'found "inf", needs a finite number'),
        ({"place": Place(turn_degrees="ninety")}, 'conductor 1 ("rod"): place.turn.degrees: '
         'found "ninety", needs a number'),
        ({"place": Place(turn_axis=(0, 0, 0))}, 'conductor 1 ("rod"): place.turn.axis: '
         "found [0, 0, 0], needs a direction other than zero"),
        ({"shape": None}, 'conductor 1 ("rod"): mesh: missing; '
         "give the name of a mesh file, or a shape"),
        ({"mesh": "a.stl"}, 'conductor 1 ("rod"): found a shape and a mesh; give one of them'),
        ({"part": "x"}, 'conductor 1 ("rod"): part: goes with a mesh file only; '
         "drop it for a shape"),
        ({"unit": "mm"}, 'conductor 1 ("rod"): unit: goes with a mesh file only; '
         "drop it for a shape"),
        ({"shape": None, "mesh": "none.stl"}, 'conductor 1 ("rod"): none.stl: no such file'),
        ({"shape": None, "mesh": 5}, 'conductor 1 ("rod"): mesh: found 5, needs a file name'),
        ({"shape": None, "mesh": "a.stl", "part": 5}, 'conductor 1 ("rod"): part: found 5, '
         "needs text that is not blank"),
        ({"shape": None, "mesh": "a.stl", "unit": "mmm"}, 'conductor 1 ("rod"): unit: found '
         "'mmm' (did you mean 'mm'?); allowed are m, cm, mm, um, nm, in, mil"),
        ({"shape": [1, 2]}, 'conductor 1 ("rod"): shape: found list, '
         "needs a Surface such as bem.box()"),
        ({"shape": Surface(np.zeros((4, 2)), BOX.faces)}, 'conductor 1 ("rod"): shape: vertices: '
         "found float64 of shape (4, 2), needs numbers of shape (n, 3)"),
        ({"shape": Surface(BOX.vertices, BOX.faces[:, :3])}, 'conductor 1 ("rod"): shape: faces: '
         "found int64 of shape (12, 3), needs whole numbers of shape (n, 4)"),
        ({"shape": Surface(BOX.vertices, 1.0 * BOX.faces)}, 'conductor 1 ("rod"): shape: faces: '
         "found float64 of shape (12, 4), needs whole numbers of shape (n, 4)"),
        ({"shape": Surface(BOX.vertices[:5], BOX.faces)}, 'conductor 1 ("rod"): shape: a face uses '
         "a corner beyond the 5 listed; mesh it again"),
        ({"shape": Surface(BOX.vertices, BOX.faces[:, ::-1])}, 'conductor 1 ("rod"): shape: faces: '
         "only the fourth corner may be -1, in a triangle"),
        ({"shape": Surface(BOX.vertices * np.nan, BOX.faces)}, 'conductor 1 ("rod"): shape: '
         "8 corners not finite, the first is number 1 at (nan, nan, nan); mesh it again"),
        ({"shape": Surface(BOX.vertices, BOX.faces[:0])}, 'conductor 1 ("rod"): shape: '
         "holds no triangle or quadrilateral; mesh the surface"),
        ({"shape": QUAD}, 'conductor 1 ("rod"): no face with an area is left of 1 face; '
         "mesh it again"),
    ],
)  # fmt: skip
def test_refused_conductors(change, message):
    """Each message names the entry, what was found and what it should be; nothing is added."""
    scene = Scene("mm")
    assert refused(BemError, lambda: scene.add_conductor(**(GOOD | change))) == message
    assert scene.conductors == []


def test_names_are_unique():
    scene = Scene("mm").add_conductor("rod", cube())
    assert refused(InputError, lambda: scene.add_conductor("rod", cube())) == (
        'conductor 2 ("rod"): name: already that of conductor 1; rename one'
    )


@settings(max_examples=40, deadline=None)
@given(
    st.tuples(*[st.floats(-5, 5)] * 3).filter(lambda a: max(map(abs, a)) > 1e-3),
    st.floats(-720, 720),
)
def test_rotations_turn_about_their_axis(axis, degrees):
    matrix = rotation(axis, degrees)
    assert matrix @ matrix.T == pytest.approx(np.eye(3), abs=1e-14)
    assert np.linalg.det(matrix) == pytest.approx(1.0)
    assert matrix @ axis == pytest.approx(np.array(axis), abs=1e-13)
    angle = np.radians(degrees)
    assert np.trace(matrix) == pytest.approx(1.0 + 2.0 * np.cos(angle), abs=1e-12)
    twist = np.array([matrix[2, 1] - matrix[1, 2], matrix[0, 2] - matrix[2, 0],
                      matrix[1, 0] - matrix[0, 1]])  # fmt: skip
    direction = np.array(axis) / np.linalg.norm(axis)
    assert twist == pytest.approx(2.0 * np.sin(angle) * direction, abs=1e-12)


@pytest.mark.parametrize("quarters", range(-5, 6))
def test_quarter_turns_are_exact(quarters):
    x, y, _ = rotation((0, 0, 0.3), 90.0 * quarters).T
    expected = [(1, 0, 0), (0, 1, 0), (-1, 0, 0), (0, -1, 0)][quarters % 4]
    assert tuple(x.tolist()) == expected
    assert tuple(y.tolist()) == (-expected[1], expected[0], 0)
