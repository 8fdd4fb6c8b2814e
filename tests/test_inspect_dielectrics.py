"""bem inspect on dielectrics: regions, planes, faces by region pair, cross-sections."""

from __future__ import annotations

import json
import math
from pathlib import Path

import meshio
import numpy as np
import pytest
from made_bodies import ball, cube, turned

import bem
from bem.cli.main import main
from bem.exports.faces_file import save_faces
from bem.exports.section_png import save_section
from bem.geometry.planes import Plane
from bem.geometry.surface import Surface
from bem.scene.inspect import inspect
from bem.scene.regions import regions_of
from bem.scene.report import report
from bem.scene.scene import Place, Scene
from bem.scene.section import METAL_HERE, Section, plane_of

MESHES = Path(__file__).parent.parent / "meshes"


def slab_scene() -> Scene:
    """A metal cube stands on a slab, which a second slab of another mesh continues below."""
    scene = Scene("mm").add_conductor("cube", bem.box(2, 2, 2), place=Place(shift=(0, 0, 2)))
    top, low = Place(shift=(0, 0, 0.5)), Place(shift=(0, 0, -0.5))
    scene.add_dielectric("top", bem.box(6, 6, 1), place=top, relative_permittivity=4.0)
    return scene.add_dielectric("low", bem.box(4, 4, 1), place=low, relative_permittivity=2.0)


def region(scene: Scene, name: str):
    [found] = [r for r in inspect(scene).regions.reports if r.name == name]
    return found


# regions


def test_regions_of_touching_bodies():
    found = inspect(slab_scene())
    assert found.fatal == []
    assert [r.name for r in found.regions.reports] == ["surroundings", "top", "low"]
    around, top, low = found.regions.reports
    assert (around.volume, top.material.relative_permittivity) == (None, 4.0)
    assert top.volume == pytest.approx(36e-9)
    assert low.volume == pytest.approx(16e-9)
    areas = {name: 1e6 * area for name, area in top.borders.items()}
    assert areas == pytest.approx({"surroundings": 32 + 20 + 24, "low": 16, "cube": 4})
    assert list(top.borders) == ["surroundings", "low", "cube"]
    assert 1e6 * around.borders["cube"] == pytest.approx(20)
    assert 1e6 * low.borders["surroundings"] == pytest.approx(16 + 16)


def test_metal_counts_before_dielectrics_and_later_ones_before_earlier():
    scene = Scene("mm").add_conductor("core", cube(1.0))
    scene.add_dielectric("first", cube(3.0), relative_permittivity=3.0)
    scene.add_dielectric("second", cube(2.0), relative_permittivity=2.0)
    found = inspect(scene)
    assert found.fatal == []
    volumes = [r.volume for r in found.regions.reports]
    assert volumes[1:] == pytest.approx([19e-9, 7e-9])
    assert set(found.regions.reports[2].borders) == {"first", "core"}


def test_the_curved_interface_is_its_fine_facets():
    scene = Scene("mm").add_conductor("core", bem.sphere(1.0))
    scene.add_dielectric("coat", bem.sphere(2.0), relative_permittivity=3.0)
    coat = region(scene, "coat")
    assert coat.volume == pytest.approx(4 / 3 * math.pi * 7e-9, rel=2e-3)
    assert coat.borders["surroundings"] == pytest.approx(16 * math.pi * 1e-6, rel=2e-3)


def test_the_report_lists_dielectrics_and_regions():
    text = report(slab_scene(), inspect(slab_scene()))
    assert text.startswith("1 conductor, 2 dielectrics, 18 faces, unit mm, relative permittivity 1")
    assert "\n  contact faces closer than 6e-06 mm coincide (1e-06 of the size)\n" in text
    assert (
        "  kind    dielectric, relative permittivity 4; 1 piece, area 96 mm^2, volume 36 mm^3\n"
    ) in text
    assert "  1 top: relative permittivity 4, volume 36 mm^3\n" in text
    assert "    borders on (mm^2): surroundings 76, low 16, cube 4\n" in text
    assert text.endswith("can be solved")


def test_a_scene_without_dielectrics_has_no_regions():
    scene = Scene("mm").add_conductor("a", cube())
    assert inspect(scene).regions is None
    assert "regions" not in report(scene, inspect(scene))


def test_conductors_that_overlap_are_still_refused():
    scene = slab_scene().add_conductor("b", bem.box(2, 2, 2), place=Place(shift=(1, 1, 3)))
    found = inspect(scene)
    assert len(found.fatal) == 1 and '"cube" and "b" touch or overlap' in found.fatal[0]
    assert found.regions is None


@pytest.mark.parametrize("shift", [(0, 0, 0), (0, 0, 1), (0.3, 0.2, 0.1), (9, 0, 0), (0, 0, 1.5)])
def test_dielectrics_may_lie_as_they_like(shift):
    scene = Scene("mm").add_conductor("a", cube())
    scene.add_dielectric("one", cube(), place=Place(shift=shift), relative_permittivity=2)
    scene.add_dielectric("two", turned(cube(), 3), place=Place(shift=shift),
                         relative_permittivity=3)  # fmt: skip
    assert inspect(scene).fatal == []


def test_permittivities_below_one_are_doubted():
    scene = Scene("mm").add_conductor("a", cube())
    scene.add_dielectric("d", cube(), relative_permittivity=0.5)
    scene.set_flat_layers(thickness=[1, 1], relative_permittivity=[2, 0.3], from_x=3)
    assert inspect(scene).warnings == [
        '"d": relative permittivity 0.5 is below that of vacuum, 1; check the number',
        "flat_layers: layer 2: relative permittivity 0.3 is below that of vacuum, 1; "
        "check the number",
    ]


# planes


def over_ground(low: float) -> Scene:
    """A cube over a grounded plane, and a slab whose lower face is at ``low``."""
    scene = Scene("mm").set_ground_plane(z=0.0)
    scene.add_conductor("a", cube(1.0, (0.0, 0.0, 3.0)))
    slab = Place(shift=(0, 0, low + 0.5))
    return scene.add_dielectric("slab", bem.box(4, 4, 1), place=slab, relative_permittivity=2)


@pytest.mark.parametrize("low", [0.0, 1e-7, 0.5])
def test_a_dielectric_may_touch_the_ground(low):
    assert inspect(over_ground(low)).fatal == []


def test_a_dielectric_may_not_cross_the_ground():
    assert inspect(over_ground(-0.25)).fatal == [
        '"slab" crosses the grounded plane z = 0 mm by 250 um; end it in the plane, which it may '
        "touch"
    ]
    assert "separates them completely" in inspect(over_ground(-5.0)).fatal[0]


def between_layers(at: float, body: Surface, dielectric: bool = False) -> list[str]:
    scene = Scene("mm").set_flat_layers(
        thickness=[4.0], relative_permittivity=[3.0], from_z=0.0, grounded_below=True,
        grounded_above=True,
    )  # fmt: skip
    scene.add_conductor("a", cube(1.0, (0, 0, 2.0)))
    place = Place(shift=(5, 0, at))
    if dielectric:
        scene.add_dielectric("b", body, place=place, relative_permittivity=2.0)
    else:
        scene.add_conductor("b", body, place=place)
    return inspect(scene).fatal


def test_grounded_layers_bound_the_scene():
    assert between_layers(2.0, cube()) == []
    assert between_layers(0.5, cube())[0].startswith('"b" touches the grounded plane z = 0 mm; ')
    assert between_layers(4.0, cube())[0].startswith('"b" crosses by 500 um the grounded plane')
    assert between_layers(0.5, cube(), dielectric=True) == []
    assert between_layers(3.5, cube(), dielectric=True) == []
    assert between_layers(4.0, cube(), dielectric=True)[0].startswith('"b" crosses the grounded')
    assert between_layers(9.0, cube())[0].startswith('"b" lies behind the grounded plane z = 4 mm')
    assert between_layers(-9.0, cube())[0].startswith('"b" lies behind the grounded plane z = 0')


def test_layers_are_listed_from_above():
    scene = Scene("mm").add_conductor("a", cube(1.0, (0, 0, 9.0)))
    scene.set_flat_layers(
        thickness=[1.0, 2.0], relative_permittivity=[3.0, 4.0], from_z=1.0, grounded_below=True
    )
    lines = report(scene, inspect(scene)).splitlines()
    assert [line for line in lines if line.startswith(("  layer", "  ground"))] == [
        "  layer   above z = 4 mm: relative permittivity 1",
        "  layer   z = 2 mm to z = 4 mm: relative permittivity 4",
        "  layer   z = 1 mm to z = 2 mm: relative permittivity 3",
        "  layer   behind the grounded plane: no field",
        "  ground  infinite plane z = 1 mm at potential zero",
    ]


# files


def test_faces_by_region_pair(tmp_path):
    """Areas by pair are those of the regions; general readers find names as field data."""
    scene = slab_scene()
    save_faces(scene, regions_of(scene).partition.parts, tmp_path / "faces.vtu")
    mesh = meshio.read(tmp_path / "faces.vtu")
    names = {name: int(number[0]) for name, number in mesh.field_data.items()}
    assert names == {
        "region -1: metal": -1, "region 0: surroundings": 0, "region 1: top": 1,
        "region 2: low": 2, "conductor 0: cube": 0,
    }  # fmt: skip
    areas: dict[tuple[int, int, int], float] = {}
    for k, block in enumerate(mesh.cells):
        corners = mesh.points[block.data]
        cross = np.cross(corners[:, 2] - corners[:, 0], corners[:, -1] - corners[:, 1])
        if block.type == "triangle":
            cross = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        keys = zip(*(mesh.cell_data[n][k].tolist() for n in ("conductor", "back", "front")),
                   strict=True)  # fmt: skip
        for key, area in zip(keys, 0.5 * np.linalg.norm(cross, axis=1), strict=True):
            key = key if key[0] >= 0 else (key[0], *sorted(key[1:]))
            areas[key] = areas.get(key, 0.0) + area
    assert areas == pytest.approx(
        {(0, -1, 0): 20, (0, -1, 1): 4, (-1, 0, 1): 76, (-1, 1, 2): 16, (-1, 0, 2): 32}
    )
    pairs = {int(p) for block in mesh.cell_data["pair"] for p in block}
    assert pairs == set(range(len(pairs)))


def at(section: Section, x: float, y: float) -> int:
    """Medium of the point nearest to (x, y) in mm."""
    across, up = section.points
    column, row = np.abs(across - 1e-3 * x).argmin(), np.abs(up - 1e-3 * y).argmin()
    return int(section.regions[row, column])


def test_a_section_tells_what_is_where():
    section = Section.of(slab_scene(), Plane(1, 0.0003))
    found = [
        at(section, *p) for p in [(0, 2), (0, 0.5), (2.5, 0.5), (0, -0.5), (2.5, -0.5), (2, 2)]
    ]
    assert found == [METAL_HERE, 1, 1, 2, 0, 0]
    share = np.mean(section.regions == 1) * np.prod(section.frame[1] - section.frame[0])
    assert share == pytest.approx(6e-6, rel=5e-3)


@pytest.mark.parametrize("axis", [0, 1, 2])
def test_a_section_in_the_plane_of_a_face_is_sound(axis):
    """Half of the points lie inside, none is lost where the plane runs through corners."""
    scene = Scene("mm").add_conductor("a", cube(2.0))
    scene.add_dielectric("ball", ball(1.0, 16), place=Place(shift=(3, 3, 3)),
                         relative_permittivity=2.0)  # fmt: skip
    section = Section.of(scene, Plane(axis, -1e-3))
    share = np.mean(section.regions == METAL_HERE) * np.prod(section.frame[1] - section.frame[0])
    assert share == pytest.approx(4e-6, rel=1e-2)


def test_skins_and_open_sheets_hold_no_metal():
    scene = Scene("mm").add_conductor("can", cube(2.0), body="shell")
    scene.add_conductor("tube", bem.tube(1.0, 2.0), place=Place(shift=(5, 0, 0)))
    scene.add_conductor("ball", bem.sphere(1.0), place=Place(shift=(9, 0, 0)))
    section = Section.of(scene, Plane(1, 0.0001))
    assert [at(section, x, 0) for x in (0, 5, 9)] == [0, 0, METAL_HERE]


def test_layers_fill_the_section():
    scene = slab_scene().set_half_space(below_z=-0.5, relative_permittivity=9.0)
    section = Section.of(scene, Plane(1, 0.0))
    assert [at(section, *p) for p in [(2.8, -0.9), (2.8, -0.2), (0, -0.9)]] == [3, 0, 2]
    assert section.media[3][0] == "half-space"
    assert at(Section.of(scene, Plane(2, -0.0008)), 2.8, 2.8) == 3
    layers = slab_scene().set_flat_layers(
        thickness=[1, 1], relative_permittivity=[2, 3], from_x=1.5
    )
    section = Section.of(layers, Plane(1, 0.0))
    assert [at(section, x, 2.0) for x in (1.2, 2.0, 3.0)] == [0, 3, 4]


def test_planes_are_read_in_the_scene_s_unit():
    assert plane_of("z=0.5", 1e-3) == Plane(2, 5e-4)
    assert plane_of(" x = -2 ", 1e-2) == Plane(0, -2e-2)
    for text in ("w=1", "z", "z=a", "z=inf", "=1"):
        with pytest.raises(bem.UsageError, match="give an axis and a number, such as z=0.5"):
            plane_of(text, 1.0)
    with pytest.raises(bem.UsageError, match="meets no body; they lie between z = -1 mm and"):
        Section.of(slab_scene(), Plane(2, 1.0))


def test_the_picture_is_a_picture(tmp_path):
    import matplotlib.image

    scene = slab_scene().set_half_space(below_z=-0.5, relative_permittivity=9.0)
    scene.add_mirror_plane(x=0.0)
    save_section(Section.of(scene), tmp_path / "s.png")
    picture = matplotlib.image.imread(tmp_path / "s.png")
    assert picture.shape[:2] == (900, 1200)
    colours = {tuple(c) for c in np.round(255 * picture[::3, ::3, :3].reshape(-1, 3)).astype(int)}
    assert {(58, 58, 58), (255, 255, 255), (141, 211, 199), (255, 255, 179)} <= colours
    assert [p.name for p in tmp_path.iterdir()] == ["s.png"]


SCENE = """
unit = "mm"
[[conductor]]
name = "rod"
shape = { kind = "box", lx = 1, ly = 1, lz = 1 }
[[dielectric]]
name = "resin"
shape = { kind = "box", lx = 3, ly = 3, lz = 3 }
relative_permittivity = 3.5
"""


def test_the_command_writes_its_files(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "s.toml").write_text(SCENE)
    options = ["--json", "s.json", "--faces", "s.vtu", "--section", "s.png", "--plane", "z=0.2"]
    assert main(["inspect", "s.toml", *options]) == 0
    assert "1 resin: relative permittivity 3.5, volume 26 mm^3" in capsys.readouterr().out
    saved = json.loads((tmp_path / "s.json").read_text())
    assert (saved["format"], saved["can_be_solved"]) == ("bem inspection", True)
    assert [body["kind"] for body in saved["bodies"]] == ["solid", "dielectric"]
    resin = saved["regions"][1]
    assert (resin["name"], resin["relative_permittivity"]) == ("resin", 3.5)
    assert resin["volume_m3"] == pytest.approx(26e-9)
    assert resin["borders_m2"] == pytest.approx({"surroundings": 54e-6, "rod": 6e-6})
    assert len(meshio.read(tmp_path / "s.vtu").points) > 0
    assert (tmp_path / "s.png").read_bytes().startswith(b"\x89PNG")


def test_the_command_refuses_in_time(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "s.toml").write_text(SCENE)
    for options, words in (
        (["--plane", "z=1"], "give --section FILE.png too"),
        (["--section", "none/s.png"], "there is no folder"),
        (["--section", "s.png", "--plane", "z=9"], "meets no body"),
        (["--section", "s.png", "--faces", "s.png"], "is also the file of"),
    ):
        assert main(["inspect", "s.toml", *options]) == 2
        assert words in capsys.readouterr().err
    assert [p.name for p in tmp_path.iterdir()] == ["s.toml"]
    monkeypatch.setattr("importlib.util.find_spec", lambda name: None)
    assert main(["inspect", "s.toml", "--section", "s.png"]) == 2
    assert "pip install 'bem-capacitance[plot]'" in capsys.readouterr().err


# demo scenes


ROD = 12 * 5.0**2 * math.tan(math.pi / 12)
"""Section of the probe rod, mm^2."""
TAPER = (240.0**3 - 60.0**3) / 3.6
"""Volume of the hopper below its upright walls, mm^3."""


@pytest.mark.parametrize(
    ("scene", "volumes"),
    [
        ("touch_pad/touch_pad_cover", {"film": 24 * 24 * 0.5, "cover": 26 * 26 * 1.8}),
        ("board_pair/board_pair", {"board": 20 * 40 * 1.6}),
        ("grain_hopper/grain_low", {"grain": (180.0**3 - 60.0**3) / 3.6 - 10 * ROD}),
        ("grain_hopper/grain_half", {"grain": TAPER + 240.0**2 * 20 - 80 * ROD}),
        ("grain_hopper/grain_full", {"grain": TAPER + 240.0**2 * 110 - 170 * ROD}),
    ],
)
def test_demo_scenes(scene, volumes):
    found = inspect(bem.load_scene(MESHES / f"{scene}.toml"))
    assert found.fatal == []
    assert {r.name: 1e9 * r.volume for r in found.regions.reports[1:]} == pytest.approx(volumes)
