"""Surfaces given as arrays in Python: checked at the door, in metres inside."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.geometry.reading.mesh_data import MeshData
from bem.geometry.surface import NO_CORNER, Surface
from bem.geometry.weld import weld


def tidy_surface(shape: Any, metres_per_unit: float) -> tuple[Surface, list[str]]:
    """Check a surface made in Python and bring it to metres.

    Faces of a shape that knows its true surface stay as they are, others are welded.

    Returns:
        The surface in metres, and what was changed, one line each.

    Raises:
        InputError: no ``Surface``, or arrays that describe none.
    """
    if not isinstance(shape, Surface):
        raise InputError(f"shape: found {type(shape).__name__}, needs a Surface such as bem.box()")
    vertices = _array(shape.vertices, "vertices", 3, "f")
    faces = _array(shape.faces, "faces", 4, "iu").astype(np.int64)
    if len(faces) and faces[:, :3].min() <= NO_CORNER:
        raise InputError("shape: faces: only the fourth corner may be -1, in a triangle")
    try:
        MeshData(vertices, faces).check()
    except InputError as problem:
        raise InputError(f"shape: {problem}") from None
    surface = replace(shape, vertices=vertices, faces=faces)
    metres = surface.placed(metres_per_unit * np.eye(3), np.zeros(3))
    return (metres, []) if shape.curve is not None else weld(metres)


def _array(value: Any, name: str, columns: int, kinds: str) -> np.ndarray:
    array = np.asarray(value)
    if array.dtype.kind == "i" and kinds == "f":
        array = array.astype(float)
    if array.ndim != 2 or array.shape[1] != columns or array.dtype.kind not in kinds:
        numbers = "numbers" if kinds == "f" else "whole numbers"
        raise InputError(
            f"shape: {name}: found {array.dtype} of shape {array.shape}, "
            f"needs {numbers} of shape (n, {columns})"
        )
    return array
