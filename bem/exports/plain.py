"""Values as JSON knows them: no arrays, no tuples, no infinities.

JSON has no token for a number that is not finite. Such a number is saved as null, and a list
beside the record tells where it stood and what it was, so that reading restores it.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from bem.errors import InputError

Where = list[str | int]


def plain(value: Any) -> Any:
    """``value`` made of dict, list, str, int, float, bool and None alone."""
    if isinstance(value, dict):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    if isinstance(value, np.ndarray | np.generic):
        return value.tolist()
    if value is None or isinstance(value, bool | int | float | str):
        return value
    return str(value)


def take_non_finite(value: Any, where: Where) -> tuple[Any, list[dict[str, Any]]]:
    """``value`` with null for each number that is not finite, and what those were.

    Args:
        value: as ``plain`` returns it.
        where: keys and indices that lead from the record to ``value``.
    """
    if isinstance(value, float) and not math.isfinite(value):
        return None, [{"at": where, "value": repr(value)}]
    if isinstance(value, dict):
        keys = list(value)
        items, found = _take_each(list(value.values()), keys, where)
        return dict(zip(keys, items, strict=True)), found
    if isinstance(value, list) and not _all_finite(value):
        return _take_each(value, list(range(len(value))), where)
    return value, []


def _all_finite(items: list[Any]) -> bool:
    """Tell at once that a list holds nothing but finite numbers: then so does their sum."""
    try:
        return math.isfinite(sum(items))
    except (TypeError, OverflowError):
        return False


def _take_each(
    items: list[Any], keys: list[Any], where: Where
) -> tuple[list[Any], list[dict[str, Any]]]:
    kept, found = [], []
    for key, item in zip(keys, items, strict=True):
        value, below = take_non_finite(item, [*where, key])
        kept.append(value)
        found.extend(below)
    return kept, found


def put_non_finite(record: Any, found: Any) -> None:
    """Undo ``take_non_finite`` in place.

    Raises:
        InputError: the list does not fit the record.
    """
    try:
        for entry in found:
            *path, last = entry["at"]
            home = record
            for key in path:
                home = home[key]
            home[last] = float(entry["value"])
    except (TypeError, KeyError, IndexError, ValueError) as error:
        raise InputError(
            "non_finite: found an entry that points nowhere; save the result again"
        ) from error
