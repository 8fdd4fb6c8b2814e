"""GLB and glTF 2.0 through trimesh: meshes placed by their nodes, in metres.

The library renames what shares a name, so it gets a header in which nodes and meshes are
called by their numbers, and nothing but geometry; the names come from the file's own header.
"""

from __future__ import annotations

import base64
import io
import itertools
import json
import struct
import urllib.parse
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.assembly import Leaf, assembled
from bem.geometry.reading.cells import as_faces
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.quiet import quiet
from bem.geometry.reading.stl import HALF_SINGLE
from bem.geometry.wording import counted

_MAGIC, _JSON, _BINARY = 0x46546C67, 0x4E4F534A, 0x004E4942
_TRIANGLES, _STRIP, _FAN = 4, 5, 6
_PLACE = ("matrix", "translation", "rotation", "scale", "children", "mesh")


def read_gltf(path: Path) -> MeshData:
    """Meshes of a GLB or glTF 2.0 file, one body for each node that holds one.

    Raises:
        InputError: the file is damaged, compressed by an extension, or of another version.
        OSError: the file, or one that it names, cannot be opened.
    """
    data = path.read_bytes()
    header, chunk = _chunks(data) if data[:4] == b"glTF" else (_parsed(data), b"")
    _check(header)
    try:
        buffers = [_buffer(item, chunk, path.parent) for item in header.get("buffers", [])]
        bare, left_out = _bare(header, buffers)
        scene = _load(bare, b"".join(buffers))
        meshes = list(_meshes(scene))
        leaves = [_leaf(header, *mesh[:3]) for mesh in meshes]
    except (AttributeError, IndexError, KeyError, TypeError, ValueError, RecursionError):
        raise _damaged() from None
    rounding = HALF_SINGLE * max((size for *_, size in meshes), default=0.0)
    lines = [f"{counted(left_out, 'set')} of points or lines left out"] if left_out else []
    return replace(assembled(leaves, "m", lines), rounding=rounding)


def _damaged() -> InputError:
    return InputError("cannot be read as glTF: its meshes or nodes are damaged; export it again")


def _chunks(data: bytes) -> tuple[dict[str, Any], bytes]:
    """Header and binary chunk of a GLB file."""
    version, length = struct.unpack_from("<II", data.ljust(12, b"\0"), 4)
    if version != 2:
        raise InputError(f"is GLB version {version}; save it as version 2")
    if len(data) < length or length < 20:
        raise InputError(
            f"is cut short: {length:,} bytes announced, found {len(data):,}; export it again"
        )
    found: dict[int, bytes] = {}
    place = 12
    while place + 8 <= length:
        size, kind = struct.unpack_from("<II", data, place)
        found.setdefault(kind, data[place + 8 : place + 8 + size])
        place += 8 + size
    return _parsed(found.get(_JSON, b"")), found.get(_BINARY, b"")


def _parsed(text: bytes) -> dict[str, Any]:
    try:
        header = json.loads(text)
    except (ValueError, RecursionError):
        header = None
    if not isinstance(header, dict) or "asset" not in header:
        raise InputError("is not glTF: its header is damaged; export it again")
    return header


def _check(header: dict[str, Any]) -> None:
    asset = header["asset"]
    version = str(asset.get("version")) if isinstance(asset, dict) else "None"
    if not version.startswith("2."):
        raise InputError(f"is glTF version {version[:20]}; save it as version 2.0")
    for name in header.get("extensionsRequired", ()):
        if not str(name).startswith(("KHR_materials", "KHR_texture", "EXT_texture")):
            raise InputError(f"needs the glTF extension {name}; export it without compression")
    if any("sparse" in accessor for accessor in header.get("accessors", ())):
        raise InputError("holds sparse glTF accessors; export it without them")


def _buffer(item: dict[str, Any], chunk: bytes, folder: Path) -> bytes:
    """Bytes of a buffer, of a length divisible by four."""
    uri = item.get("uri")
    if uri is None:
        data = chunk
    elif uri.startswith("data:"):
        data = base64.b64decode(uri.partition(",")[2], validate=True)
    else:
        data = _beside(folder, urllib.parse.unquote(uri))
    if len(data) < item["byteLength"]:
        raise InputError(
            f"is cut short: a buffer of {item['byteLength']:,} bytes announced, "
            f"found {len(data):,}; export it again"
        )
    return data + b"\0" * (-len(data) % 4)


def _beside(folder: Path, name: str) -> bytes:
    try:
        return (folder / name).read_bytes()
    except OSError as problem:
        raise InputError(
            f"needs the file {name}, which cannot be opened ({problem.strerror}); "
            "keep them in one folder"
        ) from None


def _bare(header: dict[str, Any], buffers: list[bytes]) -> tuple[dict[str, Any], int]:
    """Header with geometry only, all buffers joined, and the number of sets left out."""
    starts = np.cumsum([0, *map(len, buffers)]).tolist()
    views = [
        view | {"buffer": 0, "byteOffset": starts[view["buffer"]] + view.get("byteOffset", 0)}
        for view in header.get("bufferViews", [])
    ]
    meshes = [_bare_mesh(number, mesh) for number, mesh in enumerate(header.get("meshes", []))]
    nodes = [{key: node[key] for key in _PLACE if key in node} for node in header.get("nodes", [])]
    if not all(_is_sound(node, len(meshes)) for node in nodes):
        raise _damaged()
    every = sum(len(mesh["primitives"]) for mesh in header.get("meshes", []))
    bare = {
        "asset": {"version": "2.0"},
        "scene": 0,
        "scenes": [{"nodes": _roots(header)}],
        "nodes": nodes,
        "meshes": meshes,
        "accessors": header.get("accessors", []),
        "bufferViews": views,
        "buffers": [{"byteLength": starts[-1]}],
    }
    return bare, every - sum(len(mesh["primitives"]) for mesh in meshes)


def _is_sound(node: dict[str, Any], meshes: int) -> bool:
    """Whether a node's mesh exists and its place is finite; the library would drop it if not."""
    place = [number for key in _PLACE[:4] for number in node.get(key, ())]
    return node.get("mesh", -1) < meshes and bool(np.isfinite(place).all())


def _bare_mesh(number: int, mesh: dict[str, Any]) -> dict[str, Any]:
    """Triangles of a mesh, called by its number."""
    kept = []
    for one in mesh["primitives"]:
        mode = one.get("mode", _TRIANGLES)
        if mode in (_STRIP, _FAN):
            raise InputError("holds strips or fans of triangles; export it with plain triangles")
        if mode == _TRIANGLES:
            kept.append({"attributes": {"POSITION": one["attributes"]["POSITION"]}})
            kept[-1] |= {"indices": one["indices"]} if "indices" in one else {}
    return {"name": str(number), "primitives": kept}


def _roots(header: dict[str, Any]) -> list[int]:
    """Nodes (numbers) that the scene shows, or all that no other holds."""
    if header.get("scenes"):
        return header["scenes"][header.get("scene", 0)].get("nodes", [])
    nodes = header.get("nodes", [])
    held = {child for node in nodes for child in node.get("children", [])}
    return [number for number in range(len(nodes)) if number not in held]


def _load(bare: dict[str, Any], data: bytes) -> Any:
    """Scene that the library makes of the bare file."""
    import trimesh

    text = json.dumps(bare).encode()
    text += b" " * (-len(text) % 4)
    chunks = struct.pack("<II", len(text), _JSON) + text
    chunks += struct.pack("<II", len(data), _BINARY) + data
    file = io.BytesIO(struct.pack("<III", _MAGIC, 2, 12 + len(chunks)) + chunks)
    try:
        with quiet():
            return trimesh.load(
                file, file_type="glb", force="scene", process=False, skip_materials=True
            )
    except Exception:
        raise _damaged() from None


def _meshes(scene: Any) -> Iterator[tuple[int, np.ndarray, np.ndarray, float]]:
    """Node, placed vertices, triangles and largest size of the numbers of each mesh, in order."""
    names = sorted(scene.graph.nodes_geometry, key=_node)
    for number, together in itertools.groupby(names, _node):
        vertices, faces, size = np.empty((0, 3)), [], 0.0
        for matrix, mesh in (scene.graph[name] for name in together):
            loaded = scene.geometry[mesh]
            faces.append(np.asarray(loaded.faces, dtype=np.int64) + len(vertices))
            places = np.asarray(loaded.vertices, dtype=np.float64)
            size = max(size, float(np.abs(places).max(initial=0.0)) * _scale(matrix))
            vertices = np.concatenate([vertices, places @ matrix[:3, :3].T + matrix[:3, 3]])
        yield number, vertices, np.concatenate(faces), size


def _node(name: str) -> int:
    """Number of a node, which the library may have given an ending for one of several meshes."""
    return int(name.split("_")[0])


def _scale(matrix: np.ndarray) -> float:
    return float(np.linalg.norm(matrix[:3, :3], 2))


def _leaf(header: dict[str, Any], number: int, vertices: np.ndarray, faces: np.ndarray) -> Leaf:
    nodes = header["nodes"]
    mesh = header["meshes"][nodes[number]["mesh"]]
    own = nodes[number].get("name") or mesh.get("name") or f"node {number}"
    return Leaf((*_above(nodes, number), str(own)), vertices, as_faces(faces))


def _above(nodes: list[dict[str, Any]], number: int) -> tuple[str, ...]:
    """Names of the nodes that hold a node, the outermost first."""
    parent = {child: k for k, node in enumerate(nodes) for child in node.get("children", [])}
    names: list[str] = []
    while number in parent and len(names) < len(nodes):
        number = parent[number]
        names.insert(0, str(nodes[number].get("name", "")))
    return tuple(names)
