"""The readable report of a result: tables in at most 80 columns, then the facts."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator

from bem.exports.digits import Reading
from bem.exports.layout import Row, Table
from bem.exports.names import columns, padded, shown
from bem.exports.summary import lines_of
from bem.exports.tables import tables_of
from bem.results.result import CapacitanceResult

WIDTH = 80
_SECOND_COLUMN = "\0"
"""Stands for the second column of a wide character while lines are filled."""
PLUS_MINUS = "±"
PLUS_MINUS_ASCII = "+-"

_WIDEST_NAME = 24
_WIDEST_OF_TWO = 18
_INDENT, _GAP = "  ", "   "


def report(result: CapacitanceResult, sign: str = PLUS_MINUS) -> str:
    """Everything a person wants to read about ``result``.

    Args:
        result: what to describe.
        sign: how plus-minus is written; ``PLUS_MINUS_ASCII`` where the other cannot be shown.
    """
    blocks = [table_text(table, sign) for table in tables_of(result)]
    blocks.append("\n".join(wrapped(line) for line in lines_of(result, sign)))
    return "\n\n".join(blocks)


def wrapped(line: str) -> str:
    """``line`` in at most 80 columns, continued lines indented."""
    counted = "".join(c + _SECOND_COLUMN * (columns(c) - 1) for c in line)
    filled = textwrap.fill(counted, WIDTH, subsequent_indent=_INDENT, break_on_hyphens=False)
    return filled.replace(_SECOND_COLUMN, "")


def table_text(table: Table, sign: str) -> str:
    """``table`` as text; a table that is too wide goes on below, the names repeated."""
    names = [_label(row) for row in table.rows]
    strips = [_strip(table, column, sign) for column in range(len(table.heads))]
    lines = [wrapped(table.title)]
    for block in _blocks(strips, WIDTH - _label_width(names)):
        lines += ["", *_side_by_side(names, block)]
    return "\n".join([*lines, *([wrapped(_INDENT + table.note)] if table.note else [])])


def _label(row: Row) -> str:
    widest = _WIDEST_NAME if len(row.names) == 1 else _WIDEST_OF_TWO
    return ", ".join(shown(name, widest) for name in row.names)


def _label_width(names: list[str]) -> int:
    return len(_INDENT) + max(map(columns, names), default=0)


def _strip(table: Table, column: int, sign: str) -> list[str]:
    """One column of the table: head and cells, all of the same width."""
    cells = [row.cells[column] for row in table.rows]
    texts = [shown(table.heads[column], _WIDEST_NAME), *_aligned(cells, sign)]
    width = max(map(columns, texts))
    return [" " * (width - columns(text)) + text for text in texts]


def _aligned(cells: list[Reading], sign: str) -> list[str]:
    """Cells with their plus-minus signs below one another."""
    left = max(len(cell.value) for cell in cells)
    right = max(len(cell.bar) for cell in cells)
    return [
        Reading(cell.value.rjust(left), cell.bar.ljust(right) if cell.bar else "").joined(sign)
        for cell in cells
    ]


def _blocks(strips: list[list[str]], width: int) -> Iterator[list[list[str]]]:
    """Columns that fit beside one another, at least one at a time."""
    block: list[list[str]] = []
    used = 0
    for strip in strips:
        size = len(_GAP) + columns(strip[0])
        if block and used + size > width:
            yield block
            block, used = [], 0
        block.append(strip)
        used += size
    yield block


def _side_by_side(names: list[str], strips: list[list[str]]) -> list[str]:
    width = _label_width(names) - len(_INDENT)
    lines = []
    for number, label in enumerate(["", *names]):
        cells = [_GAP + strip[number] for strip in strips]
        lines.append((_INDENT + padded(label, width) + "".join(cells)).rstrip())
    return lines if lines[0] else lines[1:]
