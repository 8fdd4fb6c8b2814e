"""From a scene to its capacitance matrix: the one call that everything else serves."""

from __future__ import annotations

import math
import time
from collections.abc import Callable, Sequence
from dataclasses import asdict, replace
from numbers import Integral, Real
from typing import Any

import numpy as np

from bem import __version__
from bem.errors import SolutionError, UsageError
from bem.extraction.audit import Audit, audit
from bem.extraction.facets import facet_lines, facet_record
from bem.extraction.layer_check import check_layers, layer_record
from bem.extraction.loop import Limits, RoundState, Run
from bem.extraction.lossy import check_losses, media_of, with_losses
from bem.extraction.marking import Goal
from bem.extraction.memory import MemoryPlan, count_of
from bem.extraction.progress import Progress
from bem.extraction.rounds import solver_of
from bem.extraction.scaled import ScaledScene
from bem.extraction.threads import use_threads
from bem.panels.mesh import Mesh
from bem.results.result import CapacitanceResult, Round
from bem.scene.inspect import Inspection, check_scene
from bem.scene.media_record import media_record
from bem.scene.plane_checks import planes_record
from bem.scene.scene import Scene
from bem.scene.states import check_terminals, wiring_of

MAX_PANELS = 10000
TIGHTEST = 1e-6


def extract(
    scene: Scene,
    tolerance: float = 1e-3,
    *,
    pairs: dict[tuple[str, str], float] | None = None,
    max_panels: int = MAX_PANELS,
    memory: int | None = None,
    threads: int | None = None,
    progress: Callable[[Progress], None] | None = None,
    frequencies: Sequence[float] = (),
) -> CapacitanceResult:
    """Maxwell capacitance matrix of a scene, with an error bar on every entry.

    Args:
        scene: conductors and surroundings.
        tolerance: every bar is brought below this times sqrt(C_ii C_jj).
        pairs: relative accuracy wanted for single couplings, by their two names.
        max_panels: the extraction stops, unconverged, before it needs more.
        memory: limit in bytes for its matrices; by default 80 % of what is free.
        threads: of the compiled integrals; by default all cores.
        progress: called with a Progress at every step.
        frequencies: Hz; at each of them ``lossy`` of the result has C and G with the losses of
            all media. The main matrix is that without losses.

    Returns:
        The result; ``converged`` says whether all bars came below what was asked.

    Raises:
        UsageError: a setting is out of range or names no conductor, or frequencies are given
            though nothing depends on them.
        GeometryError: conductors touch, cross, or lie inside solid metal.
        MemoryRefused: the starting mesh alone exceeds the limit.
        InputError: the starting mesh alone exceeds ``max_panels``.
        SolutionError: the audit found the result unusable.
    """
    started = time.perf_counter()
    goal = goal_of(scene, tolerance, pairs or {})
    check_counts(max_panels, memory)
    wanted = frequencies_of(frequencies)
    if wanted:
        check_losses(scene)
    report = progress or (lambda _: None)
    report(Progress("checking the geometry", 0, 0, float("nan"), 0.0))
    if must_compile(mixed=bool(scene.dielectrics)):
        report(Progress("compiling kernels, first run only", 0, 0, float("nan"), 0.0))
    inspection = check_scene(scene)
    checked = time.perf_counter()
    scaled = ScaledScene.of(scene)
    limits = Limits(max_panels, MemoryPlan.of(memory))
    mesh = starting_mesh(scene, scaled, limits)
    check_layers(scene, mesh)
    solve = solver_of(mesh, scaled.permittivity)
    run = Run(len(scene.conductors), goal, limits, report, started=started, solve=solve)
    with use_threads(threads) as used:
        run.go(mesh)
        solved = time.perf_counter()
        findings = audited(run)
        lossy = with_losses(run, scene, wanted, scaled.farad)
    facets = facet_record(scene, scaled, run.rounds[-1].solution)
    ended = time.perf_counter()
    seconds = {
        "geometry": checked - started,
        "rounds": solved - checked,
        "audit": ended - solved,
        "total": ended - started,
    }
    settings = {
        "max_panels": max_panels,
        "memory_bytes": limits.memory.limit,
        "threads": used,
        "relative_permittivity": scene.relative_permittivity,
        **planes_record(scene.planes),
        **media_record(scene),
        **layer_record(run.rounds[-1].solution),
        "operator": "dense",
        "facets": facets,
    }
    notes = warnings_of(scene, inspection, wanted) + tuple(facet_lines(scene, facets))
    result = result_of(scene, scaled, run, findings, (seconds, settings, notes))
    return replace(result, lossy=lossy)


def starting_mesh(scene: Scene, scaled: ScaledScene, limits: Limits) -> Mesh:
    """First mesh of a scene, of parts if there are dielectrics.

    Raises:
        MemoryRefused: it alone exceeds the limit.
        InputError: it alone exceeds ``max_panels``.
    """
    if not scene.dielectrics:
        hollow = [k for k, c in enumerate(scene.conductors) if c.body == "shell"]
        return Mesh.start(scaled.surfaces, hollow, limits.check_start, scaled.planes)
    mesh = Mesh.start(scaled.parts, (), limits.check_start, scaled.planes, scaled.coincidence)
    limits.memory.check_start(count_of(mesh.conductor))
    return mesh


def frequencies_of(frequencies: Sequence[float]) -> tuple[float, ...]:
    """Check frequencies, in Hz.

    Raises:
        UsageError: one is not a positive number.
    """
    for frequency in frequencies:
        if not (isinstance(frequency, Real) and 0.0 < frequency < math.inf):
            raise UsageError(f"frequencies: found {frequency!r}, needs positive numbers, in Hz")
    return tuple(float(frequency) for frequency in frequencies)


def audited(run: Run) -> Audit:
    """Check the last round.

    Raises:
        SolutionError: it is unusable.
    """
    findings = audit(run.rounds[-1].solution, run.rounds[-1].found)
    if findings.wild:
        raise SolutionError(
            f"the result failed its audit: {findings.wild[0]}; "
            "check the geometry with 'bem inspect' and report the case if it is sound"
        )
    return findings


def warnings_of(
    scene: Scene, inspection: Inspection, frequencies: Sequence[float] = ()
) -> tuple[str, ...]:
    """Lines for the user about a scene."""
    lines = list(inspection.warnings)
    if not frequencies and any(medium.lossy for medium in media_of(scene)):
        lines.append(
            "losses of the media are not in these values; give frequencies (--frequency 1kHz) "
            "to have C and G with them"
        )
    if scene.relative_permittivity < 1.0:
        lines.append(
            f"relative permittivity {scene.relative_permittivity:g} is below that of vacuum, 1; "
            "check the number"
        )
    return tuple(lines)


def goal_of(scene: Scene, tolerance: float, pairs: dict[tuple[str, str], float]) -> Goal:
    """What is asked of the bars, in numbers of conductors.

    Raises:
        UsageError: a setting is out of range or names no conductor.
    """
    if not scene.conductors:
        raise UsageError("the scene has no conductors: add at least one")
    check_terminals(scene.conductors)
    if not (isinstance(tolerance, Real) and TIGHTEST <= tolerance <= 0.5):
        raise UsageError(f"tolerance: found {tolerance!r}, allowed is {TIGHTEST:g} to 0.5")
    names = [c.name for c in scene.conductors]
    wanted = []
    for pair, accuracy in pairs.items():
        if not (isinstance(pair, tuple) and len(pair) == 2):
            raise UsageError(f"pair: found {pair!r}, needs a tuple of two names of conductors")
        for name in pair:
            if name not in names:
                raise UsageError(
                    f"pair: no conductor is named {name!r}; there are {', '.join(names)}"
                )
        if pair[0] == pair[1]:
            raise UsageError(f"pair: found {pair[0]!r} twice, needs two different conductors")
        if not (isinstance(accuracy, Real) and TIGHTEST <= accuracy <= 1.0):
            raise UsageError(f"pair: found accuracy {accuracy!r}, allowed is {TIGHTEST:g} to 1")
        wanted.append((names.index(pair[0]), names.index(pair[1]), float(accuracy)))
    return Goal(float(tolerance), tuple(wanted))


def check_counts(max_panels: int, memory: int | None) -> None:
    """Refuse limits that are none.

    Raises:
        UsageError: one is out of range.
    """
    if not (isinstance(max_panels, Integral) and max_panels >= 1):
        raise UsageError(f"max_panels: found {max_panels!r}, needs a whole number of at least 1")
    if memory is not None and not (isinstance(memory, Real) and 1 <= memory < math.inf):
        raise UsageError(f"memory: found {memory!r} bytes, needs a number of at least 1")


def must_compile(mixed: bool = False) -> bool:
    """Whether the largest kernel is in no cache yet.

    Args:
        mixed: that for dielectrics, instead of that for conductors alone.
    """
    from bem.compiled import FOLDER
    from bem.kernels import mixed as interfaces
    from bem.kernels import pairs

    if (interfaces if mixed else pairs).fill_block.signatures:
        return False
    return not any(FOLDER.rglob(f"{'mixed' if mixed else 'pairs'}.fill_block-*.nbi"))


def _record(state: RoundState, farad: float) -> Round:
    count = len(state.found.value)
    return Round(
        panels=state.sums.panels,
        capacitance=farad * state.found.value[:, :count],
        error=farad * state.found.bar[:, :count],
        worst=state.worst,
        seconds=state.seconds,
    )


def _symmetric(value: np.ndarray) -> np.ndarray:
    return 0.5 * (value + value.T)


def result_of(
    scene: Scene, scaled: ScaledScene, run: Run, findings: Audit, context: tuple[Any, Any, Any]
) -> CapacitanceResult:
    """What the last round found, in farad, with how it was reached.

    Args:
        scene: conductors and surroundings.
        scaled: their frame.
        run: all rounds.
        findings: of the audit.
        context: seconds by phase, settings, and lines for the user.
    """
    seconds, settings, notes = context
    last, farad, count = run.rounds[-1], scaled.farad, run.count
    value = farad * last.found.value
    bar = farad * (last.found.bar + findings.signs) + findings.extra * np.abs(value)
    warnings = list(notes)
    if findings.extra > 0.0:
        warnings.append(f"the energy check adds {findings.extra:.1e} of each entry to its bar")
    if findings.signs.any():
        warnings.append("an entry had the wrong sign by more than its bar, which now reaches zero")
    widened = findings.extra > 0.0 or bool(findings.signs[:, :count].any())
    converged = run.stopped_by == "tolerance" and not widened
    budget = {name: farad * part[:, :count] for name, part in last.found.parts.items()}
    states, nodes = wiring_of(scene.conductors)
    return CapacitanceResult(
        conductors=tuple(c.name for c in scene.conductors),
        capacitance=_symmetric(value[:, :count]),
        error=_symmetric(bar[:, :count]),
        row_sum=value[:, -1],
        row_sum_error=bar[:, -1],
        tolerance=run.goal.tolerance,
        converged=converged,
        stopped_by=run.stopped_by,
        rounds=tuple(_record(state, farad) for state in run.rounds),
        pairs={
            (scene.conductors[i].name, scene.conductors[j].name): a for i, j, a in run.goal.pairs
        },
        budget=budget,
        audit=findings.findings,
        warnings=tuple(warnings),
        inputs=tuple({"name": c.name, **asdict(c.source)} for c in scene.conductors),
        settings=settings,
        seconds=seconds,
        version=__version__,
        states=states,
        nodes=nodes,
        panel_corners=last.solution.mesh.corners * scaled.length + scaled.center,
        panel_conductor=last.solution.conductor,
        density=last.solution.density * (farad / scaled.planes.multiplicity / scaled.length**2),
    )
