"""The one interface through which the solver sees the integral operator."""

from __future__ import annotations

from typing import Protocol

import numpy as np


class Operator(Protocol):
    """Single-layer operator, tested with the panels' indicator and with their test functions."""

    @property
    def size(self) -> int:
        """Number of panels n."""

    def apply(self, density: np.ndarray) -> np.ndarray:
        """Potential integrated over each panel, (n, k), from densities (n, k)."""

    def tests(self, density: np.ndarray) -> np.ndarray:
        """Potential integrated against each test function, (4, n, k)."""

    def near_rows(self, rows: np.ndarray) -> np.ndarray:
        """Rows (r, n) of the operator, for preconditioners and checks."""

    @property
    def far_error(self) -> float:
        """Relative error of the energy of charges of one sign that approximations may cause."""

    def magnitude(self, left: np.ndarray, right: np.ndarray) -> np.ndarray:
        """(k, m) energies without cancellation, |left|^T A |right|."""

    def asymmetry(self, density: np.ndarray) -> np.ndarray:
        """(k, k) energy that the choice between both rows of each pair decides."""
