"""The report of a result for notebooks: plain tables that inherit the page's colours."""

from __future__ import annotations

from html import escape

from bem.exports.layout import Row, Table
from bem.exports.names import shown
from bem.exports.summary import lines_of
from bem.exports.tables import tables_of
from bem.exports.text import PLUS_MINUS
from bem.results.result import CapacitanceResult

_RULE = "border-bottom: 1px solid rgba(128, 128, 128, 0.4)"
_NUMBER = f"text-align: right; white-space: nowrap; {_RULE}"
_NAME = f"text-align: left; {_RULE}"


def report(result: CapacitanceResult) -> str:
    """Return what the text report says, as an HTML fragment; names are escaped."""
    tables = "".join(_table(table) for table in tables_of(result))
    lines = "<br>".join(escape(line) for line in lines_of(result, PLUS_MINUS))
    return f'<div class="bem-result">{tables}<p><small>{lines}</small></p></div>'


def _table(table: Table) -> str:
    heads = "".join(f'<th style="{_NUMBER}">{_safe(head)}</th>' for head in table.heads)
    rows = "".join(_row(row) for row in table.rows)
    note = f"<p><small>{escape(table.note)}</small></p>" if table.note else ""
    return (
        f'<table style="border-collapse: collapse"><caption>{escape(table.title)}</caption>'
        f"<thead><tr><th></th>{heads}</tr></thead><tbody>{rows}</tbody></table>{note}"
    )


def _row(row: Row) -> str:
    name = ", ".join(_safe(name) for name in row.names)
    cells = "".join(
        f'<td style="{_NUMBER}">{escape(cell.joined(PLUS_MINUS))}</td>' for cell in row.cells
    )
    return f'<tr><th style="{_NAME}">{name}</th>{cells}</tr>'


def _safe(name: str) -> str:
    return escape(shown(name))
