"""The lines below the tables: what the bars mean, how the result was reached, what to know."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from typing import Any

import numpy as np

from bem.exports.lossy_tables import frequency_text
from bem.exports.media import media_lines, surroundings_text
from bem.exports.names import shown
from bem.geometry.wording import metre_text
from bem.results.outcome import remedy
from bem.results.result import CapacitanceResult
from bem.units import metre_unit

MEANING = "{sign} is a bound meant to hold for at least 95 % of entries"
MOST_NOTES = 10
MOST_NAMES = 12
WIDEST_NAME = 30
_ROUTINE = re.compile(r"[\d,]+ corners as read joined into [\d,]+ vertices")
"""Every STL needs this; it stays in the JSON file and in what inspect prints."""

_TOTAL = "total"


def lines_of(result: CapacitanceResult, sign: str) -> list[str]:
    """One fact per line, in the order in which a reader needs them.

    Args:
        result: what to describe.
        sign: how plus-minus is written.
    """
    return [
        MEANING.format(sign=sign),
        *_reduction(result),
        _outcome(result),
        _effort(result),
        *_phases(result),
        *_bodies(result),
        *_planes(result),
        *media_lines(result.settings),
        *_frequencies(result),
        _audit(result),
        *_changes(result),
        *(f"warning: {shown(line)}" for line in result.warnings),
    ]


def _reduction(result: CapacitanceResult) -> list[str]:
    """Say which conductors were grounded, left floating, and tied."""
    done = result.reduction
    if done is None:
        return []
    tied = [
        f"{shown(name)} is {_few(members, ' with ')}"
        for name, members in done.terminals.items()
        if members != (name,)
    ]
    parts = [f"grounded {_few(done.grounded)}"] if done.grounded else []
    afloat = [_few(node, " with ") for node in done.floating]
    parts += [f"floating without charge {', '.join(_few_of(afloat))}"] if afloat else []
    return [f"conductors reduced: {'; '.join([*parts, *_few_of(tied)])}"]


def _few(names: Sequence[str], between: str = ", ") -> str:
    return between.join(_few_of([shown(name, WIDEST_NAME) for name in names]))


def _few_of(names: Sequence[str]) -> list[str]:
    more = [f"{len(names) - MOST_NAMES} more"] if len(names) > MOST_NAMES else []
    return [*names[:MOST_NAMES], *more]


def _worst(result: CapacitanceResult) -> float:
    """Largest bar over what is allowed for it."""
    used = float(result.used.max())
    return used if result.reduction else max(result.rounds[-1].worst, used)


def _outcome(result: CapacitanceResult) -> str:
    worst = _worst(result)
    times = f"{worst:.2g} times" if math.isfinite(worst) else "not yet comparable with"
    here = " here" if result.reduction else ""
    largest = f"the largest bar{here} is {times} what it allows"
    pair = _worst_pair(result)
    if pair:
        largest = pair
    if result.converged:
        where = " by the full matrix" if result.reduction else ""
        return f"tolerance {result.tolerance:g} reached{where}: {largest}"
    reason = remedy(result.stopped_by, result.converged)
    return f"TOLERANCE {result.tolerance:g} NOT REACHED: {largest}; {reason}"


def _worst_pair(result: CapacitanceResult) -> str:
    """Words for the coupling that was asked for by name and is the furthest from its goal."""
    i, j = np.unravel_index(int(np.argmax(result.used)), result.used.shape)
    names = (result.conductors[i], result.conductors[j])
    asked = result.pairs.get(names, result.pairs.get(names[::-1]))
    value, bar = abs(result.capacitance[i, j]), result.error[i, j]
    if asked is None or result.allowance[i, j] < asked * value * (1.0 - 1e-9) or value == 0.0:
        return ""
    first, second = (shown(name, WIDEST_NAME) for name in names)
    return (
        f"the pair {first}, {second} has a bar of {100.0 * bar / value:.2g} % "
        f"of its value, asked was {100.0 * asked:g} %"
    )


def _effort(result: CapacitanceResult) -> str:
    threads = result.settings.get("threads", "not recorded")
    seconds = result.seconds.get(_TOTAL, result.rounds[-1].seconds)
    return (
        f"panels {result.panels}, rounds {len(result.rounds)}, "
        f"time {seconds:.3g} s, threads {threads}"
    )


def _phases(result: CapacitanceResult) -> list[str]:
    phases = {phase: time for phase, time in result.seconds.items() if phase != _TOTAL}
    parts = [
        f"{shown(phase)} {time:.0f} s" if time >= 10.0 else f"{shown(phase)} {time:.2g} s"
        for phase, time in phases.items()
    ]
    return [f"time by phase: {', '.join(parts)}"] if parts else []


def _bodies(result: CapacitanceResult) -> list[str]:
    """Give the size of the whole, so that a wrong unit strikes the eye, and the medium."""
    facts = []
    if result.panel_corners is not None and len(result.panel_corners):
        points = result.panel_corners.reshape(-1, 3)
        span = points.max(axis=0) - points.min(axis=0)
        name, size = metre_unit(float(span.max()))
        lengths = " x ".join(f"{length / size:.4g}" for length in span)
        cut = "mirror_planes_m" in result.settings
        kept = " (the part that mirror planes leave)" if cut else ""
        facts.append(f"bodies span {lengths} {name}{kept}")
    if "relative_permittivity" in result.settings:
        facts.append(f"relative permittivity {surroundings_text(result.settings)}")
    return [", ".join(facts)] if facts else []


def _planes(result: CapacitanceResult) -> list[str]:
    """What images stand for, and whether the half or the whole is reported."""
    lines = []
    if "ground_plane_m" in result.settings:
        where = _plane(result.settings["ground_plane_m"])
        lines.append(f"infinite grounded plane {where}")
    if mirrors := result.settings.get("mirror_planes_m"):
        where = ", ".join(map(_plane, mirrors))
        lines.append(
            f"mirror planes {where}: all values are for the whole, each body together with its "
            f"images; 1/{2 ** len(mirrors)} of it was solved"
        )
    return lines


def _frequencies(result: CapacitanceResult) -> list[str]:
    """Say what holds at frequencies, and where the tolerance was not reached."""
    if not result.lossy:
        return []
    lines = ["at a frequency f: currents I = (G + j 2 pi f C) V; above, C without losses"]
    missed = [frequency_text(entry.frequency) for entry in result.lossy if not entry.converged]
    if missed:
        lines.append(f"TOLERANCE NOT REACHED at {', '.join(_few_of(missed))}; raise max panels")
    return lines


def _plane(coordinate: dict[str, float]) -> str:
    return ", ".join(f"{axis} = {metre_text(at)}" for axis, at in coordinate.items())


def _audit(result: CapacitanceResult) -> str:
    if not result.audit:
        return "audit: no check was recorded"
    off = [_finding(name, found) for name, found in result.audit.items() if not found["ok"]]
    if off:
        return f"audit: {len(off)} of {len(result.audit)} checks off: {'; '.join(off)}"
    name = max(result.audit, key=lambda check: _used(result.audit[check]))
    nearest = _finding(name, result.audit[name])
    count = len(result.audit)
    return f"audit: {count} of {count} checks passed; nearest to its limit: {nearest}"


def _finding(name: str, found: dict[str, Any]) -> str:
    return f"{shown(name.replace('_', ' '))} {found['value']:.2g} (limit {found['limit']:.2g})"


def _used(found: dict[str, Any]) -> float:
    """How much of its limit a finding takes."""
    return float(np.divide(abs(found["value"]), abs(found["limit"]))) if found["limit"] else 0.0


def _changes(result: CapacitanceResult) -> list[str]:
    notes = [
        f"{shown(str(entry.get('name')))}: {shown(change)}"
        for entry in (*result.inputs, *result.settings.get("dielectrics", ()))
        for change in entry.get("changes", ())
        if not _ROUTINE.fullmatch(str(change))
    ]
    left_out = len(notes) - MOST_NOTES
    more = [f"{left_out} more changes on reading; all are in the JSON file"] if left_out > 0 else []
    return notes[:MOST_NOTES] + more
