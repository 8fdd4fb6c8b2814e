"""The change between two scenes: on the same panels where that is possible."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from numbers import Real
from typing import Any, NamedTuple

import numpy as np

from bem import __version__
from bem.errors import UsageError
from bem.extraction.audit import Audit
from bem.extraction.counterpart import Counterparts, check_names, in_order
from bem.extraction.extract import (
    MAX_PANELS,
    audited,
    check_counts,
    extract,
    goal_of,
    must_compile,
    result_of,
    warnings_of,
)
from bem.extraction.facets import facet_lines, facet_record
from bem.extraction.layer_check import check_layers
from bem.extraction.lockstep import Carrier, Lockstep
from bem.extraction.loop import Limits, Run
from bem.extraction.marking import Goal
from bem.extraction.memory import MemoryPlan
from bem.extraction.progress import Progress
from bem.extraction.scaled import ScaledScene
from bem.extraction.threads import use_threads
from bem.geometry.wording import listed
from bem.panels.mesh import Mesh
from bem.results import comparison
from bem.results.comparison import Comparison
from bem.results.result import CapacitanceResult
from bem.scene.inspect import check_scene
from bem.scene.media_record import media_record
from bem.scene.plane_checks import planes_record
from bem.scene.scene import Scene

CHANGE_ACCURACY = 0.02
WITH_DIELECTRICS = (
    "scenes with dielectrics are solved each on panels of its own: errors do not cancel, and the "
    "bars of both add up"
)

Side = Scene | CapacitanceResult
"""A scene, or what was computed of it before."""


@dataclass(frozen=True)
class Effort:
    """Limits of the run, as ``extract`` takes them."""

    max_panels: int
    memory: int | None
    threads: int | None
    progress: Callable[[Progress], None] | None

    @property
    def report(self) -> Callable[[Progress], None]:
        """Where to tell how it goes."""
        return self.progress or (lambda _: None)


class Asked(NamedTuple):
    """Tolerance of both matrices, and accuracy of the changes."""

    tolerance: float
    accuracy: float


def compare(
    before: Side,
    after: Side,
    tolerance: float = 1e-3,
    *,
    change_accuracy: float = CHANGE_ACCURACY,
    max_panels: int = MAX_PANELS,
    memory: int | None = None,
    threads: int | None = None,
    progress: Callable[[Progress], None] | None = None,
) -> Comparison:
    """Change of the Maxwell capacitance matrix from one scene to another, with bars.

    Both scenes are solved on the same panels, carried over from the one to the other, so that
    most of the error is the same on both sides and cancels. Where the panels cannot be carried
    over, or a side is a saved result, the two are independent and their bars add up.

    Args:
        before: the first scene, or a result of it.
        after: the second one, with the same names of conductors in any order.
        tolerance: every bar of both matrices is brought below this times sqrt(C_ii C_jj).
        change_accuracy: every bar of a change is brought below this times the largest change,
            both over sqrt(C_ii C_jj); asked only where errors cancel.
        max_panels: the comparison stops, unconverged, before it needs more.
        memory: limit in bytes for the matrices of both scenes; by default 80 % of what is free.
        threads: of the compiled integrals; by default all cores.
        progress: called with a Progress at every step.

    Returns:
        The comparison; ``converged`` says whether all that was asked was reached.

    Raises:
        UsageError: a setting is out of range, or the conductors have different names.
        GeometryError: conductors touch, cross, or lie inside solid metal.
        MemoryRefused: the starting mesh alone exceeds the limit.
        InputError: the starting mesh alone exceeds ``max_panels``.
        SolutionError: the audit found a result unusable.
    """
    started = time.perf_counter()
    asked = _asked(tolerance, change_accuracy)
    check_counts(max_panels, memory)
    effort = Effort(max_panels, memory, threads, progress)
    names = _names(before)
    check_names(names, _names(after))
    if isinstance(before, Scene) and isinstance(after, Scene):
        found = _of_scenes(before, in_order(after, names), asked, effort)
    else:
        found = _independent(before, after, asked, effort, [_saved(before, after)])
    seconds = {**found.seconds, "total": time.perf_counter() - started}
    return replace(found, seconds=seconds)


def _asked(tolerance: float, accuracy: float) -> Asked:
    if not (isinstance(accuracy, Real) and 0.0 < accuracy <= 1.0):
        raise UsageError(f"change_accuracy: found {accuracy!r}, allowed is above 0 up to 1")
    return Asked(float(tolerance), float(accuracy))


def _names(side: Side) -> list[str]:
    if isinstance(side, Scene):
        return [conductor.name for conductor in side.conductors]
    if isinstance(side, CapacitanceResult):
        return list(side.conductors)
    raise UsageError(f"found {type(side).__name__}, needs a Scene or a CapacitanceResult")


def _saved(before: Side, after: Side) -> str:
    sides = [
        name
        for name, side in (("first", before), ("second", after))
        if isinstance(side, CapacitanceResult)
    ]
    which = "both sides are saved results" if len(sides) == 2 else f"the {sides[0]} side is saved"
    return f"{which}: errors do not cancel, and the bars of both add up"


def _independent(
    before: Side, after: Side, asked: Asked, effort: Effort, notes: list[str]
) -> Comparison:
    """Each side by itself; the bars of both add up."""
    first = _result_of_side(before, asked, effort)
    second = comparison.in_order(_result_of_side(after, asked, effort), first.conductors)
    apart = 0.0 if comparison.same_result(first, second) else 1.0
    reasons = [r.stopped_by for r in (first, second) if not r.converged]
    return Comparison(
        before=first,
        after=second,
        change=second.capacitance - first.capacitance,
        change_error=apart * (first.error + second.error),
        row_sum_change=second.row_sum - first.row_sum,
        row_sum_change_error=apart * (first.row_sum_error + second.row_sum_error),
        tolerance=asked.tolerance,
        change_accuracy=asked.accuracy,
        correlated=False,
        converged=not reasons,
        stopped_by=reasons[0] if reasons else "tolerance",
        notes=(*notes, *_wiring((first, second))),
        version=__version__,
    )


def _result_of_side(side: Side, asked: Asked, effort: Effort) -> CapacitanceResult:
    if isinstance(side, CapacitanceResult):
        return side
    result = extract(
        side,
        asked.tolerance,
        max_panels=effort.max_panels,
        memory=effort.memory,
        threads=effort.threads,
        progress=effort.progress,
    )
    if result.stopped_by == "interrupt":
        raise KeyboardInterrupt
    return result


def _of_scenes(before: Scene, after: Scene, asked: Asked, effort: Effort) -> Comparison:
    goal = goal_of(before, asked.tolerance, {})
    effort.report(Progress("checking the geometry", 0, 0, float("nan"), 0.0))
    if must_compile():
        effort.report(Progress("compiling kernels, first run only", 0, 0, float("nan"), 0.0))
    lines = [warnings_of(scene, check_scene(scene)) for scene in (before, after)]
    if before.dielectrics or after.dielectrics:
        return _independent(before, after, asked, effort, [WITH_DIELECTRICS])
    forth = Counterparts.of(before, after)
    if forth.motionless:
        names = listed([before.conductors[k].name for k in forth.motionless])
        note = (
            f"the panels of {names} cannot be carried over: meshes differ, errors do not cancel, "
            "and the bars of both scenes add up"
        )
        return _independent(before, after, asked, effort, [note])
    limits = Limits(effort.max_panels, MemoryPlan.of(effort.memory, 2))
    mesh = forth.start(limits.check_start)
    back = Counterparts.of(after, before)
    check_layers(before, mesh)
    finer = None if back.motionless else back.start(limits.check_start)
    if finer is not None and len(finer.conductor) > len(mesh.conductor):
        task = _Task(after, before, back, lines[::-1])
        return _turned(_in_lockstep(task, finer, goal, (asked, effort, limits)))
    return _in_lockstep(_Task(before, after, forth, lines), mesh, goal, (asked, effort, limits))


class _Task(NamedTuple):
    """Two scenes to be solved on panels made for the first."""

    first: Scene
    second: Scene
    pair: Counterparts
    lines: list[tuple[str, ...]]


def _in_lockstep(
    task: _Task, mesh: Mesh, goal: Goal, how: tuple[Asked, Effort, Limits]
) -> Comparison:
    asked, effort, limits = how
    count, started = len(task.first.conductors), time.perf_counter()
    run = Lockstep(
        count,
        goal,
        limits,
        effort.report,
        other=Run(count, goal, limits, effort.report),
        carrier=Carrier(task.pair.carry, task.pair.redrawn, asked.accuracy),
    )
    with use_threads(effort.threads) as used:
        run.go(mesh)
        solved = time.perf_counter()
        findings = audited(run), audited(run.other)
    seconds = {"rounds": solved - started, "audit": time.perf_counter() - solved}
    settings = {
        "max_panels": effort.max_panels,
        "memory_bytes": limits.memory.limit,
        "threads": used,
        "operator": "dense",
    }
    first, second = (
        _one_result((scene, scaled, lines), run.alone(own), found, (seconds, settings))
        for scene, scaled, own, found, lines in zip(
            (task.first, task.second),
            (task.pair.first, task.pair.second),
            (run, run.other),
            findings,
            task.lines,
            strict=True,
        )
    )
    extra = max(found.extra for found in findings)
    return _compared(run, (first, second), task.pair, (asked, extra, seconds))


def _one_result(
    side: tuple[Scene, ScaledScene, tuple[str, ...]],
    run: Run,
    found: Audit,
    how: tuple[dict[str, float], dict[str, Any]],
) -> CapacitanceResult:
    """The result of one side, as if it had been extracted by itself."""
    (scene, scaled, lines), (seconds, settings) = side, how
    facets = facet_record(scene, scaled, run.rounds[-1].solution)
    settings = {
        **settings,
        "relative_permittivity": scene.relative_permittivity,
        **planes_record(scene.planes),
        **media_record(scene),
        "facets": facets,
    }
    notes = lines + tuple(facet_lines(scene, facets))
    return result_of(scene, scaled, run, found, (seconds, settings, notes))


def _compared(
    run: Lockstep,
    results: tuple[CapacitanceResult, CapacitanceResult],
    pair: Counterparts,
    context: tuple[Asked, float, dict[str, float]],
) -> Comparison:
    """The last round's difference in farad.

    With f the farad of one unit, f2 L2 - f1 L1 = f2 (L2 - L1) + (f2 - f1) L1.
    """
    asked, extra, seconds = context
    change, base = run.changes[-1], run.rounds[-1].found
    farad, other = pair.first.farad, pair.second.farad
    value = other * change.value + (other - farad) * base.value
    bar = other * change.bar + abs(other - farad) * base.bar + extra * np.abs(value)
    count = run.count
    return Comparison(
        before=results[0],
        after=results[1],
        change=0.5 * (value[:, :count] + value[:, :count].T),
        change_error=0.5 * (bar[:, :count] + bar[:, :count].T),
        row_sum_change=value[:, -1],
        row_sum_change_error=bar[:, -1],
        tolerance=asked.tolerance,
        change_accuracy=asked.accuracy,
        correlated=True,
        converged=run.stopped_by == "tolerance" and all(r.converged for r in results),
        stopped_by=run.stopped_by,
        notes=_wiring(results),
        seconds=seconds,
        version=__version__,
    )


def _wiring(results: tuple[CapacitanceResult, CapacitanceResult]) -> tuple[str, ...]:
    """Say that the full matrices are compared, where there are smaller ones."""
    if not any(result.states or result.nodes for result in results):
        return ()
    same = len({_states_of(result) for result in results}) == 1
    differ = "" if same else "; WHAT IS GROUNDED, FLOATING OR TIED DIFFERS between the two"
    return (
        f"conductors that are grounded, floating or tied are compared as all others{differ}; "
        "compare what 'bem reduce --json' saves of each for the terminals",
    )


def _states_of(result: CapacitanceResult) -> frozenset[tuple[str, str, str | None]]:
    """State and node of each conductor by name."""
    names = result.conductors
    states = result.states or ("terminal",) * len(names)
    nodes = result.nodes or (None,) * len(names)
    return frozenset(zip(names, states, nodes, strict=True))


def _turned(found: Comparison) -> Comparison:
    """The same comparison seen from the other side."""
    return replace(
        found,
        before=found.after,
        after=found.before,
        change=0.0 - found.change,
        row_sum_change=0.0 - found.row_sum_change,
    )
