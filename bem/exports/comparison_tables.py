"""What a reader of a comparison wants to see: before, after and change, line by line."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from bem.exports.digits import UNKNOWN, Reading
from bem.exports.layout import ELSEWHERE, WIDEST_MATRIX, Row, Table, Unit
from bem.exports.tables import LONGEST_LIST, unit_of
from bem.results.comparison import Comparison
from bem.units import farad_unit


class Measured(NamedTuple):
    """A value and its bar, farad."""

    value: float
    bar: float


class Line(NamedTuple):
    """One entry or one row sum, with the names of its row and column."""

    names: tuple[str, ...]
    before: Measured
    after: Measured
    change: Measured


def entry(found: Comparison, i: int, j: int) -> Line:
    """The entry of row i and column j."""
    before, after = found.before, found.after
    return Line(
        (found.conductors[i], found.conductors[j]),
        Measured(before.capacitance[i, j], before.error[i, j]),
        Measured(after.capacitance[i, j], after.error[i, j]),
        Measured(found.change[i, j], found.change_error[i, j]),
    )


def row_sum(found: Comparison, i: int) -> Line:
    """The sum of row i."""
    before, after = found.before, found.after
    return Line(
        (found.conductors[i],),
        Measured(before.row_sum[i], before.row_sum_error[i]),
        Measured(after.row_sum[i], after.row_sum_error[i]),
        Measured(found.row_sum_change[i], found.row_sum_change_error[i]),
    )


def tables_of(found: Comparison) -> list[Table]:
    """Lay out entries and row sums; of many only those that changed most."""
    count = len(found.conductors)
    first, second = np.triu_indices(count)
    pairs = list(zip(first.tolist(), second.tolist(), strict=True))
    most = len(pairs) if count <= WIDEST_MATRIX else LONGEST_LIST
    size = np.abs(found.change / found.scale)[first, second]
    entries = [entry(found, *pairs[k]) for k in _largest(size, most)]
    part = np.abs(found.row_sum_change) / np.diagonal(found.scale)
    sums = [row_sum(found, i) for i in _largest(part, LONGEST_LIST)]
    title = "Change of the Maxwell capacitance matrix C (Q = C V)"
    return [
        _table(found, title, entries, len(pairs) - len(entries)),
        _table(found, "Change of the row sums (to the surroundings)", sums, count - len(sums)),
    ]


def _largest(size: np.ndarray, most: int) -> list[int]:
    """The numbers of the largest, in their own order unless some are left out."""
    order = np.argsort(-size, kind="stable")
    return list(range(len(size))) if len(size) <= most else order[:most].tolist()


def _table(found: Comparison, title: str, lines: list[Line], left_out: int) -> Table:
    unit, small = unit_of(found.before), _unit_of_changes(found)
    heads = (f"before, {unit.name}", f"after, {unit.name}", f"change, {small.name}", "change")
    rows = tuple(
        Row(
            line.names if len(set(line.names)) > 1 else line.names[:1],
            (
                unit.reading(*line.before),
                unit.reading(*line.after),
                _signed(small.reading(*line.change), line.change.value),
                Reading(_percent(line)),
            ),
        )
        for line in lines
    )
    note = f"{left_out} more lines that changed less; {ELSEWHERE}" if left_out else ""
    return Table(title, heads, rows, note)


def _unit_of_changes(found: Comparison) -> Unit:
    """The unit that suits the largest change, or that of the matrix if nothing changed."""
    size = np.abs(found.change)
    largest = float(np.max(size, initial=0.0, where=np.isfinite(size)))
    if largest == 0.0:
        return unit_of(found.before)
    name, step = farad_unit(largest)
    return Unit(name, round(math.log10(step)))


def _signed(cell: Reading, value: float) -> Reading:
    return Reading(f"+{cell.value}", cell.bar) if value > 0.0 else cell


def _percent(line: Line) -> str:
    """The change in percent of the value before, with as many digits as its bar leaves."""
    if line.change.value == 0.0:
        return "0 %"
    if not (line.before.value and math.isfinite(line.change.value)):
        return UNKNOWN
    part = 100.0 * line.change.value / line.before.value
    return f"{part:+.3g} %"
