"""The memory plan of a dense round, made before anything is allocated."""

from __future__ import annotations

import os
from dataclasses import dataclass

import numpy as np

from bem.errors import MemoryRefused

BYTES_PER_PAIR = 8 + 16 + 8
"""Operator, its tests in single precision, and the factor."""
SHARE_OF_FREE = 0.8


def available_bytes() -> int:
    """Memory that can be had without swapping, or all memory where the system does not say."""
    try:
        with open("/proc/meminfo", encoding="ascii") as lines:
            for line in lines:
                if line.startswith("MemAvailable:"):
                    return int(line.split()[1]) * 1024
    except OSError:
        pass
    try:
        return os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
    except (AttributeError, ValueError, OSError):
        return 4 * 1024**3


def readable(size: float) -> str:
    """Bytes as kB, MB or GB."""
    for unit, scale in (("GB", 1e9), ("MB", 1e6)):
        if size >= scale:
            return f"{size / scale:.3g} {unit}"
    return f"{size / 1e3:.3g} kB"


Count = int | tuple[int, int]


def _round_bytes(panels: Count) -> tuple[int, int]:
    """Bytes of a round while it is solved, and of what the next round may take over."""
    if isinstance(panels, int):
        return BYTES_PER_PAIR * panels**2, (BYTES_PER_PAIR - 8) * panels**2
    from bem.kernels.mixed_arrays import mixed_bytes

    metal, interfaces = panels
    matrices = mixed_bytes(metal, interfaces)
    return matrices + 8 * (metal + 3 * interfaces) ** 2, matrices


def count_of(conductor: np.ndarray) -> Count:
    """Number of panels whose owners (n,) are given, or of both kinds if some are interfaces."""
    metal = int((conductor >= 0).sum())
    return metal if metal == len(conductor) else (metal, len(conductor) - metal)


@dataclass(frozen=True)
class MemoryPlan:
    """Limit in bytes for the matrices of an extraction, or of several that go side by side."""

    limit: int
    scenes: int = 1

    @classmethod
    def of(cls, asked: int | None, scenes: int = 1) -> MemoryPlan:
        """The asked limit, or 80 % of what is free now."""
        free = int(asked) if asked is not None else int(SHARE_OF_FREE * available_bytes())
        return cls(free, scenes)

    def need(self, panels: Count, kept: Count = 0) -> int:
        """Bytes of a round of ``panels``, while the round before with ``kept`` is held.

        Either is a number of conductor panels, or that and the number of interface panels.
        """
        return self.scenes * (_round_bytes(panels)[0] + _round_bytes(kept)[1])

    def fits(self, panels: Count, kept: Count = 0) -> bool:
        """Whether the next round stays within the limit."""
        return self.need(panels, kept) <= self.limit

    def check_start(self, panels: Count) -> None:
        """Refuse a start that cannot fit.

        Raises:
            MemoryRefused: names the need, the limit and what to change.
        """
        if not self.fits(panels):
            number = panels if isinstance(panels, int) else sum(panels)
            raise MemoryRefused(
                f"the starting mesh of {number} panels needs {readable(self.need(panels))}, "
                f"the limit is {readable(self.limit)}: raise --memory, or use coarser "
                "facets on curved faces"
            )
