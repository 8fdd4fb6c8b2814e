"""Scene files and scenes of mesh files alone."""

from __future__ import annotations

import meshio
import numpy as np
import pytest
from made_bodies import CUBE_QUADS, CUBE_TRIANGLES, cube, cube_vertices, soup, stl_text, write_cube

import bem
from bem.errors import InputError, UsageError
from bem.scene.scene import Place, Scene
from bem.scene.scene_file import load_scene, scene_from_files

FULL = """
unit = "mm"
[surroundings]
relative_permittivity = 2.5
[[conductor]]
name = "probe rod"
mesh = "bodies/two.stl"
part = "rod"
place = { shift = [0.0, 0.0, 12.5], turn = { axis = [0, 0, 1], degrees = 90 }, scale = 2 }
[[conductor]]
name = "can"
mesh = "bodies/two.stl"
part = "can"
unit = "cm"
body = "shell"
"""


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "bodies").mkdir()
    text = stl_text({"rod": soup(cube(1.0, (1.0, 0.0, 0.0))), "can": soup(cube(10.0))})
    (tmp_path / "bodies" / "two.stl").write_text(text)
    write_cube(tmp_path / "rod.stl")
    return tmp_path


def test_a_scene_file_is_what_python_makes(folder):
    (folder / "probe.toml").write_text(FULL)
    loaded = load_scene(folder / "probe.toml")
    place = Place(shift=(0.0, 0.0, 12.5), turn_axis=(0, 0, 1), turn_degrees=90, scale=2)
    made = Scene("mm", 2.5, folder=folder)
    made.add_conductor("probe rod", mesh="bodies/two.stl", part="rod", place=place)
    made.add_conductor("can", mesh="bodies/two.stl", part="can", unit="cm", body="shell")
    assert (loaded.unit, loaded.relative_permittivity) == ("mm", 2.5)
    for one, two in zip(loaded.conductors, made.conductors, strict=True):
        assert (one.name, one.body, one.source) == (two.name, two.body, two.source)
        assert np.array_equal(one.surface.vertices, two.surface.vertices)
        assert np.array_equal(one.surface.faces, two.surface.faces)
    assert loaded.conductors[0].source.file == "bodies/two.stl"
    assert loaded.conductors[0].surface.bounds == pytest.approx(
        1e-3 * np.array([[-1, 1, 11.5], [1, 3, 13.5]])
    )
    assert loaded.conductors[1].surface.extent == pytest.approx(0.1 * 3**0.5)
    assert bem.load_scene is load_scene


def test_what_may_be_left_out(folder):
    (folder / "s.toml").write_text('unit = "um"\n[[conductor]]\nname = "a"\nmesh = "rod.stl"\n')
    scene = load_scene(str(folder / "s.toml"))
    assert scene.relative_permittivity == 1.0
    assert scene.conductors[0].body == "solid"
    assert scene.conductors[0].surface.extent == pytest.approx(1e-6 * 3**0.5)


ROD = '[[conductor]]\nname = "rod"\nmesh = "rod.stl"\n'
TOP = (
    "known are unit, coincidence, surroundings, ground_plane, mirror_plane, half_space, "
    "flat_layers, conductor, dielectric"
)
KNOWN = (
    "known are name, mesh, shape, part, unit, body, smooth, crease_degrees, place, state, node, "
    "split"
)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ('unit = "mm"\n', "no [[conductor]] found; a scene needs at least one"),
        (ROD, "unit: missing; allowed are m, cm, mm, um, nm, in, mil"),
        ('unit = "mmm"\n' + ROD, "unit: found 'mmm' (did you mean 'mm'?); "
         "allowed are m, cm, mm, um, nm, in, mil"),
        ("unit = 5\n" + ROD, "unit: found 5; allowed are m, cm, mm, um, nm, in, mil"),
        ('units = "mm"\n' + ROD, 'unknown key "units"; did you mean "unit"? '
         f"{TOP}"),
        ('unit = "mm"\n[[conductors]]\n', 'unknown key "conductors"; did you mean "conductor"? '
         f"{TOP}"),
        ('unit = "mm"\nxyz = 1\n', 'unknown key "xyz"; '
         f"{TOP}"),
        ('unit = "mm"\nsurroundings = 2\n' + ROD, "surroundings: found 2, "
         "needs a table with relative_permittivity and loss_tangent and conductivity"),
        ('unit = "mm"\n[surroundings]\npermittivity = 2\n' + ROD, "surroundings: unknown key "
         '"permittivity"; did you mean "relative_permittivity"? known are relative_permittivity, '
         "loss_tangent, conductivity"),
        ('unit = "mm"\n[surroundings]\nrelative_permittivity = "air"\n' + ROD,
         'surroundings.relative_permittivity: found "air", needs a number'),
        ('unit = "mm"\n[surroundings]\nrelative_permittivity = 0\n' + ROD,
         "surroundings.relative_permittivity: found 0, needs a number above 0"),
        ('unit = "mm"\n[conductor]\nname = "rod"\n',
         "conductor: found a single value or [conductor]; write [[conductor]]"),
        ('unit = "mm"\nconductor = [1]\n', "conductor 1: found 1, needs a table with "
         "name and mesh and shape and part and unit and body and smooth and crease_degrees "
         "and place and state and node and split"),
        ('unit = "mm"\n[[conductor]]\nmesh = "rod.stl"\n', "conductor 1: name: missing"),
        ('unit = "mm"\n[[conductor]]\nname = "rod"\n',
         'conductor 1 ("rod"): mesh: missing; give the name of a mesh file, or a shape'),
        ('unit = "mm"\n[[conductor]]\nname = 7\nmesh = "rod.stl"\n',
         "conductor 1: name: found 7, needs text that is not blank"),
        ('unit = "mm"\n' + ROD + ROD, 'conductor 2 ("rod"): name: already that of conductor 1; '
         "rename one"),
        ('unit = "mm"\n' + ROD + 'mehs = "x"\n', 'conductor 1 ("rod"): unknown key "mehs"; '
         f'did you mean "mesh"? {KNOWN}'),
        ('unit = "mm"\n' + ROD + 'body = "hollow"\n', 'conductor 1 ("rod"): body: found "hollow"; '
         'allowed are "solid", "shell"'),
        ('unit = "mm"\n' + ROD + 'part = "x"\n', 'conductor 1 ("rod"): {folder}/rod.stl: '
         'part "x" is not in the file; the file names no parts'),
        ('unit = "mm"\n' + ROD + 'unit = "feet"\n', "conductor 1 (\"rod\"): unit: found 'feet'; "
         "allowed are m, cm, mm, um, nm, in, mil"),
        ('unit = "mm"\n' + ROD.replace("rod.stl", "none.stl"),
         'conductor 1 ("rod"): {folder}/none.stl: no such file'),
        ('unit = "mm"\n' + ROD.replace('"rod.stl"', "3"),
         'conductor 1 ("rod"): mesh: found 3, needs a file name'),
        ('unit = "mm"\n' + ROD + "place = 3\n", 'conductor 1 ("rod"): place: found 3, '
         "needs a table with shift and turn and scale"),
        ('unit = "mm"\n' + ROD + "place = { move = [1, 2, 3] }\n", 'conductor 1 ("rod"): place: '
         'unknown key "move"; known are shift, turn, scale'),
        ('unit = "mm"\n' + ROD + "place = { shift = [1, 2] }\n", 'conductor 1 ("rod"): '
         "place.shift: found [1, 2], needs three numbers"),
        ('unit = "mm"\n' + ROD + "place = { scale = -1 }\n", 'conductor 1 ("rod"): '
         "place.scale: found -1, needs a number above 0"),
        ('unit = "mm"\n' + ROD + "place = { turn = 90 }\n", 'conductor 1 ("rod"): '
         "place.turn: found 90, needs a table with axis and degrees"),
        ('unit = "mm"\n' + ROD + "place = { turn = { degrees = 90 } }\n",
         'conductor 1 ("rod"): place.turn.axis: missing'),
        ('unit = "mm"\n' + ROD + "place = { turn = { axis = [0, 0, 1] } }\n",
         'conductor 1 ("rod"): place.turn.degrees: missing'),
        ('unit = "mm"\n' + ROD + 'place = { turn = { axis = [0, 0, 1], degrees = "ninety" } }\n',
         'conductor 1 ("rod"): place.turn.degrees: found "ninety", needs a number'),
        ('unit = "mm"\n' + ROD + "place = { turn = { axis = [0, 0, 1], degree = 90 } }\n",
         'conductor 1 ("rod"): place.turn: unknown key "degree"; did you mean "degrees"? '
         "known are axis, degrees"),
    ],
)  # fmt: skip
def test_refused_scene_files(folder, text, message):
    """One line that names the file, the entry, what was found and what is allowed."""
    path = folder / "scene.toml"
    path.write_text(text)
    with pytest.raises(InputError) as caught:
        load_scene(path)
    said = str(caught.value)
    assert "\n" not in said
    assert said == f"{path}: {message.replace('{folder}', str(folder))}"


@pytest.mark.parametrize(
    ("text", "place"),
    [('unit = "mm"\nname = \n', "line 2, column 8"), ('unit = "mm"\n\n[[conductor', "line 3")],
)
def test_what_is_not_toml_is_told_with_its_line(tmp_path, text, place):
    path = tmp_path / "scene.toml"
    path.write_text(text)
    with pytest.raises(InputError) as caught:
        load_scene(path)
    assert str(caught.value).startswith(f"{path}: {place}: not TOML: ")
    assert "\n" not in str(caught.value)
    assert "(at " not in str(caught.value)


def test_scene_files_that_cannot_be_read(tmp_path):
    def refused(path) -> str:
        with pytest.raises(InputError) as caught:
            load_scene(path)
        return str(caught.value).removeprefix(f"{path}: ")

    assert refused(tmp_path / "none.toml") == "no such file"
    assert refused(tmp_path) == "cannot be opened (Is a directory)"
    (tmp_path / "latin.toml").write_bytes(b'unit = "\xb5m"')
    assert refused(tmp_path / "latin.toml") == "is not UTF-8 text (byte 8); save it as UTF-8"


# mesh files alone


def write_groups(path, names, tags=(1, 2)):
    """Write an MSH file of two cubes whose groups have ``names``."""
    points = np.concatenate([cube_vertices(), cube_vertices(1.0, (3.0, 0.0, 0.0))])
    cells = [("quad", CUBE_QUADS), ("triangle", 8 + CUBE_TRIANGLES)]
    tag_data = [np.full(len(c), t) for (_, c), t in zip(cells, tags, strict=True)]
    fields = {name: np.array([i, 2]) for i, name in enumerate(names, 1)}
    data = {"gmsh:physical": tag_data, "gmsh:geometrical": tag_data}
    mesh = meshio.Mesh(points, cells, cell_data=data, field_data=fields)
    meshio.gmsh.write(path, mesh, fmt_version="2.2", binary=False)
    return path


def test_conductors_are_named_after_files_and_groups(folder):
    named = write_groups(folder / "pair.msh", ["left bar", "right bar"])
    plain = write_groups(folder / "both.msh", [])
    scene = scene_from_files([folder / "rod.stl", str(named), plain], "cm", 3.0)
    assert [c.name for c in scene.conductors] == ["rod", "left bar", "right bar", "both"]
    assert [c.source.part for c in scene.conductors] == [None, "left bar", "right bar", None]
    assert [len(c.surface.faces) for c in scene.conductors] == [12, 6, 12, 18]
    assert scene.relative_permittivity == 3.0
    assert scene.conductors[0].surface.extent == pytest.approx(0.01 * 3**0.5)


def test_solids_of_one_stl_stay_one_conductor(folder):
    scene = scene_from_files([folder / "bodies" / "two.stl"], "mm")
    assert [c.name for c in scene.conductors] == ["two"]
    assert len(scene.conductors[0].surface.faces) == 24


def refused(kind, paths, unit="mm") -> str:
    with pytest.raises(kind) as caught:
        scene_from_files(paths, unit)
    return str(caught.value)


def test_refused_mesh_files(folder, monkeypatch):
    monkeypatch.chdir(folder)
    write_cube(folder / "bodies" / "rod.stl")
    assert refused(UsageError, []) == ("no mesh files given; name at least one mesh file")
    assert refused(UsageError, ["rod.stl"], "ft").startswith("unit: found 'ft'")
    assert refused(InputError, ["none.stl"]) == "none.stl: no such file"
    assert refused(InputError, ["rod.dwg"]).startswith(
        "rod.dwg: unknown kind of mesh file (.dwg); known are .stl, .msh, "
    )
    assert refused(InputError, ["rod.stl", "bodies/rod.stl"]) == (
        'two conductors would be called "rod" (from rod.stl and bodies/rod.stl); '
        'name them in a scene file: [[conductor]] name = "...", mesh = "..."'
    )
    write_groups(folder / "half.msh", ["left"])
    assert refused(InputError, ["half.msh"]) == (
        'half.msh: 12 faces in none of the groups "left"; '
        "name a group for them, or pick parts in a scene file"
    )
