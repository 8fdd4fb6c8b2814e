"""bem inspect: what it prints, and its exit codes."""

from __future__ import annotations

import numpy as np
import pytest
from made_bodies import CUBE_QUADS, cube, soup, stl_text, write_cube

import bem
from bem.cli.main import main
from bem.scene.inspect import inspect
from bem.scene.report import report
from bem.scene.scene import Place, Scene


@pytest.fixture
def folder(tmp_path, monkeypatch):
    write_cube(tmp_path / "rod.stl")
    write_cube(tmp_path / "can.stl", 4.0)
    write_cube(tmp_path / "far.stl", 1.0, (0.0, 3.5, 0.0))
    monkeypatch.chdir(tmp_path)
    return tmp_path


def ran(capsys, *arguments: str) -> tuple[int, str, str]:
    code = main(["inspect", *arguments])
    out, err = capsys.readouterr()
    return code, out, err


def test_a_sound_pair_of_files(folder, capsys):
    code, out, err = ran(capsys, "rod.stl", "far.stl", "--unit", "mm")
    assert (code, err) == (0, "")
    assert out == (
        "2 conductors, 24 faces, unit mm, relative permittivity 1\n"
        "  box     1 x 4.5 x 1 mm, from (-0.5, -0.5, -0.5) mm to (0.5, 4, 0.5) mm\n"
        "\n"
        "rod (rod.stl, numbers in mm)\n"
        "  box     1 x 1 x 1 mm, from (-0.5, -0.5, -0.5) mm to (0.5, 0.5, 0.5) mm\n"
        "  faces   12 triangles, 8 vertices; worst aspect 2\n"
        "  kind    closed, solid metal; 1 piece, area 6 mm^2, volume 1 mm^3\n"
        "  change  36 corners as read joined into 8 vertices\n"
        "\n"
        "far (far.stl, numbers in mm)\n"
        "  box     1 x 1 x 1 mm, from (-0.5, 3, -0.5) mm to (0.5, 4, 0.5) mm\n"
        "  faces   12 triangles, 8 vertices; worst aspect 2\n"
        "  kind    closed, solid metal; 1 piece, area 6 mm^2, volume 1 mm^3\n"
        "  change  36 corners as read joined into 8 vertices\n"
        "\n"
        "smallest gaps\n"
        "  rod - far  2.5 mm\n"
        "\n"
        "can be solved\n"
    )


def test_a_scene_that_cannot_be_solved(folder, capsys):
    code, out, _ = ran(capsys, "rod.stl", "can.stl", "far.stl", "--unit", "um")
    assert code == 3
    assert "  rod - can  1.5 um, rod inside\n" in out
    assert "  can - far  1 um\n" in out
    assert out.endswith(
        "cannot be solved\n"
        '  "rod" lies inside "can", which is solid metal; '
        'if "can" is hollow, give it body = "shell"\n'
    )


SCENE = """
unit = "cm"
surroundings = { relative_permittivity = 2.2 }
[[conductor]]
name = "case"
mesh = "can.stl"
body = "shell"
[[conductor]]
name = "core"
mesh = "rod.stl"
unit = "mm"
place = { shift = [1.0, 0.0, 0.0] }
"""


def test_a_scene_file(folder, capsys):
    (folder / "scene.toml").write_text(SCENE)
    code, out, _ = ran(capsys, "scene.toml")
    assert code == 0
    assert "unit cm, relative permittivity 2.2\n" in out
    assert "core (rod.stl, numbers in mm)\n  box     0.1 x 0.1 x 0.1 cm, from (0.95, " in out
    assert "  kind    closed, hollow shell; 1 piece, area 96 cm^2, volume 64 cm^3\n" in out
    assert '\nnotes\n  "core" lies inside "case"\n' in out
    assert "  case - core  9.5 mm, core inside\n" in out


def test_touching_and_crossing_are_marked():
    scene = Scene("mm").add_conductor("a", bem.box(1, 1, 1))
    scene.add_conductor("b", bem.box(1, 1, 1), place=Place(shift=(1, 0, 0)))
    scene.add_conductor("c", bem.box(1, 1, 1), place=Place(shift=(0.25, 0.25, 0.75)))
    text = report(scene, inspect(scene))
    assert "  a - b  0 m, touch\n" in text
    assert "  a - c  cross\n" in text
    assert "a (shape)\n" in text
    assert "6 quadrilaterals, 8 vertices;" in text


def test_open_curved_and_parts(folder, capsys):
    scene = Scene("mm").add_conductor("d", bem.disc(1.0))
    text = report(scene, inspect(scene))
    assert "facets of a curved surface, gaps are theirs\n" in text
    assert "open, 48 open edges: metal sheet without thickness; 1 piece, area 3.13" in text
    assert "smallest gaps" not in text
    (folder / "two.stl").write_text(stl_text({"x": soup(cube()), "y": soup(cube(1.0, (4, 0, 0)))}))
    scene = Scene("mm").add_conductor("y", mesh="two.stl", part="y")
    assert 'y (two.stl, part "y", numbers in mm)\n' in report(scene, inspect(scene))


def test_long_lists_of_gaps_are_cut():
    scene = Scene("mm")
    for i in range(12):
        scene.add_conductor(f"c{i}", bem.box(1, 1, 1), place=Place(shift=(1.5 * i, 0, 0)))
    text = report(scene, inspect(scene))
    assert text.count(" - c") == 60
    assert "\n  6 wider gaps not listed\n" in text


@pytest.mark.parametrize(
    ("arguments", "code", "message"),
    [
        (["rod.stl"], 2, "bem: --unit is missing: mesh files do not say their unit; "
         "allowed are m, cm, mm, um, nm, in, mil\n"),
        (["rod.stl", "--unit", "mmm"], 2, "bem: unit: found 'mmm' (did you mean 'mm'?); "
         "allowed are m, cm, mm, um, nm, in, mil\n"),
        (["a.toml", "--unit", "mm"], 2, "bem: --unit mm: a scene file states its own unit; "
         "drop the option or change the unit in a.toml\n"),
        (["a.toml", "rod.stl"], 2, "bem: found the scene a.toml among 2 files; "
         "give one scene file, or mesh files alone\n"),
        (["none.stl", "--unit", "mm"], 3, "bem: none.stl: no such file\n"),
        (["none.toml"], 3, "bem: none.toml: no such file\n"),
        (["rod.stl", "rod.stl", "--unit", "mm"], 3, 'bem: two conductors would be called "rod" '
         '(from rod.stl and rod.stl); name them in a scene file: [[conductor]] name = "...", '
         'mesh = "..."\n'),
    ],
)  # fmt: skip
def test_refusals(folder, capsys, arguments, code, message):
    assert ran(capsys, *arguments) == (code, "", message)


def test_quadrilateral_mesh_from_a_general_writer(folder, capsys):
    """Quadrilaterals and names come through a file that a library has written."""
    import meshio

    tags = [np.ones(6, dtype=int)]
    mesh = meshio.Mesh(
        cube().vertices,
        [("quad", CUBE_QUADS)],
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags},
        field_data={"busbar": np.array([1, 2])},
    )
    meshio.gmsh.write(folder / "bar.msh", mesh, fmt_version="2.2", binary=True)
    code, out, _ = ran(capsys, "bar.msh", "--unit", "in")
    assert code == 0
    assert 'busbar (bar.msh, part "busbar", numbers in in)\n' in out
    assert "  faces   6 quadrilaterals, 8 vertices; worst aspect 2\n" in out
