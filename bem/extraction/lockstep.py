"""Two scenes solved round by round on the same panels."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from bem.extraction.change import Change, ChangeSums, change_sums, estimate_change
from bem.extraction.loop import RoundState, Run
from bem.extraction.marking import indicator
from bem.extraction.solution import Solution, solve_round
from bem.extraction.solved import Solved
from bem.operators.dense import DenseOperator, Reuse
from bem.panels.mesh import Mesh
from bem.panels.transport import unmoved

SMALLEST = 1e-7
"""A change is known well enough once its bar is below this part of sqrt(L_ii L_jj): rounding
alone makes a tenth of that."""


@dataclass(frozen=True)
class Carrier:
    """How the second scene follows from the first.

    Args:
        carry: takes the panels of the first scene to those of the second.
        redrawn: (k,) bool, conductors whose numbers were rounded anew.
        accuracy: every bar of a change at most this times the largest change.
    """

    carry: Callable[[Mesh], Mesh]
    redrawn: np.ndarray
    accuracy: float


@dataclass(kw_only=True)
class Lockstep(Run):
    """The rounds of the first scene, with the second one following on the same panels.

    Args:
        other: the run of the second scene; its rounds are filled here.
        carrier: how the second scene follows from the first.
        sums: of the difference, one per round.
        changes: the difference and its bar, one per round.
    """

    other: Run
    carrier: Carrier
    sums: list[ChangeSums] = field(default_factory=list)
    changes: list[Change] = field(default_factory=list)

    def _round(self, mesh: Mesh, origin: np.ndarray | None) -> tuple[np.ndarray, Mesh]:
        far = self._far()
        self.tell("solving the first scene", len(mesh.conductor))
        first = solve_round(mesh, self.count, far, self._reuse(origin))
        self.tell("solving the second scene", len(mesh.conductor))
        moved = self.carrier.carry(mesh)
        second = solve_round(moved, self.count, far, self._shared(first, moved, origin))
        self._store(self._judged(first), self.other._judged(second))
        return self._refine(mesh, first)

    def _far(self) -> float:
        """One reach for both scenes, so that expansions err alike."""
        return max(super()._far(), self.other._far())

    def _shared(self, first: Solution, moved: Mesh, origin: np.ndarray | None) -> Reuse:
        """What the first scene's operator, or the second one's before, can give."""
        same = np.where(unmoved(first.mesh, moved), np.arange(first.operator.size), -1)
        giver = first.operator
        if origin is not None and (origin >= 0).sum() > (same >= 0).sum():
            earlier = self.other.rounds[-1].solution.operator
            if isinstance(earlier, DenseOperator) and earlier.far == self._far():
                giver, same = earlier, origin
        if not isinstance(giver, DenseOperator):
            raise TypeError("scenes are compared with dense operators only")
        return Reuse(giver, same)

    def _store(self, before: RoundState, after: RoundState) -> None:
        """Keep a round of both scenes and of their difference; all of it is known before."""
        first, second = before.solution, after.solution
        if not (isinstance(first, Solution) and isinstance(second, Solution)):
            raise TypeError("scenes are carried over with conductors alone")
        both = (first, before.sums), (second, after.sums)
        sums = [*self.sums, change_sums(*both, self.carrier.redrawn)]
        change = estimate_change(sums, before.found)
        self._keep(before)
        self.other._keep(after)
        self.sums = sums
        self.changes.append(change)

    def alone(self, run: Run) -> Run:
        """The rounds of one scene by itself, stopped by the tolerance if that was reached."""
        reached = run.rounds[-1].worst <= 1.0
        stopped_by = "tolerance" if reached else self.stopped_by
        return Run(run.count, run.goal, run.limits, run.report, run.rounds, stopped_by, run.started)

    def _size(self) -> np.ndarray:
        """(k, k) sqrt(L_ii L_jj) of the first scene."""
        root = np.sqrt(np.diagonal(self.rounds[-1].found.value))
        return root[:, None] * root

    def _allowed(self) -> float:
        """Largest bar allowed for a change, in units of the size of its entry."""
        change = self.changes[-1].value[:, : self.count] / self._size()
        return max(self.carrier.accuracy * float(np.abs(change).max()), SMALLEST)

    def _used(self) -> np.ndarray:
        """(k, k) bars of the changes over what is allowed for them."""
        return self.changes[-1].bar[:, : self.count] / (self._size() * self._allowed())

    def _worst(self) -> float:
        own = max(self.rounds[-1].worst, self.other.rounds[-1].worst)
        return max(own, float(self._used().max()))

    def _promise(self, solution: Solved) -> np.ndarray:
        """(2, n) what halving promises to either scene, or to their difference."""
        after = self.other.rounds[-1]
        mine = indicator(solution, self.goal, self.rounds[-1].found)
        theirs = indicator(after.solution, self.goal, after.found)
        difference = self._promise_to_change(solution.residual, after.solution.residual)
        return np.maximum(np.maximum(mine, theirs), difference)

    def _promise_to_change(self, before: np.ndarray, after: np.ndarray) -> np.ndarray:
        """(2, n) change of the squares of residuals (4, n, k), in units of what is allowed."""
        need = np.minimum(self._used().max(axis=1), 1.0) ** 2
        weight = need / (self._allowed() * np.diagonal(self._size()))
        energy = np.einsum("tnk,k->tn", np.abs(after**2 - before**2), weight)
        return np.stack([energy[0] + energy[2], energy[1] + energy[3]])
