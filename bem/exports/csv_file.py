"""Results in CSV files, for spreadsheets and scripts.

One header line, then one line per entry, row by row, then one per row sum:

    "quantity","row","column","capacitance_F","error_F"
    "maxwell","rod","rod",1.2e-11,3e-15
    "maxwell","rod","wall",-4.1e-12,2e-15
    ...
    "row sum","rod","",7.9e-12,4e-15

Values are in farad and exact (the shortest digits that give the same float64); text is quoted,
numbers are not; a number that is not finite is left empty. UTF-8, lines end with a line feed.
"""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Iterator
from os import PathLike

from bem.exports.atomic import write_file
from bem.results.result import CapacitanceResult

HEADER = ("quantity", "row", "column", "capacitance_F", "error_F")


def save_csv(result: CapacitanceResult, path: str | PathLike[str]) -> None:
    """Write the matrix and the row sums of ``result``.

    Raises:
        InputError: the file cannot be written.
    """
    text = io.StringIO(newline="")
    writer = csv.writer(text, quoting=csv.QUOTE_NONNUMERIC, lineterminator="\n")
    writer.writerow(HEADER)
    writer.writerows(_entries(result))
    writer.writerows(_row_sums(result))
    write_file(path, text.getvalue().encode("utf-8", "backslashreplace"))


def _entries(result: CapacitanceResult) -> Iterator[tuple[str | float, ...]]:
    for i, row in enumerate(result.conductors):
        for j, column in enumerate(result.conductors):
            value, bar = result.capacitance[i, j], result.error[i, j]
            yield "maxwell", row, column, _number(value), _number(bar)


def _row_sums(result: CapacitanceResult) -> Iterator[tuple[str | float, ...]]:
    for i, row in enumerate(result.conductors):
        yield "row sum", row, "", _number(result.row_sum[i]), _number(result.row_sum_error[i])


def _number(value: float) -> float | str:
    return float(value) if math.isfinite(value) else ""
