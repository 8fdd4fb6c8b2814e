"""Comparisons in files: JSON with everything but the panels, CSV for spreadsheets.

CSV: one header line, then one line per entry, row by row, then one per row sum, as results
have it. Values are in farad and exact.
"""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterator
from os import PathLike
from typing import Any

from bem.exports.atomic import write_file
from bem.exports.comparison_tables import Line, entry, row_sum
from bem.exports.plain import plain, take_non_finite
from bem.exports.record import to_record
from bem.results.comparison import Comparison

FORMAT = "bem comparison"
SCHEMA_VERSION = 1
HEADER = (
    "quantity",
    "row",
    "column",
    "before_F",
    "before_error_F",
    "after_F",
    "after_error_F",
    "change_F",
    "change_error_F",
)


def save_json(found: Comparison, path: str | PathLike[str]) -> None:
    """Save a comparison; the layout is described in comparison.schema.json.

    Raises:
        InputError: the file cannot be written.
    """
    lines = [f"{json.dumps(key)}: {_encoded(value)}" for key, value in record_of(found).items()]
    data = ("{\n" + ",\n".join(lines) + "\n}\n").encode("utf-8", "backslashreplace")
    write_file(path, data)


def _encoded(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def record_of(found: Comparison) -> dict[str, Any]:
    """Everything but the panels as JSON values; both results as their own files have them."""
    own = {
        "format": FORMAT,
        "schema_version": SCHEMA_VERSION,
        "version": found.version,
        "conductors": found.conductors,
        "change_F": found.change,
        "change_error_F": found.change_error,
        "row_sum_change_F": found.row_sum_change,
        "row_sum_change_error_F": found.row_sum_change_error,
        "relative_change": found.relative_change,
        "tolerance": found.tolerance,
        "change_accuracy": found.change_accuracy,
        "correlated": bool(found.correlated),
        "converged": bool(found.converged),
        "stopped_by": found.stopped_by,
        "panels": found.panels,
        "notes": found.notes,
        "seconds": found.seconds,
    }
    tidy, lost = take_non_finite(plain(own), [])
    tidy["non_finite"] = lost
    sides = {"before": found.before, "after": found.after}
    return {**tidy, **{name: to_record(side, arrays=False) for name, side in sides.items()}}


def save_csv(found: Comparison, path: str | PathLike[str]) -> None:
    """Write entries and row sums before and after, and their changes.

    Raises:
        InputError: the file cannot be written.
    """
    text = io.StringIO(newline="")
    writer = csv.writer(text, quoting=csv.QUOTE_NONNUMERIC, lineterminator="\n")
    writer.writerow(HEADER)
    writer.writerows(_rows(found))
    write_file(path, text.getvalue().encode("utf-8", "backslashreplace"))


def _rows(found: Comparison) -> Iterator[tuple[str | float, ...]]:
    count = range(len(found.conductors))
    for i in count:
        for line in (entry(found, i, j) for j in count):
            yield ("maxwell", *line.names, *_cells(line))
    for i in count:
        yield ("row sum", found.conductors[i], "", *_cells(row_sum(found, i)))


def _cells(line: Line) -> Iterator[float | str]:
    for measured in (line.before, line.after, line.change):
        for number in measured:
            yield float(number) if math.isfinite(number) else ""
