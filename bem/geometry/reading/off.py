"""OFF (text): faces of any number of corners, in the order of the file."""

from __future__ import annotations

import re
from pathlib import Path

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.polygons import Polygons, cut_polygons
from bem.geometry.reading.text_numbers import numbers

_HEADER = re.compile(rb"\s*(?:ST|C|N)*OFF\b")
_COMMENT = re.compile(rb"#[^\r\n]*")


def read_off(path: Path) -> MeshData:
    """Faces of an OFF file; colours, normals and texture coordinates are passed over.

    Raises:
        InputError: the file is damaged, binary, or not in three dimensions.
        OSError: the file cannot be opened.
    """
    text = _COMMENT.sub(b"", path.read_bytes())
    header = _HEADER.match(text)
    if header is None or text[header.end() :].split(None, 1)[:1] == [b"BINARY"]:
        raise InputError("is not a text OFF file: it does not start with OFF; export it again")
    lines = [words for line in text[header.end() :].splitlines() if (words := line.split())]
    counts = numbers(lines[0] if lines else [], int, "OFF")
    if len(counts) < 2 or counts.min() < 0:
        raise InputError("does not state its numbers of vertices and faces; export it again")
    return _read(lines[1:], int(counts[0]), int(counts[1]))


def _read(lines: list[list[bytes]], places: int, faces: int) -> MeshData:
    if len(lines) < places + faces:
        raise InputError(
            f"is cut short: {places:,} vertices and {faces:,} faces announced, "
            f"found {len(lines):,} lines; export it again"
        )
    if any(len(line) < 3 for line in lines[:places]):
        raise InputError("a vertex has less than 3 coordinates; export it again")
    words = [word for line in lines[:places] for word in line[:3]]
    vertices = numbers(words, float, "OFF").reshape(-1, 3)
    listed = lines[places : places + faces]
    sizes = numbers([line[0] for line in listed], int, "OFF")
    if any(len(line) <= size for line, size in zip(listed, sizes, strict=True)):
        raise InputError("a face has fewer corners than it announces; export it again")
    corners = [w for line, size in zip(listed, sizes, strict=True) for w in line[1 : size + 1]]
    cut = cut_polygons(vertices, Polygons(numbers(corners, int, "OFF"), sizes))
    return MeshData(vertices, cut.faces, changes=cut.changes)
