"""STEP assemblies through Gmsh and its CAD kernel, as an extra: bodies become facets.

A facet of a curved surface spans at most 1/48 of a turn, and leaves a curved edge by at most
1/200 of the edge's length. Gmsh keeps one state for a process, so it runs in a process of its
own: safe beside other threads, and beside a Gmsh that the caller is using.
"""

from __future__ import annotations

import importlib.util
import json
import math
import re
import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np

from bem.errors import InputError
from bem.geometry.reading import step_facets
from bem.geometry.reading.assembly import Leaf, assembled
from bem.geometry.reading.cells import as_faces
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.reading.step_names import completed
from bem.units import METRES_PER

FACETS_PER_TURN = 48
CHORD = 0.005
"""A chord leaves a curved edge by at most this part of the edge's length."""

_UNIT = re.compile(
    rb"SI_UNIT\s*\(\s*(\$|\.\w+\.)\s*,\s*\.METRE\.\s*\)|CONVERSION_BASED_UNIT\s*\(\s*('\w+)",
    re.IGNORECASE,
)
_TEXT = re.compile(rb"'[^']*'|/\*.*?\*/", re.DOTALL)
_USED, _DEFINED = re.compile(rb"#(\d+)"), re.compile(rb"#(\d+)\s*=")
_NAMES = {
    "$": "m", ".CENTI.": "cm", ".MILLI.": "mm", ".MICRO.": "um", ".NANO.": "nm",
    "'INCH": "in", "'MIL": "mil",
}  # fmt: skip
"""Lengths as STEP files call them, by the unit here."""
_CONVERTED = ("'INCH", "'MIL", "'FOOT")


def read_step(path: Path) -> MeshData:
    """Facets of a STEP file; each solid, and each shell outside solids, is a body by its name.

    Raises:
        InputError: the extra is missing, or the file is damaged or holds no body.
        OSError: the file cannot be opened.
    """
    data = path.read_bytes()
    _check(data)
    unit = _unit(data)
    if importlib.util.find_spec("gmsh") is None:
        raise InputError(
            "is a STEP file, which needs an extra: pip install 'bem-capacitance[step]'"
        )
    leaves = _leaves(path, data, 1e-3 / METRES_PER[unit])
    if not leaves:
        raise InputError("is STEP without a solid or a surface; export it again")
    return assembled(leaves, unit)


def _check(data: bytes) -> None:
    """Refuse what the CAD kernel would read in part without a word."""
    if b"ISO-10303-21" not in data[:1000]:
        raise InputError("is not STEP: it does not start with ISO-10303-21; export it again")
    if b"END-ISO-10303-21" not in data:
        raise InputError("is cut short: it does not end with END-ISO-10303-21; export it again")
    bare = _TEXT.sub(b"", data)
    lost = set(_USED.findall(bare)) - set(_DEFINED.findall(bare))
    if lost:
        number = min(map(int, lost))
        raise InputError(f"is damaged: it uses #{number}, which it does not hold; export it again")


def _unit(data: bytes) -> str:
    """Unit of the file's lengths; mm if it states several, or one that is unknown here."""
    found = {(metric or other).decode().upper() for metric, other in _UNIT.findall(data)}
    lengths = found.intersection(_CONVERTED) or {name for name in found if name[0] != "'"}
    return _NAMES.get(lengths.pop(), "mm") if len(lengths) == 1 else "mm"


def _leaves(path: Path, data: bytes, per_millimetre: float) -> list[Leaf]:
    """Bodies of a file, their coordinates times a factor."""
    with tempfile.TemporaryDirectory() as folder:
        _run(path, folder)
        names = completed(json.loads((Path(folder) / "names.json").read_text()), data)
        with np.load(Path(folder) / "arrays.npz") as arrays:
            order = np.argsort(arrays["tags"])
            tags, places = arrays["tags"][order], per_millimetre * arrays["places"][order]
            corners = [np.searchsorted(tags, arrays[f"body{k}"]) for k in range(len(names))]
    return [
        Leaf(_levels(name, number), places[np.unique(triangles)], _renumbered(triangles))
        for number, (name, triangles) in enumerate(zip(names, corners, strict=True), 1)
    ]


def _renumbered(triangles: np.ndarray) -> np.ndarray:
    """Triangles as faces of the nodes that they use."""
    _, place = np.unique(triangles, return_inverse=True)
    return as_faces(place.reshape(-1, 3).astype(np.int64))


def _levels(name: str, number: int) -> tuple[str, ...]:
    """Names of the assemblies and of the body in them; Gmsh joins them by strokes."""
    levels = tuple(name.removeprefix("Shapes/").split("/")) if name else ()
    return levels or (f"body {number}",)


def _run(path: Path, folder: str) -> None:
    """Let a process of its own write the facets into a folder."""
    angle, script = 2.0 * math.pi / FACETS_PER_TURN, step_facets.__file__
    done = subprocess.run(
        [sys.executable, "-P", script, str(path), folder, str(angle), str(CHORD)],
        capture_output=True,
        check=False,
    )
    if done.returncode == step_facets.NO_LIBRARY:
        reason = " ".join(done.stderr.decode(errors="replace").split())
        raise InputError(f"is a STEP file, but Gmsh cannot be loaded ({reason})")
    if done.returncode != 0:
        raise InputError("cannot be read as STEP: its bodies are damaged; export it again")
