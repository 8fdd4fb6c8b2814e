"""Files of the general mesh reader, volume cells by their boundary, and MSH of every version.

The files in ``tests/files`` were written by other libraries (see the README there).
"""

from __future__ import annotations

import sys
from pathlib import Path

import meshio
import numpy as np
import pytest
from made_bodies import CUBE_QUADS, cube_vertices
from test_geometry_files_formats import check_boxes, refused, save
from two_boxes import CORNERS, MIXED, QUADS, lines

from bem.geometry.reading.files import Bodies, bodies_in, read_surface
from bem.geometry.reading.general import KINDS
from bem.scene.body import Body
from bem.scene.scene import Conductor, Source

FILES = Path(__file__).parent / "files"
LEFT_OUT = "67 volume cells left out"


def volume(surface) -> float:
    found = Body(Conductor("it", surface, "solid", Source(None, None, "m")), surface).volume
    assert found is not None, "closed"
    return found


# MSH as its own program writes it


@pytest.mark.parametrize("version", ["2.2_txt", "2.2_bin", "4.0_txt", "4.1_txt", "4.1_bin"])
def test_msh_of_every_version(version):
    path = FILES / f"gmsh_{version}.msh"
    check_boxes(path)
    check_boxes(path, part="can")
    check_boxes(path, part="can metal")
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    assert read_surface(path, 1.0, "can")[1] == [LEFT_OUT]
    assert read_surface(path, 1.0, "can metal")[1] == []
    assert "metal" in refused(path, "x")


def test_a_count_below_zero(tmp_path):
    text = (FILES / "gmsh_4.0_txt.msh").read_text().replace("$Entities\n16 ", "$Entities\n-16 ")
    assert refused(save(tmp_path / "two.msh", text)) == (
        "has a damaged section $Entities; export it again"
    )


@pytest.mark.parametrize("header", ["2", "2.0", "2.1"])
def test_msh_2_under_its_other_numbers(tmp_path, header):
    text = (FILES / "gmsh_2.2_txt.msh").read_text().replace("2.2 0 8", f"{header} 0 8")
    check_boxes(save(tmp_path / "two.msh", text))


def test_msh_of_version_1_is_refused(tmp_path):
    path = save(tmp_path / "two.msh", "$NOD\n1\n1 0 0 0\n$ENDNOD\n")
    assert refused(path) == "is MSH version 1; save it as version 2.2 or 4.1"


def test_volume_groups_are_bodies_if_there_is_no_surface():
    path = FILES / "gmsh_volume.msh"
    check_boxes(path)
    check_boxes(path, part="can")
    assert bodies_in(path) == Bodies(("rod", "can"), 0)
    assert read_surface(path, 1.0)[1] == []


# other kinds


@pytest.mark.parametrize(
    ("name", "can"),
    [
        ("gmsh_volume.inp", "can"),
        ("gmsh_volume.mesh", "ref 2"),
        ("gmsh_volume.med", "can"),
        ("gmsh_volume.vtk", "CellEntityIds 2"),
        ("gmsh.su2", "can"),
        ("pyvista.vtk", "material 7"),
        ("pyvista.vtu", "material 7"),
        ("pyvista_text.vtu", "material 7"),
        ("pyvista_surface.vtk", "material 7"),
        ("pyvista_surface_text.vtk", "material 7"),
    ],
)
def test_kinds_of_files(name, can, capfd):
    """Sets and tags are parts, floating numbers are none."""
    check_boxes(FILES / name)
    check_boxes(FILES / name, part=can)
    assert "weight" not in refused(FILES / name, "x")
    named = ("rod", "can") if can == "can" else ()
    assert bodies_in(FILES / name).names == named
    assert capfd.readouterr() == ("", "")


NASTRAN = "".join(
    [
        "$ made for a test\nSOL 101\nCEND\nBEGIN BULK\n",
        *(f"GRID,{k},,{x},{y},{z}\n" for k, (x, y, z) in enumerate(CORNERS.tolist(), 1)),
        *(
            f"{'CQUAD4' if len(f) == 4 else 'CTRIA3'},{k},{1 if k < 7 else 2},"
            f"{','.join(str(c + 1) for c in f)}\n"
            for k, f in enumerate(MIXED, 1)
        ),
        "ENDDATA\n",
    ]
)
UGRID = f"16 12 6 0 0 0 0\n{lines(CORNERS)}" + "".join(
    [lines(MIXED[6:], first=1), lines(MIXED[:6], first=1), "2\n" * 12, "1\n" * 6]
)
AVS = "".join(
    [
        f"16 18 0 0 0\n{lines(np.column_stack([np.arange(1, 17), CORNERS]).astype(object))}",
        *(
            f"{k} {1 if k < 7 else 2} {'quad' if len(f) == 4 else 'tri'} "
            f"{' '.join(str(c + 1) for c in f)}\n"
            for k, f in enumerate(MIXED, 1)
        ),
    ]
)
ABAQUS = "".join(
    [
        "*HEADING\nmade for a test\n*NODE\n",
        *(f"{k}, {x}, {y}, {z}\n" for k, (x, y, z) in enumerate(CORNERS.tolist(), 1)),
        "*ELEMENT, TYPE=S4, ELSET=rod\n",
        *(f"{k}, {', '.join(str(c + 1) for c in f)}\n" for k, f in enumerate(MIXED[:6], 1)),
        "*ELEMENT, TYPE=S3, ELSET=big_can\n",
        *(f"{k}, {', '.join(str(c + 1) for c in f)}\n" for k, f in enumerate(MIXED[6:], 7)),
    ]
)


@pytest.mark.parametrize(
    ("name", "text", "can"),
    [
        ("two.bdf", NASTRAN, "ref 2"),
        ("two.nas", NASTRAN, "ref 2"),
        ("two.fem", NASTRAN, "ref 2"),
        ("two.ugrid", UGRID, "ref 2"),
        ("two.avs", AVS, "material 2"),
        ("two.inp", ABAQUS, "big_can"),
    ],
)
def test_kinds_of_files_made_here(tmp_path, name, text, can, capfd):
    path = save(tmp_path / name, text)
    check_boxes(path)
    check_boxes(path, part=can)
    assert len(read_surface(path, 1.0)[0].faces) == 18
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("kind", [".vtu", ".vtk"])
def test_overlapping_sets_and_values_of_many_kinds(tmp_path, kind):
    """An array with a value for each of very many cells numbers the cells, not parts."""
    number = 1200
    points = np.random.default_rng(5).random((3 * number, 3))
    cells = [("triangle", np.arange(3 * number).reshape(-1, 3))]
    data = {"id": [np.arange(number)], "half": [np.arange(number) // 600]}
    meshio.Mesh(points, cells, cell_data=data).write(tmp_path / f"many{kind}")
    assert refused(tmp_path / f"many{kind}", "x") == (
        'part "x" is not in the file; found "half 0", "half 1"'
    )


# volume cells of each kind

SOLIDS = {
    "tetra": ([[0, 1, 2, 4], [3, 2, 1, 7], [5, 4, 7, 1], [6, 7, 4, 2], [1, 2, 4, 7]], 12),
    "hexahedron": ([[0, 1, 3, 2, 4, 5, 7, 6]], 6),
    "wedge": ([[0, 1, 2, 4, 5, 6], [1, 3, 2, 5, 7, 6]], 8),
    "pyramid": ([[*f, 8] for f in CUBE_QUADS.tolist()], 6),
}


@pytest.mark.parametrize("kind", SOLIDS)
def test_boundary_of_volume_cells(tmp_path, kind):
    """A cube of each kind of cell comes out as its boundary, whatever lies inside."""
    cells, faces = SOLIDS[kind]
    points = np.concatenate([cube_vertices(), [[0.0, 0.0, 0.0]]])
    path = tmp_path / "cube.vtu"
    meshio.Mesh(points, [(kind, np.array(cells))]).write(path)
    surface, changes = read_surface(path, 1.0)
    assert len(surface.faces) == faces
    assert volume(surface) == pytest.approx(1.0)
    assert len(surface.vertices) == 8
    assert changes == []


def test_regions_that_share_faces():
    """Each region has its own closed boundary, and the whole has none between them."""
    path = FILES / "pyvista_hexahedra.vtu"
    assert volume(read_surface(path, 1.0)[0]) == pytest.approx(2.0)
    for name in ("region 1", "region 2"):
        surface, _ = read_surface(path, 1.0, name)
        assert (len(surface.faces), volume(surface)) == (6, pytest.approx(1.0))


def test_one_name_for_surface_and_volume_cells(tmp_path):
    """The surface cells have the name; a tagged solid is called so."""
    points = cube_vertices()
    cells = [("quad", CUBE_QUADS[:5]), ("hexahedron", np.array([[0, 1, 3, 2, 4, 5, 7, 6]]))]
    data = {"tag": [np.full(5, 4), np.array([4])]}
    meshio.Mesh(points, cells, cell_data=data).write(tmp_path / "cube.vtu")
    skin, changes = read_surface(tmp_path / "cube.vtu", 1.0, "tag 4")
    assert (len(skin.faces), changes) == (5, ["1 volume cell left out"])
    solid, changes = read_surface(tmp_path / "cube.vtu", 1.0, "tag 4 (volume)")
    assert (len(solid.faces), changes) == (6, [])


def test_cells_of_higher_order(tmp_path):
    quarter = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]]
    middle = [[0.5, 0, 0], [0.5, 0.5, 0], [0, 0.5, 0], [0, 0, 0.5], [0.5, 0, 0.5], [0, 0.5, 0.5]]
    points = np.array([*quarter, *middle], dtype=float)
    meshio.Mesh(points, [("tetra10", np.arange(10)[None])]).write(tmp_path / "curved.vtu")
    surface, changes = read_surface(tmp_path / "curved.vtu", 1.0)
    assert volume(surface) == pytest.approx(1 / 6)
    assert changes == ["1 cell of higher order reduced to the corners"]


# legacy VTK

VTK = "# vtk DataFile Version 3.0\nmade for a test\nASCII\n"
GRID = (
    f"{VTK}DATASET UNSTRUCTURED_GRID\nPOINTS 16 double\n{lines(CORNERS)}\nCELLS 13 63\n2 0 1\n"
    + "".join(f"4 {' '.join(map(str, f))}\n" for f in QUADS.tolist())
    + "CELL_TYPES 13\n3\n"
    + "9\n" * 12
    + "POINT_DATA 16\nNORMALS n float\n"
    + "0 0 1\n" * 16
    + "CELL_DATA 13\nSCALARS part%20of int 1\nLOOKUP_TABLE default\n0\n"
    + "1\n" * 6
    + "2\n" * 6
    + "FIELD FieldData 1\nheat 1 13 float\n"
    + "0.5 " * 13
)


def test_vtk_with_lines_and_names_of_its_arrays(tmp_path):
    path = save(tmp_path / "two.vtk", GRID)
    check_boxes(path)
    check_boxes(path, part="part of 2")
    assert refused(path, "x").endswith('found "part of 1", "part of 2"')


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "is empty (0 bytes)"),
        ("hello", "is not legacy VTK: its first lines are damaged; export it again"),
        (VTK, "is not legacy VTK: its first lines are damaged; export it again"),
        (VTK + "DATASET POLYDATA\n", "holds no triangle or quadrilateral; mesh the surface"),
        (GRID.replace("POINTS 16", "POINTS 17"),
         "cannot be read as VTK: found 'CELLS' where a number belongs; export it again"),
        (GRID.replace("POINTS 16", "POINTS many"),
         "cannot be read as VTK: its sections are damaged; export it again"),
        (GRID.replace("4.0", "four", 1),
         "cannot be read as VTK: found 'four' where a number belongs; export it again"),
        (GRID.replace("CELLS 13 63", "CELLS 13 64"),
         "cannot be read as VTK: its sections are damaged; export it again"),
        (GRID.replace("CELL_TYPES 13\n3\n", "CELL_TYPES 12\n"),
         "cannot be read as VTK: its sections are damaged; export it again"),
        (GRID.replace("CELL_TYPES 13\n3\n9\n", "CELL_TYPES 13\n3\n42\n"),
         "holds VTK cells of type 42, which are not read; export plain triangles, or tetrahedra"),
        (GRID.replace("4 0 2 3 1", "4 0 2 3 16", 1),
         "a cell uses a node beyond the 16 listed; export it again"),
        (GRID.replace("4.0 2.0 1.0", "4.0 nan 1.0"),
         "1 corner not finite, the first is number 16 at (4.0, nan, 1.0); mesh it again"),
        (GRID[: GRID.index("CELLS") + 40],
         "is cut short: a section ends before its announced number; export it again"),
    ],
)  # fmt: skip
def test_damaged_vtk(tmp_path, text, message, capfd):
    assert refused(save(tmp_path / "bad.vtk", text)) == message
    assert capfd.readouterr() == ("", "")


def test_a_kind_that_needs_a_package(monkeypatch):
    monkeypatch.setitem(sys.modules, "h5py", None)
    assert refused(FILES / "gmsh_volume.med") == (
        "is a .med file, which needs the package h5py; install it: pip install h5py"
    )


# damage in all kinds

SAMPLES = {
    ".vtk": "pyvista_surface.vtk", ".vtu": "pyvista.vtu", ".inp": "gmsh_volume.inp",
    ".mesh": "gmsh_volume.mesh", ".su2": "gmsh.su2",
    ".med": "gmsh_volume.med",
}  # fmt: skip


@pytest.mark.parametrize("kind", [*KINDS])
@pytest.mark.parametrize(
    "content",
    [
        b"",
        b"hello\n",
        b"\x00\xff\xfe" * 50,
        b"16 18 0 0 0 0 0\n1 2\n",
        b"$ bulk data\nBEGIN BULK\n",
    ],
)
def test_garbage(tmp_path, kind, content, capfd):
    said = refused(save(tmp_path / f"bad{kind}", content))
    assert said.startswith(
        ("is empty", "is not", "cannot be read", "holds no", "is a ", "lists no")
    )
    assert capfd.readouterr() == ("", "")


@pytest.mark.parametrize("kind", SAMPLES)
@pytest.mark.parametrize("part", [0.1, 0.4, 0.7])
def test_files_cut_anywhere(tmp_path, kind, part, capfd):
    data = (FILES / SAMPLES[kind]).read_bytes()
    refused(save(tmp_path / f"bad{kind}", data[: int(part * len(data))]))
    assert capfd.readouterr() == ("", "")


# data of the whole file, which some writers always add

TEXTS = b"FIELD FieldData 2\nTIME 1 1 double\n%s\nNOTE 1 2 string\n%s"
SQUARE = b"POINTS 4 float\n%s\nPOLYGONS 1 5\n%s\n"


@pytest.mark.parametrize("binary", [False, True])
def test_texts_in_a_vtk_file_are_passed_over(tmp_path, binary):
    """Packed texts follow their length, whose first bits tell how long it is itself."""
    points = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0]], dtype=">f4")
    cell = np.array([4, 0, 1, 2, 3], dtype=">i4")
    long = b"x" * 100
    if binary:
        texts = TEXTS % (np.array([0.5], ">f8").tobytes(), b"\xc3abc" + b"\x80\x64" + long + b"\n")
        shape = SQUARE % (points.tobytes(), cell.tobytes())
    else:
        texts = TEXTS % (b"0.5", b"abc\n" + long + b"\n")
        shape = SQUARE % (b" ".join(b"%g" % x for x in points.flat), b"4 0 1 2 3")
    kind = b"BINARY" if binary else b"ASCII"
    head = b"# vtk DataFile Version 4.2\nsquare\n%s\nDATASET POLYDATA\n" % kind
    surface, _ = read_surface(save(tmp_path / "square.vtk", head + texts + shape), 1.0)
    assert surface.vertices[surface.faces[0]].tolist() == points.tolist()


def test_texts_in_a_vtu_file_are_passed_over(tmp_path):
    data = (FILES / "pyvista.vtu").read_bytes()
    text = b'<FieldData><Array type="String" Name="note" format="ascii">97 0</Array></FieldData>'
    place = data.index(b"<Piece")
    path = save(tmp_path / "noted.vtu", data[:place] + text + data[place:])
    plain, _ = read_surface(FILES / "pyvista.vtu", 1.0)
    noted, _ = read_surface(path, 1.0)
    assert np.array_equal(noted.vertices, plain.vertices)
    assert np.array_equal(noted.faces, plain.faces)
