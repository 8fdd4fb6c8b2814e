"""Two boxes, "rod" of 1 x 1 x 1 and "can" of 1 x 2 x 1, as the files of several kinds hold them."""

from __future__ import annotations

import io
import json
import struct
import zipfile

import numpy as np
from made_bodies import CUBE_QUADS, CUBE_TRIANGLES

AREA, VOLUME = 16.0, 3.0
BOUNDS = [[0.0, 0.0, 0.0], [4.0, 2.0, 1.0]]
CAN_BOUNDS = [[3.0, 0.0, 0.0], [4.0, 2.0, 1.0]]


def box(low: tuple[float, float, float], high: tuple[float, float, float]) -> np.ndarray:
    """Corners (8, 3), numbered x + 2 y + 4 z."""
    corners = np.array([[k & 1, k >> 1 & 1, k >> 2] for k in range(8)])
    return np.where(corners == 1, np.array(high, dtype=float), np.array(low, dtype=float))


ROD, CAN = box((0, 0, 0), (1, 1, 1)), box((3, 0, 0), (4, 2, 1))
CORNERS = np.concatenate([ROD, CAN])
TRIANGLES = np.concatenate([CUBE_TRIANGLES, 8 + CUBE_TRIANGLES])
QUADS = np.concatenate([CUBE_QUADS, 8 + CUBE_QUADS])
MIXED = [*CUBE_QUADS.tolist(), *(8 + CUBE_TRIANGLES).tolist()]
"""The rod of quadrilaterals, the can of triangles."""


def lines(rows, before: str = "", first: int = 0) -> str:
    """Rows of numbers as lines of text."""
    texts = (" ".join(repr(x + first) for x in np.asarray(row).tolist()) for row in rows)
    return "".join(f"{before}{text}\n" for text in texts)


def obj_text() -> str:
    """OBJ with objects and groups, normals and textures, comments, and corners from behind."""
    rod = "".join("f " + " ".join(f"{c + 1}/1/1" for c in f) + "\n" for f in MIXED[:6])
    can = "".join("f " + " ".join(f"{c - 16}//1" for c in f) + " # can\n" for f in MIXED[6:])
    return (
        "# made for a test\nmtllib none.mtl\nvt 0 0\nvn 0 0 1\no rod\n"
        f"{lines(CORNERS[:8], 'v ')}g default\nusemtl copper\ns off\n{rod}"
        f"o big can\n{lines(CORNERS[8:], 'v ')}g lid side\n{can}"
    )


def off_text() -> str:
    """OFF with faces of three and of four corners, some with colours."""
    faces = "".join(f"{len(f)} {' '.join(map(str, f))} 255 0 0\n" for f in MIXED)
    return f"OFF # made for a test\n\n16 18 0\n{lines(CORNERS)}{faces}"


def ply(form: str, number: str = "float") -> bytes:
    """PLY of faces with three and four corners, with colours at vertices and faces."""
    header = (
        f"ply\nformat {form} 1.0\ncomment made for a test\nelement vertex 16\n"
        f"property uchar red\nproperty {number} x\nproperty {number} y\nproperty {number} z\n"
        "element edge 1\nproperty int vertex1\nproperty int vertex2\n"
        "element face 18\nproperty list uchar int vertex_indices\nproperty uchar red\nend_header\n"
    )
    if form == "ascii":
        faces = "".join(f"{len(f)} {' '.join(map(str, f))} 9\n" for f in MIXED)
        return (header + lines(CORNERS, "7 ") + "0 1\n" + faces).encode()
    order, real = "<" if "little" in form else ">", "f" if number == "float" else "d"
    body = b"".join(struct.pack(f"{order}B3{real}", 7, *corner) for corner in CORNERS)
    body += struct.pack(f"{order}2i", 0, 1)
    body += b"".join(struct.pack(f"{order}B{len(f)}iB", len(f), *f, 9) for f in MIXED)
    return header.encode() + body


def model_3mf(unit: str | None = "millimeter", objects: str = "") -> str:
    """Model of a 3MF archive: the boxes in an assembly, the can shifted where it is used."""

    def mesh(number: int, name: str, corners: np.ndarray) -> str:
        places = "".join(f'<vertex x="{x}" y="{y}" z="{z}"/>' for x, y, z in corners.tolist())
        faces = "".join(
            f'<triangle v1="{a}" v2="{b}" v3="{c}"/>' for a, b, c in CUBE_TRIANGLES.tolist()
        )
        return (
            f'<object id="{number}" name="{name}" type="model"><mesh><vertices>{places}'
            f"</vertices><triangles>{faces}</triangles></mesh></object>"
        )

    stated = "" if unit is None else f' unit="{unit}"'
    return (
        f'<?xml version="1.0" encoding="UTF-8"?><model{stated} '
        'xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02"><resources>'
        f"{mesh(1, 'rod', ROD)}{mesh(2, 'can', CAN - [3, 0, 0])}{objects}"
        '<object id="3" name="pair"><components><component objectid="1"/>'
        '<component objectid="2" transform="1 0 0 0 1 0 0 0 1 3 0 0"/></components></object>'
        '</resources><build><item objectid="3"/></build></model>'
    )


def archive_3mf(model: str) -> bytes:
    """3MF archive around a model."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("3D/3dmodel.model", model)
    return packed.getvalue()


def gltf_header(nodes: list[dict]) -> tuple[dict, bytes]:
    """Header and buffer of glTF: two meshes of one name, with indices of two kinds."""
    binary, views, accessors, meshes = b"", [], [], []
    for k, (corners, kind) in enumerate(((ROD, "<u2"), (CAN - [3, 0, 0], "<u4"))):
        for data in (corners.astype("<f4").tobytes(), CUBE_TRIANGLES.astype(kind).tobytes()):
            views.append({"buffer": 0, "byteOffset": len(binary), "byteLength": len(data)})
            binary += data
        index = 5123 if kind == "<u2" else 5125
        accessors += [
            {"bufferView": 2 * k, "componentType": 5126, "count": 8, "type": "VEC3"},
            {"bufferView": 2 * k + 1, "componentType": index, "count": 36, "type": "SCALAR"},
        ]
        primitive = {"attributes": {"POSITION": 2 * k}, "indices": 2 * k + 1}
        meshes.append({"name": "shared", "primitives": [primitive]})
    header = {
        "asset": {"version": "2.0"},
        "scene": 0,
        "scenes": [{"nodes": [0]}],
        "nodes": nodes,
        "meshes": meshes,
        "accessors": accessors,
        "bufferViews": views,
        "buffers": [{"byteLength": len(binary)}],
    }
    return header, binary


PAIR = [
    {"name": "pair", "children": [1, 2]},
    {"name": "rod", "mesh": 0},
    {"name": "can", "mesh": 1, "translation": [3, 0, 0]},
]


def glb(header: dict, binary: bytes) -> bytes:
    """GLB file of a header and its buffer."""
    text = json.dumps(header).encode()
    text += b" " * (-len(text) % 4)
    binary += b"\0" * (-len(binary) % 4)
    chunks = struct.pack("<II", len(text), 0x4E4F534A) + text
    chunks += struct.pack("<II", len(binary), 0x004E4942) + binary
    return struct.pack("<4sII", b"glTF", 2, 12 + len(chunks)) + chunks
