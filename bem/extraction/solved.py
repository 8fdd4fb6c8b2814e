"""What a solved round offers to the loop, whatever was solved."""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np

from bem.extraction.solution import Sums
from bem.kernels.arrays import PanelArrays
from bem.panels.mesh import Mesh


class Solved(Protocol):
    """Densities on n panels of k conductors, and what they fail to satisfy."""

    @property
    def mesh(self) -> Mesh:
        """The panels."""

    @property
    def panels(self) -> PanelArrays:
        """Arrays of the panels."""

    @property
    def operator(self) -> Any:
        """What was solved; it may serve the next round."""

    @property
    def conductor(self) -> np.ndarray:
        """(n,) owner of each panel, negative on interfaces."""

    @property
    def density(self) -> np.ndarray:
        """(n, k) free charge density of each panel with one conductor at unit potential."""

    @property
    def residual(self) -> np.ndarray:
        """(4, n, k) residual against each test over the root of its energy."""

    @property
    def dual(self) -> np.ndarray:
        """(4, n, k) the same of the transposed system."""

    def potential(self, points: np.ndarray, column: int) -> np.ndarray:
        """(m,) potential at points (m, 3) with conductor ``column`` at 1 and the others at 0."""

    def sums(self) -> Sums:
        """What the round says of every entry."""

    def shape_energy(self, weight: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """(n,) effects of moves to the true surface, normal and of rims, on weighted entries."""

    def facet_shares(self) -> np.ndarray:
        """(k,) relative change of each L_ii if the facets of i became what they may stand for."""
