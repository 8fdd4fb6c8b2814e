"""Parts of surfaces by what lies on both sides: metal, a dielectric, or the surroundings."""

from __future__ import annotations

from dataclasses import dataclass

from bem.geometry.surface import Surface

METAL = -1
"""Stands for a region inside solid metal, where there is no field."""
SURROUNDINGS = 0
"""Number of the outer medium among the regions; dielectric m (from 0) is region m + 1."""
INTERFACE = -1
"""Stands for the conductor of a part between two dielectrics."""


@dataclass(frozen=True)
class Part:
    """Faces with one region behind all of them and one in front.

    Args:
        surface: faces whose normals, counterclockwise, lead from ``back`` to ``front``.
        conductor: index of the conductor that they bound, or INTERFACE.
        back: region behind, or METAL.
        front: region in front; never METAL.
        body: index of the body that they were cut from, conductors first, then dielectrics.
    """

    surface: Surface
    conductor: int
    back: int
    front: int
    body: int
