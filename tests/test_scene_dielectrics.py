"""Dielectrics, half-space and layers in scenes and scene files."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from made_bodies import ball, cube, soup, stl_text, write_cube

import bem
from bem.errors import BemError, GeometryError
from bem.geometry.surface import Surface
from bem.scene.material import Material
from bem.scene.scene import Place, Scene
from bem.scene.scene_file import load_scene
from bem.units import EPS0

OPEN = Surface(cube().vertices, cube().faces[2:])


def refused(make) -> str:
    with pytest.raises(BemError) as caught:
        make()
    assert "\n" not in str(caught.value)
    return str(caught.value)


SCENE = """
unit = "mm"
coincidence = 1e-5
[surroundings]
relative_permittivity = 2.0
conductivity = 1e-9
[[conductor]]
name = "rod"
mesh = "rod.stl"
[[dielectric]]
name = "cover"
mesh = "two.stl"
part = "cover"
relative_permittivity = 7.0
loss_tangent = 0.02
place = { shift = [0.0, 0.0, 12.5] }
unit = "cm"
smooth = false
[[dielectric]]
name = "grain"
shape = { kind = "sphere", radius = 2.0 }
relative_permittivity = 2.8
conductivity = 1e-7
"""


@pytest.fixture
def folder(tmp_path):
    text = stl_text({"cover": soup(cube(3.0)), "rest": soup(cube(1.0, (9.0, 0.0, 0.0)))})
    (tmp_path / "two.stl").write_text(text)
    write_cube(tmp_path / "rod.stl")
    return tmp_path


def test_a_scene_file_is_what_python_makes(folder):
    (folder / "s.toml").write_text(SCENE)
    loaded = load_scene(folder / "s.toml")
    made = Scene("mm", 2.0, folder=folder, conductivity=1e-9, coincidence=1e-5)
    made.add_conductor("rod", mesh="rod.stl")
    made.add_dielectric(
        "cover", mesh="two.stl", part="cover", relative_permittivity=7.0, loss_tangent=0.02,
        place=Place(shift=(0.0, 0.0, 12.5)), unit="cm", smooth=False,
    )  # fmt: skip
    made.add_dielectric("grain", bem.sphere(2.0), relative_permittivity=2.8, conductivity=1e-7)
    assert loaded.surroundings == made.surroundings == Material(2.0, conductivity=1e-9)
    assert loaded.coincidence == made.coincidence == 1e-5
    for one, two in zip(loaded.dielectrics, made.dielectrics, strict=True):
        assert replace(one, surface=two.surface) == two
        assert np.array_equal(one.surface.vertices, two.surface.vertices)
    cover, grain = loaded.dielectrics
    assert (cover.material, cover.surface.smooth) == (Material(7.0, 0.02), False)
    assert cover.surface.bounds == pytest.approx(
        1e-3 * np.array([[-15, -15, -2.5], [15, 15, 27.5]])
    )
    assert grain.surface.curve is not None
    assert loaded.bodies == [*loaded.conductors, *loaded.dielectrics]
    assert loaded.size == pytest.approx(0.0300)


def test_a_scene_without_dielectrics_is_as_before(folder):
    (folder / "s.toml").write_text('unit = "mm"\n[[conductor]]\nname = "a"\nmesh = "rod.stl"\n')
    scene = load_scene(folder / "s.toml")
    assert (scene.dielectrics, scene.stack, scene.coincidence) == ([], None, 1e-6)
    assert scene.surroundings == Material()


def test_split_makes_a_dielectric_of_each_body(folder):
    scene = Scene("mm", folder=folder)
    scene.add_dielectric("beads", mesh="two.stl", split=True, relative_permittivity=4)
    assert [d.name for d in scene.dielectrics] == ["beads 1", "beads 2"]
    assert {d.relative_permittivity for d in scene.dielectrics} == {4.0}
    assert scene.dielectrics[1].source.changes[-1] == "piece 2 of 2"


GOOD = {"name": "cover", "shape": cube(), "relative_permittivity": 7.0}


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"name": ""}, 'dielectric 1 (""): name: found "", needs text that is not blank'),
        ({"name": "rod"}, 'dielectric 1 ("rod"): name: already that of conductor 1; rename one'),
        ({"relative_permittivity": 0}, 'dielectric 1 ("cover"): relative_permittivity: found 0, '
         "needs a number above 0"),
        ({"relative_permittivity": math.inf}, 'dielectric 1 ("cover"): relative_permittivity: '
         'found "inf", needs a finite number'),
        ({"loss_tangent": -0.1}, 'dielectric 1 ("cover"): loss_tangent: found -0.1, '
         "needs a number of 0 or more"),
        ({"conductivity": "wet"}, 'dielectric 1 ("cover"): conductivity: found "wet", '
         "needs a number"),
        ({"conductivity": 1, "loss_tangent": 0}, 'dielectric 1 ("cover"): found loss_tangent and '
         "conductivity; give one of them"),
        ({"shape": OPEN}, 'dielectric 1 ("cover"): open, 4 open edges, the first at '
         "(-0.5, -0.5, -0.5) mm; a dielectric fills a volume: close the surface there and "
         "export it again"),
        ({"shape": None}, 'dielectric 1 ("cover"): mesh: missing; '
         "give the name of a mesh file, or a shape"),
        ({"place": 3}, 'dielectric 1 ("cover"): place: found 3, needs a Place'),
    ],
)  # fmt: skip
def test_refused_dielectrics(change, message):
    """Nothing is added."""
    scene = Scene("mm").add_conductor("rod", cube())
    assert refused(lambda: scene.add_dielectric(**(GOOD | change))) == message
    assert scene.dielectrics == []


@pytest.mark.parametrize("sheet", [bem.disc(1.0), bem.tube(1.0, 2.0), bem.plate(1, 1), OPEN])
def test_open_surfaces_bound_no_dielectric(sheet):
    with pytest.raises(GeometryError, match="open, .* a dielectric fills a volume"):
        Scene("mm").add_dielectric("d", sheet, relative_permittivity=2.0)


@pytest.mark.parametrize(
    "solid", [bem.sphere(1.0), bem.cylinder(1.0, 2.0), bem.torus(2.0, 0.5), bem.ring(2.0, 0.5)]
)
def test_closed_shapes_do(solid):
    assert len(Scene("mm").add_dielectric("d", solid, relative_permittivity=2.0).dielectrics) == 1


def test_small_damage_is_repaired_with_a_word():
    torn = Surface(ball(1.0, 32).vertices, ball(1.0, 32).faces[1:])
    scene = Scene("mm").add_dielectric("d", torn, relative_permittivity=2.0)
    assert any("1 small hole filled" in line for line in scene.dielectrics[0].source.changes)


def test_names_are_unique_across_kinds():
    scene = Scene("mm").add_dielectric("a", cube(), relative_permittivity=2.0)
    said = refused(lambda: scene.add_conductor("a", cube()))
    assert said == 'conductor 1 ("a"): name: already that of dielectric 1; rename one'


def test_complex_permittivity():
    """exp(j w t): loss is a negative imaginary part, of conductivity sigma / (w eps0)."""
    assert Material(3.0).at(50.0) == 3.0
    assert Material(3.0, 0.01).at(50.0) == pytest.approx(3.0 - 0.03j)
    found = Material(3.0, conductivity=1e-6).at(1e3)
    assert found == pytest.approx(3.0 - 1j * 1e-6 / (2 * math.pi * 1e3 * EPS0))
    assert [Material(3.0).lossy, Material(3.0, 0.0).lossy, Material(3.0, 0.1).lossy] == [
        False, False, True,
    ]  # fmt: skip
    assert str(Material(3.0, 0.01)) == "relative permittivity 3, loss tangent 0.01"


# half-space and layers


def planes_of(scene: Scene) -> tuple:
    stack = scene.stack
    permittivity = [material.relative_permittivity for material in stack.materials]
    return stack.axis, list(stack.planes), permittivity, stack.grounded


@pytest.mark.parametrize(
    ("key", "axis", "expected"),
    [("below_z", 2, [4.0, 1.5]), ("above_z", 2, [1.5, 4.0]), ("below_x", 0, [4.0, 1.5]),
     ("above_y", 1, [1.5, 4.0])],
)  # fmt: skip
def test_a_half_space_fills_one_side(tmp_path, key, axis, expected):
    made = Scene("mm", 1.5).set_half_space(relative_permittivity=4.0, **{key: 2.0})
    assert planes_of(made) == (axis, [2e-3], expected, ())
    (tmp_path / "s.toml").write_text(
        f'unit = "mm"\n[surroundings]\nrelative_permittivity = 1.5\n[half_space]\n{key} = 2.0\n'
        "relative_permittivity = 4.0\n[[conductor]]\nname = 'a'\n"
        "shape = { kind = 'sphere', radius = 1.0 }\n"
    )
    assert load_scene(tmp_path / "s.toml").stack == made.stack


def test_layers_are_stacked_upward(tmp_path):
    made = Scene("mm").set_flat_layers(
        thickness=[0.2, 1.2], relative_permittivity=[3.6, 4.4], from_z=1.0, grounded_below=True
    )
    axis, planes, permittivity, grounded = planes_of(made)
    assert (axis, permittivity) == (2, [1.0, 3.6, 4.4, 1.0])
    assert planes == pytest.approx([1e-3, 1.2e-3, 2.4e-3])
    assert grounded == (1e-3,)
    (tmp_path / "s.toml").write_text(
        'unit = "mm"\n[flat_layers]\nfrom_z = 1.0\ngrounded_below = true\n'
        "grounded_above = false\nthickness = [0.2, 1.2]\nrelative_permittivity = [3.6, 4.4]\n"
        "[[conductor]]\nname = 'a'\nshape = { kind = 'sphere', radius = 1.0 }\n"
    )
    assert load_scene(tmp_path / "s.toml").stack == made.stack


def test_layers_may_have_loss_and_two_grounds():
    scene = Scene("mm").set_flat_layers(
        thickness=(1,), relative_permittivity=(2,), loss_tangent=(0.1,), from_x=0,
        grounded_below=True, grounded_above=True,
    )  # fmt: skip
    assert scene.stack.materials[1] == Material(2.0, 0.1)
    assert scene.stack.grounded == (0.0, 1e-3)


LAYERS = {"thickness": [1.0, 2.0], "relative_permittivity": [3.0, 4.0], "from_z": 0.0}


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"thickness": [1.0]}, "flat_layers: relative_permittivity: found 2 for 1 of thickness; "
         "give one for each layer, the lowest first"),
        ({"thickness": []}, "flat_layers: thickness: found [], needs a list of numbers, "
         "one for each layer"),
        ({"thickness": 1.0}, "flat_layers: thickness: found 1.0, needs a list of numbers, "
         "one for each layer"),
        ({"thickness": [1.0, 0.0]}, "flat_layers: thickness[1]: found 0.0, "
         "needs a number above 0"),
        ({"relative_permittivity": [3.0, -4.0]}, "flat_layers: layer 2: relative_permittivity: "
         "found -4.0, needs a number above 0"),
        ({"loss_tangent": [0.1, 0.1], "conductivity": [1, 1]}, "flat_layers: layer 1: found "
         "loss_tangent and conductivity; give one of them"),
        ({"from_z": None}, "flat_layers: found {}, needs one of from_x, from_y, from_z"),
        ({"from_x": 1}, 'flat_layers: found {"from_x": 1, "from_z": 0.0}, '
         "needs one of from_x, from_y, from_z"),
        ({"grounded_below": 1}, "flat_layers: grounded_below: found 1, needs true or false"),
    ],
)  # fmt: skip
def test_refused_layers(change, message):
    scene = Scene("mm")
    assert refused(lambda: scene.set_flat_layers(**(LAYERS | change))) == message
    assert scene.stack is None


def test_one_description_of_layers():
    scene = Scene("mm").set_half_space(below_z=0, relative_permittivity=2)
    assert refused(lambda: scene.set_flat_layers(**LAYERS)) == (
        "flat_layers: found a half_space too; describe all layers by one flat_layers"
    )
    assert refused(lambda: Scene("mm").set_half_space(relative_permittivity=2)) == (
        "half_space: found {}, needs one of below_x, above_x, below_y, above_y, below_z, above_z"
    )


def both_orders(kind: str, **plane: float) -> set[str]:
    """What is said when layers follow a plane, and when the plane follows layers."""
    return {
        refused(lambda: getattr(Scene("mm"), kind)(**plane).set_flat_layers(**LAYERS)),
        refused(lambda: getattr(Scene("mm").set_flat_layers(**LAYERS), kind)(**plane)),
    }


def test_planes_that_do_not_go_with_layers():
    words = "leave out ground_plane, and write flat_layers with grounded_below or grounded_above"
    assert both_orders("set_ground_plane", z=-1.0) == {
        f"{entry}: found ground_plane and flat_layers normal to z; {words}"
        for entry in ("flat_layers", "ground_plane")
    }
    assert both_orders("add_mirror_plane", z=-1.0) == {
        f"{entry}: found mirror_plane and flat_layers, both normal to z; leave out one of them"
        for entry in ("flat_layers", "mirror_plane 1")
    }
    Scene("mm").add_mirror_plane(x=0.0).set_flat_layers(**LAYERS)
    Scene("mm").set_ground_plane(x=0.0).set_flat_layers(**LAYERS)
    grounded = LAYERS | {"grounded_above": True}
    assert "leave out ground_plane" in refused(
        lambda: Scene("mm").set_ground_plane(x=0.0).set_flat_layers(**grounded)
    )


BALL = "[[conductor]]\nname = 'a'\nshape = { kind = 'sphere', radius = 1.0 }\n"


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("coincidence = 0.1\n", "coincidence: found 0.1, needs a number from 1e-09 to 0.001"),
        ("coincidence = true\n", "coincidence: found true, needs a number"),
        ("[half_space]\nbelow_z = 1\n", "half_space: relative_permittivity: missing"),
        ("[half_space]\nbelov_z = 1\n", 'half_space: unknown key "belov_z"; did you mean '
         '"below_z"? known are below_x, above_x, below_y, above_y, below_z, above_z, '
         "relative_permittivity, loss_tangent, conductivity"),
        ("[half_space]\nbelow_z = 'a'\nrelative_permittivity = 2\n",
         'half_space: below_z: found "a", needs a number'),
        ("[flat_layers]\nfrom_z = 1\n", "flat_layers: thickness: missing"),
        ("[surroundings]\nloss_tangent = 1\nconductivity = 1\n", "surroundings: found loss_tangent "
         "and conductivity; give one of them"),
        ("[dielectric]\nname = 'd'\n", "dielectric: found a single value or [dielectric]; "
         "write [[dielectric]]"),
        ("[[dielectric]]\nrelative_permittivity = 2\n", "dielectric 1: name: missing"),
        ("[[dielectric]]\nname = 'd'\n", 'dielectric 1 ("d"): relative_permittivity: missing'),
        ("[[dielectric]]\nname = 'd'\nrelative_permittivity = 2\nbody = 'shell'\n",
         'dielectric 1 ("d"): unknown key "body"; known are name, mesh, shape, part, unit, '
         "smooth, crease_degrees, place, split, relative_permittivity, loss_tangent, "
         "conductivity"),
        ("[[dielectric]]\nname = 'd'\nrelative_permittivity = 2\nmesh = 'none.stl'\n",
         'dielectric 1 ("d"): {folder}/none.stl: no such file'),
    ],
)  # fmt: skip
def test_refused_scene_files(tmp_path, text, message):
    path = tmp_path / "scene.toml"
    path.write_text(f'unit = "mm"\n{text}{BALL}')
    said = refused(lambda: load_scene(path))
    assert said == f"{path}: {message.replace('{folder}', str(tmp_path))}"
