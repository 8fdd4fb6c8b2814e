"""What a body of a scene is drawn as: a shape or a mesh file, its place, how facets are taken."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, NamedTuple, Protocol

import numpy as np

from bem.errors import BemError, GeometryError, InputError
from bem.geometry.surface import Surface
from bem.geometry.wording import counted, point_text
from bem.scene import checks
from bem.scene.placing import Place, place_or_refuse
from bem.units import metres_per

SHARPEST = 90.0
"""Largest crease angle in degrees: no surface turns smoothly by more from facet to facet."""


@dataclass(frozen=True)
class Source:
    """Where a body's surface came from, for the record.

    Args:
        file: file name as given, or None for a shape made in Python.
        sha256: hex digest of the file's bytes, or None.
        unit: unit of the numbers in the file.
        part: named portion of the file, or None for all of it.
        changes: what reading changed, one line each (welded vertices, dropped faces, ...).
    """

    file: str | None
    sha256: str | None
    unit: str
    part: str | None = None
    changes: tuple[str, ...] = ()


class Drawn(NamedTuple):
    """One body in metres, placed; ``name`` has a number at its end if a file was split."""

    name: str
    surface: Surface
    source: Source


@dataclass(frozen=True)
class Drawing:
    """What a user says of a body, as given; see ``Scene.add_conductor``."""

    shape: Any
    mesh: Any
    part: Any
    unit: Any
    place: Any
    smooth: Any
    crease_degrees: Any
    split: Any


class Desk(NamedTuple):
    """Where drawings are read: unit of the scene, and folder of its files or None."""

    unit: str
    folder: Path | None


class Named(Protocol):
    """A body as far as its name goes."""

    @property
    def name(self) -> str:
        """Its name."""


def entry_name(number: int, name: Any, kind: str = "conductor") -> str:
    """Name an entry as messages do: 'conductor 2 ("probe rod")'."""
    return f'{kind} {number} ("{name}")' if isinstance(name, str) else f"{kind} {number}"


def check_name(entry: str, name: Any, others: dict[str, Sequence[Named]]) -> None:
    """Refuse a name that is none, or that a body has already.

    Args:
        entry: how messages name the body.
        name: found.
        others: bodies of the scene by their kind.

    Raises:
        InputError: the message names the body that has it.
    """
    checks.text(f"{entry}: name", name)
    for kind, bodies in others.items():
        for number, other in enumerate(bodies, 1):
            if other.name == name:
                raise InputError(f"{entry}: name: already that of {kind} {number}; rename one")


def drawn(entry: tuple[str, str], drawing: Drawing, desk: Desk, kind: str) -> list[Drawn]:
    """Read, mend and place what a body is drawn as.

    Args:
        entry: how messages name the body, and its name.
        drawing: what its user says.
        desk: unit and folder of the scene.
        kind: "solid", "shell", or "dielectric", which is a solid that must be closed.

    Returns:
        One body, or each one in the file if it is split.

    Raises:
        InputError: a value does not fit, or the file cannot be used.
        UsageError: the unit is unknown.
    """
    where, name = entry
    place = place_or_refuse(f"{where}: place", drawing.place)
    checks.one_of(f"{where}: split", drawing.split, (False, True))
    _check_choice(where, drawing)
    try:
        surface, source = _repaired(*_read(drawing, desk), kind)
    except BemError as problem:
        raise type(problem)(f"{where}: {problem}") from None
    if place != Place():
        surface = surface.placed(place.matrix, metres_per(desk.unit) * np.array(place.shift))
    surface = _smoothing(where, surface, drawing.smooth, drawing.crease_degrees)
    whole = Drawn(name, surface, source)
    return _pieces(whole) if drawing.split else [whole]


def _check_choice(entry: str, drawing: Drawing) -> None:
    """Refuse a shape and a mesh together, neither, or a mesh's options without a mesh."""
    if drawing.shape is not None and drawing.mesh is not None:
        raise InputError(f"{entry}: found a shape and a mesh; give one of them")
    if drawing.shape is None and drawing.mesh is None:
        raise InputError(f"{entry}: mesh: missing; give the name of a mesh file, or a shape")
    given = {"part": drawing.part, "unit": drawing.unit, "split": drawing.split or None}
    for key, value in given.items():
        if drawing.mesh is None and value is not None:
            raise InputError(f"{entry}: {key}: goes with a mesh file only; drop it for a shape")
    if drawing.part is not None:
        checks.text(f"{entry}: part", drawing.part)


def _read(drawing: Drawing, desk: Desk) -> tuple[Surface, Source]:
    if drawing.mesh is None:
        return _from_shape(drawing.shape, desk.unit)
    return _from_mesh(drawing, desk)


def _from_shape(shape: Any, unit: str) -> tuple[Surface, Source]:
    from bem.geometry.arrays_in import tidy_surface

    surface, changes = tidy_surface(shape, metres_per(unit))
    return surface, Source(None, None, unit, changes=tuple(changes))


def _from_mesh(drawing: Drawing, desk: Desk) -> tuple[Surface, Source]:
    from bem.geometry.reading.files import file_digest, read_surface

    mesh, unit = drawing.mesh, drawing.unit or desk.unit
    if not isinstance(mesh, str | Path):
        raise checks.refuse("mesh", mesh, "a file name")
    path = Path(mesh) if desk.folder is None else desk.folder / mesh
    surface, changes = read_surface(path, metres_per(unit), drawing.part)
    return surface, Source(str(mesh), file_digest(path), unit, drawing.part, tuple(changes))


def _repaired(surface: Surface, source: Source, kind: str) -> tuple[Surface, Source]:
    """Mend the faces as far as that is safe, and tell."""
    from bem.geometry.repair.repair import repair

    surface, changes = repair(surface, kind != "shell", source.unit)
    if kind == "dielectric":
        _check_closed(surface, source.unit)
    return surface, replace(source, changes=(*source.changes, *changes))


def _check_closed(surface: Surface, unit: str) -> None:
    """Refuse a surface that bounds no volume."""
    from bem.geometry.topology import edges_of, open_edges
    from bem.geometry.weld import WELD, weld

    faces = surface if surface.curve is None else weld(surface)[0]
    edges = edges_of(faces.triangles)
    found = open_edges(faces.vertices, edges, 2.0 * WELD * faces.extent)
    if len(found):
        place = point_text(faces.vertices[edges.ends[found[0], 0]], unit)
        raise GeometryError(
            f"open, {counted(len(found), 'open edge')}, the first at {place}; "
            "a dielectric fills a volume: close the surface there and export it again"
        )


def _smoothing(entry: str, surface: Surface, smooth: Any, crease_degrees: Any) -> Surface:
    """Surface with what its user says of its facets."""
    if smooth is not None:
        surface = replace(surface, smooth=checks.flag(f"{entry}: smooth", smooth))
    if crease_degrees is not None:
        degrees = checks.positive(f"{entry}: crease_degrees", crease_degrees)
        if degrees > SHARPEST:
            raise checks.refuse(
                f"{entry}: crease_degrees", degrees, f"an angle of at most {SHARPEST:g}"
            )
        surface = replace(surface, crease=math.radians(degrees))
    return surface


def _pieces(whole: Drawn) -> list[Drawn]:
    """Take a surface apart into its bodies."""
    from bem.geometry.split import split_bodies

    surfaces = split_bodies(whole.surface)
    return [
        Drawn(
            f"{whole.name} {number}",
            surface,
            replace(
                whole.source,
                changes=(*whole.source.changes, f"piece {number} of {len(surfaces)}"),
            ),
        )
        for number, surface in enumerate(surfaces, 1)
    ]
