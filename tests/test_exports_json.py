"""Saved results follow their schema, and damaged ones are refused by name."""

from __future__ import annotations

import base64
import json
import struct
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest
from test_results import assert_same, sample_result

from bem.errors import InputError
from bem.exports.record import to_record
from bem.results.outcome import STOPPED_BY
from bem.results.result import Reduction, load_result

SCHEMA = json.loads(files("bem.exports").joinpath("result.schema.json").read_text())

LATER = {"states", "nodes", "reduction"}
"""Entries that files of the first version may lack."""


def saved(tmp_path: Path, **changes: Any) -> dict[str, Any]:
    """Return the record of a sample result on disk, read as any JSON program would."""

    def refuse(token: str) -> None:
        raise AssertionError(f"{token} is not JSON")

    sample_result(**changes).to_json(tmp_path / "r.json")
    return json.loads((tmp_path / "r.json").read_text(), parse_constant=refuse)


def damaged(tmp_path: Path, **entries: Any) -> Path:
    """Write a saved file with some entries replaced, or removed where None is given."""
    record = {**saved(tmp_path), **entries}
    kept = {key: value for key, value in record.items() if value is not None}
    path = tmp_path / "damaged.json"
    path.write_text(json.dumps(kept))
    return path


def refusal(path: Path) -> str:
    with pytest.raises(InputError) as caught:
        load_result(path)
    message = str(caught.value)
    assert message.startswith(f"{path}: ") and "\n" not in message
    return message.removeprefix(f"{path}: ")


def test_the_schema_is_itself_valid() -> None:
    jsonschema.Draft202012Validator.check_schema(SCHEMA)


def test_saved_files_follow_the_schema(tmp_path: Path) -> None:
    record = saved(tmp_path, pairs={("probe rod", "wall"): 0.01})
    jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)


def test_numbers_that_are_not_finite_follow_the_schema(tmp_path: Path) -> None:
    record = saved(tmp_path, error=np.array([[np.nan, np.inf], [-np.inf, 1.0]]))
    jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)
    assert record["error_F"] == [[None, None], [None, 1.0]]
    assert {"at": ["error_F", 0, 1], "value": "inf"} in record["non_finite"]


@pytest.mark.parametrize(
    ("entry", "value"),
    [
        ("schema_version", 2),
        ("converged", "yes"),
        ("stopped_by", "boredom"),
        ("capacitance_F", [["1e-12"]]),
        ("inputs", [{"name": "rod"}]),
        ("conductors", ["rod", "rod"]),
        ("rounds", []),
    ],
)
def test_the_schema_refuses_nonsense(tmp_path: Path, entry: str, value: Any) -> None:
    record = {**saved(tmp_path), entry: value}
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)


def test_the_schema_describes_every_entry_and_no_other(tmp_path: Path) -> None:
    assert set(saved(tmp_path)) == set(SCHEMA["properties"]) - {"frequencies"}
    written = set(to_record(sample_result(), arrays=False))
    assert set(SCHEMA["required"]) == written - LATER


def test_the_schema_knows_every_reason_to_stop() -> None:
    assert SCHEMA["properties"]["stopped_by"]["enum"] == list(STOPPED_BY)


def test_derived_entries_are_in_the_file(tmp_path: Path) -> None:
    record = saved(tmp_path)
    assert record["panels"] == 308
    assert record["mutual_F"] == sample_result().mutual.tolist()
    assert record["row_sum_F"] == sample_result().row_sum.tolist()


def test_arrays_can_be_read_without_this_package(tmp_path: Path) -> None:
    packed = saved(tmp_path)["arrays"]["density_C_per_m2_per_V"]
    assert packed["dtype"] == "<f8" and packed["shape"] == [3, 2]
    numbers = struct.unpack("<6d", base64.b64decode(packed["base64"]))
    assert list(numbers) == np.ravel(sample_result().density).tolist()


def test_one_entry_per_line(tmp_path: Path) -> None:
    record = saved(tmp_path)
    assert len((tmp_path / "r.json").read_text().splitlines()) == len(record) + 2


def test_names_stay_readable_and_lone_surrogates_survive(tmp_path: Path) -> None:
    result = sample_result(names=("Füllstand", "rod\udcff"))
    result.to_json(tmp_path / "r.json")
    assert "Füllstand" in (tmp_path / "r.json").read_text(encoding="utf-8")
    assert_same(load_result(tmp_path / "r.json"), result)


def test_unknown_entries_are_ignored(tmp_path: Path) -> None:
    assert_same(load_result(damaged(tmp_path, colour="blue")), sample_result())


def test_missing_file(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cannot read .*gone.json: No such file"):
        load_result(tmp_path / "gone.json")


@pytest.mark.parametrize("key", [k for k in SCHEMA["required"] if k not in ("format", "mutual_F")])
def test_a_missing_entry_is_named(tmp_path: Path, key: str) -> None:
    derived = {"panels", "non_finite"}
    path = damaged(tmp_path, **{key: None})
    if key in derived:
        assert_same(load_result(path), sample_result())
    else:
        assert key in refusal(path)


@pytest.mark.parametrize(
    ("entries", "expected"),
    [
        ({"format": "poem"}, "not a saved result"),
        ({"schema_version": 7}, "schema_version: found 7; this bem reads 1"),
        ({"error_F": [[1.0]]}, "'error_F' is damaged"),
        ({"capacitance_F": [[1.0, "x"], [1.0, 2.0]]}, "'capacitance_F' is damaged"),
        ({"conductors": "rod"}, "damaged"),
        ({"conductors": [1, 2]}, "'conductors' is damaged"),
        ({"rounds": []}, "'rounds' is damaged"),
        ({"rounds": [{"panels": 3}]}, "'rounds' is damaged"),
        ({"pairs": [{"conductors": ["a"], "accuracy": 1}]}, "'pairs' is damaged"),
        ({"pairs": [{"conductors": ["wall", "x"], "accuracy": 1}]}, "'pairs' is damaged"),
        ({"audit": []}, "'audit' is damaged"),
        ({"budget_F": {"quadrature": [1.0]}}, "'budget_F' is damaged"),
        ({"arrays": []}, "'arrays' is damaged"),
        ({"arrays": {"panel_conductor": {"dtype": "<f8"}}}, "arrays: panel_conductor: found no"),
        ({"non_finite": [{"at": ["nowhere", 1], "value": "nan"}]}, "points nowhere"),
    ],
)
def test_a_damaged_entry_is_named(tmp_path: Path, entries: Any, expected: str) -> None:
    assert expected in refusal(damaged(tmp_path, **entries))


@pytest.mark.parametrize(
    ("packed", "expected"),
    [
        ({"dtype": "<f8", "shape": [3], "base64": "AAAA"}, "found 3 bytes"),
        ({"dtype": "<f8", "shape": [2], "base64": "AAAAAAAAAAA="}, "shape [2]"),
        ({"dtype": "<c16", "shape": [1], "base64": ""}, "dtype: found '<c16'"),
        ({"dtype": "<f8", "shape": ["x"], "base64": ""}, "shape ['x']"),
        ({"dtype": "<f8", "shape": [0], "base64": "not base64!"}, "found no dtype"),
    ],
)
def test_a_damaged_array_is_named(tmp_path: Path, packed: Any, expected: str) -> None:
    message = refusal(damaged(tmp_path, arrays={"panel_corners_m": packed}))
    assert message.startswith("arrays: panel_corners_m: ") and expected in message


@pytest.mark.parametrize(
    ("data", "expected"),
    [
        (b"", "line 1: not JSON"),
        (b'{\n"format": "bem', "line 2: not JSON"),
        (b"\xff\xfe\xff", "not JSON text"),
        (b"[" * 100_000, "not JSON text"),
        (b"[1, 2]", "not a saved result"),
    ],
)
def test_other_files_are_refused(tmp_path: Path, data: bytes, expected: str) -> None:
    path = tmp_path / "other.json"
    path.write_bytes(data)
    assert expected in refusal(path)


def test_arrays_of_a_foreign_type_are_not_saved(tmp_path: Path) -> None:
    result = sample_result(density=np.zeros((3, 2), dtype=complex))
    with pytest.raises(InputError, match="cannot save an array of complex128"):
        result.to_json(tmp_path / "r.json")
    assert list(tmp_path.iterdir()) == []


WIRED: dict[str, Any] = {
    "states": ("grounded", "terminal"),
    "nodes": (None, "frame"),
    "reduction": Reduction({"frame": ("wall", "door")}, ("rod",), (("pad", "stud"),)),
}


def test_states_and_reductions_follow_the_schema(tmp_path: Path) -> None:
    record = saved(tmp_path, **WIRED)
    jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)
    assert_same(load_result(tmp_path / "r.json"), sample_result(**WIRED))


def test_files_of_before_states_still_load(tmp_path: Path) -> None:
    path = damaged(tmp_path, **dict.fromkeys(LATER))
    record = json.loads(path.read_text())
    assert not LATER & set(record)
    jsonschema.validate(record, SCHEMA, cls=jsonschema.Draft202012Validator)
    assert_same(load_result(path), sample_result())


@pytest.mark.parametrize(
    ("entry", "value"),
    [
        ("states", ["grounded"]),
        ("states", ["earthed", "terminal"]),
        ("nodes", [None]),
        ("nodes", [1, None]),
        ("reduction", {"terminals": {}}),
        ("reduction", {"terminals": {"a": [1]}, "grounded": [], "floating": []}),
        ("reduction", 3),
    ],
)
def test_damaged_states_are_refused_by_name(tmp_path: Path, entry: str, value: Any) -> None:
    said = refusal(damaged(tmp_path, **{entry: value}))
    assert said == f"entry {entry!r} is damaged; save the result again"
