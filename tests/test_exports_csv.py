"""CSV files: every number exact, every name whole."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from test_results import results, sample_result

from bem.results.result import CapacitanceResult


def rows_of(path: Path) -> list[list[str]]:
    with open(path, newline="", encoding="utf-8") as file:
        return list(csv.reader(file))


def test_layout(tmp_path: Path) -> None:
    matrix = np.array([[3e-12, -1e-12], [-1e-12, 2e-12]])
    sums = np.array([2e-12, 1e-12])
    result = sample_result(matrix, row_sum=sums, row_sum_error=np.array([1e-15, 1e-15]))
    result.to_csv(tmp_path / "r.csv")
    assert (tmp_path / "r.csv").read_text().splitlines() == [
        '"quantity","row","column","capacitance_F","error_F"',
        '"maxwell","probe rod","probe rod",3e-12,1.2e-15',
        '"maxwell","probe rod","wall",-1e-12,1.2e-15',
        '"maxwell","wall","probe rod",-1e-12,1.2e-15',
        '"maxwell","wall","wall",2e-12,1.2e-15',
        '"row sum","probe rod","",2e-12,1e-15',
        '"row sum","wall","",1e-12,1e-15',
    ]


def test_unknown_numbers_are_empty(tmp_path: Path) -> None:
    sample_result(error=np.array([[np.nan, np.inf], [1.0, 1.0]])).to_csv(tmp_path / "r.csv")
    assert [row[4] for row in rows_of(tmp_path / "r.csv")[1:3]] == ["", ""]


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(result=results())
@pytest.mark.filterwarnings("ignore:(invalid|overflow)")
def test_any_name_and_number_comes_back(result: CapacitanceResult, tmp_path: Path) -> None:
    result.to_csv(tmp_path / "r.csv")
    rows = rows_of(tmp_path / "r.csv")[1:]
    n = len(result.conductors)
    assert len(rows) == n * n + n
    assert [row[2] for row in rows[:n]] == list(result.conductors)
    assert [row[1] for row in rows[-n:]] == list(result.conductors)
    expected = [*result.capacitance.ravel(), *result.row_sum]
    for row, value in zip(rows, expected, strict=True):
        assert (row[3] == "" and not math.isfinite(value)) or float(row[3]) == value
