"""How the bars are composed, part by part."""

from __future__ import annotations

import numpy as np

from bem.exports.digits import Reading
from bem.exports.layout import Row, Table, Unit
from bem.exports.names import shown
from bem.exports.tables import unit_of
from bem.exports.text import table_text, wrapped
from bem.results.result import CapacitanceResult


def budget_text(result: CapacitanceResult, sign: str) -> str:
    """Show the parts of the bar that is nearest to its allowance, and of the largest bars."""
    i, j = tightest_entry(result)
    if not result.budget:
        return wrapped("budget: no parts of the bars were recorded")
    unit = unit_of(result)
    rows = [_part(unit, name, part, (i, j), result) for name, part in result.budget.items()]
    entry = f"C({shown(result.conductors[i])}, {shown(result.conductors[j])})"
    table = Table(
        f"Parts of the bars in {unit.name}",
        ("at one entry", "share of its bar", "largest at any entry"),
        (*rows, _bar_row(unit, (i, j), result)),
        f"the one entry is that nearest to its allowance, {entry}",
    )
    return table_text(table, sign)


def tightest_entry(result: CapacitanceResult) -> tuple[int, int]:
    """Row and column of the entry whose bar takes most of what is allowed for it."""
    used = np.where(np.isnan(result.used), np.inf, result.used)
    return divmod(int(np.argmax(used)), len(result.conductors))


def _part(
    unit: Unit, name: str, part: np.ndarray, entry: tuple[int, int], result: CapacitanceResult
) -> Row:
    bar = result.error[entry]
    share = f"{100 * part[entry] / bar:.0f} %" if bar > 0 else ""
    return Row((name,), (_amount(unit, part[entry]), Reading(share), _amount(unit, part.max())))


def _bar_row(unit: Unit, entry: tuple[int, int], result: CapacitanceResult) -> Row:
    cells = (result.error[entry], result.error.max())
    at_entry, largest = (_amount(unit, value) for value in cells)
    return Row(("the bar itself",), (at_entry, Reading(""), largest))


def _amount(unit: Unit, value: float) -> Reading:
    return Reading(f"{float(value) * 10.0**-unit.power:.2g}")
