"""Capacitance and conductance at one frequency as an entry of a record, and back."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from bem.results.lossy import Lossy

_MATRICES = {
    "capacitance": "capacitance_F",
    "error": "error_F",
    "conductance": "conductance_S",
    "conductance_error": "conductance_error_S",
}
_ROWS = {
    "row_sum": "row_sum_F",
    "row_sum_error": "row_sum_error_F",
    "row_conductance": "row_conductance_S",
    "row_conductance_error": "row_conductance_error_S",
}


def lossy_record(entry: Lossy) -> dict[str, Any]:
    """One frequency as plain names and values."""
    arrays = {key: getattr(entry, name) for name, key in (_MATRICES | _ROWS).items()}
    return {
        "frequency_Hz": entry.frequency,
        "converged": bool(entry.converged),
        "panels": entry.panels,
        **arrays,
    }


def lossy_of(
    entry: dict[str, Any], n: int, floats: Callable[[Any, tuple[int, ...]], np.ndarray]
) -> Lossy:
    """Return what ``lossy_record`` described.

    Args:
        entry: of the record.
        n: number of conductors.
        floats: makes an array of a shape.

    Raises:
        KeyError: an entry is missing.
        ValueError: an array has another shape.
    """
    matrices = {name: floats(entry[key], (n, n)) for name, key in _MATRICES.items()}
    rows = {name: floats(entry[key], (n,)) for name, key in _ROWS.items()}
    return Lossy(
        frequency=float(entry["frequency_Hz"]),
        converged=bool(entry["converged"]),
        panels=int(entry["panels"]),
        **matrices,
        **rows,
    )
