"""What a comparison says, and what it leaves on disk."""

from __future__ import annotations

import csv
import dataclasses
import json
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest
from test_results import ROD_AND_WALL, sample_result

import bem
from bem.exports.comparison_files import record_of
from bem.exports.comparison_text import excess_lines, report
from bem.exports.json_file import load_json
from bem.exports.names import columns
from bem.exports.record import from_record
from bem.results.comparison import Comparison, in_order

SCHEMA = json.loads(files("bem.exports").joinpath("comparison.schema.json").read_text())
CHANGE = np.array([[2.0e-15, -1.0e-15], [-1.0e-15, 6.0e-14]])


def sample_comparison(**changes: Any) -> Comparison:
    """Make a comparison as it would come out, around a small change."""
    before = sample_result()
    fields: dict[str, Any] = {
        "before": before,
        "after": sample_result(ROD_AND_WALL + CHANGE, warnings=("a sliver",)),
        "change": CHANGE,
        "change_error": np.full((2, 2), 1.5e-17),
        "row_sum_change": CHANGE.sum(axis=1),
        "row_sum_change_error": np.array([2e-17, 3e-17]),
        "tolerance": 1e-3,
        "change_accuracy": 0.02,
        "correlated": True,
        "converged": True,
        "stopped_by": "tolerance",
        "seconds": {"rounds": 0.2, "total": 0.25},
        "version": "0.1.0",
    }
    return Comparison(**{**fields, **changes})


def ladder(n: int) -> Comparison:
    """Make a comparison of many conductors whose couplings change more the larger their number."""
    matrix = 1e-12 * (np.eye(n) * n - np.ones((n, n)) * 0.5)
    change = 1e-16 * np.add.outer(np.arange(n), np.arange(n))
    names = tuple(f"stud {k}" for k in range(n))
    return sample_comparison(
        before=sample_result(matrix, names=names),
        after=sample_result(matrix + change, names=names),
        change=change,
        change_error=np.full((n, n), 1e-18),
        row_sum_change=change.sum(axis=1),
        row_sum_change_error=np.full(n, 1e-18),
    )


def test_the_report_shows_before_after_and_change() -> None:
    text = str(sample_comparison())
    assert "12.3457 ± 0.0012" in text
    assert "12.3477 ± 0.0012" in text
    assert "+2.000 ± 0.015" in text
    assert "-1.000 ± 0.015" in text
    assert "+0.132 %" in text
    assert "same panels in both scenes" in text
    assert "reached" in text
    assert "warning: a sliver" in text
    assert max(map(columns, text.splitlines())) <= 80


def test_the_report_says_what_was_not_reached() -> None:
    text = str(
        sample_comparison(converged=False, stopped_by="max-panels", notes=("meshes differ",))
    )
    assert "NOT REACHED" in text
    assert "raise max-panels" in text
    assert "note: meshes differ" in text
    assert "independent panels" in str(sample_comparison(correlated=False))


def test_no_change_is_said_plainly() -> None:
    none = np.zeros((2, 2))
    text = str(
        sample_comparison(
            change=none,
            change_error=none,
            row_sum_change=none[0],
            row_sum_change_error=none[0],
        )
    )
    assert "nothing changed" in text
    assert "0 %" in text


def test_of_many_conductors_the_largest_changes_are_listed() -> None:
    text = report(ladder(60))
    assert "1790 more lines" in text
    assert "20 more lines" in text
    assert "stud 58, stud 59" in text
    assert "stud 1, stud 2" not in text


def test_ascii_screens_get_another_sign() -> None:
    assert report(sample_comparison(), "+-").isascii()


def test_relative_changes() -> None:
    found = sample_comparison()
    assert found.relative_change == pytest.approx(CHANGE / ROD_AND_WALL)
    matrix = np.diag([1e-12, 2e-12])
    lone = sample_comparison(before=sample_result(matrix))
    assert np.isnan(lone.relative_change[0, 1])
    assert "?" in str(lone)


def test_changes_above_a_limit_are_named_the_largest_first() -> None:
    found = sample_comparison()
    wall = 6.0e-14 / 45.6e-12
    certain = found.exceeding(1e-3)
    assert [(entry.pair, entry.certain) for entry in certain] == [(("wall", "wall"), True)]
    assert certain[0].change == pytest.approx(wall)
    assert found.exceeding(2e-3) == []
    doubtful = found.exceeding(wall + 1e-7)
    assert [entry.certain for entry in doubtful] == [False]
    assert len(found.exceeding(1e-6)) == 3
    assert "is above the limit of 0.1 %" in excess_lines(certain, 1e-3)[0]
    assert "C(wall, wall)" in excess_lines(certain, 1e-3)[0]
    assert "cannot be ruled out" in excess_lines(doubtful, wall + 1e-7)[0]


def test_a_bar_that_is_unknown_is_above_every_limit() -> None:
    found = sample_comparison(change_error=np.full((2, 2), np.nan))
    assert len(found.exceeding(0.5)) == 3


def test_only_so_many_lines_about_excesses() -> None:
    found = ladder(20).exceeding(1e-9)
    lines = excess_lines(found, 1e-9)
    assert len(lines) == 11
    assert lines[-1].startswith(f"{len(found) - 10} more")


@pytest.mark.parametrize("limit", [0.0, -1.0, float("nan"), float("inf")])
def test_limits_out_of_range(limit: float) -> None:
    with pytest.raises(bem.UsageError, match="limit: found"):
        sample_comparison().exceeding(limit)


def test_the_file_follows_its_schema_and_keeps_every_bit(tmp_path: Path) -> None:
    found = sample_comparison()
    found.to_json(tmp_path / "c.json")
    record = json.loads((tmp_path / "c.json").read_text("utf-8"))
    jsonschema.Draft202012Validator.check_schema(SCHEMA)
    jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)
    assert np.array_equal(record["change_F"], CHANGE)
    assert np.array_equal(record["change_error_F"], found.change_error)
    before = from_record(record["before"])
    assert np.array_equal(before.capacitance, found.before.capacitance)
    assert before.panel_corners is None
    with pytest.raises(bem.InputError, match="not a saved result"):
        load_json(tmp_path / "c.json")


def test_numbers_that_are_not_finite_become_null() -> None:
    record = record_of(sample_comparison(change_error=np.full((2, 2), np.inf)))
    assert record["change_error_F"] == [[None, None], [None, None]]
    assert len(record["non_finite"]) == 4


def test_csv_has_a_line_per_entry_and_row_sum(tmp_path: Path) -> None:
    sample_comparison().to_csv(tmp_path / "c.csv")
    with (tmp_path / "c.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 6
    wall = rows[3]
    assert (wall["quantity"], wall["row"], wall["column"]) == ("maxwell", "wall", "wall")
    assert float(wall["change_F"]) == 6.0e-14
    assert float(wall["after_F"]) == 45.6e-12 + 6.0e-14
    assert rows[5]["quantity"] == "row sum"
    assert float(rows[5]["change_error_F"]) == 3e-17


def test_files_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(bem.InputError, match="cannot write"):
        sample_comparison().to_json(tmp_path / "none" / "c.json")


def test_another_order_of_conductors_loses_nothing() -> None:
    result = sample_result(states=("terminal", "grounded"), nodes=("n", None))
    other = in_order(result, ("wall", "probe rod"))
    assert other.conductors == ("wall", "probe rod")
    assert other.capacitance[0, 0] == result.capacitance[1, 1]
    assert other.row_sum[0] == result.row_sum[1]
    assert other.rounds[0].capacitance[0, 0] == result.rounds[0].capacitance[1, 1]
    assert other.inputs[0] == result.inputs[1]
    assert other.states == ("grounded", "terminal")
    assert other.nodes == (None, "n")
    assert np.array_equal(other.panel_conductor, 1 - np.asarray(result.panel_conductor))
    assert in_order(other, result.conductors).density == pytest.approx(result.density)
    assert in_order(result, result.conductors) is result


def test_it_shows_itself_briefly() -> None:
    found = sample_comparison()
    assert "2 conductors" in repr(found)
    assert "not reached" in repr(dataclasses.replace(found, converged=False))
    assert found.panels == 308
