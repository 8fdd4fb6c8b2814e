"""The faces of a scene by the regions on their sides, as a VTU file for general viewers.

Cell data: ``conductor`` (-1 for an interface), ``back`` and ``front`` (-1 for solid metal, 0 for
the surroundings, else the number of the dielectric from 1), and ``pair``, which numbers the
combinations. Field data tell which name has which number. Coordinates are in the scene's unit.
"""

from __future__ import annotations

import tempfile
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any
from xml.sax.saxutils import quoteattr

import numpy as np

from bem.exports.atomic import write_file
from bem.geometry.parts import Part
from bem.scene.regions import region_names
from bem.scene.scene import Scene
from bem.scene.section import facets_of
from bem.units import metres_per

if TYPE_CHECKING:
    from meshio import Mesh

_START = b"<UnstructuredGrid>"
KINDS = {"triangle": 3, "quad": 4}


def save_faces(scene: Scene, parts: list[Part], path: str | PathLike[str]) -> None:
    """Write the parts that a scene was cut into.

    Raises:
        InputError: the file cannot be written.
    """
    with tempfile.TemporaryDirectory() as folder:
        scratch = Path(folder) / "faces.vtu"
        _mesh(parts, metres_per(scene.unit)).write(scratch)
        data = scratch.read_bytes()
    names = _fields(scene).encode("utf-8", "xmlcharrefreplace")
    write_file(path, data.replace(_START, _START + b"\n" + names, 1))


def _mesh(parts: list[Part], metres: float) -> Mesh:
    from meshio import Mesh

    surfaces = [facets_of(part.surface) for part in parts]
    start = np.cumsum([0] + [len(surface.vertices) for surface in surfaces])
    pairs = sorted({(part.conductor, part.back, part.front) for part in parts})
    cells: list[tuple[str, np.ndarray]] = []
    data: dict[str, list[np.ndarray]] = {"conductor": [], "back": [], "front": [], "pair": []}
    for part, surface, first in zip(parts, surfaces, start, strict=False):
        key = (part.conductor, part.back, part.front)
        for kind, rows in _rows(surface.faces):
            cells.append((kind, rows + first))
            for name, value in zip(data, (*key, pairs.index(key)), strict=True):
                data[name].append(np.full(len(rows), value, dtype=np.int32))
    points = np.concatenate([surface.vertices for surface in surfaces]) / metres
    cell_data: dict[str, Any] = data
    return Mesh(points, cells, cell_data=cell_data)


def _rows(faces: np.ndarray) -> list[tuple[str, np.ndarray]]:
    """Triangles and quadrilaterals apart, those that there are."""
    three = faces[:, 3] < 0
    both = zip(KINDS.items(), (three, ~three), strict=True)
    return [(kind, faces[chosen, :n]) for (kind, n), chosen in both if chosen.any()]


def _fields(scene: Scene) -> str:
    """Field data: one number for each name."""
    numbers = {"region -1: metal": -1}
    numbers |= {f"region {k}: {name}": k for k, name in enumerate(region_names(scene))}
    numbers |= {f"conductor {k}: {c.name}": k for k, c in enumerate(scene.conductors)}
    arrays = [
        f'<DataArray type="Int32" Name={quoteattr(name)} NumberOfTuples="1" format="ascii">'
        f"{value}</DataArray>"
        for name, value in numbers.items()
    ]
    return "\n".join(["<FieldData>", *arrays, "</FieldData>"])
