"""What the user describes: named conductors, dielectrics, and the medium around them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.planes import AXES, NO_PLANES, Plane, Planes
from bem.geometry.surface import Surface
from bem.scene import checks
from bem.scene.drawing import Desk, Drawing, Source, check_name, drawn, entry_name
from bem.scene.material import Material, material_of
from bem.scene.placing import Place, rotation
from bem.scene.stack import (
    FlatLayers,
    HalfSpace,
    Stack,
    check_planes,
    flat_layers_of,
    half_space_of,
)
from bem.scene.states import TERMINAL, check_wiring
from bem.units import metres_per

__all__ = ["Conductor", "Dielectric", "Place", "Scene", "Source", "entry_name", "rotation"]

BODIES = ("solid", "shell")
"""What a closed surface may stand for: solid metal, or a hollow skin of metal."""
COINCIDENCE = 1e-6
"""Faces closer than this part of the scene's size coincide, unless the user says otherwise."""
COINCIDENCE_RANGE = (1e-9, 1e-3)
"""Least and most that the user may say."""


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


@dataclass(frozen=True)
class Dielectric:
    """One named dielectric body in metres, placed.

    Args:
        name: unique in its scene, among conductors too.
        surface: closed, faces in metres.
        source: where the surface came from.
        relative_permittivity: positive.
        loss_tangent: the same at every frequency, or None.
        conductivity: S/m, or None.
    """

    name: str
    surface: Surface
    source: Source
    relative_permittivity: float
    loss_tangent: float | None = None
    conductivity: float | None = None

    @property
    def material(self) -> Material:
        """Its medium."""
        return Material(self.relative_permittivity, self.loss_tangent, self.conductivity)


@dataclass
class Scene:
    """Conductors and dielectrics in their surroundings, with or without infinite planes.

    Where bodies overlap, a conductor counts before a dielectric, and a later dielectric before
    an earlier one.

    Args:
        unit: unit of every length that the scene is given; required.
        relative_permittivity: of the surroundings.
        conductors: filled by ``add_conductor``.
        folder: where relative names of mesh files start; None is the current directory.
        planes: in metres, filled by ``set_ground_plane`` and ``add_mirror_plane``.
        dielectrics: filled by ``add_dielectric``.
        loss_tangent: of the surroundings, or None.
        conductivity: of the surroundings, S/m, or None.
        coincidence: faces of two bodies closer than this part of the scene's size coincide.
        half_space: filled by ``set_half_space``.
        flat_layers: filled by ``set_flat_layers``.

    Raises:
        UsageError: the unit is unknown.
        InputError: the permittivity is not a positive finite number, or another number of the
            surroundings does not fit.
    """

    unit: str
    relative_permittivity: float = 1.0
    conductors: list[Conductor] = field(default_factory=list)
    folder: Path | None = None
    planes: Planes = NO_PLANES
    dielectrics: list[Dielectric] = field(default_factory=list)
    loss_tangent: float | None = None
    conductivity: float | None = None
    coincidence: float = COINCIDENCE
    half_space: HalfSpace | None = None
    flat_layers: FlatLayers | None = None

    def __post_init__(self) -> None:
        metres_per(self.unit)
        found = material_of("", self.relative_permittivity, self.loss_tangent, self.conductivity)
        self.relative_permittivity = found.relative_permittivity
        self.loss_tangent, self.conductivity = found.loss_tangent, found.conductivity
        self.coincidence = coincidence_of(self.coincidence)

    @property
    def bodies(self) -> list[Conductor | Dielectric]:
        """Conductors, then dielectrics."""
        return [*self.conductors, *self.dielectrics]

    @property
    def size(self) -> float:
        """Largest side of the bounding box of all bodies, metres."""
        bounds = np.array([body.surface.bounds for body in self.bodies])
        return float((bounds[:, 1].max(axis=0) - bounds[:, 0].min(axis=0)).max())

    @property
    def surroundings(self) -> Material:
        """Medium around all bodies."""
        return Material(self.relative_permittivity, self.loss_tangent, self.conductivity)

    @property
    def stack(self) -> Stack | None:
        """Flat layers of infinite extent, or None."""
        flat = self.half_space or self.flat_layers
        return None if flat is None else flat.stack(self.surroundings)

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
        drawing = Drawing(shape, mesh, part, unit, place, smooth, crease_degrees, split)
        pieces = drawn((entry, name), drawing, Desk(self.unit, self.folder), body)
        found = [Conductor(*p[:2], body, p.source, state, node) for p in pieces]
        for one in found:
            self._check_name(entry, one.name)
        self.conductors += found
        return self

    def add_dielectric(
        self,
        name: str,
        shape: Surface | None = None,
        *,
        relative_permittivity: float,
        mesh: str | Path | None = None,
        part: str | None = None,
        place: Place | None = None,
        unit: str | None = None,
        smooth: bool | None = None,
        crease_degrees: float | None = None,
        split: bool = False,
        loss_tangent: float | None = None,
        conductivity: float | None = None,
    ) -> Scene:
        """Add a dielectric body from a closed shape or mesh file; returns the scene itself.

        Bodies may touch, enclose and overlap each other: a conductor counts before a
        dielectric, and a later dielectric before an earlier one.

        Args:
            name: unique in the scene, among conductors too.
            shape: faces in the scene's unit; or else
            relative_permittivity: above 0.
            mesh: a file of a kind in ``bem.geometry.reading.files.SUFFIXES``, and
            part: a named portion of it.
            place: scaled first, then turned about the origin, then shifted.
            unit: of the numbers in the mesh file, if not the scene's.
            smooth: as for conductors.
            crease_degrees: as for conductors.
            split: each body in the mesh file is a dielectric of its own, "NAME 1", ...
            loss_tangent: 0 or more, the same at every frequency; or else
            conductivity: S/m, 0 or more.

        Raises:
            InputError: a value does not fit, or the file cannot be used.
            GeometryError: the surface is open; the message says where.
            UsageError: the unit is unknown.
        """
        entry = entry_name(len(self.dielectrics) + 1, name, "dielectric")
        self._check_name(entry, name)
        medium = material_of(f"{entry}: ", relative_permittivity, loss_tangent, conductivity)
        drawing = Drawing(shape, mesh, part, unit, place, smooth, crease_degrees, split)
        pieces = drawn((entry, name), drawing, Desk(self.unit, self.folder), "dielectric")
        found = [Dielectric(*piece, **vars(medium)) for piece in pieces]
        for one in found:
            self._check_name(entry, one.name)
        self.dielectrics += found
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
        self._set_planes("ground_plane", replace(self.planes, ground=plane))
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
        entry = f"mirror_plane {len(self.planes.mirrors) + 1}"
        plane = self._plane(entry, {"x": x, "y": y, "z": z})
        self._set_planes(entry, replace(self.planes, mirrors=(*self.planes.mirrors, plane)))
        return self

    def _set_planes(self, entry: str, planes: Planes) -> None:
        check_planes(entry, planes, self.half_space or self.flat_layers)
        self.planes = planes

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

    def set_half_space(
        self,
        *,
        relative_permittivity: float,
        below_x: float | None = None,
        above_x: float | None = None,
        below_y: float | None = None,
        above_y: float | None = None,
        below_z: float | None = None,
        above_z: float | None = None,
        loss_tangent: float | None = None,
        conductivity: float | None = None,
    ) -> Scene:
        """Fill one side of an infinite plane with another medium; returns the scene itself.

        Give one coordinate, in the scene's unit. The surroundings fill the other side.

        Raises:
            InputError: not one coordinate, a number does not fit, or there are layers already.
        """
        entry = "half_space"
        self._check_no_layers(entry)
        medium = material_of(f"{entry}: ", relative_permittivity, loss_tangent, conductivity)
        given = {"below_x": below_x, "above_x": above_x, "below_y": below_y}
        given |= {"above_y": above_y, "below_z": below_z, "above_z": above_z}
        found = half_space_of(entry, self.unit, given, medium)
        check_planes(entry, self.planes, found)
        self.half_space = found
        return self

    def set_flat_layers(
        self,
        *,
        thickness: Sequence[float],
        relative_permittivity: Sequence[float],
        from_x: float | None = None,
        from_y: float | None = None,
        from_z: float | None = None,
        grounded_below: bool = False,
        grounded_above: bool = False,
        loss_tangent: Sequence[float] | None = None,
        conductivity: Sequence[float] | None = None,
    ) -> Scene:
        """Put a stack of layers of infinite extent; returns the scene itself.

        Args:
            thickness: of each layer, the lowest first, in the scene's unit.
            relative_permittivity: of each layer.
            from_x: coordinate of the lowest plane of layers normal to x; or else
            from_y: of layers normal to y; or else
            from_z: of layers normal to z.
            grounded_below: whether the lowest plane is at potential zero.
            grounded_above: whether the highest plane is.
            loss_tangent: of each layer; or else
            conductivity: of each layer, S/m.

        Raises:
            InputError: not one coordinate, lists of different length, a number that does not
                fit, or there are layers or a grounded plane already.
        """
        entry = "flat_layers"
        self._check_no_layers(entry)
        layers: dict[str, Any] = {
            "thickness": thickness,
            "relative_permittivity": relative_permittivity,
        }
        layers |= {"grounded_below": grounded_below, "grounded_above": grounded_above}
        layers |= {"loss_tangent": loss_tangent, "conductivity": conductivity}
        given = {"from_x": from_x, "from_y": from_y, "from_z": from_z}
        found = flat_layers_of(entry, self.unit, given, layers)
        check_planes(entry, self.planes, found)
        self.flat_layers = found
        return self

    def _check_no_layers(self, entry: str) -> None:
        """Refuse a second stack."""
        for key, found in (("half_space", self.half_space), ("flat_layers", self.flat_layers)):
            if found is not None:
                raise InputError(
                    f"{entry}: found a {key} too; describe all layers by one flat_layers"
                )

    def _check_name(self, entry: str, name: Any) -> None:
        check_name(entry, name, {"conductor": self.conductors, "dielectric": self.dielectrics})


def coincidence_of(value: Any) -> float:
    """Check which part of the scene's size still counts as contact.

    Raises:
        InputError: no number, or out of range.
    """
    return checks.within("coincidence", value, *COINCIDENCE_RANGE)
