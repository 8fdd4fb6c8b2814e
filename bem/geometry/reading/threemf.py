"""3MF: objects with their names, placed as the build says, in the unit that the file states.

Read with the archive and XML readers of the standard library; the general mesh reader needs
two libraries more, and renames objects.
"""

from __future__ import annotations

import contextlib
import io
import zipfile
import zlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from xml.etree import ElementTree

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.assembly import Leaf, assembled
from bem.geometry.reading.cells import as_faces
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.text_numbers import numbers

_MODEL = "3d/3dmodel.model"
_UNITS = {
    "micron": ("um", 1.0),
    "millimeter": ("mm", 1.0),
    "centimeter": ("cm", 1.0),
    "inch": ("in", 1.0),
    "foot": ("in", 12.0),
    "meter": ("m", 1.0),
}
"""Units of the 3MF core specification, by the unit here and its number in one of them."""
_DEEP = 50
"""Objects are nested less deeply than this."""


@dataclass(frozen=True)
class _Link:
    """Another object, in a model file of the archive, and where it is placed."""

    model: str
    number: str
    matrix: np.ndarray


@dataclass(frozen=True)
class _Object:
    """An object of the file: a mesh, or others put together.

    Args:
        name: as the file gives it, or "".
        vertices: (v, 3), none if it has no mesh.
        triangles: (t, 3).
        components: the objects in it.
    """

    name: str
    vertices: np.ndarray
    triangles: np.ndarray
    components: list[_Link]


@dataclass(frozen=True)
class _Model:
    """What one model file of the archive holds: unit, objects by number, what is built."""

    unit: str
    objects: dict[str, _Object]
    items: list[_Link]


class _Archive:
    """Models of a 3MF archive, each read once."""

    def __init__(self, archive: zipfile.ZipFile) -> None:
        self._archive = archive
        self._names = {name.lower().lstrip("/"): name for name in archive.namelist()}
        self._models: dict[str, _Model] = {}

    def model(self, name: str) -> _Model:
        """Contents of a model file."""
        key = name.lower().lstrip("/")
        if key not in self._names:
            raise InputError(f"is not 3MF: it holds no {name}; export it again")
        if key not in self._models:
            self._models[key] = _read_model(self._archive.read(self._names[key]), key)
        return self._models[key]


def read_3mf(path: Path) -> MeshData:
    """Meshes of a 3MF file, one body for each that the build places.

    Raises:
        InputError: the file is damaged, or its unit is unknown.
        OSError: the file cannot be opened.
    """
    with _damage(), zipfile.ZipFile(io.BytesIO(path.read_bytes())) as opened:
        archive = _Archive(opened)
        model = archive.model(_MODEL)
        leaves = [leaf for item in model.items for leaf in _leaves(archive, item, ())]
    unit, factor = _UNITS[model.unit]
    lines = ["lengths in feet turned into inches"] if model.unit == "foot" else []
    scaled = [leaf._replace(vertices=leaf.vertices * factor) for leaf in leaves]
    return assembled(scaled, unit, lines)


@contextlib.contextmanager
def _damage() -> Iterator[None]:
    """Turn what the readers of archives and XML raise into one line."""
    try:
        yield
    except ElementTree.ParseError as problem:
        raise InputError(f"is 3MF with damaged XML ({problem}); export it again") from None
    except (KeyError, ValueError, OverflowError):
        raise InputError("is 3MF with damaged objects; export it again") from None
    except (zipfile.BadZipFile, zlib.error, EOFError, NotImplementedError, RuntimeError):
        raise InputError(
            "is not 3MF, or damaged: its archive cannot be read; export it again"
        ) from None


def _leaves(archive: _Archive, link: _Link, above: tuple[str, ...]) -> Iterator[Leaf]:
    """Meshes that a placed object holds."""
    if len(above) > _DEEP:
        raise InputError("is 3MF with objects that hold themselves; export it again")
    thing = archive.model(link.model).objects.get(link.number)
    if thing is None:
        raise InputError(f"places object {link.number}, which it lacks; export it again")
    names = (*above, thing.name or _nearest(above) or f"object {link.number}")
    if len(thing.triangles):
        places = thing.vertices @ link.matrix[:3] + link.matrix[3]
        yield Leaf(names, places, as_faces(thing.triangles))
    for inner in thing.components:
        for leaf in _leaves(archive, inner, (*above, thing.name)):
            yield leaf._replace(vertices=leaf.vertices @ link.matrix[:3] + link.matrix[3])


def _nearest(names: tuple[str, ...]) -> str:
    return next((name for name in reversed(names) if name), "")


def _read_model(data: bytes, key: str) -> _Model:
    root = ElementTree.fromstring(data)
    unit = root.get("unit", "millimeter")
    if unit not in _UNITS:
        raise InputError(f"is 3MF in the unit {unit[:30]!r}; known are {', '.join(_UNITS)}")
    objects = {thing.attrib["id"]: _object(thing, key) for thing in root.iterfind(".//{*}object")}
    return _Model(unit, objects, [_link(item, key) for item in root.iterfind(".//{*}item")])


def _object(thing: ElementTree.Element, key: str) -> _Object:
    places = [v.attrib[axis] for v in thing.iterfind(".//{*}vertex") for axis in "xyz"]
    corners = [
        t.attrib[corner] for t in thing.iterfind(".//{*}triangle") for corner in ("v1", "v2", "v3")
    ]
    return _Object(
        thing.get("name", "").strip(),
        numbers([word.encode() for word in places], float, "3MF").reshape(-1, 3),
        numbers([word.encode() for word in corners], int, "3MF").reshape(-1, 3),
        [_link(inner, key) for inner in thing.iterfind(".//{*}component")],
    )


def _link(thing: ElementTree.Element, key: str) -> _Link:
    """Object that an item or a component places; its transform has four rows of three."""
    model = next((v for k, v in thing.attrib.items() if k.endswith("}path")), key)
    given = thing.get("transform", "1 0 0 0 1 0 0 0 1 0 0 0").encode().split()
    return _Link(model, thing.attrib["objectid"], numbers(given, float, "3MF").reshape(4, 3))
