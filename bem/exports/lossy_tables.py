"""Capacitance and conductance at each frequency, as tables."""

from __future__ import annotations

import math

import numpy as np

from bem.exports.layout import ELSEWHERE, WIDEST_MATRIX, Row, Table, Unit
from bem.results.lossy import Lossy
from bem.results.result import CapacitanceResult
from bem.units import siemens_unit

MOST_FREQUENCIES = 8
"""More frequencies than this are not printed, only saved."""


def lossy_tables(result: CapacitanceResult, unit: Unit) -> list[Table]:
    """Two tables for each frequency; with many conductors their diagonals alone."""
    tables = []
    for entry in result.lossy[:MOST_FREQUENCIES]:
        conduction = _siemens(entry)
        tables += [
            _table(result, unit, entry, (entry.capacitance, entry.error), "capacitance matrix C"),
            _table(
                result,
                conduction,
                entry,
                (entry.conductance, entry.conductance_error),
                "conductance matrix G",
            ),
        ]
    left_out = len(result.lossy) - MOST_FREQUENCIES
    if left_out > 0:
        tables[-1] = _noted(tables[-1], f"{left_out} more frequencies; {ELSEWHERE}")
    return tables


def _noted(table: Table, note: str) -> Table:
    return Table(table.title, table.heads, table.rows, note)


def _siemens(entry: Lossy) -> Unit:
    largest = float(np.abs(np.diagonal(entry.conductance)).max(initial=0.0))
    name, size = siemens_unit(largest)
    return Unit(name, round(math.log10(size)))


def _table(
    result: CapacitanceResult,
    unit: Unit,
    entry: Lossy,
    pair: tuple[np.ndarray, np.ndarray],
    what: str,
) -> Table:
    value, bar = pair
    names = result.conductors
    title = f"At {frequency_text(entry.frequency)}: {what} in {unit.name}"
    if len(names) <= WIDEST_MATRIX:
        rows = [Row((n,), tuple(map(unit.reading, value[i], bar[i]))) for i, n in enumerate(names)]
        return Table(title, names, tuple(rows))
    rows = [Row((n,), (unit.reading(value[i, i], bar[i, i]),)) for i, n in enumerate(names)]
    return Table(f"{title}, diagonal", ("",), tuple(rows), ELSEWHERE)


def frequency_text(frequency: float) -> str:
    """Write a frequency with the unit that suits it, as in "50 Hz" or "2.4 GHz"."""
    for name, size in (("GHz", 1e9), ("MHz", 1e6), ("kHz", 1e3)):
        if frequency >= size:
            return f"{frequency / size:.6g} {name}"
    return f"{frequency:.6g} Hz"
