"""What the user describes: named conductors and the medium around them."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np

from bem.errors import BemError, InputError
from bem.geometry.planes import AXES, NO_PLANES, Plane, Planes
from bem.geometry.surface import Surface
from bem.scene import checks
from bem.scene.placing import Place, place_or_refuse, rotation
from bem.scene.states import TERMINAL, check_wiring
from bem.units import metres_per

__all__ = ["Conductor", "Place", "Scene", "Source", "rotation"]

SHARPEST = 90.0
"""Largest crease angle in degrees: no surface turns smoothly by more from facet to facet."""
BODIES = ("solid", "shell")
"""What a closed surface may stand for: solid metal, or a hollow skin of metal."""


@dataclass(frozen=True)
class Source:
    """Where a conductor's surface came from, for the record.

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


@dataclass(frozen=True)
class Conductor:
    """One named conductor in metres, placed.

    Args:
        name: unique in its scene.
        surface: faces in metres.
        body: "solid" (a closed mesh is solid metal) or "shell" (only its faces are metal).
        source: where the surface came from.
        state: "terminal", "grounded" or "floating" (no net charge).
        node: conductors with one node are tied; None is a node of its own.
    """

    name: str
    surface: Surface
    body: str
    source: Source
    state: str = TERMINAL
    node: str | None = None


@dataclass
class Scene:
    """Conductors in one homogeneous medium, with or without grounded and mirror planes.

    Args:
        unit: unit of every length that the scene is given; required.
        relative_permittivity: of the surroundings.
        conductors: filled by ``add_conductor``.
        folder: where relative names of mesh files start; None is the current directory.
        planes: in metres, filled by ``set_ground_plane`` and ``add_mirror_plane``.

    Raises:
        UsageError: the unit is unknown.
        InputError: the permittivity is not a positive finite number.
    """

    unit: str
    relative_permittivity: float = 1.0
    conductors: list[Conductor] = field(default_factory=list)
    folder: Path | None = None
    planes: Planes = NO_PLANES

    def __post_init__(self) -> None:
        metres_per(self.unit)
        self.relative_permittivity = checks.positive(
            "relative_permittivity", self.relative_permittivity
        )

    def add_conductor(
        self,
        name: str,
        shape: Surface | None = None,
        *,
        mesh: str | Path | None = None,
        part: str | None = None,
        place: Place | None = None,
        body: str = "solid",
        unit: str | None = None,
        smooth: bool | None = None,
        crease_degrees: float | None = None,
        state: str = TERMINAL,
        node: str | None = None,
        split: bool = False,
    ) -> Scene:
        """Add a conductor from a shape or a mesh file; returns the scene itself.

        Args:
            name: unique in the scene.
            shape: faces in the scene's unit; or else
            mesh: a file of a kind in ``bem.geometry.reading.files.SUFFIXES``, and
            part: a named portion of it.
            place: scaled first, then turned about the origin, then shifted.
            body: "solid" (a closed surface is solid metal) or "shell" (hollow).
            unit: of the numbers in the mesh file, if not the scene's.
            smooth: True refines onto a smooth surface fitted to the facets, False takes the
                facets for the shape; left out, they are solved as they are, and the bar holds
                what a smooth surface would change.
            crease_degrees: edges that turn by more stay sharp, 40 if left out.
            state: "terminal" of the matrix, "grounded", or "floating" with no net charge.
            node: conductors with one node are tied, and have one state.
            split: each body in the mesh file is a conductor of its own, "NAME 1", "NAME 2", ...

        Raises:
            InputError: a value does not fit, or the file cannot be used.
            UsageError: the unit is unknown.
        """
        entry = entry_name(len(self.conductors) + 1, name)
        self._check_name(entry, name)
        checks.one_of(f"{entry}: body", body, BODIES)
        check_wiring(entry, (name, state, node), self.conductors)
        where = place_or_refuse(f"{entry}: place", place)
        checks.one_of(f"{entry}: split", split, (False, True))
        given = {"mesh": mesh, "shape": shape, "part": part, "unit": unit, "split": split or None}
        _check_choice(entry, given)
        try:
            if mesh is None:
                surface, source = self._from_shape(shape)
            else:
                surface, source = self._from_mesh(mesh, part, unit or self.unit)
            surface, source = _repaired(surface, source, body)
        except BemError as problem:
            raise type(problem)(f"{entry}: {problem}") from None
        if where != Place():
            surface = surface.placed(where.matrix, metres_per(self.unit) * np.array(where.shift))
        surface = _smoothing(entry, surface, smooth, crease_degrees)
        whole = Conductor(name, surface, body, source, state, node)
        return self._append(entry, _pieces(whole) if split else [whole])

    def _append(self, entry: str, conductors: list[Conductor]) -> Scene:
        for conductor in conductors:
            self._check_name(entry, conductor.name)
        self.conductors += conductors
        return self

    def set_ground_plane(
        self, *, x: float | None = None, y: float | None = None, z: float | None = None
    ) -> Scene:
        """Put an infinite plane at potential zero; returns the scene itself.

        All conductors must lie on one side of it. Give one coordinate, in the scene's unit.

        Raises:
            InputError: not one coordinate, there is a grounded plane, or a plane of that axis.
        """
        if self.planes.ground is not None:
            raise InputError("ground_plane: found a second one; a scene has at most one")
        plane = self._plane("ground_plane", {"x": x, "y": y, "z": z})
        self.planes = replace(self.planes, ground=plane)
        return self

    def add_mirror_plane(
        self, *, x: float | None = None, y: float | None = None, z: float | None = None
    ) -> Scene:
        """Add an infinite plane of symmetry; returns the scene itself.

        The mirror image of a body belongs to its conductor, and results are for the whole.
        Give one coordinate, in the scene's unit.

        Raises:
            InputError: not one coordinate, or there is a plane of that axis already.
        """
        number = len(self.planes.mirrors) + 1
        plane = self._plane(f"mirror_plane {number}", {"x": x, "y": y, "z": z})
        self.planes = replace(self.planes, mirrors=(*self.planes.mirrors, plane))
        return self

    def _plane(self, entry: str, given: dict[str, Any]) -> Plane:
        found = {key: value for key, value in given.items() if value is not None}
        if len(found) != 1:
            raise checks.refuse(entry, found, "one of x, y, z")
        [(key, value)] = found.items()
        at = metres_per(self.unit) * checks.number(f"{entry}: {key}", value)
        axis = AXES.index(key)
        if any(plane.axis == axis for plane in self.planes.all):
            raise InputError(
                f"{entry}: found a second plane normal to {key}; each axis has room for one"
            )
        return Plane(axis, at)

    def _check_name(self, entry: str, name: Any) -> None:
        checks.text(f"{entry}: name", name)
        for number, other in enumerate(self.conductors, 1):
            if other.name == name:
                raise InputError(f"{entry}: name: already that of conductor {number}; rename one")

    def _from_shape(self, shape: Any) -> tuple[Surface, Source]:
        from bem.geometry.arrays_in import tidy_surface

        surface, changes = tidy_surface(shape, metres_per(self.unit))
        return surface, Source(None, None, self.unit, changes=tuple(changes))

    def _from_mesh(self, mesh: Any, part: str | None, unit: str) -> tuple[Surface, Source]:
        from bem.geometry.reading.files import file_digest, read_surface

        if not isinstance(mesh, str | Path):
            raise checks.refuse("mesh", mesh, "a file name")
        path = Path(mesh) if self.folder is None else self.folder / mesh
        surface, changes = read_surface(path, metres_per(unit), part)
        return surface, Source(str(mesh), file_digest(path), unit, part, tuple(changes))


def _repaired(surface: Surface, source: Source, body: str) -> tuple[Surface, Source]:
    """Mend the faces as far as that is safe, and tell."""
    from bem.geometry.repair.repair import repair

    surface, changes = repair(surface, body == "solid", source.unit)
    return surface, replace(source, changes=(*source.changes, *changes))


def _pieces(whole: Conductor) -> list[Conductor]:
    """One conductor for each body of a surface."""
    from bem.geometry.split import split_bodies

    surfaces = split_bodies(whole.surface)
    return [
        replace(
            whole,
            name=f"{whole.name} {number}",
            surface=surface,
            source=replace(
                whole.source,
                changes=(*whole.source.changes, f"piece {number} of {len(surfaces)}"),
            ),
        )
        for number, surface in enumerate(surfaces, 1)
    ]


def entry_name(number: int, name: Any) -> str:
    """Name an entry as messages do: 'conductor 2 ("probe rod")'."""
    return f'conductor {number} ("{name}")' if isinstance(name, str) else f"conductor {number}"


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


def _check_choice(entry: str, given: dict[str, Any]) -> None:
    """Refuse a shape and a mesh together, neither, or a mesh's options without a mesh."""
    if given["shape"] is not None and given["mesh"] is not None:
        raise InputError(f"{entry}: found a shape and a mesh; give one of them")
    if given["shape"] is None and given["mesh"] is None:
        raise InputError(f"{entry}: mesh: missing; give the name of a mesh file, or a shape")
    for key in ("part", "unit", "split"):
        if given["mesh"] is None and given[key] is not None:
            raise InputError(f"{entry}: {key}: goes with a mesh file only; drop it for a shape")
    if given["part"] is not None:
        checks.text(f"{entry}: part", given["part"])
