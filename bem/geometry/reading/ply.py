"""PLY, text and binary of either byte order: faces of any number of corners.

Read here, because the general readers take no binary file that mixes triangles with larger
faces, and round the numbers of text files.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.polygons import Polygons, cut_polygons
from bem.geometry.reading.stl import HALF_SINGLE
from bem.geometry.reading.text_numbers import numbers

_HEADER = re.compile(rb"ply\s*?\r?\n(.*?)^end_header[ \t]*(\r\n|\n|\r)", re.DOTALL | re.MULTILINE)
_KINDS = {
    "char": "i1", "uchar": "u1", "short": "i2", "ushort": "u2", "int": "i4", "uint": "u4",
    "float": "f4", "double": "f8", "int8": "i1", "uint8": "u1", "int16": "i2", "uint16": "u2",
    "int32": "i4", "uint32": "u4", "float32": "f4", "float64": "f8", "int64": "i8",
    "uint64": "u8",
}  # fmt: skip
_CORNERS = ("vertex_indices", "vertex_index")


@dataclass(frozen=True)
class _Property:
    """One column: its kind of number, and for a list that of its length."""

    name: str
    kind: str
    length: str | None = None


@dataclass(frozen=True)
class _Element:
    """Rows of one kind: vertices, faces, or others."""

    name: str
    rows: int
    columns: tuple[_Property, ...]


def read_ply(path: Path) -> MeshData:
    """Faces of a PLY file.

    Raises:
        InputError: the file is damaged.
        OSError: the file cannot be opened.
    """
    data = path.read_bytes()
    header = _HEADER.match(data)
    if header is None:
        raise InputError("is not PLY: no header from 'ply' to 'end_header'; export it again")
    lines = [line.split() for line in header.group(1).decode("ascii", "replace").splitlines()]
    elements = _elements(lines)
    return _mesh_data(_body(lines, data[header.end() :]), elements)


def _elements(lines: list[list[str]]) -> list[_Element]:
    elements: list[_Element] = []
    try:
        for words in lines:
            if words[:1] == ["element"]:
                elements.append(_Element(words[1], int(words[2]), ()))
            elif words[:1] == ["property"]:
                last = elements.pop()
                columns = (*last.columns, _property(words))
                elements.append(_Element(last.name, last.rows, columns))
    except (IndexError, KeyError, ValueError):
        raise InputError("is not PLY: its header is damaged; export it again") from None
    return elements


def _property(words: list[str]) -> _Property:
    if words[1] == "list":
        return _Property(words[4], _KINDS[words[3]], _KINDS[words[2]])
    return _Property(words[2], _KINDS[words[1]])


class _Body:
    """Cells after the header: words of a text file, bytes of a binary one."""

    def __init__(self, data: bytes, order: str | None) -> None:
        self._order = order
        self._data = data.split() if order is None else data
        self.is_text = order is None
        self.size = len(self._data)

    def width(self, kind: str) -> int:
        """Number of cells that a number takes."""
        return 1 if self._order is None else np.dtype(kind).itemsize

    def integer(self, kind: str, place: int) -> int:
        """Length of a list, which stands at ``place``."""
        if place + self.width(kind) > len(self._data):
            raise _short()
        return int(self.numbers(kind, np.array([place]))[0])

    def numbers(self, kind: str, places: np.ndarray) -> np.ndarray:
        """Numbers (n,) that stand at the places (n,)."""
        width = self.width(kind)
        if len(places) and (places.min() < 0 or places.max() + width > len(self._data)):
            raise _short()
        if isinstance(self._data, list):
            words = [self._data[place] for place in places.tolist()]
            return numbers(words, float if kind.startswith("f") else int, "PLY")
        cells = np.frombuffer(self._data, np.uint8)[places[:, None] + np.arange(width)]
        return np.ascontiguousarray(cells).view(f"{self._order}{kind}").reshape(-1)


def _short() -> InputError:
    return InputError("is cut short: it ends before the announced rows; export it again")


def _body(lines: list[list[str]], data: bytes) -> _Body:
    form = next((words[1] for words in lines if words[:1] == ["format"] and len(words) > 1), "?")
    orders = {"ascii": None, "binary_little_endian": "<", "binary_big_endian": ">"}
    if form not in orders:
        raise InputError(f"is PLY of unknown format {form[:30]!r}; save it as text or binary")
    return _Body(data, orders[form])


class _Layout(NamedTuple):
    """Where the numbers of an element stand.

    Args:
        starts: (rows, columns) place of the first number.
        sizes: (rows, columns) how many there are.
        end: place after the last one.
    """

    starts: np.ndarray
    sizes: np.ndarray
    end: int


def _layout(body: _Body, element: _Element, place: int) -> _Layout:
    """Layout of an element; its rows are first taken to be all as long as the first one."""
    if element.rows <= 0 or not element.columns:
        none = np.empty((0, len(element.columns)), dtype=np.int64)
        return _Layout(none, none, place)
    return _equal_rows(body, element, place) or _walk(body, element, place, element.rows)


def _walk(body: _Body, element: _Element, place: int, rows: int) -> _Layout:
    """Layout row by row, for lists of any length."""
    starts, sizes = [], []
    for column in element.columns * rows:
        size = 1
        if column.length is not None:
            size = max(body.integer(column.length, place), 0)
            place += body.width(column.length)
        starts.append(place)
        sizes.append(size)
        place += size * body.width(column.kind)
    shape = (rows, len(element.columns))
    return _Layout(np.reshape(starts, shape), np.reshape(sizes, shape), place)


def _equal_rows(body: _Body, element: _Element, place: int) -> _Layout | None:
    """Layout of rows that are all as long as the first one, or None."""
    first = _walk(body, element, place, 1)
    step = first.end - place
    end = place + step * element.rows
    starts = first.starts + step * np.arange(element.rows)[:, None]
    lists = [k for k, column in enumerate(element.columns) if column.length is not None]
    if end > body.size:
        return None
    for k in lists:
        kind = element.columns[k].length or ""
        if (body.numbers(kind, starts[:, k] - body.width(kind)) != first.sizes[0, k]).any():
            return None
    return _Layout(starts, np.repeat(first.sizes, element.rows, axis=0), end)


def _mesh_data(body: _Body, elements: list[_Element]) -> MeshData:
    layouts, place = {}, 0
    for element in elements:
        layouts[element.name] = (element, _layout(body, element, place))
        place = layouts[element.name][1].end
    if place > body.size:
        raise _short()
    vertices, rounding = _vertices(body, *layouts.get("vertex", _NOTHING))
    cut = cut_polygons(vertices, _polygons(body, *layouts.get("face", _NOTHING)))
    return MeshData(vertices, cut.faces, changes=cut.changes, rounding=rounding)


def _vertices(body: _Body, element: _Element, layout: _Layout) -> tuple[np.ndarray, float]:
    """Vertices (v, 3), and half the spacing of the largest number if they are binary singles."""
    names = [column.name for column in element.columns]
    if not {"x", "y", "z"} <= set(names):
        raise InputError("is not a PLY mesh: it lists no vertices with x, y, z; export it again")
    places = [names.index(axis) for axis in "xyz"]
    kinds = [element.columns[k].kind for k in places]
    axes = [body.numbers(kind, layout.starts[:, k]) for kind, k in zip(kinds, places, strict=True)]
    vertices = np.stack(axes, axis=1).astype(np.float64)
    single = not body.is_text and "f4" in kinds
    return vertices, HALF_SINGLE * float(np.abs(vertices).max(initial=0.0)) if single else 0.0


def _polygons(body: _Body, element: _Element, layout: _Layout) -> Polygons:
    found = [k for k, column in enumerate(element.columns) if column.name in _CORNERS]
    if not found:
        return Polygons(np.empty(0, dtype=np.int64), np.empty(0, dtype=np.int64))
    kind, starts, sizes = element.columns[found[0]].kind, *(a[:, found[0]] for a in layout[:2])
    within = np.arange(sizes.sum()) - np.repeat(np.cumsum(sizes) - sizes, sizes)
    corners = body.numbers(kind, np.repeat(starts, sizes) + body.width(kind) * within)
    return Polygons(corners.astype(np.int64), sizes)


_NOTHING = (_Element("", 0, ()), _Layout(np.empty((0, 0)), np.empty((0, 0)), 0))
