"""Which panels are halved next, and in which direction."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.extraction.estimate import RIM, SHARE, Estimate
from bem.extraction.solved import Solved


@dataclass(frozen=True)
class Goal:
    """What is asked of the bars.

    Args:
        tolerance: every bar at most this times sqrt(L_ii L_jj).
        pairs: ((i, j, relative accuracy of that coupling), ...).
    """

    tolerance: float
    pairs: tuple[tuple[int, int, float], ...] = ()

    def allowance(self, value: np.ndarray) -> np.ndarray:
        """(k, k) largest bar allowed for each entry of ``value`` (k, k)."""
        root = np.sqrt(np.abs(np.diagonal(value)))
        allowed = self.tolerance * root[:, None] * root
        for i, j, accuracy in self.pairs:
            wanted = max(accuracy * abs(value[i, j]), 1e-300)
            allowed[i, j] = allowed[j, i] = min(allowed[i, j], wanted)
        return allowed

    def worst(self, found: Estimate) -> np.ndarray:
        """(k, k) bars over what is allowed for them."""
        count = len(found.value)
        return found.bar[:, :count] / self.allowance(found.value[:, :count])


def indicator(solution: Solved, goal: Goal, found: Estimate) -> np.ndarray:
    """(2, n) what halving each panel in either direction promises, in units of what is allowed.

    Conductors whose row is good enough already count little, so that effort goes where a
    bar is still too large.
    """
    count = solution.density.shape[1]
    excess = goal.worst(found)
    need = np.minimum(excess.max(axis=1), 1.0) ** 2
    allowed = goal.allowance(found.value[:, :count])
    weight = need / (goal.tolerance * np.diagonal(found.value))
    residual, dual = solution.residual, solution.dual
    energy = np.einsum("tnk,k->tn", np.abs(residual * dual), weight)
    for i, j, _ in goal.pairs:
        if excess[i, j] > 1.0:
            energy += np.abs(residual[:, :, i] * dual[:, :, j]) / allowed[i, j]
    facet = _facet_indicator(solution, weight, found.facet_doubt / SHARE)
    return np.stack([energy[0] + energy[2] + facet[0], energy[1] + energy[3] + facet[1]])


def _facet_indicator(solution: Solved, weight: np.ndarray, doubt: float) -> np.ndarray:
    """(2, n) doubt in the faceting effect of each panel, given to the direction that bulges."""
    faceting = solution.mesh.faceting()
    if faceting.exact:
        return np.zeros((2, len(faceting.offset)))
    side = solution.panels.sides[:, :, 2]
    normal, rim = solution.shape_energy(weight)
    size = doubt * (normal + rim) + RIM / SHARE * rim
    along = solution.mesh.bulging(side[:, 0] + side[:, 2] >= side[:, 1] + side[:, 3])
    return np.stack([np.where(along, size, 0.0), np.where(along, 0.0, size)])


def mark(promise: np.ndarray, bulk: float, room: int) -> tuple[np.ndarray, np.ndarray]:
    """Panels that together hold a part of the promise (bulk marking, Doerfler 1996).

    Args:
        promise: (2, n).
        bulk: part of the sum that the marked panels hold.
        room: at most this many are marked.

    Returns:
        (n,) bool marked and (n,) int direction.
    """
    total = promise.sum(axis=0)
    order = np.argsort(-total, kind="stable")
    held = np.cumsum(total[order])
    count = int(np.searchsorted(held, bulk * held[-1])) + 1
    marked = np.zeros(len(total), dtype=bool)
    marked[order[: min(count, room)]] = True
    return marked, (promise[1] > promise[0]).astype(int)
