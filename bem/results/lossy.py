"""Capacitance and conductance at one frequency, where media have losses.

With the complex permittivity eps' - j eps'' the matrix is C - j G / (2 pi f): the currents into
the conductors are I = (G + j 2 pi f C) V, for phasors of exp(j 2 pi f t).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True, eq=False)
class Lossy:
    """Maxwell matrices of capacitance and conductance at one frequency, with error bars.

    Args:
        frequency: Hz.
        capacitance: (n, n) F.
        error: (n, n) F, bar of each entry.
        conductance: (n, n) S; diagonal entries positive, the others negative or zero.
        conductance_error: (n, n) S.
        row_sum: (n,) F, to the surroundings and to all that is grounded.
        row_sum_error: (n,) F.
        row_conductance: (n,) S, the same of the conductance.
        row_conductance_error: (n,) S.
        converged: whether every bar, of C and of G / (2 pi f), is below the tolerance times
            the root of the moduli of both diagonal entries.
        panels: number of panels of its last round.
    """

    frequency: float
    capacitance: np.ndarray
    error: np.ndarray
    conductance: np.ndarray
    conductance_error: np.ndarray
    row_sum: np.ndarray
    row_sum_error: np.ndarray
    row_conductance: np.ndarray
    row_conductance_error: np.ndarray
    converged: bool
    panels: int

    @property
    def admittance(self) -> np.ndarray:
        """(n, n) S, G + j 2 pi f C."""
        return self.conductance + 2j * np.pi * self.frequency * self.capacitance
