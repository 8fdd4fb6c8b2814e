"""The entry ``shape`` of scene files: the same surfaces as in Python, and what is refused."""

from __future__ import annotations

import inspect
from pathlib import Path

import numpy as np
import pytest
from made_bodies import write_cube

import bem
from bem.errors import InputError
from bem.geometry.revolved import Revolution
from bem.geometry.shapes.kinds import SHAPES
from bem.geometry.surface import Surface
from bem.scene.scene_file import load_scene

UP = np.array([0.0, 0.0, 1.5])
ENTRIES = {
    "{ kind = 'box', lx = 1, ly = 2.5, lz = 3, center = [1, 2, 3] }": bem.box(1, 2.5, 3, (1, 2, 3)),
    "{ kind = 'disc', radius = 2 }": bem.disc(2),
    "{ kind = 'annulus', inner = 1, outer = 2 }": bem.annulus(1, 2),
    "{ kind = 'tube', radius = 1, length = 2 }": bem.tube(1, 2),
    "{ kind = 'bowl', radius = 1 }": bem.bowl(1),
    "{ kind = 'sphere', radius = 1 }": bem.sphere(1),
    "{ kind = 'spheroid', radius = 1, half_length = 2 }": bem.spheroid(1, 2),
    "{ kind = 'ellipsoid', a = 1, b = 2, c = 3 }": bem.ellipsoid(1, 2, 3),
    "{ kind = 'cylinder', radius = 1, length = 2 }": bem.cylinder(1, 2),
    "{ kind = 'hemisphere', radius = 1 }": bem.hemisphere(1),
    "{ kind = 'torus', major = 2, minor = 0.5 }": bem.torus(2, 0.5),
    "{ kind = 'ring', major = 2.0, minor = 0.5 }": bem.ring(2, 0.5),
    "{ kind = 'ring', inner = 1, outer = 2, height = 3 }": bem.ring(inner=1, outer=2, height=3),
    "{ kind = 'cone', radius = 2, height = 3, top_radius = 1 }": bem.cone(2, 3, 1),
    "{ kind = 'revolve', steps = [[0, -1], { via = [1, 0], to = [0, 1] }], around = 20 }": (
        bem.revolve([(0, -1), bem.ArcTo((1, 0), (0, 1))], around=20)
    ),
    "{ kind = 'plate', lx = 4, ly = 3, holes = [{ center = [1, 0], radius = 0.5 }] }": bem.plate(
        4, 3, holes=[{"center": (1, 0), "radius": 0.5}]
    ),
    "{ kind = 'sheet', outline = [[0, 0], [2, 0], { via = [3, 1], to = [2, 2] }, [0, 2]] }": (
        bem.sheet([(0, 0), (2, 0), bem.ArcTo((3, 1), (2, 2)), (0, 2)])
    ),
    "{ kind = 'extrude', outline = [[0, 0], [2, 0], [1, 2]], height = 0.5 }": bem.extrude(
        [(0, 0), (2, 0), (1, 2)], 0.5
    ),
    "{ kind = 'wire', path = [[0, 0, 0], [5, 0, 0], [5, 5, 0]], radius = 0.5, bend_radius = 2 }": (
        bem.wire([(0, 0, 0), (5, 0, 0), (5, 5, 0)], 0.5, bend_radius=2)
    ),
    """{ kind = 'union', around = 24, of = [
        { kind = 'sphere', radius = 1 },
        { kind = 'cylinder', radius = 0.2, length = 2, place = { shift = [0, 0, 1.5] } },
    ] }""": bem.union([bem.sphere(1), bem.cylinder(0.2, 2).placed(np.eye(3), UP)], around=24),
    """{ kind = 'difference', of = [
        { kind = 'box', lx = 2, ly = 2, lz = 2 },
        { kind = 'intersection', of = [
            { kind = 'box', lx = 1, ly = 1, lz = 4 },
            { kind = 'box', lx = 4, ly = 4, lz = 1.5, place = { scale = 2 } },
        ] },
    ] }""": bem.difference(
        [bem.box(2, 2, 2), bem.intersection([bem.box(1, 1, 4), bem.box(8, 8, 3)])]
    ),
}


def loaded(folder: Path, entry: str, more: str = "") -> bem.Scene:
    path = folder / "scene.toml"
    path.write_text(f'unit = "mm"\n[[conductor]]\nname = "ring"\nshape = {entry}\n{more}')
    return load_scene(path)


def same_curve(one: Revolution | None, two: Revolution | None) -> bool:
    if one is None or two is None:
        return one is two
    same = one.profile == two.profile
    return same and np.array_equal(one.matrix, two.matrix) and np.array_equal(one.shift, two.shift)


@pytest.mark.parametrize("entry", ENTRIES)
def test_an_entry_is_what_python_makes(tmp_path: Path, entry: str) -> None:
    (conductor,) = loaded(tmp_path, entry, 'body = "shell"\n').conductors
    made = bem.Scene("mm").add_conductor("ring", ENTRIES[entry], body="shell").conductors[0]
    assert (conductor.body, conductor.source) == (made.body, made.source)
    assert np.array_equal(conductor.surface.faces, made.surface.faces)
    assert np.array_equal(conductor.surface.vertices, made.surface.vertices)
    assert same_curve(conductor.surface.curve, made.surface.curve)


def test_every_shape_is_in_the_package_and_was_tried() -> None:
    for kind in SHAPES:
        assert inspect.isfunction(getattr(bem, kind))
        assert any(f"kind = '{kind}'" in entry for entry in ENTRIES)


def test_a_conductor_of_a_shape_may_be_placed(tmp_path: Path) -> None:
    place = "place = { shift = [1, 0, 0], turn = { axis = [0, 1, 0], degrees = 90 }, scale = 2 }\n"
    (conductor,) = loaded(
        tmp_path, "{ kind = 'cylinder', radius = 1, length = 4 }", place
    ).conductors
    low, high = conductor.surface.bounds
    assert high - low == pytest.approx([8e-3, 4e-3, 4e-3], rel=1e-12)
    assert 0.5 * (high + low) == pytest.approx([1e-3, 0.0, 0.0], abs=1e-15)


def test_a_shape_may_be_a_table_of_its_own(tmp_path: Path) -> None:
    path = tmp_path / "scene.toml"
    path.write_text(
        'unit = "mm"\n[[conductor]]\nname = "ball"\n'
        '[conductor.shape]\nkind = "sphere"\nradius = 2\n'
    )
    assert load_scene(path).conductors[0].surface.extent == pytest.approx(4e-3 * 3**0.5)


ALL = f"known are {', '.join(SHAPES)}"
BOX = "{ kind = 'box', lx = 1, ly = 1, lz = 1 }"


@pytest.mark.parametrize(
    ("entry", "message"),
    [
        ("3", ': found 3, needs a table such as { kind = "sphere", radius = 1.0 }'),
        ("{ radius = 1 }", f".kind: missing; {ALL}"),
        ("{ kind = 4 }", ".kind: found 4, needs text that is not blank"),
        ("{ kind = 'rign' }", f'.kind: found "rign"; did you mean "ring"? {ALL}'),
        ("{ kind = 'qqq' }", f'.kind: found "qqq"; {ALL}'),
        ("{ kind = 'ring', majr = 2 }", ': unknown key "majr"; did you mean "major"? '
         "known are kind, major, minor, inner, outer, height"),
        ("{ kind = 'sphere', radius = 1, place = {} }", ': unknown key "place"; '
         "known are kind, radius"),
        ("{ kind = 'sphere' }", ".radius: missing"),
        ("{ kind = 'sphere', radius = true }", ".radius: found True; give a finite number"),
        ("{ kind = 'sphere', radius = 'r' }", ".radius: found 'r'; give a finite number"),
        ("{ kind = 'sphere', radius = {} }", ".radius: found {}; give a finite number"),
        ("{ kind = 'ring', major = 2, minor = 3 }",
         ".minor: found 3.0; it must be below major, which is 2.0"),
        ("{ kind = 'ring', major = 2 }",
         ": found major; give major and minor, or inner, outer and height"),
        ("{ kind = 'revolve', steps = [[0, 0], { via = [1, 1] }] }", ".steps[1].to: missing"),
        ("{ kind = 'revolve', steps = [[0, 0], { via = [1, 1], to = [0, 2], r = 1 }] }",
         '.steps[1]: unknown key "r"; known are via, to'),
        ("{ kind = 'revolve', steps = [[0, 0], { via = [1, 1], to = 7 }] }",
         ".profile point 2: found 7; give its coordinates as a tuple of numbers"),
        ("{ kind = 'plate', lx = 1, ly = 1, holes = [{ center = [0, 0], radius = 1 }] }",
         ".holes[0]: reaches the outline or lies outside near x = 1, y = 0; keep it inside"),
        ("{ kind = 'wire', path = [[0, 0, 0], [1, 0, 0]] }",
         ": found neither of radius and side; give one of them"),
        ("{ kind = 'union', of = 3 }", ".of: found 3, needs a list of shapes"),
        (f"{{ kind = 'union', of = [{BOX}] }}", ": found 1 bodies; give a list of at least two"),
        (f"{{ kind = 'union', of = [{BOX}, 3] }}",
         '.of[1]: found 3, needs a table such as { kind = "sphere", radius = 1.0 }'),
        (f"{{ kind = 'union', of = [{BOX}, {{ kind = 'disc', radius = -1 }}] }}",
         ".of[1].radius: found -1; a length must be positive and finite"),
        (f"{{ kind = 'union', of = [{BOX}, {{ kind = 'plate', lx = 1, ly = 1 }}] }}",
         ".of[1]: is no closed solid (4 sides without exactly two faces); "
         "give closed bodies, no sheets"),
        ("{ kind = 'union', of = [{ kind = 'sphere', radius = 1, place = { shift = [1] } }] }",
         ".of[0].place.shift: found [1], needs three numbers"),
        ("{ kind = 'union', of = [{ kind = 'sphere', radius = 1, place = { move = 1 } }] }",
         '.of[0].place: unknown key "move"; known are shift, turn, scale'),
    ],
)  # fmt: skip
def test_refused_entries(tmp_path: Path, entry: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        loaded(tmp_path, entry)
    assert str(caught.value) == f'{tmp_path}/scene.toml: conductor 1 ("ring"): shape{message}'


@pytest.mark.parametrize(
    ("more", "message"),
    [
        ('mesh = "rod.stl"', "found a shape and a mesh; give one of them"),
        ('part = "x"', "part: goes with a mesh file only; drop it for a shape"),
        ('unit = "cm"', "unit: goes with a mesh file only; drop it for a shape"),
    ],
)
def test_keys_that_go_with_a_mesh_only(tmp_path: Path, more: str, message: str) -> None:
    write_cube(tmp_path / "rod.stl")
    with pytest.raises(InputError) as caught:
        loaded(tmp_path, BOX, more)
    assert str(caught.value) == f'{tmp_path}/scene.toml: conductor 1 ("ring"): {message}'


def test_the_surface_of_an_entry_is_in_the_unit_of_the_scene(tmp_path: Path) -> None:
    (conductor,) = loaded(tmp_path, BOX).conductors
    assert isinstance(conductor.surface, Surface)
    assert conductor.surface.bounds == pytest.approx(1e-3 * np.array([[-0.5] * 3, [0.5] * 3]))
