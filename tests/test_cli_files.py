"""From files of several kinds to the matrix, with nothing played."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from step_boxes import two_in_an_assembly
from two_boxes import CORNERS, PAIR, TRIANGLES, glb, gltf_header, obj_text, ply

from bem.cli.main import main
from bem.geometry.surface import NO_CORNER, Surface
from bem.results.result import load_result
from bem.scene.scene import Scene

FILES = Path(__file__).parent / "files"


def extract(path: Path, folder: Path, *options: str):
    """Matrix of a file by the command line, with bars."""
    saved = folder / "result.json"
    arguments = ["extract", str(path), "--tolerance", "1%", "--quiet", "--json", str(saved)]
    assert main([*arguments, *options]) == 0
    return load_result(saved)


@pytest.fixture(scope="module")
def expected():
    """Matrix of the two boxes, in metres, made of arrays."""
    import bem

    scene = Scene("m")
    for name, first in (("rod", 0), ("can", 12)):
        triangles = TRIANGLES[first : first + 12]
        faces = np.column_stack([triangles, np.full(12, NO_CORNER)])
        scene.add_conductor(name, Surface(CORNERS, faces))
    return bem.extract(scene, tolerance=1e-2)


@pytest.mark.parametrize(
    ("name", "content", "options", "metres"),
    [
        ("two.obj", obj_text(), ["--unit", "cm"], 1e-2),
        ("two.ply", ply("binary_big_endian"), ["--unit", "mm", "--split"], 1e-3),
        ("two.glb", glb(*gltf_header(PAIR)), ["--unit", "m"], 1.0),
        ("two.step", two_in_an_assembly(), ["--unit", "mm"], 1e-3),
        ("gmsh_volume.msh", None, ["--unit", "in"], 0.0254),
        ("gmsh_volume.inp", None, ["--unit", "m"], 1.0),
    ],
)
def test_a_file_gives_the_matrix(tmp_path, capsys, expected, name, content, options, metres):
    path = FILES / name if content is None else tmp_path / name
    if content is not None:
        path.write_bytes(content.encode() if isinstance(content, str) else content)
    result = extract(path, tmp_path, *options)
    allowed = result.error + metres * expected.error
    assert (np.abs(result.capacitance - metres * expected.capacitance) <= allowed).all()
    assert len(result.conductors) == 2
    assert capsys.readouterr().err == ""


def test_tagged_regions_of_one_file(tmp_path, expected):
    """One file of volume cells holds all conductors."""
    mesh = FILES / "gmsh_volume.mesh"
    entries = "".join(
        f'[[conductor]]\nname = "{name}"\nmesh = "{mesh}"\npart = "ref {k}"\n'
        for k, name in enumerate(("rod", "can"), 1)
    )
    path = tmp_path / "scene.toml"
    path.write_text(f'unit = "m"\n{entries}')
    result = extract(path, tmp_path)
    assert result.conductors == ("rod", "can")
    allowed = result.error + expected.error
    assert (np.abs(result.capacitance - expected.capacitance) <= allowed).all()
