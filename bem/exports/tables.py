"""What a reader of a result wants to see, as tables that text and HTML both render."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from bem.exports.digits import UNKNOWN, Reading
from bem.exports.layout import ELSEWHERE, WIDEST_MATRIX, Row, Table, Unit
from bem.exports.lossy_tables import lossy_tables
from bem.exports.media import grounded_layers
from bem.results.result import CapacitanceResult
from bem.units import farad_unit

LONGEST_LIST = 40
MOST_COUPLINGS = 20


def unit_of(result: CapacitanceResult) -> Unit:
    """Return the unit of all tables of ``result``: it suits the largest diagonal entry."""
    diagonal = np.abs(np.diagonal(result.capacitance))
    largest = float(np.max(diagonal, initial=0.0, where=np.isfinite(diagonal)))
    name, size = farad_unit(largest)
    return Unit(name, round(math.log10(size)))


def tables_of(result: CapacitanceResult) -> list[Table]:
    """Lay out the matrix (with many conductors, its diagonal), row sums and couplings."""
    unit = unit_of(result)
    small = len(result.conductors) <= WIDEST_MATRIX
    first = [_matrix(result, unit), _row_sums(result, unit)] if small else [_own(result, unit)]
    return [*first, *_couplings(result, unit), *lossy_tables(result, unit)]


def outward(result: CapacitanceResult) -> str:
    """Say where the row sums lead: to the surroundings, and to what is grounded."""
    ends = ["the surroundings"]
    if "ground_plane_m" in result.settings or grounded_layers(result.settings):
        ends.append("the grounded plane")
    if result.reduction is not None and result.reduction.grounded:
        ends.append("grounded conductors")
    return ", ".join(ends[:-1]) + " and " + ends[-1] if len(ends) > 1 else ends[0]


def _matrix(result: CapacitanceResult, unit: Unit) -> Table:
    rows = [
        Row((name,), tuple(map(unit.reading, result.capacitance[i], result.error[i])))
        for i, name in enumerate(result.conductors)
    ]
    title = f"Maxwell capacitance matrix C in {unit.name} (Q = C V)"
    return Table(title, result.conductors, tuple(rows))


def _row_sums(result: CapacitanceResult, unit: Unit) -> Table:
    readings = map(unit.reading, result.row_sum, result.row_sum_error)
    rows = [Row((name,), (cell,)) for name, cell in zip(result.conductors, readings, strict=True)]
    return Table(f"To {outward(result)} (row sums) in {unit.name}", ("",), tuple(rows))


def _own(result: CapacitanceResult, unit: Unit) -> Table:
    diagonal = map(unit.reading, np.diagonal(result.capacitance), np.diagonal(result.error))
    sums = map(unit.reading, result.row_sum, result.row_sum_error)
    lines = zip(result.conductors, diagonal, sums, strict=True)
    rows = [Row((name,), (own, out)) for name, own, out in lines][:LONGEST_LIST]
    title = (
        f"Maxwell capacitance matrix C in {unit.name} (Q = C V): "
        f"diagonal and row sums (to {outward(result)})"
    )
    left_out = len(result.conductors) - len(rows)
    note = f"{left_out} more conductors; {ELSEWHERE}" if left_out else ""
    return Table(title, ("C_ii", "row sum"), tuple(rows), note)


def _couplings(result: CapacitanceResult, unit: Unit) -> list[Table]:
    n = len(result.conductors)
    count = n * (n - 1) // 2
    if not count:
        return []
    chosen = list(_chosen_pairs(result))
    rows = tuple(_coupling(result, unit, i, j) for i, j in chosen)
    title = f"Mutual capacitances (-C_ij) in {unit.name}, largest first"
    heads = ("", "bar / value", "asked")[: 3 if result.pairs else 2]
    note = f"{count - len(rows)} more pairs; {ELSEWHERE}" if count > len(rows) else ""
    return [Table(title, heads, rows, note)]


def _chosen_pairs(result: CapacitanceResult) -> Iterator[tuple[int, int]]:
    """Choose the pairs to list, by size: all, or the largest and those that were asked for."""
    n = len(result.conductors)
    first, second = np.triu_indices(n, 1)
    order = np.argsort(-np.abs(result.capacitance[first, second]), kind="stable")
    most = len(order) if n <= WIDEST_MATRIX else MOST_COUPLINGS
    for place, index in enumerate(order):
        i, j = int(first[index]), int(second[index])
        if place < most or _asked(result, i, j) is not None:
            yield i, j


def _coupling(result: CapacitanceResult, unit: Unit, i: int, j: int) -> Row:
    value, bar = -result.capacitance[i, j], result.error[i, j]
    cells = [unit.reading(value, bar), Reading(_percent(bar / abs(value) if value else math.inf))]
    if result.pairs:
        asked = _asked(result, i, j)
        cells.append(Reading("" if asked is None else _percent(asked)))
    return Row((result.conductors[i], result.conductors[j]), tuple(cells))


def _asked(result: CapacitanceResult, i: int, j: int) -> float | None:
    a, b = result.conductors[i], result.conductors[j]
    return result.pairs.get((a, b), result.pairs.get((b, a)))


def _percent(ratio: float) -> str:
    if not math.isfinite(ratio):
        return UNKNOWN
    return f"{100 * ratio:.2g} %" if ratio < 1 else "over 100 %"
