"""One file with several bodies as several conductors, hollow ones with their inner walls."""

from __future__ import annotations

import numpy as np
import pytest
from made_bodies import ball, cube, ring, soup, stl_text
from two_boxes import obj_text

from bem.cli.main import main
from bem.errors import InputError, UsageError
from bem.geometry.shapes.round import box
from bem.geometry.split import split_bodies
from bem.geometry.surface import Surface
from bem.scene.body import body_of
from bem.scene.placing import Place
from bem.scene.scene import Scene
from bem.scene.scene_file import load_scene, scene_from_files


def joined(*surfaces: Surface) -> Surface:
    """One surface of several."""
    first = np.cumsum([0, *(len(s.vertices) for s in surfaces)])
    faces = [np.where(s.faces < 0, -1, s.faces + k) for s, k in zip(surfaces, first, strict=False)]
    return Surface(
        np.concatenate([s.vertices for s in surfaces]), np.concatenate(faces), None, 1e-9
    )


def sizes(surface: Surface) -> list[int]:
    return [len(body.faces) for body in split_bodies(surface)]


def test_bodies_in_the_order_of_their_first_faces():
    """Quadrilaterals and triangles, whatever stands where."""
    torus, small = ring(1.0, 0.2), cube(0.5, (5.0, 0.0, 0.0))
    assert sizes(joined(torus, small)) == [192, 12]
    assert sizes(joined(small, torus)) == [12, 192]
    both = joined(small, torus)
    mixed = Surface(both.vertices, np.concatenate([both.faces[-1:], both.faces[:-1]]))
    assert sizes(mixed) == [192, 12]
    for body, made in zip(split_bodies(joined(torus, small)), (torus, small), strict=True):
        assert np.array_equal(body.vertices[body.triangles], made.vertices[made.triangles])
        assert body.rounding == 1e-9


def test_inner_walls_stay_by_parity():
    """Shells 1 | 2 | 3 | 4 inside one another: 2 is the wall of 1, and 4 that of 3."""
    nested = [cube(size) for size in (4.0, 3.0, 2.0, 1.0)]
    assert sizes(joined(*nested)) == [24, 24]
    assert sizes(joined(*nested[:3])) == [24, 12]
    assert sizes(joined(*nested[::-1])) == [24, 24]
    bodies = split_bodies(joined(*nested[::-1]))
    assert [body.extent for body in bodies] == pytest.approx([2 * 3**0.5, 4 * 3**0.5])


def test_two_voids_in_one_body_and_a_neighbour_in_its_box():
    """A body beside the ring lies in its box, but not inside it."""
    torus = ring(2.0, 0.5, around=48, section=16)
    hole = cube(0.1, (0.0, 0.0, 0.0))
    voids = [cube(0.1, (2.0, 0.0, 0.0)), cube(0.1, (0.0, 2.0, 0.0))]
    assert sizes(joined(torus, hole, *voids)) == [768 + 24, 12]


def test_an_open_sheet_is_a_body_wherever_it_lies():
    whole = cube(0.5)
    sheet = Surface(whole.vertices, whole.faces[2:6])
    assert sizes(joined(cube(2.0), sheet)) == [12, 4]
    assert sizes(joined(Surface(cube(2.0).vertices, cube(2.0).faces[:10]), cube(0.5))) == [10, 12]


def test_one_body_alone():
    assert sizes(ball(1.0)) == [len(ball(1.0).faces)]


@pytest.fixture
def bodies(tmp_path):
    """Text STL of a hollow cube and another cube, in two solids."""
    solids = {"a": soup(cube(2.0)), "b": soup(joined(cube(1.0), cube(1.0, (5.0, 0.0, 0.0))))}
    path = tmp_path / "bodies.stl"
    path.write_text(stl_text(solids))
    return path


def test_conductors_of_one_file(bodies):
    scene = Scene("m")
    place = Place(shift=(0.0, 0.0, 7.0), scale=2.0)
    scene.add_conductor("metal", mesh=bodies, unit="mm", place=place, state="floating", split=True)
    one, two = scene.conductors
    assert (one.name, two.name) == ("metal 1", "metal 2")
    assert (one.state, two.state) == ("floating", "floating")
    assert [len(c.surface.faces) for c in scene.conductors] == [24, 12]
    assert body_of(one).volume == pytest.approx(7 * 0.002**3, rel=1e-12, abs=0.0)
    assert two.surface.bounds.mean(axis=0) == pytest.approx([0.01, 0.0, 7.0])
    assert one.source.changes[-1] == "piece 1 of 2"
    assert two.source.changes[-1] == "piece 2 of 2"
    scene.add_conductor("b", mesh=bodies, unit="mm", part="b", split=True)
    assert [c.name for c in scene.conductors[2:]] == ["b 1", "b 2"]


def test_split_in_a_scene_file(bodies):
    text = 'unit = "mm"\n[[conductor]]\nname = "metal"\nmesh = "bodies.stl"\nsplit = true\n'
    path = bodies.with_name("scene.toml")
    path.write_text(text)
    assert [c.name for c in load_scene(path).conductors] == ["metal 1", "metal 2"]
    path.write_text(text.replace("true", '"yes"'))
    with pytest.raises(InputError, match='split: found "yes"; allowed are false, true'):
        load_scene(path)
    path.write_text(text + '[[conductor]]\nname = "metal 2"\nmesh = "bodies.stl"\n')
    with pytest.raises(InputError, match="name: already that of conductor 2"):
        load_scene(path)


def test_a_name_that_a_piece_has_taken(bodies):
    scene = Scene("m").add_conductor("metal 2", mesh=bodies)
    with pytest.raises(InputError, match="already that of conductor 1"):
        scene.add_conductor("metal", mesh=bodies, split=True)
    assert len(scene.conductors) == 1


def test_split_goes_with_a_mesh(bodies):
    with pytest.raises(InputError, match="split: goes with a mesh file only; drop it for a shape"):
        Scene("m").add_conductor("box", box(1.0, 1.0, 1.0), split=True)


def test_split_of_files_alone(bodies):
    """Files that name their bodies are taken by them, others by their pieces."""
    named = bodies.with_name("named.obj")
    named.write_text(obj_text())
    scene = scene_from_files([bodies, named], "mm", split=True)
    assert [c.name for c in scene.conductors] == ["bodies 1", "bodies 2", "rod", "big can"]


def test_split_on_the_command_line(bodies, capsys):
    assert main(["inspect", str(bodies), "--unit", "mm", "--split"]) == 0
    assert "bodies 2" in capsys.readouterr().out
    scene = bodies.with_name("scene.toml")
    scene.write_text('unit = "mm"\n')
    assert main(["inspect", str(scene), "--split"]) == UsageError.exit_code
    assert "--split: goes with mesh files; write split = true in" in capsys.readouterr().err
