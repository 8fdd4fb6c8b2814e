"""Results in CSV files, for spreadsheets and scripts.

One header line, then one line per entry, row by row, then one per row sum:

    "quantity","row","column","capacitance_F","error_F"
    "maxwell","rod","rod",1.2e-11,3e-15
    "maxwell","rod","wall",-4.1e-12,2e-15
    ...
    "row sum","rod","",7.9e-12,4e-15

With frequencies, three columns more follow, empty in these lines, and then the same lines for each
frequency, with conductances beside the capacitances:

    "quantity","row","column","capacitance_F","error_F","frequency_Hz","conductance_S","conductance_error_S"
    "maxwell","rod","rod",1.2e-11,3e-15,"","",""
    ...
    "maxwell","rod","rod",1.2e-11,4e-15,50.0,3.1e-11,5e-15

Values are in farad and siemens, and exact (the shortest digits that give the same float64); text
is quoted, numbers are not; a number that is not finite is left empty. UTF-8, lines end with a line
feed.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator
from os import PathLike
from typing import Any

import numpy as np

from bem.exports.atomic import write_file
from bem.results.lossy import Lossy
from bem.results.result import CapacitanceResult

HEADER = ("quantity", "row", "column", "capacitance_F", "error_F")
MORE = ("frequency_Hz", "conductance_S", "conductance_error_S")
"""Columns that follow if there are frequencies."""


def save_csv(result: CapacitanceResult, path: str | PathLike[str]) -> None:
    """Write the matrix and the row sums of ``result``.

    Raises:
        InputError: the file cannot be written.
    """
    text = io.StringIO(newline="")
    writer = csv.writer(text, quoting=csv.QUOTE_NONNUMERIC, lineterminator="\n")
    more = ("",) * len(MORE) if result.lossy else ()
    writer.writerow(HEADER + (MORE if result.lossy else ()))
    writer.writerows((*line, *more) for line in _entries(result))
    writer.writerows((*line, *more) for line in _row_sums(result))
    for entry in result.lossy:
        writer.writerows(_at_frequency(result.conductors, entry))
    write_file(path, text.getvalue().encode("utf-8", "backslashreplace"))


def _entries(result: CapacitanceResult) -> Iterator[tuple[str | float, ...]]:
    for i, row in enumerate(result.conductors):
        for j, column in enumerate(result.conductors):
            value, bar = result.capacitance[i, j], result.error[i, j]
            yield "maxwell", row, column, _number(value), _number(bar)


def _row_sums(result: CapacitanceResult) -> Iterator[tuple[str | float, ...]]:
    for i, row in enumerate(result.conductors):
        yield "row sum", row, "", _number(result.row_sum[i]), _number(result.row_sum_error[i])


def _at_frequency(names: tuple[str, ...], entry: Lossy) -> Iterator[tuple[str | float, ...]]:
    """All lines of one frequency."""
    places = [(i, j) for i in range(len(names)) for j in range(len(names))]
    arrays = (entry.capacitance, entry.error, entry.conductance, entry.conductance_error)
    for i, j in places:
        yield "maxwell", names[i], names[j], *_columns(entry, arrays, (i, j))
    rows = (entry.row_sum, entry.row_sum_error, entry.row_conductance, entry.row_conductance_error)
    for i, name in enumerate(names):
        yield "row sum", name, "", *_columns(entry, rows, i)


def _columns(entry: Lossy, arrays: tuple[np.ndarray, ...], at: Any) -> list[float | str]:
    """Capacitance, its bar, the frequency, conductance, its bar."""
    values = [_number(array[at]) for array in arrays]
    return [*values[:2], entry.frequency, *values[2:]]


def _number(value: float) -> float | str:
    return float(value) if math.isfinite(value) else ""
