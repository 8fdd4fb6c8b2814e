"""OBJ: faces of any number of corners, objects (o) and groups (g) as parts.

Read line by line here, because the general readers join names, reorder faces and cut
polygons like fans, which is wrong for those that are not convex.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.polygons import Polygons, cut_polygons
from bem.geometry.reading.text_numbers import numbers

_LINE = re.compile(rb"^[ \t]*(v|f|o|g)[ \t]+([^\r\n]*)", re.MULTILINE)


@dataclass
class _Lines:
    """What the lines of a file say, face after face.

    Args:
        places: words of the coordinates, three for each vertex.
        corners: words of the corners.
        sizes: number of corners of each face.
        seen: number of vertices listed before each face, for corners counted backwards.
        members: faces of each object and each group by name.
        objects: names of objects, in order.
    """

    places: list[bytes] = field(default_factory=list)
    corners: list[bytes] = field(default_factory=list)
    sizes: list[int] = field(default_factory=list)
    seen: list[int] = field(default_factory=list)
    members: dict[str, list[int]] = field(default_factory=dict)
    objects: dict[str, None] = field(default_factory=dict)


def read_obj(path: Path) -> MeshData:
    """Faces of an OBJ file; each object and each group is a part.

    The objects stand for a body each; in a file without any, the groups do.

    Raises:
        InputError: the file is damaged.
        OSError: the file cannot be opened.
    """
    lines = _scan(path.read_bytes().replace(b"\\\r\n", b" ").replace(b"\\\n", b" "))
    vertices = numbers(lines.places, float, "OBJ").reshape(-1, 3)
    polygons = Polygons(_corners(lines), np.array(lines.sizes, dtype=np.int64))
    cut = cut_polygons(vertices, polygons)
    parts = {
        name: np.flatnonzero(np.isin(cut.source, members))
        for name, members in lines.members.items()
        if members
    }
    bodies = tuple(name for name in parts if name in lines.objects) or tuple(parts)
    return MeshData(vertices, cut.faces, parts, bodies, cut.changes)


def _scan(data: bytes) -> _Lines:
    lines = _Lines()
    current: dict[str, list[str]] = {"o": [], "g": []}
    for found in _LINE.finditer(data):
        key, rest = found.group(1), found.group(2).split(b"#", 1)[0]
        if key == b"v":
            _vertex(lines, rest.split())
        elif key == b"f":
            _face(lines, rest.split(), [*current["o"], *current["g"]])
        else:
            current[key.decode()] = _names(key, rest.decode("utf-8", "replace"))
            lines.objects |= dict.fromkeys(current["o"])
    if not lines.places and not lines.sizes and b"\nv" not in b"\n" + data:
        raise InputError("is not OBJ: it has no line that starts with v; export it again")
    return lines


def _vertex(lines: _Lines, words: list[bytes]) -> None:
    if len(words) < 3:
        raise InputError(
            f"vertex {len(lines.places) // 3 + 1} has {len(words)} of 3 coordinates: cut short? "
            "export it again"
        )
    lines.places += words[:3]


def _face(lines: _Lines, words: list[bytes], names: list[str]) -> None:
    for name in dict.fromkeys(names):
        lines.members.setdefault(name, []).append(len(lines.sizes))
    lines.corners += [word.split(b"/", 1)[0] for word in words]
    lines.sizes.append(len(words))
    lines.seen.append(len(lines.places) // 3)


def _names(key: bytes, rest: str) -> list[str]:
    """Name of an object, which may hold blanks, or names of groups; "default" is none."""
    names = [rest.strip()] if key == b"o" else rest.split()
    return [name for name in names if name and name != "default"]


def _corners(lines: _Lines) -> np.ndarray:
    """Corners of all faces from 0; in the file they count from 1, or backwards from -1."""
    corners = numbers(lines.corners, int, "OBJ")
    if len(corners) and not corners.all():
        raise InputError("a face uses corner 0, but OBJ counts from 1; export it again")
    before = np.repeat(np.array(lines.seen, dtype=np.int64), lines.sizes)
    return np.where(corners > 0, corners - 1, before + corners)
