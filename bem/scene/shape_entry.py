"""Shapes in scene files.

The entry ``shape`` of a conductor stands for a call of the shape of that name in Python, with the
same arguments, and lengths in the scene's unit. Arcs are tables of ``via`` and ``to``; shapes that
others are made of may say where they go, as conductors do::

    shape = { kind = "ring", major = 2.0, minor = 0.5 }
    shape = { kind = "plate", lx = 4, ly = 3, holes = [{ center = [1, 0], radius = 0.5 }] }
    shape = { kind = "revolve", steps = [[0, -1], { via = [1, 0], to = [0, 1] }] }

    [conductor.shape]
    kind = "union"
    of = [
        { kind = "sphere", radius = 1.0 },
        { kind = "cylinder", radius = 0.2, length = 2.0, place = { shift = [0, 0, 1.5] } },
    ]
"""

from __future__ import annotations

import inspect
from collections.abc import Callable
from importlib import import_module
from typing import Any

import numpy as np

from bem.errors import BemError, InputError
from bem.geometry.shapes.kinds import SHAPES
from bem.geometry.shapes.steps import ArcTo
from bem.geometry.surface import Surface
from bem.geometry.wording import shown
from bem.scene import checks
from bem.scene.placing import place_of, place_or_refuse

PARTS = "of"
"""Argument that holds shapes."""


def shape_of(where: str, entry: Any, placed: bool = False) -> Surface:
    """Surface that an entry describes, in the scene's unit.

    Args:
        where: the entry, such as 'conductor 2 ("ring"): shape'.
        entry: what was found there.
        placed: whether the entry may say where the shape goes, as one of several.

    Raises:
        InputError: the entry is no table, a key is unknown or missing, or a value does not fit.
    """
    maker = _maker(where, entry)
    parameters = inspect.signature(maker).parameters
    known = ("kind", *parameters, *(("place",) if placed else ()))
    given = dict(checks.table(where, entry, known))
    del given["kind"]
    place = place_or_refuse(f"{where}.place", _place(where, given.pop("place", None)))
    for key, parameter in parameters.items():
        if parameter.default is parameter.empty and key not in given:
            raise InputError(f"{where}.{key}: missing")
    values = {key: _argument(f"{where}.{key}", key, value) for key, value in given.items()}
    try:
        surface = maker(**values)
    except BemError as problem:
        raise InputError(_placed_message(where, str(problem), entry["kind"])) from None
    return surface.placed(place.matrix, np.array(place.shift))


def _maker(where: str, entry: Any) -> Callable[..., Surface]:
    """Function of the shape that the entry names."""
    if not isinstance(entry, dict):
        raise checks.refuse(where, entry, 'a table such as { kind = "sphere", radius = 1.0 }')
    if "kind" not in entry:
        raise InputError(f"{where}.kind: missing; known are {', '.join(SHAPES)}")
    kind = checks.text(f"{where}.kind", entry["kind"])
    if kind not in SHAPES:
        raise InputError(f"{where}.kind: found {shown(kind)}{checks.near(kind, SHAPES)}")
    maker: Callable[..., Surface] = getattr(import_module(SHAPES[kind]), kind)
    return maker


def _placed_message(where: str, problem: str, kind: str) -> str:
    """Message with its place in front; it starts with an argument or with the kind of shape."""
    whole = f"{kind}: "
    if problem.startswith(whole):
        return f"{where}: {problem.removeprefix(whole)}"
    return f"{where}.{problem}"


def _place(where: str, value: Any) -> Any:
    return None if value is None else place_of(f"{where}.place", value)


def _argument(where: str, key: str, value: Any) -> Any:
    """Value of an argument as Python would be given it."""
    if key != PARTS:
        return _value(where, value)
    if not isinstance(value, list):
        raise checks.refuse(where, value, "a list of shapes")
    return [shape_of(f"{where}[{k}]", part, placed=True) for k, part in enumerate(value)]


def _value(where: str, value: Any) -> Any:
    if isinstance(value, list):
        return [_value(f"{where}[{k}]", item) for k, item in enumerate(value)]
    if not isinstance(value, dict) or not {"via", "to"} & value.keys():
        return value
    arc = checks.table(where, value, ("via", "to"))
    for key in ("via", "to"):
        if key not in arc:
            raise InputError(f"{where}.{key}: missing")
    return ArcTo(arc["via"], arc["to"])
