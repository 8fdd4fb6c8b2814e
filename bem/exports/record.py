"""A result as one record of plain values (see result.schema.json), and back."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from bem.errors import InputError
from bem.exports.arrays import pack, unpack
from bem.exports.lossy_record import lossy_of, lossy_record
from bem.exports.plain import plain, put_non_finite, take_non_finite
from bem.results.lossy import Lossy
from bem.results.result import CapacitanceResult, Reduction, Round
from bem.scene.states import STATES

FORMAT = "bem capacitance result"
SCHEMA_VERSION = 1

_ARRAYS = {
    "panel_corners": "panel_corners_m",
    "panel_conductor": "panel_conductor",
    "density": "density_C_per_m2_per_V",
}


def to_record(result: CapacitanceResult, arrays: bool = True) -> dict[str, Any]:
    """Everything in ``result`` as JSON values.

    Args:
        result: what to describe.
        arrays: also the panels and densities.
    """
    record = {**_values(result), **_origin(result), **_wiring_record(result)}
    if result.lossy:
        record["frequencies"] = [lossy_record(entry) for entry in result.lossy]
    tidy, found = take_non_finite(plain(record), [])
    tidy["non_finite"] = found
    if arrays:
        tidy["arrays"] = _packed(result)
    return tidy


def _values(result: CapacitanceResult) -> dict[str, Any]:
    return {
        "format": FORMAT,
        "schema_version": SCHEMA_VERSION,
        "version": result.version,
        "conductors": result.conductors,
        "capacitance_F": result.capacitance,
        "error_F": result.error,
        "row_sum_F": result.row_sum,
        "row_sum_error_F": result.row_sum_error,
        "mutual_F": result.mutual,
        "tolerance": result.tolerance,
        "pairs": [
            {"conductors": names, "accuracy": accuracy} for names, accuracy in result.pairs.items()
        ],
        "converged": bool(result.converged),
        "stopped_by": result.stopped_by,
    }


def _origin(result: CapacitanceResult) -> dict[str, Any]:
    return {
        "panels": result.panels,
        "rounds": [_round_record(entry) for entry in result.rounds],
        "budget_F": result.budget,
        "audit": result.audit,
        "warnings": result.warnings,
        "inputs": result.inputs,
        "settings": result.settings,
        "seconds": result.seconds,
    }


def _round_record(entry: Round) -> dict[str, Any]:
    return {
        "panels": entry.panels,
        "capacitance_F": entry.capacitance,
        "error_F": entry.error,
        "worst": entry.worst,
        "seconds": entry.seconds,
    }


def _wiring_record(result: CapacitanceResult) -> dict[str, Any]:
    done = result.reduction
    reduction = (
        {
            "terminals": done.terminals,
            "grounded": done.grounded,
            "floating": done.floating,
        }
        if done
        else None
    )
    return {"states": result.states, "nodes": result.nodes, "reduction": reduction}


def _packed(result: CapacitanceResult) -> dict[str, Any]:
    values = {key: getattr(result, name) for name, key in _ARRAYS.items()}
    return {key: pack(array) for key, array in values.items() if array is not None}


def from_record(record: Any) -> CapacitanceResult:
    """Return the result that ``to_record`` described.

    Args:
        record: as read from JSON; changed on the way.

    Raises:
        InputError: an entry is missing or damaged; the message names it.
    """
    _check_kind(record)
    put_non_finite(record, record.get("non_finite", []))
    entries = _Entries(record)
    names = tuple(entries.get("conductors", lambda found: [_text(name) for name in found]))
    n = len(names)
    return CapacitanceResult(
        conductors=names,
        capacitance=entries.floats("capacitance_F", (n, n)),
        error=entries.floats("error_F", (n, n)),
        row_sum=entries.floats("row_sum_F", (n,)),
        row_sum_error=entries.floats("row_sum_error_F", (n,)),
        **_outcome(entries, names),
        **_history(entries, n),
        **_circumstances(entries),
        **_wiring(entries, n),
        lossy=entries.later("frequencies", lambda found: _lossy(found, n), ()),
        **_unpacked(record),
    )


def _check_kind(record: Any) -> None:
    if not isinstance(record, dict) or record.get("format") != FORMAT:
        raise InputError(
            f"not a saved result: its entry format must be {FORMAT!r}; "
            "give a file that --json or to_json wrote"
        )
    found = record.get("schema_version")
    if found != SCHEMA_VERSION:
        raise InputError(
            f"schema_version: found {found!r}; this bem reads {SCHEMA_VERSION}; "
            "use the bem that wrote the file or a newer one"
        )


class _Entries:
    """Entries of a record, each converted, with messages that name the entry."""

    def __init__(self, record: dict[str, Any]) -> None:
        self._record = record

    def get(self, key: str, convert: Callable[[Any], Any]) -> Any:
        try:
            return convert(self._record[key])
        except (KeyError, TypeError, ValueError, AttributeError, OverflowError) as error:
            what = "damaged" if key in self._record else "missing"
            raise InputError(f"entry {key!r} is {what}; save the result again") from error

    def later(self, key: str, convert: Callable[[Any], Any], missing: Any) -> Any:
        """As ``get``, for an entry that older files do not have."""
        return self.get(key, convert) if key in self._record else missing

    def floats(self, key: str, shape: tuple[int, ...]) -> np.ndarray:
        return self.get(key, lambda found: _floats(found, shape))


def _floats(found: Any, shape: tuple[int, ...]) -> np.ndarray:
    array = np.asarray(found, dtype=float)
    if array.shape != shape:
        raise ValueError(f"shape {array.shape}, expected {shape}")
    return array


def _outcome(entries: _Entries, names: tuple[str, ...]) -> dict[str, Any]:
    return {
        "tolerance": entries.get("tolerance", float),
        "pairs": entries.get("pairs", lambda found: _pairs(found, names)),
        "converged": entries.get("converged", bool),
        "stopped_by": entries.get("stopped_by", _text),
        "version": entries.get("version", _text),
    }


def _history(entries: _Entries, n: int) -> dict[str, Any]:
    def rounds(found: list[dict[str, Any]]) -> tuple[Round, ...]:
        if not found:
            raise ValueError("no round")
        return tuple(_round(entry, n) for entry in found)

    def budget(found: dict[str, Any]) -> dict[str, np.ndarray]:
        return {part: _floats(values, (n, n)) for part, values in found.items()}

    return {
        "rounds": entries.get("rounds", rounds),
        "budget": entries.get("budget_F", budget),
    }


def _circumstances(entries: _Entries) -> dict[str, Any]:
    return {
        "audit": entries.get("audit", _by_name),
        "warnings": entries.get("warnings", lambda found: tuple(_text(line) for line in found)),
        "inputs": entries.get("inputs", lambda found: tuple(_input(entry) for entry in found)),
        "settings": entries.get("settings", dict),
        "seconds": entries.get("seconds", _seconds),
    }


def _wiring(entries: _Entries, n: int) -> dict[str, Any]:
    def states(found: list[str]) -> tuple[str, ...]:
        if not set(found) <= set(STATES):
            raise ValueError("unknown state")
        return _all_or_none(found, n)

    def nodes(found: list[str | None]) -> tuple[str | None, ...]:
        return _all_or_none([None if node is None else _text(node) for node in found], n)

    return {
        "states": entries.later("states", states, ()),
        "nodes": entries.later("nodes", nodes, ()),
        "reduction": entries.later("reduction", _reduction, None),
    }


def _lossy(found: list[dict[str, Any]], n: int) -> tuple[Lossy, ...]:
    return tuple(lossy_of(entry, n, _floats) for entry in found)


def _all_or_none(found: list[Any], n: int) -> tuple[Any, ...]:
    if len(found) not in (0, n):
        raise ValueError(f"{len(found)} entries, expected {n} or none")
    return tuple(found)


def _reduction(found: dict[str, Any] | None) -> Reduction | None:
    if found is None:
        return None
    return Reduction(
        terminals={name: _names(members) for name, members in found["terminals"].items()},
        grounded=_names(found["grounded"]),
        floating=tuple(map(_names, found["floating"])),
    )


def _names(found: list[str]) -> tuple[str, ...]:
    return tuple(map(_text, found))


def _round(entry: dict[str, Any], n: int) -> Round:
    return Round(
        panels=int(entry["panels"]),
        capacitance=_floats(entry["capacitance_F"], (n, n)),
        error=_floats(entry["error_F"], (n, n)),
        worst=float(entry["worst"]),
        seconds=float(entry["seconds"]),
    )


def _text(found: Any) -> str:
    if not isinstance(found, str):
        raise TypeError(f"found {found!r}, expected text")
    return found


def _pairs(found: list[dict[str, Any]], names: tuple[str, ...]) -> dict[tuple[str, str], float]:
    return {_pair(entry["conductors"], names): float(entry["accuracy"]) for entry in found}


def _pair(pair: list[str], names: tuple[str, ...]) -> tuple[str, str]:
    first, second = pair
    if first not in names or second not in names:
        raise ValueError(f"{pair} are not conductors")
    return first, second


def _by_name(found: dict[str, dict[str, Any]]) -> dict[str, dict[str, Any]]:
    return {name: dict(finding) for name, finding in found.items()}


def _seconds(found: dict[str, float]) -> dict[str, float]:
    return {phase: float(value) for phase, value in found.items()}


def _input(entry: dict[str, Any]) -> dict[str, Any]:
    changes = {"changes": tuple(entry["changes"])} if "changes" in entry else {}
    return {**entry, **changes}


def _unpacked(record: dict[str, Any]) -> dict[str, Any]:
    arrays = record.get("arrays", {})
    if not isinstance(arrays, dict):
        raise InputError("entry 'arrays' is damaged; save the result again")
    return {
        name: unpack(arrays[key], f"arrays: {key}")
        for name, key in _ARRAYS.items()
        if key in arrays
    }
