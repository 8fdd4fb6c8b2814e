"""OBJ, PLY, OFF, 3MF and glTF: the same two boxes come out of each, whoever wrote the file.

The files in ``tests/files`` were written by other libraries (see the README there), those made
here by the few lines of ``two_boxes``, and some by trimesh, which reads none of these but glTF.
"""

from __future__ import annotations

import base64
import json
from pathlib import Path

import numpy as np
import pytest
import trimesh
from made_bodies import CUBE_TRIANGLES, ball, soup
from two_boxes import (
    AREA,
    BOUNDS,
    CAN,
    CAN_BOUNDS,
    CORNERS,
    MIXED,
    PAIR,
    QUADS,
    ROD,
    TRIANGLES,
    VOLUME,
    archive_3mf,
    glb,
    gltf_header,
    model_3mf,
    obj_text,
    off_text,
    ply,
)

from bem.errors import InputError
from bem.geometry.reading.files import Bodies, bodies_in, read_surface
from bem.scene.body import body_of
from bem.scene.scene import Scene
from bem.units import METRES_PER

FILES = Path(__file__).parent / "files"
MM = 1e-3


def refused(path, part=None, unit: float = 1.0) -> str:
    """Return the one-line message with which reading is refused."""
    with pytest.raises(InputError) as caught:
        read_surface(path, unit, part)
    message = str(caught.value)
    assert message.startswith(f"{path}: ")
    assert "\n" not in message
    return message.removeprefix(f"{path}: ")


def save(path: Path, content: str | bytes) -> Path:
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def check_boxes(path: Path, unit: str = "m", part: str | None = None, scale: float = 1.0) -> None:
    """Check area, volume and box of the two boxes, or of the can alone."""
    scene = Scene("m").add_conductor("it", mesh=path, unit=unit, part=part)
    body, size = body_of(scene.conductors[0]), scale * METRES_PER[unit]
    area, volume, bounds = (AREA, VOLUME, BOUNDS) if part is None else (10.0, 2.0, CAN_BOUNDS)
    assert body.closed
    assert body.area == pytest.approx(area * size**2, rel=1e-6, abs=0.0)
    assert body.volume == pytest.approx(volume * size**3, rel=1e-6, abs=0.0)
    assert body.bounds == pytest.approx(np.array(bounds) * size, rel=1e-6, abs=1e-6 * size)


# OBJ


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
def test_obj(tmp_path, ending):
    path = save(tmp_path / "two.OBJ", obj_text().replace("\n", ending))
    check_boxes(path)
    check_boxes(path, part="big can")
    check_boxes(path, part="lid")
    surface, changes = read_surface(path, 1.0)
    assert np.array_equal(surface.faces[:6], MIXED[:6])
    assert np.array_equal(surface.faces[6:, :3], MIXED[6:])
    assert changes == []
    assert bodies_in(path) == Bodies(("rod", "big can"), 0)
    assert refused(path, "x") == (
        'part "x" is not in the file; found "rod", "big can", "lid", "side"'
    )


def test_obj_of_groups_alone(tmp_path):
    """Groups stand for bodies if there are no objects; one may go on later."""
    text = obj_text().replace("o rod\n", "").replace("o big can\n", "")
    path = save(tmp_path / "two.obj", text.replace("g default", "g rod").replace("lid side", "can"))
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    again = save(tmp_path / "again.obj", path.read_text() + "g rod\nf 9 10 11\n")
    assert len(read_surface(again, 1.0, "rod")[0].faces) == 7


@pytest.mark.parametrize("name", ["meshlab.obj", "meshlab.off", "meshlab.ply"])
def test_files_of_another_library(name):
    check_boxes(FILES / name)
    assert bodies_in(FILES / name) == Bodies((), 24)


@pytest.mark.parametrize("kind", ["obj", "off", "ply"])
def test_files_of_trimesh(tmp_path, kind):
    mesh = trimesh.Trimesh(CORNERS, TRIANGLES, process=False)
    mesh.export(tmp_path / f"two.{kind}")
    check_boxes(tmp_path / f"two.{kind}")


@pytest.mark.parametrize("kind", ["obj", "off", "ply"])
def test_a_ball_keeps_its_faces_in_order(tmp_path, kind):
    corners = soup(ball(1.0))
    points, faces = corners.reshape(-1, 3), np.arange(3 * len(corners)).reshape(-1, 3)
    trimesh.Trimesh(points, faces, process=False).export(tmp_path / f"ball.{kind}")
    surface, _ = read_surface(tmp_path / f"ball.{kind}", 1.0)
    assert surface.vertices[surface.triangles] == pytest.approx(corners, abs=1e-6)


ARROW = [[0.0, 0, 0], [2, 0, 0], [2, 2, 0], [1, 0.5, 0], [0, 2, 0], [0, 1, 0]]
"""A polygon that is not convex, with a corner on a straight side."""


def test_polygons_that_are_not_convex(tmp_path):
    rows = "".join(f"v {x} {y} {z}\n" for x, y, z in ARROW)
    path = save(tmp_path / "arrow.obj", rows + "f 1 2 3 4 5 6\nf 1 2 3\n")
    surface, changes = read_surface(path, 1.0)
    a, b, c = np.moveaxis(surface.vertices[surface.faces[:4, :3]], 1, 0)
    areas = np.cross(b - a, c - a)[:, 2] / 2
    assert areas.min() > 0.0
    assert areas.sum() == pytest.approx(2.5)
    assert changes == ["1 polygon with more than four corners cut into triangles"]


def test_a_polygon_of_many_corners_has_its_area(tmp_path):
    turn = 2 * np.pi * np.arange(300) / 300
    rows = "".join(
        f"v {x} {y} {0.3 * x - y}\n" for x, y in zip(np.cos(turn), np.sin(turn), strict=True)
    )
    star = "".join(
        f"v {r * x} {r * y} 5\n"
        for r, x, y in zip([3, 1] * 150, np.cos(turn), np.sin(turn), strict=True)
    )
    faces = f"f {' '.join(map(str, range(1, 301)))}\nf {' '.join(map(str, range(301, 601)))}\n"
    surface, _ = read_surface(save(tmp_path / "round.obj", rows + star + faces), 1.0)
    a, b, c = np.moveaxis(surface.vertices[surface.triangles], 1, 0)
    areas = np.cross(b - a, c - a)[:, 2] / 2
    assert len(areas) == 596
    assert areas[:298].sum() == pytest.approx(150 * np.sin(np.pi / 150))
    assert areas[298:].sum() == pytest.approx(450 * np.sin(np.pi / 150))
    assert areas.min() > 0.0


VERTICES = "v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\n"


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "is empty (0 bytes)"),
        ("hello\n", "is not OBJ: it has no line that starts with v; export it again"),
        (VERTICES, "holds no triangle or quadrilateral; mesh the surface"),
        ("v 1 2\nf 1 1 1\n", "vertex 1 has 2 of 3 coordinates: cut short? export it again"),
        (VERTICES + "f 1 2\n", "face 1 has 2 corners, needs at least 3; export it again"),
        (VERTICES + "f 1 2 5\n", "a face uses a corner beyond the 4 listed; mesh it again"),
        (VERTICES + "f 1 2 -5\n", "a face uses a corner beyond the 4 listed; mesh it again"),
        (VERTICES + "f 1 2 0\n",
         "a face uses corner 0, but OBJ counts from 1; export it again"),
        (VERTICES + "f 1 2 x/1\n",
         "cannot be read as OBJ: found 'x' where a number belongs; export it again"),
        (VERTICES.replace("1 1 0", "one 1 0") + "f 1 2 3\n",
         "cannot be read as OBJ: found 'one' where a number belongs; export it again"),
        (VERTICES.replace("1 1 0", "nan 1 0") + "f 1 2 3\n",
         "1 corner not finite, the first is number 3 at (nan, 1.0, 0.0); mesh it again"),
        (VERTICES + "v 2 2 1\nf 1 2 3 4 5\n",
         "face 1, a polygon with 5 corners, is not flat; export it as triangles"),
        (VERTICES + "v -1 0.5 0\nf 1 3 2 4 5\n",
         "the sides of face 1, a polygon with 5 corners, cross each other; export it as triangles"),
    ],
)  # fmt: skip
def test_damaged_obj(tmp_path, text, message, capfd):
    assert refused(save(tmp_path / "bad.obj", text)) == message
    assert capfd.readouterr() == ("", "")


def test_coordinates_without_end(tmp_path, recwarn):
    text = VERTICES.replace("1 1 0", "1e300 1 0") + "f 1 2 3\n"
    assert refused(save(tmp_path / "far.obj", text)) == (
        "the coordinates are too large to compute with; check the unit"
    )
    assert len(recwarn) == 0


# PLY and OFF


@pytest.mark.parametrize("number", ["float", "double"])
@pytest.mark.parametrize("form", ["ascii", "binary_little_endian", "binary_big_endian"])
def test_ply(tmp_path, form, number):
    """Triangles and quadrilaterals in one file, with other columns and elements."""
    path = save(tmp_path / "two.ply", ply(form, number))
    check_boxes(path)
    surface, changes = read_surface(path, MM)
    assert [len(set(f) - {-1}) for f in surface.faces.tolist()] == [4] * 6 + [3] * 12
    assert changes == []
    single = form != "ascii" and number == "float"
    assert surface.rounding == (MM * 4.0 * 2.0**-24 if single else 0.0)


def test_ply_text_keeps_all_digits(tmp_path):
    text = ply("ascii").decode().replace("4.0", "3.123456789012345")
    surface, _ = read_surface(save(tmp_path / "two.ply", text), 1.0)
    assert surface.bounds[1, 0] == 3.123456789012345


def test_off(tmp_path):
    path = save(tmp_path / "two.off", off_text())
    check_boxes(path)
    assert len(read_surface(path, 1.0)[0].faces) == 18
    check_boxes(
        save(tmp_path / "one_line.off", off_text().replace("OFF # made for a test\n", "OFF "))
    )


PLY = ply("ascii").decode()
SHORT = "is cut short: it ends before the announced rows; export it again"


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "is empty (0 bytes)"),
        (b"hello", "is not PLY: no header from 'ply' to 'end_header'; export it again"),
        (PLY.replace("end_header\n", ""),
         "is not PLY: no header from 'ply' to 'end_header'; export it again"),
        (PLY.replace("vertex 16", "vertex many"),
         "is not PLY: its header is damaged; export it again"),
        (PLY.replace("property float x", "property real x"),
         "is not PLY: its header is damaged; export it again"),
        (PLY.replace("ascii", "packed"),
         "is PLY of unknown format 'packed'; save it as text or binary"),
        (PLY.replace("face 18", "face 0"), "holds no triangle or quadrilateral; mesh the surface"),
        (PLY.replace("face 18", "face 19"), SHORT),
        (PLY[:-20], SHORT),
        (PLY.replace("property float z\n", "property float w\n"),
         "is not a PLY mesh: it lists no vertices with x, y, z; export it again"),
        (PLY.replace("4.0", "four", 1),
         "cannot be read as PLY: found 'four' where a number belongs; export it again"),
        (PLY.replace("4 0 2 3 1", "4 0 2 3 99"),
         "a face uses a corner beyond the 16 listed; mesh it again"),
        (PLY.replace("7 4.0", "7 nan", 1),
         "1 corner not finite, the first is number 10 at (nan, 0.0, 0.0); mesh it again"),
        (ply("binary_little_endian")[:-9], SHORT),
        (ply("binary_big_endian").replace(b"face 18", b"face 99"), SHORT),
    ],
)  # fmt: skip
def test_damaged_ply(tmp_path, content, message, capfd):
    assert refused(save(tmp_path / "bad.ply", content)) == message
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("form", ["ascii", "binary_little_endian"])
@pytest.mark.parametrize("part", [0.02, 0.1, 0.3, 0.5, 0.7, 0.9])
def test_ply_cut_anywhere(tmp_path, form, part):
    data = ply(form)
    assert "export it again" in refused(save(tmp_path / "bad.ply", data[: int(part * len(data))]))


OFF = off_text()


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "is empty (0 bytes)"),
        ("hello", "is not a text OFF file: it does not start with OFF; export it again"),
        ("OFF BINARY\n", "is not a text OFF file: it does not start with OFF; export it again"),
        ("OFF\n", "does not state its numbers of vertices and faces; export it again"),
        ("OFF\nmany 2 0\n",
         "cannot be read as OFF: found 'many' where a number belongs; export it again"),
        ("OFF\n0 0 0\n", "holds no triangle or quadrilateral; mesh the surface"),
        (OFF.replace("16 18 0", "16 19 0"), "is cut short: 16 vertices and 19 faces announced, "
         "found 34 lines; export it again"),
        (OFF.replace("4 0 2 3 1 255 0 0", "9 0 2 3 1 255 0 0"),
         "a face has fewer corners than it announces; export it again"),
        (OFF.replace("4 0 2 3 1", "4 0 2 3 16"),
         "a face uses a corner beyond the 16 listed; mesh it again"),
        (OFF.replace("4.0 2.0 1.0", "4.0"),
         "a vertex has less than 3 coordinates; export it again"),
        (OFF.replace("4.0 2.0 1.0", "4.0 inf 1.0"),
         "1 corner not finite, the first is number 16 at (4.0, inf, 1.0); mesh it again"),
    ],
)  # fmt: skip
def test_damaged_off(tmp_path, text, message, capfd):
    assert refused(save(tmp_path / "bad.off", text)) == message
    assert capfd.readouterr() == ("", "")


# 3MF


@pytest.mark.parametrize(
    ("stated", "unit", "scale"),
    [
        (None, "mm", 1.0),
        ("micron", "um", 1.0),
        ("millimeter", "mm", 1.0),
        ("centimeter", "cm", 1.0),
        ("inch", "in", 1.0),
        ("foot", "in", 12.0),
        ("meter", "m", 1.0),
    ],
)
def test_3mf(tmp_path, stated, unit, scale):
    """The unit is the file's, millimetres if it states none (3MF core specification)."""
    path = save(tmp_path / "two.3mf", archive_3mf(model_3mf(stated)))
    check_boxes(path, unit, scale=scale)
    check_boxes(path, unit, part="can", scale=scale)
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    assert len(read_surface(path, METRES_PER[unit], "pair")[0].faces) == 24


def test_3mf_of_other_libraries():
    check_boxes(FILES / "meshlab.3mf", "mm")
    assert bodies_in(FILES / "lib3mf.3mf") == Bodies(("rod", "can"), 0)
    can, _ = read_surface(FILES / "lib3mf.3mf", 0.0254, "can")
    assert can.bounds == pytest.approx(0.0254 * (np.array(CAN_BOUNDS) + [10, 0, 0]))


def test_3mf_with_one_object_used_twice(tmp_path):
    """Both uses are placed, and numbered, since they share their name."""
    turned = "0 1 0 -1 0 0 0 0 1 0 0 5"
    model = model_3mf().replace(
        '<item objectid="3"/>', f'<item objectid="1"/><item objectid="1" transform="{turned}"/>'
    )
    path = save(tmp_path / "two.3mf", archive_3mf(model))
    assert bodies_in(path) == Bodies(("rod 1", "rod 2"), 0)
    second, changes = read_surface(path, MM, "rod 2")
    assert second.bounds == pytest.approx(MM * np.array([[-1, 0, 5], [0, 1, 6]]))
    assert changes == ['2 bodies called "rod" numbered']
    assert len(read_surface(path, MM, "rod")[0].faces) == 24


def test_3mf_in_several_model_files(tmp_path):
    """Objects may lie in other model files of the archive (3MF production extension)."""
    import zipfile

    path = tmp_path / "two.3mf"
    inner = model_3mf().replace('name="rod"', "").replace('objectid="3"', 'objectid="1"')
    outer = (
        '<model unit="millimeter" xmlns="x" xmlns:p="y"><resources><object id="8" name="holder">'
        '<components><component p:path="/3D/Objects/a.model" objectid="1"/></components></object>'
        '</resources><build><item objectid="8"/></build></model>'
    )
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("3D/3dmodel.model", outer)
        archive.writestr("3D/Objects/a.model", inner)
    assert bodies_in(path) == Bodies(("holder",), 0)
    assert read_surface(path, MM)[0].bounds == pytest.approx(MM * np.array([[0, 0, 0], [1, 1, 1]]))


MODEL = model_3mf()
DAMAGED_OBJECTS = "is 3MF with damaged objects; export it again"


@pytest.mark.parametrize(
    ("model", "message"),
    [
        (MODEL.replace('v1="0"', 'v1="8"', 1),
         'mesh "rod" uses a corner beyond the 8 listed; mesh it again'),
        (MODEL.replace('v1="0"', 'v1="-1"', 1),
         'mesh "rod" uses a corner beyond the 8 listed; mesh it again'),
        (MODEL.replace('v1="0"', "", 1), DAMAGED_OBJECTS),
        (MODEL.replace('transform="1 0', 'transform="1'), DAMAGED_OBJECTS),
        (MODEL.replace('x="0.0"', 'x="zero"', 1),
         "cannot be read as 3MF: found 'zero' where a number belongs; export it again"),
        (MODEL.replace('x="0.0"', 'x="nan"', 1),
         "1 corner not finite, the first is number 1 at (nan, "),
        (MODEL.replace('component objectid="2"', 'component objectid="7"'),
         "places object 7, which it lacks; export it again"),
        (MODEL.replace('component objectid="2"', 'component objectid="3"'),
         "is 3MF with objects that hold themselves; export it again"),
        (MODEL.replace('<item objectid="3"/>', ""),
         "holds no triangle or quadrilateral; mesh the surface"),
        (model_3mf("furlong"), "is 3MF in the unit 'furlong'; known are micron, millimeter, "
         "centimeter, inch, foot, meter"),
        (MODEL[:-30], "is 3MF with damaged XML"),
        ("", "is 3MF with damaged XML"),
    ],
)  # fmt: skip
def test_damaged_3mf(tmp_path, model, message, capfd):
    assert refused(save(tmp_path / "bad.3mf", archive_3mf(model)), unit=MM).startswith(message)
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("part", [0.0, 0.1, 0.5, 0.95])
def test_damaged_archive(tmp_path, part):
    data = archive_3mf(MODEL)
    said = refused(save(tmp_path / "bad.3mf", b"garbage" + data[: int(part * len(data))]), unit=MM)
    assert said == "is not 3MF, or damaged: its archive cannot be read; export it again"


def test_archive_that_is_no_3mf(tmp_path):
    data = archive_3mf(MODEL).replace(b"3dmodel.model", b"3dmodel.other")
    assert refused(save(tmp_path / "bad.3mf", data), unit=MM) == (
        "is not 3MF: it holds no 3d/3dmodel.model; export it again"
    )


# glTF


def test_glb(tmp_path):
    path = save(tmp_path / "two.glb", glb(*gltf_header(PAIR)))
    check_boxes(path)
    check_boxes(path, part="can")
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    surface, changes = read_surface(path, 1.0)
    assert changes == []
    assert surface.rounding == 2.0 * 2.0**-24
    assert refused(path, "x") == 'part "x" is not in the file; found "rod", "can", "pair"'


@pytest.mark.parametrize("name", ["pygltflib.glb", "pygltflib.gltf"])
def test_gltf_of_another_library(name):
    assert bodies_in(FILES / name) == Bodies(("rod", "can"), 0)
    both, _ = read_surface(FILES / name, 1.0)
    assert both.bounds == pytest.approx(np.array(BOUNDS) + [10, 0, 0])


def test_gltf_beside_its_buffer(tmp_path):
    header, binary = gltf_header(PAIR)
    header["buffers"][0]["uri"] = "two%20boxes.bin"
    path = save(tmp_path / "two.gltf", json.dumps(header))
    assert refused(path) == (
        "needs the file two boxes.bin, which cannot be opened (No such file or directory); "
        "keep them in one folder"
    )
    save(tmp_path / "two boxes.bin", binary)
    check_boxes(path)


def test_names_of_nodes_and_meshes(tmp_path):
    """A node's name goes before its mesh's; nodes of one name are numbered."""
    nodes = [{"children": [1, 2, 3]}, {"name": "bolt_1", "mesh": 0}, {"mesh": 1}, {"mesh": 1}]
    nodes[3] |= {"scale": [2, 2, 2], "translation": [0, 0, 9]}
    path = save(tmp_path / "two.glb", glb(*gltf_header(nodes)))
    assert bodies_in(path) == Bodies(("bolt_1", "shared 1", "shared 2"), 0)
    last, _ = read_surface(path, 1.0, "shared 2")
    assert last.bounds.tolist() == [[0, 0, 9], [2, 4, 11]]


def test_meshes_of_several_sets(tmp_path):
    """All triangles of a node are one body; points and lines are counted as left out."""
    header, binary = gltf_header(PAIR)
    sets = [*header["meshes"][0]["primitives"], *header["meshes"][1]["primitives"]]
    header["meshes"][0]["primitives"] = [*sets, {"attributes": {"POSITION": 0}, "mode": 1}]
    surface, changes = read_surface(save(tmp_path / "two.glb", glb(header, binary)), 1.0, "rod")
    assert len(surface.faces) == 12 + 10, "ten of those two boxes share no side"
    assert changes[0] == "1 set of points or lines left out"


def test_a_file_in_metres_that_is_asked_for_in_millimetres(tmp_path):
    path = save(tmp_path / "two.glb", glb(*gltf_header(PAIR)))
    assert refused(path, unit=MM) == (
        "its lengths are in m, as the file itself or its format states, but mm was asked for; "
        'give this conductor unit = "m" (on the command line: --unit m)'
    )


def edited(change) -> bytes:
    header, binary = gltf_header([dict(node) for node in PAIR])
    binary = change(header) or binary
    return glb(header, binary)


GLTF = "cannot be read as glTF: its meshes or nodes are damaged; export it again"


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda h: h["asset"].update(version="1.0"), "is glTF version 1.0; save it as version 2.0"),
        (lambda h: h.update(extensionsRequired=["KHR_draco_mesh_compression"]), "needs the glTF "
         "extension KHR_draco_mesh_compression; export it without compression"),
        (lambda h: h["accessors"][0].update(sparse={}),
         "holds sparse glTF accessors; export it without them"),
        (lambda h: h["meshes"][0]["primitives"][0].update(mode=5),
         "holds strips or fans of triangles; export it with plain triangles"),
        (lambda h: h["meshes"][0]["primitives"][0].update(mode=6),
         "holds strips or fans of triangles; export it with plain triangles"),
        (lambda h: h["accessors"][1].update(count=99), GLTF),
        (lambda h: h["accessors"][0].update(count=7),
         'mesh "rod" uses a corner beyond the 7 listed; mesh it again'),
        (lambda h: h["bufferViews"][0].update(buffer=3), GLTF),
        (lambda h: h["nodes"][1].update(mesh=9), GLTF),
        (lambda h: h["nodes"][0].update(children=[9]), GLTF),
        (lambda h: h["meshes"][0]["primitives"][0].update(attributes={}), GLTF),
        (lambda h: h.update(meshes="none"), GLTF),
        (lambda h: h.update(nodes=[]), GLTF),
        (lambda h: h["buffers"][0].update(byteLength=9999), "is cut short: a buffer of 9,999 bytes "
         "announced, found 408; export it again"),
        (lambda h: h["nodes"][1].update(translation=[0, 0, 1e999]), GLTF),
        (lambda h: h.update(scenes=[{"nodes": []}]),
         "holds no triangle or quadrilateral; mesh the surface"),
    ],
)  # fmt: skip
def test_damaged_gltf(tmp_path, change, message, capfd):
    assert refused(save(tmp_path / "bad.glb", edited(change))) == message
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "is empty (0 bytes)"),
        (b"hello", "is not glTF: its header is damaged; export it again"),
        (b"glTF", "is GLB version 0; save it as version 2"),
        (glb(*gltf_header(PAIR))[:-9], "is cut short"),
        (glb(*gltf_header(PAIR)).replace(b'"asset"', b'"abcde"'),
         "is not glTF: its header is damaged; export it again"),
        (glb({"asset": {"version": "2.0"}}, b""),
         "holds no triangle or quadrilateral; mesh the surface"),
    ],
)  # fmt: skip
def test_damaged_glb(tmp_path, content, message, capfd):
    assert refused(save(tmp_path / "bad.glb", content)).startswith(message)
    assert capfd.readouterr() == ("", "")


def test_a_coordinate_that_is_no_number(tmp_path):
    header, binary = gltf_header(PAIR)
    data = glb(header, np.float32(np.nan).tobytes() + binary[4:])
    said = refused(save(tmp_path / "bad.glb", data))
    assert said.startswith("1 corner not finite, the first is number 1 at (nan, ")


def test_gltf_with_a_buffer_in_its_text(tmp_path):
    header, binary = gltf_header(PAIR)
    text = base64.b64encode(binary).decode()
    header["buffers"][0]["uri"] = f"data:application/octet-stream;base64,{text}"
    check_boxes(save(tmp_path / "two.gltf", json.dumps(header)))
    header["buffers"][0]["uri"] = f"data:application/octet-stream;base64,{text[:-9]}!"
    assert refused(save(tmp_path / "bad.gltf", json.dumps(header))) == GLTF


def test_the_boxes_are_what_they_should_be():
    """The tables of the tests agree with one another."""
    assert np.array_equal(CORNERS, np.concatenate([ROD, CAN]))
    assert len(QUADS) == 12
    assert len(CUBE_TRIANGLES) == 12
