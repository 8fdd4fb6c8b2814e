"""The readable report of a comparison: tables in at most 80 columns, then the facts."""

from __future__ import annotations

import numpy as np

from bem.exports.comparison_tables import tables_of
from bem.exports.names import shown
from bem.exports.summary import MEANING
from bem.exports.text import PLUS_MINUS, table_text, wrapped
from bem.results.comparison import Comparison, Excess
from bem.results.outcome import remedy

MOST_EXCESSES = 10


def report(found: Comparison, sign: str = PLUS_MINUS) -> str:
    """Everything a person wants to read about a comparison.

    Args:
        found: what to describe.
        sign: how plus-minus is written.
    """
    blocks = [table_text(table, sign) for table in tables_of(found)]
    blocks.append("\n".join(wrapped(line) for line in lines_of(found, sign)))
    return "\n\n".join(blocks)


def lines_of(found: Comparison, sign: str) -> list[str]:
    """One fact per line, in the order in which a reader needs them."""
    warnings = dict.fromkeys([*found.before.warnings, *found.after.warnings])
    return [
        MEANING.format(sign=sign),
        *(f"note: {shown(line)}" for line in found.notes),
        _correlation(found),
        outcome(found),
        _effort(found),
        *(f"warning: {shown(line)}" for line in warnings),
    ]


def _correlation(found: Comparison) -> str:
    size, bar = (np.abs(x / found.scale) for x in (found.change, found.change_error))
    largest = float(size.max())
    how = "same panels in both scenes" if found.correlated else "independent panels"
    if largest == 0.0:
        return f"{how}; nothing changed"
    return f"{how}; the largest bar of a change is {bar.max() / largest:.2g} of the largest change"


def outcome(found: Comparison) -> str:
    """Say whether all that was asked was reached, and if not, what to do."""
    asked = f"tolerance {found.tolerance:g}"
    if found.correlated:
        asked += f", accuracy of changes {found.change_accuracy:g}"
    if found.converged:
        return f"{asked}: reached"
    return f"{asked}: NOT REACHED; {remedy(found.stopped_by, found.converged)}"


def _effort(found: Comparison) -> str:
    parts = [f"panels {found.panels}"]
    if "total" in found.seconds:
        parts.append(f"time {found.seconds['total']:.3g} s")
    return ", ".join(parts)


def excess_lines(found: list[Excess], limit: float) -> list[str]:
    """One line per entry whose change is, or may be, above a limit.

    Args:
        found: what ``Comparison.exceeding`` gave.
        limit: as a fraction of sqrt(C_ii C_jj).
    """
    lines = [_excess(entry, limit) for entry in found[:MOST_EXCESSES]]
    left_out = len(found) - len(lines)
    return lines + ([f"{left_out} more entries, with smaller changes"] if left_out else [])


def _excess(entry: Excess, limit: float) -> str:
    first, second = (shown(name) for name in entry.pair)
    verdict = "is above" if entry.certain else "cannot be ruled out to be above"
    return (
        f"the change of C({first}, {second}), {100.0 * entry.change:.3g} % +- "
        f"{100.0 * entry.bar:.2g} % of sqrt(C_ii C_jj), {verdict} the limit of {100.0 * limit:g} %"
    )
