"""Mesh files in: every kind, every writer's version, every message."""

from __future__ import annotations

import struct

import meshio
import numpy as np
import pytest
from made_bodies import (
    CUBE_QUADS,
    CUBE_TRIANGLES,
    ball,
    cube,
    cube_vertices,
    soup,
    stl_binary,
    stl_text,
    write_cube,
)

from bem.errors import InputError
from bem.geometry.reading.files import Bodies, bodies_in, file_digest, read_surface

MM = 1e-3
MSH_VERSIONS = [("2.2", False), ("2.2", True), ("4.1", False), ("4.1", True)]


def refused(path, part=None) -> str:
    """Return the one-line message with which reading is refused."""
    with pytest.raises(InputError) as caught:
        read_surface(path, 1.0, part)
    message = str(caught.value)
    assert message.startswith(f"{path}: ")
    assert "\n" not in message
    return message.removeprefix(f"{path}: ")


def save(path, content):
    if isinstance(content, str):
        path.write_text(content)
    else:
        path.write_bytes(content)
    return path


def volume(surface) -> float:
    a, b, c = np.moveaxis(surface.vertices[surface.triangles], 1, 0)
    return abs(float(np.einsum("tx,tx->", a, np.cross(b, c)))) / 6.0


# STL


@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_text_stl(tmp_path, ending):
    path = tmp_path / "cube.stl"
    path.write_bytes(stl_text({"part": soup(cube())}).replace("\n", ending).encode())
    surface, changes = read_surface(path, MM)
    assert (len(surface.vertices), len(surface.faces)) == (8, 12)
    assert volume(surface) == pytest.approx(1e-9, rel=1e-12, abs=0.0)
    assert changes == ["36 corners as read joined into 8 vertices"]


def test_binary_stl_whose_header_begins_like_text(tmp_path):
    path = save(tmp_path / "cube.STL", stl_binary(soup(cube(2.0)), b"solid but binary"))
    surface, _ = read_surface(path, 0.0254)
    assert volume(surface) == pytest.approx((2 * 0.0254) ** 3, rel=1e-6, abs=0.0)


def test_text_and_binary_stl_agree(tmp_path):
    corners = soup(ball(1.0)).astype(np.float32).astype(float)
    text, _ = read_surface(save(tmp_path / "a.stl", stl_text({"": corners})), MM)
    binary, _ = read_surface(save(tmp_path / "b.stl", stl_binary(corners)), MM)
    assert np.array_equal(text.vertices, binary.vertices)
    assert np.array_equal(text.faces, binary.faces)


def test_order_of_faces_is_that_of_the_file(tmp_path):
    """Nothing is reordered: the triangles come back one for one."""
    corners = soup(ball(1.0))[::-1]
    surface, _ = read_surface(save(tmp_path / "a.stl", stl_text({"x": corners})), 1.0)
    assert np.array_equal(surface.vertices[surface.faces[:, :3]], corners)


def test_long_text_stl_is_read_in_pieces(tmp_path, monkeypatch):
    monkeypatch.setattr("bem.geometry.reading.stl._BLOCK", 300)
    corners = soup(ball(1.0))
    surface, _ = read_surface(save(tmp_path / "a.stl", stl_text({"x": corners})), 1.0)
    assert np.array_equal(surface.vertices[surface.faces[:, :3]], corners)


def test_solids_of_a_text_stl_are_parts(tmp_path):
    """Solids of one name are one part; a name may hold words of the format."""
    left, right = soup(cube()), soup(cube(1.0, (3.0, 0.0, 0.0)))
    text = stl_text({"vertex facet": left, "rod": right[:6]}) + stl_text({"rod": right[6:]})
    path = save(tmp_path / "two.stl", text)
    assert len(read_surface(path, 1.0)[0].faces) == 24
    rod, _ = read_surface(path, 1.0, "rod")
    assert rod.bounds.tolist() == [[2.5, -0.5, -0.5], [3.5, 0.5, 0.5]]
    assert len(read_surface(path, 1.0, "vertex facet")[0].faces) == 12
    assert refused(path, "wire") == 'part "wire" is not in the file; found "vertex facet", "rod"'


def test_a_part_of_a_file_without_parts(tmp_path):
    path = write_cube(tmp_path / "cube.stl")
    assert refused(path, "rod") == 'part "rod" is not in the file; the file names no parts'


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "is empty (0 bytes)"),
        (b"hello", "is not STL: 5 bytes and no 'solid' at the start"),
        (stl_binary(soup(cube()))[:-7], "is cut short or not STL: binary STL with this header "
         "has 684 bytes, found 677; export it again"),
        (stl_binary(np.empty((0, 3, 3))), "holds no triangle or quadrilateral; mesh the surface"),
        (b"solid a\nendsolid a\n", "holds no triangle or quadrilateral; mesh the surface"),
        (stl_text({"a": soup(cube())})[:-12], "a solid has no 'endsolid' line: cut short? "
         "export it again"),
        (stl_text({"a": soup(cube())[:1]}).replace("vertex", "vertx", 1),
         "cannot be read as STL: the corners of a facet are damaged; export it again"),
        (stl_text({"a": soup(cube())[:2]}).replace("endfacet", "", 1),
         "cannot be read as STL: a solid with 2 triangles in 1 finished facet; export it again"),
        (stl_text({"a": soup(cube())}).replace("0.5", "nan", 1),
         "1 corner not finite, the first is number 1 at (nan, -0.5, -0.5); mesh it again"),
        (stl_binary(np.full((2, 3, 3), np.inf)),
         "6 corners not finite, the first is number 1 at (inf, inf, inf); mesh it again"),
    ],
)  # fmt: skip
def test_damaged_stl(tmp_path, content, message, capfd):
    assert refused(save(tmp_path / "bad.stl", content)) == message
    assert capfd.readouterr() == ("", "")


def test_words_where_numbers_belong(tmp_path):
    text = stl_text({"a": soup(cube())}).replace("0.5", "half", 1)
    assert refused(save(tmp_path / "bad.stl", text)) == (
        "cannot be read as STL: the corners of a facet are damaged; export it again"
    )


# the file itself


def test_files_that_cannot_be_opened(tmp_path):
    assert refused(tmp_path / "none.stl") == "no such file"
    known = "known are .stl, .msh, .obj, .ply, .off, .3mf, .glb, .gltf, .step, .stp, .vtk, .vtu"
    assert refused(tmp_path / "body.dwg").startswith(f"unknown kind of mesh file (.dwg); {known}")
    assert refused(tmp_path / "body").startswith(f"unknown kind of mesh file (no ending); {known}")
    folder = tmp_path / "folder.msh"
    folder.mkdir()
    assert refused(folder) == "cannot be opened (Is a directory)"


def test_a_file_that_changes_is_read_again(tmp_path):
    path = write_cube(tmp_path / "cube.stl")
    assert read_surface(path, 1.0)[0].extent == pytest.approx(3**0.5)
    save(path, stl_text({"": soup(cube(2.0))}))
    assert read_surface(path, 1.0)[0].extent == pytest.approx(2 * 3**0.5)


def test_digest(tmp_path):
    path = save(tmp_path / "abc.stl", b"abc")
    assert file_digest(path) == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    with pytest.raises(InputError, match=r"none\.stl: no such file"):
        file_digest(tmp_path / "none.stl")


# MSH


def two_boxes() -> meshio.Mesh:
    """Make a quadrilateral cube "rod", a triangle cube "can", and a volume and a line besides."""
    points = np.concatenate([cube_vertices(), cube_vertices(1.0, (3.0, 0.0, 0.0))])
    cells = [
        ("line", np.array([[0, 1]])),
        ("quad", CUBE_QUADS),
        ("triangle", 8 + CUBE_TRIANGLES),
        ("tetra", np.array([[0, 1, 2, 4]])),
    ]
    tags = [np.full(len(block), tag) for (_, block), tag in zip(cells, (9, 1, 2, 3), strict=True)]
    names = {"rim": [9, 1], "rod": [1, 2], "can": [2, 2], "metal": [3, 3]}
    return meshio.Mesh(
        points,
        cells,
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags},
        field_data={name: np.array(value) for name, value in names.items()},
        point_data={"gmsh:dim_tags": np.tile([2, 1], (len(points), 1))},
    )


def write_msh(path, mesh, version, binary):
    meshio.gmsh.write(path, mesh, fmt_version=version, binary=binary)
    return path


ENTITIES_41 = """$Entities
0 1 2 1
9 0 0 0 1 1 1 1 9 0
1 0 0 0 1 1 1 1 1 0
2 0 0 0 1 1 1 1 2 0
3 0 0 0 1 1 1 1 3 0
$EndEntities
"""


def with_entities(path, binary: bool):
    """Insert the section $Entities, which the writer leaves out, into an MSH 4.1 file."""
    data = path.read_bytes()
    if binary:
        body = struct.pack("<4Q", 0, 1, 2, 1)
        for tag in (9, 1, 2, 3):
            body += struct.pack("<i6dQiQ", tag, 0, 0, 0, 1, 1, 1, 1, tag, 0)
        section = b"$Entities\n" + body + b"\n$EndEntities\n"
    else:
        section = ENTITIES_41.encode()
    start = data.index(b"$Entities") if b"$Entities" in data else data.index(b"$Nodes")
    path.write_bytes(data[:start] + section + data[data.index(b"$Nodes") :])
    return path


@pytest.mark.parametrize(("version", "binary"), MSH_VERSIONS)
def test_msh(tmp_path, version, binary, capfd):
    path = write_msh(tmp_path / "two.msh", two_boxes(), version, binary)
    if version == "4.1":
        with_entities(path, binary)
    capfd.readouterr()
    rod, changes = read_surface(path, MM, "rod")
    assert changes == ["1 volume cell left out"]
    assert np.array_equal(rod.faces, CUBE_QUADS)
    assert np.array_equal(rod.vertices, MM * cube_vertices())
    can, _ = read_surface(path, MM, "can")
    assert np.array_equal(can.vertices[can.faces[:, :3]], MM * soup(cube(1.0, (3.0, 0.0, 0.0))))
    both, _ = read_surface(path, MM)
    assert len(both.faces) == 18
    metal, changes = read_surface(path, MM, "metal")
    assert changes == []
    assert volume(metal) == pytest.approx(1e-9 / 6, rel=1e-12, abs=0.0)
    assert refused(path, "x") == 'part "x" is not in the file; found "rod", "can", "metal"'
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    assert capfd.readouterr() == ("", "")


TETRA_22 = """$MeshFormat
2.2 0 8
$EndMeshFormat
$PhysicalNames
3
2 5 "shell's skin"
3 5 "shell's skin"
3 6 "metal"
$EndPhysicalNames
$Nodes
4
10 0 0 0
20 1 0 0
30 0 1 0
40 0 0 1
$EndNodes
$Elements
4
1 2 2 5 1 10 30 20
2 2 2 5 1 10 20 40
3 2 2 6 1 20 30 40
4 2 2 0 1 10 40 30
$EndElements
"""


def test_groups_without_names_and_cells_without_groups(tmp_path):
    """Node numbers may skip; a volume may share a surface's name or number."""
    path = save(tmp_path / "tetra.msh", TETRA_22)
    surface, _ = read_surface(path, 1.0)
    assert volume(surface) == pytest.approx(1 / 6)
    assert len(read_surface(path, 1.0, "shell's skin")[0].faces) == 2
    assert len(read_surface(path, 1.0, "group 6")[0].faces) == 1
    assert bodies_in(path) == Bodies(("shell's skin",), 2)
    assert refused(path, "x") == ('part "x" is not in the file; found "shell\'s skin", "group 6"')


SQUARE_41 = """$MeshFormat
4.1 0 8
$EndMeshFormat
$PhysicalNames
3
2 1 "left"
2 2 "all"
2 3 "nowhere"
$EndPhysicalNames
$Entities
1 0 3 0
7 0 0 0 0
1 0 0 0 1 1 0 2 1 -2 0
2 0 0 0 1 1 0 1 2 3 7 7 7
3 0 0 0 1 1 0 0 0
$EndEntities
$Nodes
1 6 1 6
2 1 0 6
1
2
3
4
5
6
0 0 0
1 0 0
1 1 0
0 1 0
2 0 0
2 1 0
$EndNodes
$Elements
3 3 1 3
2 1 3 1
1 1 2 3 4
2 2 2 1
2 2 5 6
2 3 2 1
3 2 6 3
$EndElements
$Comments
anything
$EndComments
"""


def test_entities_in_several_groups_and_in_none(tmp_path):
    path = save(tmp_path / "square.msh", SQUARE_41)
    assert len(read_surface(path, 1.0)[0].faces) == 3
    assert len(read_surface(path, 1.0, "left")[0].faces) == 1
    assert len(read_surface(path, 1.0, "all")[0].faces) == 2
    assert bodies_in(path) == Bodies(("all",), 1), "a group within another is no body"


def test_curved_cells_are_reduced_to_their_corners(tmp_path):
    middle = [[0.5, 0, 0], [0.5, 0.5, 0], [0, 0.5, 0]]
    points = np.array([[0.0, 0, 0], [1, 0, 0], [0, 1, 0], *middle])
    mesh = meshio.Mesh(points, [("triangle6", np.arange(6)[None])])
    path = write_msh(tmp_path / "curved.msh", mesh, "2.2", False)
    surface, changes = read_surface(path, 1.0)
    assert np.array_equal(surface.vertices, points[:3])
    assert changes == ["1 cell of higher order reduced to the corners"]
    assert bodies_in(path) == Bodies((), 1)


def cut(text: str, section: str) -> str:
    start, end = text.index(f"${section}"), text.index(f"$End{section}") + len(section) + 5
    return text[:start] + text[end:]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("hello\n", "is not a Gmsh MSH file: no $MeshFormat section"),
        (TETRA_22.replace("2.2 0 8", "1.0 0 8"),
         "is MSH version 1.0; save it as version 2.2 or 4.1"),
        (TETRA_22.replace("2.2 0 8", "2.2"), "is MSH version 2.2; save it as version 2.2 or 4.1"),
        (cut(TETRA_22, "Nodes"), "has no section $Nodes; export the mesh again"),
        (cut(TETRA_22, "Elements"), "has no section $Elements; export the mesh again"),
        (TETRA_22[:-30], "is cut short: section $Elements has no end; export it again"),
        (TETRA_22.replace("10 40 30", "10 40 33"),
         "an element uses a node that $Nodes does not list; export it again"),
        (TETRA_22.replace("20 1 0 0", "20 nan 0 0"),
         "1 corner not finite, the first is number 2 at (nan, 0.0, 0.0); mesh it again"),
        (SQUARE_41.replace("7 0 0 0 0", "7 0 0 0 999999"),
         "is cut short: section $Entities ends early; export it again"),
    ],
)  # fmt: skip
def test_damaged_msh(tmp_path, content, message, capfd):
    assert refused(save(tmp_path / "bad.msh", content)) == message
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("20 1 0 0", "20 one 0 0"),
        ("$Nodes\n4", "$Nodes\n5"),
        ("$Nodes\n4", "$Nodes\n99999999999999999999"),
        ("4 2 2 0 1 10 40 30", "4 2 2 0 1 10 40 999"),
        ("4 2 2 0 1 10 40 30", "4 777 2 0 1 10 40 30"),
        ("4 2 2 0 1 10 40 30", ""),
        ("$Elements\n4", "$Elements\n1000"),
    ],
)
def test_damage_that_the_library_meets(tmp_path, old, new, capfd):
    assert refused(save(tmp_path / "bad.msh", TETRA_22.replace(old, new))) == (
        "cannot be read as MSH 2.2: its nodes or elements are damaged; export it again"
    )
    assert capfd.readouterr() == ("", "")


def test_words_in_entities(tmp_path):
    bad = SQUARE_41.replace("7 0 0 0 0", "seven 0 0 0 0")
    assert refused(save(tmp_path / "bad.msh", bad)) == (
        "has a damaged section $Entities; export it again"
    )


def test_what_the_library_says_is_passed_on(tmp_path):
    bad = SQUARE_41.replace("2 1 0 6", "2 1 1 6")
    assert refused(save(tmp_path / "bad.msh", bad)) == (
        "cannot be read as MSH 4.1: parametric nodes not implemented; export it again"
    )


@pytest.mark.parametrize("version", ["2.2", "4.1"])
@pytest.mark.parametrize("part", [0.2, 0.4, 0.6, 0.8])
def test_binary_msh_cut_anywhere(tmp_path, version, part):
    path = write_msh(tmp_path / "two.msh", two_boxes(), version, True)
    data = path.read_bytes()
    assert "export" in refused(save(path, data[: int(part * len(data))]))


def test_volume_mesh_without_surface(tmp_path):
    mesh = meshio.Mesh(cube_vertices(), [("tetra", np.array([[0, 1, 2, 4]]))])
    path = write_msh(tmp_path / "solid.msh", mesh, "2.2", False)
    surface, changes = read_surface(path, 1.0)
    assert (len(surface.faces), changes) == (4, [])
    assert volume(surface) == pytest.approx(1 / 6)
