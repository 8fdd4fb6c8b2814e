"""Results in JSON files: one entry of the record per line."""

from __future__ import annotations

import json
from os import PathLike
from pathlib import Path
from typing import Any

from bem.errors import InputError
from bem.exports.atomic import write_file
from bem.exports.record import from_record, to_record
from bem.results.result import CapacitanceResult


def save_json(result: CapacitanceResult, path: str | PathLike[str], arrays: bool = True) -> None:
    """Save ``result``; the layout is described in result.schema.json.

    Raises:
        InputError: the file cannot be written.
    """
    lines = [
        f"{json.dumps(key)}: {_encoded(value)}" for key, value in to_record(result, arrays).items()
    ]
    # a lone surrogate, as in a file name of unknown encoding, becomes its JSON escape
    data = ("{\n" + ",\n".join(lines) + "\n}\n").encode("utf-8", "backslashreplace")
    write_file(path, data)


def _encoded(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def load_json(path: str | PathLike[str]) -> CapacitanceResult:
    """Read what ``save_json`` wrote.

    Raises:
        InputError: the file is missing, damaged, or something else.
    """
    record = _read(path)
    try:
        return from_record(record)
    except InputError as error:
        raise InputError(f"{path}: {error}") from error


def _read(path: str | PathLike[str]) -> Any:
    try:
        return json.loads(Path(path).read_bytes())
    except OSError as error:
        raise InputError(f"cannot read {path}: {error.strerror}; check the name") from error
    except json.JSONDecodeError as error:
        raise InputError(
            f"{path}: line {error.lineno}: not JSON ({error.msg}); "
            "give a file that --json or to_json wrote"
        ) from error
    except (ValueError, RecursionError) as error:
        raise InputError(
            f"{path}: not JSON text in UTF-8; give a file that --json or to_json wrote"
        ) from error
