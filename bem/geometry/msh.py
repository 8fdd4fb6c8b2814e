"""Gmsh MSH 2.2 and 4.1, text and binary, through meshio; physical groups become parts."""

from __future__ import annotations

import contextlib
import io
import tempfile
import warnings
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.mesh_data import MeshData
from bem.geometry.msh_sections import (
    MshFormat,
    file_format,
    groups_of_surfaces,
    split_sections,
    surface_names,
)
from bem.geometry.surface import NO_CORNER
from bem.geometry.wording import counted

_CORNERS = {"triangle": 3, "quad": 4}
_VOLUMES = ("tetra", "hexahedron", "wedge", "pyramid")


def read_msh(path: Path) -> MeshData:
    """Surface cells of an MSH file, with its surface groups as parts.

    A group without a name is called "group N".

    Raises:
        InputError: the file is damaged or of another version.
        OSError: the file cannot be opened.
    """
    sections = split_sections(path.read_bytes())
    form = file_format(sections["MeshFormat"])
    for name in ("Nodes", "Elements"):
        if name not in sections:
            raise InputError(f"has no section ${name}; export the mesh again")
    mesh = _read(sections, form)
    kept = [i for i, block in enumerate(mesh.cells) if _kind(block.type) is not None]
    faces = [_faces(mesh.cells[i]) for i in kept]
    names = surface_names(sections.get("PhysicalNames", b""))
    parts = _parts(names, _members(sections, form, mesh, kept))
    return MeshData(
        np.asarray(mesh.points, dtype=np.float64),
        np.concatenate([np.empty((0, 4), dtype=np.int64), *faces]),
        parts,
        tuple(name for name in parts if name in names.values()),
        tuple(_changes(mesh)),
    )


def _read(sections: dict[str, bytes], form: MshFormat) -> Any:
    """Give meshio a file with nothing but format, nodes and elements."""
    import meshio

    with tempfile.TemporaryDirectory() as folder:
        bare = Path(folder) / "bare.msh"
        with bare.open("wb") as out:
            for name in ("MeshFormat", "Nodes", "Elements"):
                out.write(b"$%s\n%s$End%s\n" % (name.encode(), sections[name], name.encode()))
        try:
            with _silent():
                return meshio.gmsh.read(bare)
        except Exception as problem:
            said = " ".join(str(problem).split()) if isinstance(problem, meshio.ReadError) else ""
            reason = said or "its nodes or elements are damaged"
            raise InputError(
                f"cannot be read as MSH {form.version}: {reason}; export it again"
            ) from None


@contextlib.contextmanager
def _silent() -> Iterator[None]:
    """Keep a library from printing, and turn its warnings into errors."""
    sink = io.StringIO()
    with warnings.catch_warnings(), np.errstate(all="ignore"):
        warnings.simplefilter("error")
        with contextlib.redirect_stdout(sink), contextlib.redirect_stderr(sink):
            yield


def _kind(cell: str) -> str | None:
    """Return "triangle" or "quad" for surface cells of any order."""
    return next((kind for kind in _CORNERS if cell.startswith(kind)), None)


def _faces(block: Any) -> np.ndarray:
    kind = _kind(block.type)
    corners = np.asarray(block.data, dtype=np.int64)[:, : _CORNERS[kind] if kind else 0]
    if corners.size and corners.min() < 0:
        raise InputError("an element uses a node that $Nodes does not list; export it again")
    faces = np.full((len(corners), 4), NO_CORNER)
    faces[:, : corners.shape[1]] = corners
    return faces


def _changes(mesh: Any) -> list[str]:
    curved = sum(
        len(block.data)
        for block in mesh.cells
        if (kind := _kind(block.type)) and block.data.shape[1] > _CORNERS[kind]
    )
    volume = sum(len(block.data) for block in mesh.cells if block.type.startswith(_VOLUMES))
    lines = []
    if curved:
        lines.append(f"{counted(curved, 'cell')} of higher order reduced to the corners")
    if volume:
        lines.append(f"{counted(volume, 'volume cell')} left out")
    return lines


def _parts(names: dict[int, str], members: dict[int, np.ndarray]) -> dict[str, np.ndarray]:
    """Cells (indices) of each group by name; groups of one name are one part."""
    parts: dict[str, np.ndarray] = {}
    for number in sorted(members):
        name = names.get(number, f"group {number}")
        parts[name] = np.union1d(parts.get(name, members[number]), members[number])
    return parts


def _members(
    sections: dict[str, bytes], form: MshFormat, mesh: Any, kept: list[int]
) -> dict[int, np.ndarray]:
    """Cells (indices) of each group that has any."""
    if form.version.startswith("4"):
        entity = _tags(mesh, "gmsh:geometrical", kept)
        groups = groups_of_surfaces(sections.get("Entities", b""), form)
        return _by_group(entity, groups)
    group = np.abs(_tags(mesh, "gmsh:physical", kept))
    return {int(tag): np.flatnonzero(group == tag) for tag in np.unique(group[group > 0])}


def _tags(mesh: Any, key: str, kept: list[int]) -> np.ndarray:
    """Tag of each kept cell (f,), 0 for all if the file gives none."""
    blocks = mesh.cell_data.get(key)
    sizes = [len(mesh.cells[i].data) for i in kept]
    if blocks is None or not kept:
        return np.zeros(sum(sizes), dtype=np.int64)
    if [len(blocks[i]) for i in kept] != sizes:
        raise InputError("some elements have a group number and others none; export it again")
    return np.concatenate([np.asarray(blocks[i], dtype=np.int64) for i in kept])


def _by_group(entity: np.ndarray, groups: dict[int, list[int]]) -> dict[int, np.ndarray]:
    """Cells (indices) of each group, from the entity of each cell."""
    entities: dict[int, list[int]] = {}
    for tag, numbers in groups.items():
        for number in numbers:
            entities.setdefault(number, []).append(tag)
    found = {number: np.flatnonzero(np.isin(entity, tags)) for number, tags in entities.items()}
    return {number: cells for number, cells in found.items() if len(cells)}
