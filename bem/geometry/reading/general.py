"""VTU and finite-element mesh files through meshio.

Named sets of cells become parts by their names, and whole numbers given to cells become
parts called "ARRAY VALUE", such as "material 3". Numbers of points, and numbers that are not
whole, say nothing of parts.
"""

from __future__ import annotations

import importlib
import re
import tempfile
from dataclasses import replace
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.cell_mesh import cell_mesh
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.quiet import quiet
from bem.geometry.reading.stl import HALF_SINGLE
from bem.geometry.reading.vtk_legacy import VtkMesh, read_legacy

KINDS = {
    ".vtk": "vtk",
    ".vtu": "vtu",
    ".inp": "abaqus",
    ".bdf": "nastran",
    ".nas": "nastran",
    ".fem": "nastran",
    ".mesh": "medit",
    ".meshb": "medit",
    ".su2": "su2",
    ".ugrid": "ugrid",
    ".avs": "avsucd",
    ".med": "med",
}
"""Endings of names, and what meshio calls such files."""

MOST_VALUES = 1000
"""A cell array with more values than this numbers something other than parts."""

_FIELD_DATA = re.compile(rb"<FieldData>.*?</FieldData>", re.DOTALL)
_UNKNOWN_CELL = re.compile(r"cannot handle \(type (\d+)\)")
_MARKER = re.compile(
    r"^\s*MARKER_TAG\s*=[ \t]*(.*?)[ \t]*$(?:\s*MARKER_ELEMS\s*=\s*(\d+))?", re.MULTILINE
)
_LINES_AND_POINTS = {2, 4}
"""Numbers of VTK's chains of lines and sets of points, which the library does not know."""


def read_general(path: Path) -> MeshData:
    """Surface cells of a mesh file, or the boundary of its volume cells if it has no others.

    Raises:
        InputError: the file is damaged, or a package that its kind needs is missing.
        OSError: the file cannot be opened.
    """
    with path.open("rb"):
        pass
    kind = KINDS[path.suffix.lower()]
    if kind == "nastran":
        _check_end(path)
    legacy = read_legacy(path) if kind == "vtk" else None
    return _mesh_data(_read(path, kind) if legacy is None else _as_mesh(legacy))


def _check_end(path: Path) -> None:
    """Refuse bulk data without its last line: the library would look for it forever."""
    if not re.search(rb"^BEGIN BULK[^\n]*\n(?:.*\n)?ENDDATA", path.read_bytes(), re.M | re.S):
        raise InputError(
            f"cannot be read as {path.suffix}: it has no lines BEGIN BULK and ENDDATA, or is cut "
            "short between them; export it again"
        )


def _read(path: Path, kind: str) -> Any:
    """Mesh as the library sees it."""
    with quiet() as said:
        try:
            found = _library_reads(path, kind)
        except ImportError as problem:
            raise InputError(
                f"is a {path.suffix} file, which needs the package {problem.name}; "
                f"install it: pip install {problem.name}"
            ) from None
        except Exception as problem:
            raise InputError(
                f"cannot be read as {path.suffix}{_reason(problem)}; export it again"
            ) from None
    unknown = {int(kind) for kind in _UNKNOWN_CELL.findall(said.getvalue())}
    if unknown - _LINES_AND_POINTS:
        raise InputError(
            f"holds kinds of cells that are not read from {path.suffix}; "
            "export plain triangles, or tetrahedra"
        )
    return found if kind != "su2" else _with_markers(found, path)


def _library_reads(path: Path, kind: str) -> Any:
    """What the library reads; data of a whole VTU file, which may be texts, is kept from it."""
    reader = importlib.import_module(f"meshio.{kind}")
    data = path.read_bytes() if kind == "vtu" else b""
    bare = _FIELD_DATA.sub(b"", data)
    if bare == data:
        return reader.read(path)
    with tempfile.TemporaryDirectory() as folder:
        copy = Path(folder) / "bare.vtu"
        copy.write_bytes(bare)
        return reader.read(copy)


def _with_markers(mesh: Any, path: Path) -> Any:
    """Mesh of an SU2 file with its markers as sets; the library numbers them from 1."""
    tags = mesh.cell_data.pop("su2:tag", [])
    for number, (name, count) in enumerate(_MARKER.findall(path.read_text()), 1):
        tag = int(name) if name.lstrip("-").isdigit() else number
        found = [np.flatnonzero(np.asarray(block) == tag) for block in tags]
        mesh.cell_sets[name] = found
        if sum(map(len, found)) != int(count or -1):
            raise InputError(f"is cut short: marker {name} lacks cells; export it again")
    return mesh


def _as_mesh(found: VtkMesh) -> Any:
    """Mesh as the library would make it, without checks."""
    ends = np.cumsum([len(nodes) for _, nodes in found.blocks])[:-1]
    return SimpleNamespace(
        points=found.points,
        cells=[SimpleNamespace(type=kind, data=nodes) for kind, nodes in found.blocks],
        cell_data={name: np.split(array, ends) for name, array in found.arrays.items()},
        cell_sets={},
    )


def _reason(problem: Exception) -> str:
    """What the library says on purpose, on one line."""
    import meshio

    said = " ".join(str(problem).split()) if isinstance(problem, meshio.ReadError) else ""
    return f": {said.rstrip('.')}" if said else ": it is damaged, or of a kind not known"


def _mesh_data(mesh: Any) -> MeshData:
    blocks = [(block.type, np.asarray(block.data, dtype=np.int64)) for block in mesh.cells]
    points = np.asarray(mesh.points, dtype=np.float64)
    if points.ndim != 2 or points.shape[1] not in (2, 3):
        raise InputError("lists no points with two or three coordinates; export it again")
    points = np.pad(points, ((0, 0), (0, 3 - points.shape[1])))
    sets = _sets(mesh)
    found = cell_mesh(points, blocks, sets | _values(mesh), set(sets))
    single = np.asarray(mesh.points).dtype.itemsize <= 4
    largest = float(np.abs(points).max(initial=0.0))
    return replace(found, rounding=HALF_SINGLE * largest if single else 0.0)


def _sets(mesh: Any) -> dict[str, np.ndarray]:
    """Cells (numbers) of each named set, and of each group of a MED file."""
    first = _first(mesh)
    sets: dict[str, np.ndarray] = {}
    for name, members in mesh.cell_sets.items():
        found = [start + np.asarray(m) for start, m in zip(first, members, strict=True) if len(m)]
        sets[name.strip()] = np.concatenate([np.empty(0), *found]).astype(np.int64)
    tags = _whole_numbers(mesh, "cell_tags")
    for number, names in getattr(mesh, "cell_tags", {}).items():
        for name in names if tags is not None else ():
            cells = np.flatnonzero(tags == int(number))
            sets[name.strip()] = np.union1d(sets.get(name.strip(), cells), cells)
    return sets


def _first(mesh: Any) -> list[int]:
    """Number of the first cell of each block."""
    sizes = [len(block.data) for block in mesh.cells]
    return (np.cumsum(sizes) - sizes).tolist()


def _values(mesh: Any) -> dict[str, np.ndarray]:
    """Cells (numbers) of each value of each array of whole numbers."""
    groups: dict[str, np.ndarray] = {}
    for array in mesh.cell_data:
        numbers = None if array == "cell_tags" else _whole_numbers(mesh, array)
        values = np.unique(numbers) if numbers is not None else np.empty(0)
        if len(values) <= MOST_VALUES:
            name = array.rpartition(":")[2]
            groups |= {f"{name} {value}": np.flatnonzero(numbers == value) for value in values}
    return groups


def _whole_numbers(mesh: Any, array: str) -> np.ndarray | None:
    """Whole number (c,) of each cell, or None if the array holds anything else."""
    blocks = mesh.cell_data.get(array, [])
    numbers = [np.asarray(block) for block in blocks]
    flat = [n.reshape(-1) for n in numbers if n.dtype.kind in "iu" and n.size == len(n)]
    return np.concatenate(flat) if flat and len(flat) == len(numbers) else None
