"""Solve, value, bar, refine: until every bar is small enough or a limit is met."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from bem.errors import InputError, SolutionError
from bem.extraction.estimate import ROUNDS, Estimate, estimate
from bem.extraction.marking import Goal, indicator, mark
from bem.extraction.memory import MemoryPlan, count_of, readable
from bem.extraction.progress import Progress
from bem.extraction.solution import Sums, solve_round
from bem.extraction.solved import Solved
from bem.operators.dense import far_reach
from bem.panels.mesh import Mesh

MOST_ROUNDS = 60
FINE_START, EARLY = 500, 0.3
"""A mesh of so many panels may do at once, if its own bar is below this part of what is allowed."""
BULK_FAR, BULK_NEAR = 0.85, 0.7
"""Part of the promise that is refined in one round, far from the goal and near it."""
FAR_FROM_GOAL = 4.0
_OF_THE_INPUT = {"input-rounding": "input rounding", "faceting": "facets of the file"}
"""Parts of the bar that no refinement shrinks, by the reason they stop a run for."""


@dataclass(frozen=True)
class Limits:
    """When to stop early: panels, and bytes of the matrices."""

    max_panels: int
    memory: MemoryPlan

    def check_start(self, panels: int) -> None:
        """Refuse a starting mesh that a limit leaves no room for.

        Raises:
            MemoryRefused: its matrices exceed the memory limit.
            InputError: it has more panels than are allowed in all.
        """
        self.memory.check_start(panels)
        if panels > self.max_panels:
            raise InputError(
                f"the geometry needs at least {panels:,} panels to start with, the limit is "
                f"{self.max_panels:,}: raise max-panels (memory for these: "
                f"{readable(self.memory.need(panels))}), or use coarser facets on curved faces"
            )

    def fits(self, mesh: Mesh, kept: Mesh) -> bool:
        """Whether there is memory for a mesh, while what the one before left is held."""
        return self.memory.fits(count_of(mesh.conductor), count_of(kept.conductor))


@dataclass(frozen=True)
class RoundState:
    """One finished round."""

    solution: Solved
    sums: Sums
    found: Estimate
    worst: float
    seconds: float


@dataclass
class Run:
    """The rounds of an extraction and why it stopped.

    Args:
        count: number of conductors.
        goal: what is asked.
        limits: when to stop early.
        report: called with a Progress at every step.
        solve: solves a mesh, given the number of conductors, where expansions begin, and what
            an earlier operator can give.
    """

    count: int
    goal: Goal
    limits: Limits
    report: Callable[[Progress], None]
    rounds: list[RoundState] = field(default_factory=list)
    stopped_by: str = ""
    started: float = field(default_factory=time.perf_counter)
    solve: Callable[[Mesh, int, float, Any], Solved] = solve_round

    @property
    def elapsed(self) -> float:
        """Seconds since the start."""
        return time.perf_counter() - self.started

    def tell(self, phase: str, panels: int) -> None:
        """Report a step of the round that is being worked on."""
        worst = self.rounds[-1].worst if self.rounds else float("nan")
        self.report(Progress(phase, len(self.rounds) + 1, panels, worst, self.elapsed))

    def go(self, mesh: Mesh) -> None:
        """Run rounds from a starting mesh until the goal or a limit is met.

        Raises:
            KeyboardInterrupt: interrupted before the first round was done.
        """
        try:
            origin = None
            while not self.stopped_by:
                origin, mesh = self._round(mesh, origin)
        except KeyboardInterrupt:
            if not self.rounds:
                raise
            self.stopped_by = "interrupt"
        except SolutionError:
            if len(self.rounds) < ROUNDS:
                raise
            self.stopped_by = "breakdown"

    def _round(self, mesh: Mesh, origin: np.ndarray | None) -> tuple[np.ndarray, Mesh]:
        panels = len(mesh.conductor)
        self.tell("solving", panels)
        solution = self.solve(mesh, self.count, self._far(), self._reuse(origin))
        self._keep(self._judged(solution))
        return self._refine(mesh, solution)

    def _far(self) -> float:
        """Where expansions begin; the first round shows how much they must be trusted with."""
        cancellation = self.rounds[0].sums.cancellation if self.rounds else 1.0
        return far_reach(self.goal.tolerance, cancellation)

    def _reuse(self, origin: np.ndarray | None) -> Any:
        """What the round before can give, if it is as accurate as this one must be."""
        if origin is None:
            return None
        earlier = self.rounds[-1].solution.operator
        return earlier.given(origin) if earlier.far == self._far() else None

    def _judged(self, solution: Solved) -> RoundState:
        """The round with its value, its bars, and how far these are from the goal."""
        here = solution.sums()
        found = estimate([r.sums for r in self.rounds] + [here])
        worst = float(self.goal.worst(found).max())
        fine = here.panels >= FINE_START and worst <= 1.0 and self._own(found) <= EARLY
        if len(self.rounds) + 1 < ROUNDS and not fine:
            worst = max(worst, 1.0 + 1e-9)
        return RoundState(solution, here, found, worst, self.elapsed)

    def _keep(self, state: RoundState) -> None:
        """Add a round, and let go of the matrices of the one before."""
        self.rounds = [*(_light(r) for r in self.rounds), state]

    def _own(self, found: Estimate) -> float:
        """Largest bar over what is allowed for it, without what no refinement shrinks."""
        allowed = self.goal.allowance(found.value[:, : self.count])
        given = sum(found.parts[part] for part in _OF_THE_INPUT.values())
        return float(((found.bar - given)[:, : self.count] / allowed).max())

    def _held_up_by_input(self, last: RoundState) -> str:
        """What of the input alone keeps bars too large, "" if nothing does."""
        count = self.count
        allowed = self.goal.allowance(last.found.value[:, :count])
        parts = {name: last.found.parts[part][:, :count] for name, part in _OF_THE_INPUT.items()}
        given = sum(parts.values())
        rest = last.found.bar[:, :count] - given
        enough = 1.0 if len(self.rounds) >= ROUNDS else EARLY
        small = rest <= enough * np.maximum(allowed, given)
        if not ((given > 0.9 * allowed).any() and small.all()):
            return ""
        return max(parts, key=lambda name: float((parts[name] / allowed).max()))

    def _worst(self) -> float:
        """Largest bar over its allowance after the last round."""
        return self.rounds[-1].worst

    def _promise(self, solution: Solved) -> np.ndarray:
        """(2, n) what halving each panel in either direction promises."""
        return indicator(solution, self.goal, self.rounds[-1].found)

    def _refine(self, mesh: Mesh, solution: Solved) -> tuple[np.ndarray, Mesh]:
        last, worst = self.rounds[-1], self._worst()
        panels = len(mesh.conductor)
        if worst <= 1.0:
            self.stopped_by = "tolerance"
        elif held_up := self._held_up_by_input(last):
            self.stopped_by = held_up
        elif len(self.rounds) >= MOST_ROUNDS:
            self.stopped_by = "rounds"
        elif panels >= self.limits.max_panels:
            self.stopped_by = "max-panels"
        if self.stopped_by:
            return np.empty(0), mesh
        bulk = BULK_FAR if worst > FAR_FROM_GOAL else BULK_NEAR
        room = self.limits.max_panels - panels
        finer, origin = mesh.refine(*mark(self._promise(solution), bulk, room))
        if not self.limits.fits(finer, mesh):
            self.stopped_by = "memory"
        elif len(finer.conductor) > self.limits.max_panels:
            self.stopped_by = "max-panels"
        return origin, finer


def _light(state: RoundState) -> RoundState:
    """The round without its solution."""
    return RoundState(None, state.sums, state.found, state.worst, state.seconds)  # type: ignore[arg-type]
