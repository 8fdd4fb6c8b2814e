"""Capacitance matrices of real 3D conductors, with an error bar on every entry.

The public names are loaded on first use, so that ``import bem`` costs next to nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

from bem.geometry.shapes.kinds import SHAPES

__version__ = "0.1.0"

_HOME = {
    "Scene": "bem.scene.scene",
    "Place": "bem.scene.scene",
    "load_scene": "bem.scene.scene_file",
    "Surface": "bem.geometry.surface",
    "ArcTo": "bem.geometry.shapes.steps",
    **SHAPES,
    "extract": "bem.extraction.extract",
    "compare": "bem.extraction.compare",
    "CapacitanceResult": "bem.results.result",
    "Comparison": "bem.results.comparison",
    "load_result": "bem.results.result",
    "BemError": "bem.errors",
    "UsageError": "bem.errors",
    "InputError": "bem.errors",
    "GeometryError": "bem.errors",
    "SolutionError": "bem.errors",
    "ToleranceNotReached": "bem.errors",
    "MemoryRefused": "bem.errors",
    "ChangeExceeded": "bem.errors",
    "EPS0": "bem.units",
}

__all__ = ["__version__", *sorted(_HOME)]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'bem' has no attribute {name!r}")
    value = getattr(import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return __all__
