"""Tables, their rows and units, as text and HTML both render them."""

from __future__ import annotations

from dataclasses import dataclass

from bem.exports.digits import Reading, reading

WIDEST_MATRIX = 8
"""More conductors than this: no matrix, but the self-capacitances and the largest couplings."""

ELSEWHERE = "every entry is in the JSON and CSV files (--json, --csv; to_json, to_csv)"


@dataclass(frozen=True)
class Row:
    """One line of a table: the conductors that it is about, and its cells."""

    names: tuple[str, ...]
    cells: tuple[Reading, ...]


@dataclass(frozen=True)
class Table:
    """A titled table; every cell is a reading in the unit that the title names."""

    title: str
    heads: tuple[str, ...]
    rows: tuple[Row, ...]
    note: str = ""


@dataclass(frozen=True)
class Unit:
    """A unit of capacitance or conductance, 10**power farad or siemens."""

    name: str
    power: int

    def reading(self, value: float, bar: float) -> Reading:
        """``value`` and ``bar`` (farad or siemens) in this unit."""
        return reading(value, bar, self.power)
