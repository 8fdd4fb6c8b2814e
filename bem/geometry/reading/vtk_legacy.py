"""Legacy VTK files, text and binary, of surfaces (POLYDATA) and of UNSTRUCTURED_GRID.

Read here, because the general reader takes neither surfaces nor all that the VTK library
writes today. Grids with implied cells are left to the general reader.
"""

from __future__ import annotations

import re
import urllib.parse
from pathlib import Path
from typing import NamedTuple

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.text_numbers import numbers

_HEADER = re.compile(
    rb"# vtk DataFile[^\n]*\n[^\n]*\n\s*(ASCII|BINARY)\s*\n(?:\s*FIELD\b.*?\n)?", re.IGNORECASE
)
_DATASET = re.compile(rb"^\s*DATASET\s+(\w+)", re.MULTILINE | re.IGNORECASE)
_TYPES = {
    "unsigned_char": "u1", "char": "i1", "unsigned_short": "u2", "short": "i2",
    "unsigned_int": "u4", "int": "i4", "unsigned_long": "u8", "long": "i8", "float": "f4",
    "double": "f8", "vtktypeint64": "i8", "vtktypeuint64": "u8", "vtkidtype": "i4",
    "vtktypeint32": "i4",
}  # fmt: skip
_CELLS = {
    5: "triangle", 7: "polygon", 8: "pixel", 9: "quad", 10: "tetra", 11: "voxel",
    12: "hexahedron", 13: "wedge", 14: "pyramid", 22: "triangle6", 23: "quad8", 24: "tetra10",
    25: "hexahedron20", 26: "wedge15", 27: "pyramid13", 28: "quad9", 29: "hexahedron27",
    34: "triangle7",
}  # fmt: skip
_IGNORED = (1, 2, 3, 4, 21, 35)
"""Points and lines."""
_POLYDATA = {"VERTICES": 2, "LINES": 4, "POLYGONS": 7, "TRIANGLE_STRIPS": 6}
_LENGTH_BYTES = (8, 4, 2, 1)
_COMPONENTS = {"VECTORS": 3, "NORMALS": 3, "TENSORS": 9, "TENSORS6": 6, "GLOBAL_IDS": 1}


class Cells(NamedTuple):
    """Cells as the file lists them.

    Args:
        nodes: (k,) int64, cell after cell.
        sizes: (c,) int64 number of nodes of each.
        types: (c,) int64 VTK's number of each kind.
    """

    nodes: np.ndarray
    sizes: np.ndarray
    types: np.ndarray


class VtkMesh(NamedTuple):
    """Points (v, 3), kinds of cells with their nodes (n, k), whole numbers (c,) by array."""

    points: np.ndarray
    blocks: list[tuple[str, np.ndarray]]
    arrays: dict[str, np.ndarray]


class _Stream:
    """Words, lines and numbers of the file, one after the other."""

    def __init__(self, data: bytes, place: int, binary: bool) -> None:
        self._data, self._place, self._binary = data, place, binary

    def line(self) -> list[str]:
        """Words of the next line that has any; none at the end."""
        while self._place < len(self._data):
            end = self._data.find(b"\n", self._place)
            end = len(self._data) if end < 0 else end
            words = self._data[self._place : end].decode("utf-8", "replace").split()
            self._place = end + 1
            if words:
                return words
        return []

    def mark(self) -> int:
        """Place to go back to."""
        return self._place

    def back(self, mark: int) -> None:
        """Go back to a place."""
        self._place = mark

    def skip_to_blank(self) -> None:
        """Pass over lines until an empty one."""
        found = re.compile(rb"\n[ \t\r]*\n").search(self._data, max(self._place - 1, 0))
        self._place = found.end() if found else len(self._data)

    def skip_strings(self, count: int) -> None:
        """Pass over texts: one to a line or, packed, each after its length.

        The first two bits of a length tell how many bytes it takes.
        """
        for _ in range(count):
            if self._binary:
                head = _LENGTH_BYTES[self._data[self._place] >> 6]
                length = int.from_bytes(self._data[self._place : self._place + head], "big")
                self._place += head + length % (1 << (8 * head - 2))
            else:
                self._place = self._data.index(b"\n", self._place) + 1

    def numbers(self, kind: str, count: int) -> np.ndarray:
        """Next numbers of a kind such as "float"."""
        if kind.lower() not in _TYPES or count < 0:
            raise _damaged()
        code = _TYPES[kind.lower()]
        return self._packed(code, count) if self._binary else self._written(code, count)

    def _packed(self, code: str, count: int) -> np.ndarray:
        start, self._place = self._place, self._place + count * np.dtype(code).itemsize
        if self._place > len(self._data):
            raise _short()
        return np.frombuffer(self._data[start : self._place], f">{code}")

    def _written(self, code: str, count: int) -> np.ndarray:
        words: list[bytes] = []
        while len(words) < count:
            if self._place >= len(self._data):
                raise _short()
            end = self._data.find(b"\n", self._place)
            end = len(self._data) if end < 0 else end
            words += self._data[self._place : end].split()
            self._place = end + 1
        if len(words) > count:
            raise _damaged()
        return numbers(words, float if code[0] == "f" else int, "VTK")


def _damaged() -> InputError:
    return InputError("cannot be read as VTK: its sections are damaged; export it again")


def _short() -> InputError:
    return InputError("is cut short: a section ends before its announced number; export it again")


def read_legacy(path: Path) -> VtkMesh | None:
    """Cells of a legacy VTK file; None for a grid with implied cells.

    Raises:
        InputError: the file is damaged.
    """
    data = path.read_bytes().replace(b"\r\n", b"\n") if _is_text(path) else path.read_bytes()
    header = _HEADER.match(data)
    kind = _DATASET.search(data, header.end() - 1) if header else None
    if header is None or kind is None:
        raise InputError("is not legacy VTK: its first lines are damaged; export it again")
    dataset = kind.group(1).decode().upper()
    if dataset not in ("POLYDATA", "UNSTRUCTURED_GRID"):
        return None
    binary = header.group(1).upper() == b"BINARY"
    try:
        return _read(_Stream(data, kind.end(), binary))
    except (IndexError, ValueError, OverflowError):
        raise _damaged() from None


def _is_text(path: Path) -> bool:
    with path.open("rb") as file:
        return b"\nASCII" in file.read(600).replace(b"\r", b"").upper()


def _read(stream: _Stream) -> VtkMesh:
    points, types = np.empty((0, 3)), None
    cells: list[Cells] = []
    arrays: dict[str, np.ndarray] = {}
    while words := stream.line():
        key = words[0].upper()
        if key == "POINTS":
            points = stream.numbers(words[2], 3 * int(words[1])).reshape(-1, 3)
        elif key in ("CELLS", *_POLYDATA):
            cells.append(_listed(stream, words, _POLYDATA.get(key, 0)))
        elif key == "CELL_TYPES":
            types = stream.numbers("int", int(words[1]))
        elif key == "CELL_DATA":
            arrays = _attributes(stream, int(words[1]))
        elif key == "POINT_DATA":
            _attributes(stream, int(words[1]))
        elif key == "METADATA":
            stream.skip_to_blank()
        elif key == "FIELD":
            _field(stream, int(words[2]))
        else:
            raise _damaged()
    return _mesh(points, _joined(cells, types), arrays)


def _listed(stream: _Stream, words: list[str], kind: int) -> Cells:
    """Cells of a section, in the order of version 5 (offsets apart) or of those before it."""
    count, size = int(words[1]), int(words[2])
    mark = stream.mark()
    following = stream.line()
    if following[:1] == ["OFFSETS"]:
        offsets = stream.numbers(following[1], count)
        nodes = stream.numbers(stream.line()[1], size)
        sizes = np.diff(offsets)
    else:
        stream.back(mark)
        nodes, sizes = _counted(stream.numbers("int", size), count)
    if (sizes < 0).any() or sizes.sum() != len(nodes):
        raise _damaged()
    return Cells(nodes.astype(np.int64), sizes.astype(np.int64), np.full(len(sizes), kind))


def _counted(flat: np.ndarray, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Nodes and sizes of cells that each begin with their size."""
    starts, place = np.empty(count, dtype=np.int64), 0
    for cell in range(count):
        starts[cell] = place
        place += 1 + max(int(flat[place]), 0)
    if place != len(flat):
        raise _damaged()
    return np.delete(flat, starts), flat[starts]


def _joined(listed: list[Cells], types: np.ndarray | None) -> Cells:
    none = np.empty(0, dtype=np.int64)
    nodes, sizes, kinds = (np.concatenate([none, *(c[k] for c in listed)]) for k in range(3))
    if types is not None and len(types) != len(sizes):
        raise _damaged()
    return Cells(nodes, sizes, kinds if types is None else types.astype(np.int64))


def _attributes(stream: _Stream, count: int) -> dict[str, np.ndarray]:
    """Arrays of whole numbers, one for each cell, up to the next section."""
    arrays: dict[str, np.ndarray] = {}
    while True:
        mark = stream.mark()
        words = stream.line()
        key = words[0].upper() if words else ""
        if key == "SCALARS":
            found = _scalars(stream, words, count)
        elif key == "FIELD":
            found = _field(stream, int(words[2]))
        elif key in _COMPONENTS:
            found = {"": stream.numbers(words[2], _COMPONENTS[key] * count)}
        elif key == "METADATA":
            found = {}
            stream.skip_to_blank()
        else:
            stream.back(mark)
            break
        arrays |= {urllib.parse.unquote(name): array for name, array in found.items()}
    return {n: a for n, a in arrays.items() if n and len(a) == count and a.dtype.kind in "iu"}


def _scalars(stream: _Stream, words: list[str], count: int) -> dict[str, np.ndarray]:
    """Array of one section SCALARS; a table of colours between may be left out."""
    components = int(words[3]) if len(words) > 3 else 1
    mark = stream.mark()
    if stream.line()[:1] != ["LOOKUP_TABLE"]:
        stream.back(mark)
    return {words[1]: stream.numbers(words[2], components * count)}


def _field(stream: _Stream, count: int) -> dict[str, np.ndarray]:
    arrays = {}
    for _ in range(count):
        words = stream.line()
        while words[0] == "METADATA":
            stream.skip_to_blank()
            words = stream.line()
        size = int(words[1]) * int(words[2])
        if words[3].lower() == "string":
            stream.skip_strings(size)
        else:
            arrays[words[0]] = stream.numbers(words[3], size)
    return arrays


def _mesh(points: np.ndarray, cells: Cells, arrays: dict[str, np.ndarray]) -> VtkMesh:
    """Cells in blocks of one kind and size; points and lines are passed over."""
    kept = ~np.isin(cells.types, _IGNORED)
    unknown = set(cells.types[kept].tolist()) - set(_CELLS)
    if unknown:
        raise InputError(
            f"holds VTK cells of type {min(unknown)}, which are not read; "
            "export plain triangles, or tetrahedra"
        )
    first = np.cumsum(cells.sizes) - cells.sizes
    chosen = np.flatnonzero(kept)
    key = np.stack([cells.types[chosen], cells.sizes[chosen]], axis=1)
    edges = np.flatnonzero((key[1:] != key[:-1]).any(axis=1)) + 1
    blocks = []
    for run in np.split(chosen, edges) if len(chosen) else []:
        nodes = cells.nodes[first[run, None] + np.arange(cells.sizes[run[0]])]
        blocks.append((_CELLS[int(cells.types[run[0]])], nodes))
    return VtkMesh(points, blocks, {n: a[kept] for n, a in arrays.items() if len(a) == len(kept)})
