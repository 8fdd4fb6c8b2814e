"""Bodies made from numbers; each shape is loaded on first use (``kinds.py`` lists them)."""

from __future__ import annotations

from importlib import import_module
from typing import Any

from bem.geometry.shapes.kinds import SHAPES

_HOME = {**SHAPES, "ArcTo": "bem.geometry.shapes.steps"}

__all__ = sorted(_HOME)


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'bem.geometry.shapes' has no attribute {name!r}")
    return getattr(import_module(_HOME[name]), name)
