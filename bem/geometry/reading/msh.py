"""Gmsh MSH 2.2, 4.0 and 4.1, text and binary, through meshio; physical groups become parts."""

from __future__ import annotations

import tempfile
from pathlib import Path
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.cell_mesh import cell_mesh
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.msh_sections import (
    SURFACE,
    VOLUME,
    MshFormat,
    file_format,
    group_names,
    groups_of_entities,
    split_sections,
)
from bem.geometry.reading.quiet import quiet


def read_msh(path: Path) -> MeshData:
    """Surface cells of an MSH file, with its surface and volume groups as parts.

    A group without a name is called "group N". The named ones stand for a body each: those
    of surface cells, or of volume cells in a file that has no others.

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
    blocks = [(block.type, _nodes(block)) for block in mesh.cells]
    groups: dict[str, np.ndarray] = {}
    named: set[str] = set()
    for dimension in (SURFACE, VOLUME):
        names = group_names(sections.get("PhysicalNames", b""), dimension)
        here = _groups(names, _members(sections, form, mesh, dimension))
        groups |= {name: np.union1d(groups.get(name, cells), cells) for name, cells in here.items()}
        named |= set(names.values())
    points = np.asarray(mesh.points, dtype=np.float64)
    return cell_mesh(points, blocks, groups, named)


def _read(sections: dict[str, bytes], form: MshFormat) -> Any:
    """Give meshio a file with nothing but format, nodes and elements."""
    import meshio

    bare = sections | {"MeshFormat": _written_out(sections["MeshFormat"], form)}
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "bare.msh"
        with file.open("wb") as out:
            for name in ("MeshFormat", "Nodes", "Elements"):
                out.write(b"$%s\n%s$End%s\n" % (name.encode(), bare[name], name.encode()))
        try:
            with quiet():
                return meshio.gmsh.read(file)
        except Exception as problem:
            said = " ".join(str(problem).split()) if isinstance(problem, meshio.ReadError) else ""
            reason = said or "its nodes or elements are damaged"
            raise InputError(
                f"cannot be read as MSH {form.version}: {reason}; export it again"
            ) from None


def _written_out(section: bytes, form: MshFormat) -> bytes:
    """The section $MeshFormat with version 4.0 not called 4, which the library takes for 4.1."""
    return section.replace(b"4 ", b"4.0 ", 1) if form.version == "4" else section


def _nodes(block: Any) -> np.ndarray:
    nodes = np.asarray(block.data, dtype=np.int64)
    if nodes.size and nodes.min() < 0:
        raise InputError("an element uses a node that $Nodes does not list; export it again")
    return nodes


def _groups(names: dict[int, str], members: dict[int, np.ndarray]) -> dict[str, np.ndarray]:
    """Cells (numbers) of each group by name; groups of one name are one."""
    groups: dict[str, np.ndarray] = {}
    for number in sorted(members):
        name = names.get(number, f"group {number}")
        groups[name] = np.union1d(groups.get(name, members[number]), members[number])
    return groups


def _members(
    sections: dict[str, bytes], form: MshFormat, mesh: Any, dimension: int
) -> dict[int, np.ndarray]:
    """Cells (numbers) of each group of a dimension that has any."""
    key = "gmsh:geometrical" if form.version.startswith("4") else "gmsh:physical"
    tags = np.abs(_tags(mesh, key, dimension))
    if form.version.startswith("4"):
        groups = groups_of_entities(sections.get("Entities", b""), form, dimension)
        return _by_group(tags, groups)
    return {int(tag): np.flatnonzero(tags == tag) for tag in np.unique(tags[tags > 0])}


def _tags(mesh: Any, key: str, dimension: int) -> np.ndarray:
    """Tag of each cell (c,); 0 for those without one, or of another dimension."""
    blocks = mesh.cell_data.get(key)
    tags = []
    for number, block in enumerate(mesh.cells):
        if blocks is None or block.dim != dimension:
            tags.append(np.zeros(len(block.data), dtype=np.int64))
        elif len(blocks[number]) != len(block.data):
            raise InputError("some elements have a group number and others none; export it again")
        else:
            tags.append(np.asarray(blocks[number], dtype=np.int64))
    return np.concatenate([np.empty(0, dtype=np.int64), *tags])


def _by_group(entity: np.ndarray, groups: dict[int, list[int]]) -> dict[int, np.ndarray]:
    """Cells (numbers) of each group, from the entity of each cell."""
    entities: dict[int, list[int]] = {}
    for tag, numbers in groups.items():
        for number in numbers:
            entities.setdefault(number, []).append(tag)
    found = {number: np.flatnonzero(np.isin(entity, tags)) for number, tags in entities.items()}
    return {number: cells for number, cells in found.items() if len(cells)}
