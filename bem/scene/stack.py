"""Flat layers of infinite extent: a half-space of another medium, or a stack of layers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

from bem.errors import InputError
from bem.geometry.planes import AXES, Planes
from bem.scene import checks
from bem.scene.material import Material, material_of
from bem.units import metres_per

SIDES = tuple(f"{side}_{axis}" for axis in AXES for side in ("below", "above"))
"""Keys that say where a half-space is filled."""
STARTS = tuple(f"from_{axis}" for axis in AXES)
"""Keys that say where the lowest plane of a stack is."""


class Stack(NamedTuple):
    """Flat layers from the lowest to the highest, the outermost of them half-spaces.

    Args:
        axis: 0, 1 or 2, normal to the layers.
        planes: (k,) ascending coordinates of the planes between the layers, metres.
        materials: (k + 1,) of the layers; behind a grounded plane it has no meaning.
        grounded_below: whether the lowest plane is at potential zero.
        grounded_above: whether the highest plane is.
    """

    axis: int
    planes: tuple[float, ...]
    materials: tuple[Material, ...]
    grounded_below: bool = False
    grounded_above: bool = False

    @property
    def grounded(self) -> tuple[float, ...]:
        """Coordinates of the planes at potential zero, metres."""
        below = self.planes[:1] if self.grounded_below else ()
        return below + (self.planes[-1:] if self.grounded_above else ())


@dataclass(frozen=True)
class HalfSpace:
    """Everything on one side of a plane is of another medium than the surroundings.

    Args:
        axis: 0, 1 or 2, normal to the plane.
        at: coordinate of the plane, metres.
        above: whether the side of larger coordinates is filled.
        material: of that side.
    """

    axis: int
    at: float
    above: bool
    material: Material

    def stack(self, surroundings: Material) -> Stack:
        """Describe it as layers; ``surroundings`` fill the other side."""
        both = (self.material, surroundings)
        return Stack(self.axis, (self.at,), both[::-1] if self.above else both)


@dataclass(frozen=True)
class FlatLayers:
    """Layers of infinite extent, the lowest first; the surroundings go on beyond them.

    Args:
        axis: 0, 1 or 2, normal to the layers.
        at: coordinate of the lowest plane, metres.
        thickness: of each layer, metres.
        materials: of each layer.
        grounded_below: whether the lowest plane is at potential zero.
        grounded_above: whether the highest plane is.
    """

    axis: int
    at: float
    thickness: tuple[float, ...]
    materials: tuple[Material, ...]
    grounded_below: bool = False
    grounded_above: bool = False

    @property
    def planes(self) -> tuple[float, ...]:
        """Coordinates of all planes, ascending, metres."""
        found = [self.at]
        for thickness in self.thickness:
            found.append(found[-1] + thickness)
        return tuple(found)

    def stack(self, surroundings: Material) -> Stack:
        """Describe them with the ``surroundings`` below and above."""
        return Stack(
            self.axis,
            self.planes,
            (surroundings, *self.materials, surroundings),
            self.grounded_below,
            self.grounded_above,
        )


def half_space_of(entry: str, unit: str, given: dict[str, Any], medium: Material) -> HalfSpace:
    """Check where a half-space is.

    Args:
        entry: how messages name it.
        unit: of the coordinate.
        given: coordinate by its key, one of ``SIDES``; those that are None do not count.
        medium: that fills it.

    Raises:
        InputError: not one coordinate.
    """
    key, at = _one(entry, given, SIDES)
    side, axis = key.split("_")
    return HalfSpace(AXES.index(axis), metres_per(unit) * at, side == "above", medium)


def flat_layers_of(
    entry: str, unit: str, given: dict[str, Any], layers: dict[str, Any]
) -> FlatLayers:
    """Check a stack of layers.

    Args:
        entry: how messages name it.
        unit: of the lengths.
        given: coordinate of the lowest plane by its key, one of ``STARTS``.
        layers: thickness, relative_permittivity, and loss_tangent and conductivity or None:
            lists with one number for each layer; and the flags grounded_below, grounded_above.

    Raises:
        InputError: a value does not fit, or the lists are of different length.
    """
    key, at = _one(entry, given, STARTS)
    metres = metres_per(unit)
    thickness = _numbers(f"{entry}: thickness", layers["thickness"])
    for k, value in enumerate(thickness):
        checks.positive(f"{entry}: thickness[{k}]", value)
    grounded = [
        checks.flag(f"{entry}: {side}", layers[side])
        for side in ("grounded_below", "grounded_above")
    ]
    return FlatLayers(
        AXES.index(key.removeprefix("from_")),
        metres * at,
        tuple(metres * value for value in thickness),
        _materials(entry, layers, len(thickness)),
        *grounded,
    )


def check_planes(entry: str, planes: Planes, flat: HalfSpace | FlatLayers | None) -> None:
    """Refuse planes that do not go with flat layers.

    Args:
        entry: how messages name what was given last.
        planes: grounded and mirror planes of the scene.
        flat: its layers, or None.

    Raises:
        InputError: a plane is parallel to the layers, or there are grounded ones of both kinds.
    """
    if flat is None:
        return
    kind = "half_space" if isinstance(flat, HalfSpace) else "flat_layers"
    grounded = isinstance(flat, FlatLayers) and (flat.grounded_below or flat.grounded_above)
    axis = AXES[flat.axis]
    if planes.ground is not None and (grounded or planes.ground.axis == flat.axis):
        raise InputError(
            f"{entry}: found ground_plane and {kind} normal to {axis}; leave out ground_plane, and "
            "write flat_layers with grounded_below or grounded_above"
        )
    if any(mirror.axis == flat.axis for mirror in planes.mirrors):
        raise InputError(
            f"{entry}: found mirror_plane and {kind}, both normal to {axis}; leave out one of them"
        )


def flat_record(flat: HalfSpace | FlatLayers | None) -> dict[str, Any]:
    """A half-space or layers as plain values in metres, for records; empty without them."""
    if flat is None:
        return {}
    axis = AXES[flat.axis]
    if isinstance(flat, HalfSpace):
        side = "above" if flat.above else "below"
        return {"half_space": {f"{side}_{axis}_m": flat.at, **flat.material.record()}}
    layers = [
        {"thickness_m": thickness, **material.record()}
        for thickness, material in zip(flat.thickness, flat.materials, strict=True)
    ]
    grounded = {"grounded_below": flat.grounded_below, "grounded_above": flat.grounded_above}
    return {"flat_layers": {f"from_{axis}_m": flat.at, **grounded, "layers": layers}}


def _materials(entry: str, layers: dict[str, Any], number: int) -> tuple[Material, ...]:
    """One medium for each layer, from lists of their numbers."""
    rows = []
    for key in ("relative_permittivity", "loss_tangent", "conductivity"):
        column: Sequence[Any] = [None] * number
        if layers[key] is not None:
            column = _numbers(f"{entry}: {key}", layers[key])
        if len(column) != number:
            raise InputError(
                f"{entry}: {key}: found {len(column)} for {number} of thickness; "
                "give one for each layer, the lowest first"
            )
        rows.append(column)
    return tuple(
        material_of(f"{entry}: layer {k}: ", *numbers)
        for k, numbers in enumerate(zip(*rows, strict=True), 1)
    )


def _one(entry: str, given: dict[str, Any], keys: tuple[str, ...]) -> tuple[str, float]:
    """Find the only key that is given, and its number."""
    found = {key: value for key, value in given.items() if value is not None}
    if len(found) != 1:
        raise checks.refuse(entry, found, f"one of {', '.join(keys)}")
    [(key, value)] = found.items()
    return key, checks.number(f"{entry}: {key}", value)


def _numbers(where: str, value: Any) -> list[float]:
    """Read a list of numbers, at least one."""
    items = None if isinstance(value, str | dict) or not hasattr(value, "__iter__") else list(value)
    if not items:
        raise checks.refuse(where, value, "a list of numbers, one for each layer")
    return [checks.number(f"{where}[{k}]", item) for k, item in enumerate(items)]
