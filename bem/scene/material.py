"""What a medium is made of: permittivity and loss, as its user states them."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from typing import Any

from bem.errors import InputError
from bem.scene import checks
from bem.units import EPS0

MATERIAL_KEYS = ("relative_permittivity", "loss_tangent", "conductivity")
"""Keys of scene files that describe a medium."""


@dataclass(frozen=True)
class Material:
    """A homogeneous medium.

    Args:
        relative_permittivity: its real part, positive.
        loss_tangent: ratio of the imaginary part to it, the same at every frequency; or None.
        conductivity: S/m, which adds ``conductivity / (2 pi f)`` to the imaginary part; or None.
    """

    relative_permittivity: float = 1.0
    loss_tangent: float | None = None
    conductivity: float | None = None

    @property
    def lossy(self) -> bool:
        """Whether it has any loss."""
        return bool(self.loss_tangent or self.conductivity)

    def at(self, frequency: float) -> complex:
        """Complex relative permittivity under exp(j 2 pi f t).

        Args:
            frequency: f, Hz, positive.
        """
        tangent = self.loss_tangent or 0.0
        flow = (self.conductivity or 0.0) / (2.0 * math.pi * frequency * EPS0)
        return complex(self.relative_permittivity, -self.relative_permittivity * tangent - flow)

    def __str__(self) -> str:
        text = f"relative permittivity {self.relative_permittivity:g}"
        if self.loss_tangent is not None:
            text += f", loss tangent {self.loss_tangent:g}"
        if self.conductivity is not None:
            text += f", conductivity {self.conductivity:g} S/m"
        return text

    def record(self) -> dict[str, float]:
        """Values that are stated, as plain numbers."""
        found = {
            "relative_permittivity": self.relative_permittivity,
            "loss_tangent": self.loss_tangent,
            "conductivity_S_per_m": self.conductivity,
        }
        return {key: value for key, value in found.items() if value is not None}


VACUUM = Material()
"""No matter at all."""


def material_of(where: str, permittivity: Any, tangent: Any, conductivity: Any) -> Material:
    """Check the numbers of a medium.

    Args:
        where: start of messages, such as 'dielectric 1 ("cover"): '.
        permittivity: relative, above 0.
        tangent: loss tangent of 0 or more, or None.
        conductivity: S/m, 0 or more, or None.

    Raises:
        InputError: a number does not fit, or there are two kinds of loss.
    """
    real = checks.positive(f"{where}relative_permittivity", permittivity)
    if tangent is not None and conductivity is not None:
        start = re.sub(r"\.$", ": ", where)
        raise InputError(f"{start}found loss_tangent and conductivity; give one of them")
    if tangent is not None:
        tangent = checks.not_negative(f"{where}loss_tangent", tangent)
    if conductivity is not None:
        conductivity = checks.not_negative(f"{where}conductivity", conductivity)
    return Material(real, tangent, conductivity)


def below_vacuum(what: str, material: Material) -> list[str]:
    """Warn of a permittivity that no passive medium has in a static field."""
    value = material.relative_permittivity
    if value >= 1.0:
        return []
    return [f"{what}: relative permittivity {value:g} is below that of vacuum, 1; check the number"]
