"""STL, text and binary: the numbers through trimesh, named solids by their lines."""

from __future__ import annotations

import io
import re
import warnings
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.surface import NO_CORNER
from bem.geometry.wording import counted

HALF_SINGLE = 2.0**-24
"""Half the relative spacing of the single-precision numbers of binary STL."""
_HEADER = 84
_FACET = 50
_BLOCK = 1 << 24
_FACET_START = re.compile(rb"\bfacet\b", re.IGNORECASE)
_FACET_END = re.compile(rb"\bendfacet\b", re.IGNORECASE)
_BOUNDARY = re.compile(rb"^[ \t]*(end)?solid\b([^\r\n]*)", re.IGNORECASE | re.MULTILINE)


def read_stl(path: Path) -> MeshData:
    """Faces and named solids of an STL file.

    Raises:
        InputError: neither text nor binary STL, or cut short.
        OSError: the file cannot be opened.
    """
    data = path.read_bytes()
    if _promised(data) == len(data):
        mesh = _mesh_data([_numbers(data)], [""])
        return replace(mesh, rounding=HALF_SINGLE * float(np.abs(mesh.vertices).max(initial=0.0)))
    if data.lstrip()[:5].lower() == b"solid":
        return _read_text(data.replace(b"\r\n", b"\n").replace(b"\r", b"\n"))
    if len(data) < _HEADER:
        raise InputError(f"is not STL: {counted(len(data), 'byte')} and no 'solid' at the start")
    raise InputError(
        f"is cut short or not STL: binary STL with this header has {_promised(data):,} bytes, "
        f"found {len(data):,}; export it again"
    )


def _promised(data: bytes) -> int:
    """Length in bytes that a binary file's header states; 0 without a header."""
    if len(data) < _HEADER:
        return 0
    return _HEADER + _FACET * int.from_bytes(data[_HEADER - 4 : _HEADER], "little")


def _numbers(data: bytes) -> np.ndarray:
    """Corners (t, 3, 3) of one solid."""
    from trimesh.exchange.stl import load_stl

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            loaded = load_stl(io.BytesIO(data))
    except Exception:
        raise InputError(
            "cannot be read as STL: the corners of a facet are damaged; export it again"
        ) from None
    return np.asarray(loaded.get("vertices", ()), dtype=np.float64).reshape(-1, 3, 3)


def _read_text(data: bytes) -> MeshData:
    names, corners = [], []
    lines = list(_BOUNDARY.finditer(data))
    for line, following in zip(lines, [*lines[1:], None], strict=True):
        if line.group(1):
            continue
        if following is None or not following.group(1):
            raise InputError("a solid has no 'endsolid' line: cut short? export it again")
        names.append(line.group(2).decode("utf-8", "replace").strip())
        blocks = [_block(data[a:b]) for a, b in _spans(data, line.end(), following.start())]
        corners.append(np.concatenate(blocks))
    return _mesh_data(corners, names)


def _spans(data: bytes, start: int, stop: int) -> Iterator[tuple[int, int]]:
    """Pieces of whole facets of [start, stop), so that memory stays small."""
    while start < stop:
        facet = _FACET_END.search(data, min(start + _BLOCK, stop), stop)
        end = facet.end() if facet else stop
        yield start, end
        start = end


def _block(text: bytes) -> np.ndarray:
    """Corners (t, 3, 3) of the facets in a piece of text."""
    facets = len(_FACET_END.findall(text))
    corners = _numbers(b"solid\n" + text + b"\nendsolid\n") if facets else np.empty((0, 3, 3))
    if len(corners) != facets or len(_FACET_START.findall(text)) != facets:
        raise InputError(
            f"cannot be read as STL: a solid with {counted(len(corners), 'triangle')} "
            f"in {counted(facets, 'finished facet')}; export it again"
        )
    return corners


def _mesh_data(corners: list[np.ndarray], names: list[str]) -> MeshData:
    """Join solids; those of one name make one part."""
    points = np.concatenate(corners).reshape(-1, 3)
    first = np.arange(0, len(points), 3)
    faces = np.stack([first, first + 1, first + 2, np.full(len(first), NO_CORNER)], axis=1)
    owner = np.repeat(np.arange(len(names)), [len(c) for c in corners])
    parts = {
        name: np.flatnonzero(np.isin(owner, [i for i, n in enumerate(names) if n == name]))
        for name in dict.fromkeys(names)
        if name
    }
    return MeshData(points, faces, parts)
