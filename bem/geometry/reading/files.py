"""Mesh files in: all kinds become surfaces in metres, welded and checked.

Files are loaded raw, without any merging or reordering by a library; what is changed
afterwards is our own doing (see ``bem.geometry.weld``) and comes back as lines.
"""

from __future__ import annotations

import contextlib
import hashlib
import importlib
import math
from collections.abc import Iterator
from dataclasses import replace
from functools import lru_cache
from pathlib import Path
from typing import NamedTuple

from bem.errors import InputError
from bem.geometry.reading.general import KINDS
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.surface import Surface
from bem.geometry.weld import weld
from bem.geometry.wording import listed
from bem.units import METRES_PER, metres_per

_READERS = {
    ".stl": ("stl", "read_stl"),
    ".msh": ("msh", "read_msh"),
    ".obj": ("obj", "read_obj"),
    ".ply": ("ply", "read_ply"),
    ".off": ("off", "read_off"),
    ".3mf": ("threemf", "read_3mf"),
    ".glb": ("gltf", "read_gltf"),
    ".gltf": ("gltf", "read_gltf"),
    ".step": ("step", "read_step"),
    ".stp": ("step", "read_step"),
} | dict.fromkeys(KINDS, ("general", "read_general"))
"""Module and function that read each kind of file, by the ending of the name."""

MOST_NAMED = 6
"""Parts that a line lists by name."""

SUFFIXES = tuple(_READERS)
"""Kinds of mesh files that are read, by the ending of the name."""


def read_surface(
    path: str | Path, metres_per_unit: float, part: str | None = None
) -> tuple[Surface, list[str]]:
    """Surface of a mesh file, or of a named part of it.

    Args:
        path: a file with one of the endings in ``SUFFIXES``.
        metres_per_unit: length of the file's unit in metres.
        part: a named portion of the file, such as a solid of a text STL or a physical group
            of an MSH; None takes all.

    Returns:
        The surface in metres, and what reading changed, one line each.

    Raises:
        InputError: the file is missing, unreadable, damaged or empty, has no such part, or
            states another unit.
    """
    with _named(path):
        mesh = _open(path)
        _check_unit(mesh.unit, metres_per_unit)
        faces = mesh.faces_of(part)
        surface, changes = weld(Surface(mesh.vertices * metres_per_unit, faces))
    surface = replace(surface, rounding=mesh.rounding * metres_per_unit)
    return surface, [*_together(mesh, part), *mesh.changes_of(part), *changes]


def _together(mesh: MeshData, part: str | None) -> list[str]:
    """Say that parts were taken as one, where the file does not say that they are bodies."""
    if part is not None or mesh.bodies or len(mesh.parts) < 2:
        return []
    names = list(mesh.parts)
    more = f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else ""
    return [f"parts {listed(names[:MOST_NAMED])}{more} taken together; give one as part to pick it"]


def _check_unit(stated: str | None, metres_per_unit: float) -> None:
    """Refuse a length other than that of the unit that the file itself states."""
    if stated is None or math.isclose(metres_per(stated), metres_per_unit, rel_tol=1e-9):
        return
    same = (name for name, metres in METRES_PER.items() if math.isclose(metres, metres_per_unit))
    raise InputError(
        f"its lengths are in {stated}, as the file itself or its format states, but "
        f"{next(same, f'{metres_per_unit:g} m')} was asked for; give this conductor "
        f'unit = "{stated}" (on the command line: --unit {stated})'
    )


class Bodies(NamedTuple):
    """Parts of a mesh file that stand for a body each.

    Args:
        names: of the parts; none in an STL file, or if the file names no bodies.
        outside: number of faces in none of them.
    """

    names: tuple[str, ...]
    outside: int


def bodies_in(path: str | Path) -> Bodies:
    """Bodies that a mesh file names.

    Raises:
        InputError: the file is missing, unreadable, damaged or empty.
    """
    with _named(path):
        mesh = _open(path)
    return Bodies(mesh.bodies, mesh.outside_bodies)


def file_digest(path: str | Path) -> str:
    """SHA-256 of a file's bytes, in hexadecimal.

    Raises:
        InputError: the file cannot be opened.
    """
    with _named(path), Path(path).open("rb") as data:
        return hashlib.file_digest(data, "sha256").hexdigest()


@contextlib.contextmanager
def _named(path: str | Path) -> Iterator[None]:
    """Put the file's name before messages about it."""
    try:
        yield
    except InputError as problem:
        raise InputError(f"{path}: {problem}") from None
    except FileNotFoundError:
        raise InputError(f"{path}: no such file") from None
    except OSError as problem:
        raise InputError(f"{path}: cannot be opened ({problem.strerror})") from None


def _open(path: str | Path) -> MeshData:
    path = Path(path).absolute()
    if path.suffix.lower() not in SUFFIXES:
        found = path.suffix or "no ending"
        raise InputError(f"unknown kind of mesh file ({found}); known are {', '.join(SUFFIXES)}")
    state = path.stat()
    if path.is_file() and state.st_size == 0:
        raise InputError("is empty (0 bytes)")
    return _parsed(path, (state.st_mtime_ns, state.st_size))


@lru_cache(maxsize=2)
def _parsed(path: Path, _stamp: tuple[int, int]) -> MeshData:
    """Contents of a file; kept for a while, since one file may hold many conductors."""
    module, reader = _READERS[path.suffix.lower()]
    return getattr(importlib.import_module(f"bem.geometry.reading.{module}"), reader)(path).check()
