"""The result record: what it derives, how it shows itself, and that nothing is lost on disk."""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import bem
from bem.results.outcome import STOPPED_BY, remedy
from bem.results.result import CapacitanceResult, Round, load_result

ROD_AND_WALL = np.array([[12.3456789e-12, -4.1e-12], [-4.1e-12, 45.6e-12]])


def sample_result(
    capacitance: np.ndarray = ROD_AND_WALL,
    error: np.ndarray | None = None,
    names: tuple[str, ...] | None = None,
    **changes: Any,
) -> CapacitanceResult:
    """Make a result as an extraction would return it, around the given matrix (F)."""
    matrix = np.asarray(capacitance, dtype=float)
    bars = np.full(matrix.shape, 1.2e-15) if error is None else np.asarray(error, dtype=float)
    n = len(matrix)
    fields: dict[str, Any] = {
        "conductors": names or ("probe rod", "wall", *(f"stud {k}" for k in range(2, n)))[:n],
        "capacitance": matrix,
        "error": bars,
        "row_sum": matrix.sum(axis=1),
        "row_sum_error": 1.5 * bars.max(axis=1),
        "tolerance": 1e-3,
        "converged": True,
        "stopped_by": "tolerance",
        "rounds": (
            Round(96, matrix * 1.01, bars * 20.0, 2.4, 0.031),
            Round(308, matrix, bars, 0.12, 0.118),
        ),
        "budget": {"discretisation": 0.75 * bars, "quadrature": 0.25 * bars},
        "audit": {"reciprocity": {"value": 2e-5, "limit": 1e-3, "ok": True}},
        "inputs": tuple(_input(k) for k in range(n)),
        "settings": {"threads": 2, "max_panels": 20000, "memory": None},
        "seconds": {"assembly": 0.081, "solve": 0.022},
        "version": "0.1.0",
        "panel_corners": np.linspace(0.0, 0.12, 36).reshape(3, 4, 3),
        "panel_conductor": np.array([0, n - 1, n - 1]),
        "density": np.linspace(-1e-9, 1e-9, 3 * n).reshape(3, n),
    }
    return CapacitanceResult(**{**fields, **changes})


def _input(index: int) -> dict[str, Any]:
    return {
        "name": f"stud {index}",
        "file": f"stud_{index}.stl",
        "sha256": "0f" * 32,
        "unit": "mm",
        "part": None,
        "changes": ("welded 8 vertices within 1e-9 m",) if index == 0 else (),
    }


def assert_same(first: Any, second: Any) -> None:
    """Equal in every field, type and bit that matters; NaN equals NaN."""
    assert type(first) is type(second)
    if dataclasses.is_dataclass(first):
        for entry in dataclasses.fields(first):
            assert_same(getattr(first, entry.name), getattr(second, entry.name))
    elif isinstance(first, np.ndarray):
        assert first.dtype == second.dtype and first.shape == second.shape
        np.testing.assert_array_equal(first, second)
        known = first[first == first], second[second == second]
        np.testing.assert_array_equal(*map(np.signbit, known))
    elif isinstance(first, dict):
        assert list(first) == list(second)
        assert_same(list(first.values()), list(second.values()))
    elif isinstance(first, list | tuple):
        assert len(first) == len(second)
        for a, b in zip(first, second, strict=True):
            assert_same(a, b)
    else:
        assert first == second or (math.isnan(first) and math.isnan(second))


def test_mutual_has_the_couplings_and_the_row_sums() -> None:
    result = sample_result()
    expected = [[12.3456789e-12 - 4.1e-12, 4.1e-12], [4.1e-12, 45.6e-12 - 4.1e-12]]
    np.testing.assert_allclose(result.mutual, expected, rtol=1e-15)


def test_mutual_of_an_isolated_pair_is_a_positive_zero() -> None:
    result = sample_result(np.diag([1e-12, 2e-12]))
    assert not np.signbit(result.mutual).any()


def test_mutual_leaves_the_matrix_alone() -> None:
    result = sample_result()
    before = result.capacitance.copy()
    assert result.mutual is not result.capacitance
    np.testing.assert_array_equal(result.capacitance, before)


def test_allowance_is_the_tolerance_times_the_mean_of_the_diagonal() -> None:
    result = sample_result(np.array([[4.0, -1.0], [-1.0, 9.0]]))
    np.testing.assert_allclose(result.allowance, 1e-3 * np.array([[4.0, 6.0], [6.0, 9.0]]))


def test_a_pair_may_be_allowed_less_than_the_tolerance_does() -> None:
    matrix = np.array([[4.0, -1.0], [-1.0, 9.0]])
    strict = sample_result(matrix, pairs={("wall", "probe rod"): 1e-4})
    np.testing.assert_allclose(strict.allowance, [[4e-3, 1e-4], [1e-4, 9e-3]])
    loose = sample_result(matrix, pairs={("wall", "probe rod"): 0.5})
    np.testing.assert_allclose(loose.allowance, [[4e-3, 6e-3], [6e-3, 9e-3]])


def test_used_is_the_bar_over_what_is_allowed() -> None:
    result = sample_result(
        np.array([[4.0, -1.0], [-1.0, 9.0]]), np.array([[2e-3, 0], [3e-3, 9e-3]])
    )
    np.testing.assert_allclose(result.used, [[0.5, 0.0], [0.5, 1.0]])
    nothing = sample_result(np.zeros((2, 2)), np.array([[0.0, 1.0], [0.0, 0.0]]))
    np.testing.assert_array_equal(nothing.used, [[0.0, np.inf], [0.0, 0.0]])


def test_panels_are_those_of_the_last_round() -> None:
    assert sample_result().panels == 308


def test_repr_is_one_short_line_and_str_the_table() -> None:
    result = sample_result(converged=False)
    assert repr(result) == (
        "<CapacitanceResult: 2 conductors, 308 panels, tolerance 0.001 not reached>"
    )
    assert "12.3457 ± 0.0012" in str(result)


def test_every_reason_to_stop_has_a_remedy() -> None:
    for reason in ("max-panels", "memory", "rounds", "breakdown", "interrupt"):
        assert remedy(reason, False) == STOPPED_BY[reason] != reason
    assert remedy("tolerance", True) == STOPPED_BY["tolerance"]
    assert "audit widened the bars" in remedy("tolerance", False)
    assert remedy("power cut", False) == "power cut"


def test_saved_and_loaded_is_the_same(tmp_path: Path) -> None:
    result = sample_result(pairs={("probe rod", "wall"): 0.01}, warnings=("thin gap",))
    result.to_json(tmp_path / "r.json")
    assert_same(load_result(tmp_path / "r.json"), result)
    assert_same(bem.load_result(str(tmp_path / "r.json")), result)


def test_without_arrays_the_rest_is_the_same(tmp_path: Path) -> None:
    result = sample_result()
    result.to_json(tmp_path / "r.json", arrays=False)
    bare = dataclasses.replace(result, panel_corners=None, panel_conductor=None, density=None)
    assert_same(load_result(tmp_path / "r.json"), bare)


names = st.lists(
    st.text(min_size=1, max_size=12)
    | st.sampled_from(['a,b"c', "line\nbreak", "tab\tcr\r", "Füllstand 液位", "=1+1", "\x00"]),
    min_size=1,
    max_size=4,
    unique=True,
)
numbers = st.floats(allow_nan=True, allow_infinity=True, width=64)


@st.composite
def results(draw: st.DrawFn) -> CapacitanceResult:
    """Results with any names and any numbers, finite or not."""
    conductors = tuple(draw(names))
    n = len(conductors)

    def floats(*shape: int) -> np.ndarray:
        size = math.prod(shape)
        return np.array(draw(st.lists(numbers, min_size=size, max_size=size))).reshape(shape)

    return sample_result(
        floats(n, n),
        floats(n, n),
        conductors,
        row_sum=floats(n),
        row_sum_error=floats(n),
        rounds=(Round(7, floats(n, n), floats(n, n), draw(numbers), draw(numbers)),),
        budget={draw(st.text()): floats(n, n)},
        audit={"sign": {"value": draw(numbers), "limit": draw(numbers), "ok": False}},
        settings={"depth": draw(numbers), "memory": None, "list": [draw(numbers), "x"]},
        density=floats(3, n),
    )


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(result=results())
@pytest.mark.filterwarnings("ignore:(invalid|overflow)")
def test_no_name_or_number_is_lost(result: CapacitanceResult, tmp_path: Path) -> None:
    result.to_json(tmp_path / "r.json")
    assert_same(load_result(tmp_path / "r.json"), result)


def test_other_element_types_are_kept(tmp_path: Path) -> None:
    result = sample_result(
        panel_conductor=np.array([0, 1, 1], dtype=">i4"),
        density=np.asfortranarray(np.arange(6, dtype=np.float32).reshape(3, 2)),
    )
    result.to_json(tmp_path / "r.json")
    loaded = load_result(tmp_path / "r.json")
    assert loaded.density is not None and loaded.density.dtype == np.float32
    assert loaded.panel_conductor is not None and loaded.panel_conductor.dtype == np.int32
    np.testing.assert_array_equal(loaded.density, result.density)
    np.testing.assert_array_equal(loaded.panel_conductor, [0, 1, 1])
