"""Checks of a finished solve that share as little with it as possible.

The residual is evaluated with exact integrals at random points of the panels, away from the
points that the equations used; points are drawn by charge, so that the mean residual is the
relative error of the energy. Signs and row sums must be those of every Maxwell matrix.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from bem.extraction.estimate import Estimate
from bem.extraction.solved import Solved

POINTS = 200
WILD = 0.05
"""A mean residual above this says that the solution is not one."""
ASYMMETRY = 1e-3
WRONG_SIGN = 0.01
"""Up to this part of the largest entry a wrong sign widens the bar; beyond, it is no solution."""


@dataclass(frozen=True)
class Audit:
    """Findings by name, and what they add to the bars.

    Args:
        findings: {check: {"value", "limit", "ok"}}.
        extra: relative bar that the energy check adds to every entry.
        signs: (k, k + 1) what the bars need to reach zero where an entry has the wrong sign.
        wild: lines that make the result an error; empty if it is sound.
    """

    findings: dict[str, dict[str, Any]]
    extra: float
    signs: np.ndarray
    wild: tuple[str, ...]


def _random_points(
    solution: Solved, column: int, rng: np.random.Generator
) -> tuple[np.ndarray, np.ndarray]:
    """Points (m, 3) drawn by |charge| of one column, and their panels (m,)."""
    charge = np.abs(solution.density[:, column]) * solution.panels.area
    chosen = rng.choice(len(charge), POINTS, p=charge / charge.sum())
    corners = solution.mesh.corners[chosen]
    halves = np.linalg.norm(
        np.cross(corners[:, [1, 2]] - corners[:, :1], corners[:, [2, 3]] - corners[:, :1]), axis=2
    )
    second = rng.random(POINTS) * halves.sum(axis=1) > halves[:, 0]
    tri = np.where(second[:, None, None], corners[:, [0, 2, 3]], corners[:, [0, 1, 2]])
    a, b = rng.random((2, POINTS))
    a, b = np.where(a + b > 1, 1 - a, a), np.where(a + b > 1, 1 - b, b)
    return tri[:, 0] + a[:, None] * (tri[:, 1] - tri[:, 0]) + b[:, None] * (
        tri[:, 2] - tri[:, 0]
    ), chosen


def _energy_check(solution: Solved) -> tuple[float, float, float]:
    """Largest over the columns of |mean residual|, with its standard error, and rms residual."""
    rng = np.random.default_rng(20)
    worst = (0.0, 0.0, 0.0)
    columns = range(min(solution.density.shape[1], 4))
    for column in columns:
        points, chosen = _random_points(solution, column, rng)
        found = solution.potential(points, column)
        want = (solution.conductor[chosen] == column).astype(float)
        sign = np.sign(solution.density[chosen, column])
        residual = (want - found) * sign
        mean, spread = float(residual.mean()), float(residual.std())
        if abs(mean) >= abs(worst[0]):
            worst = (abs(mean), spread / np.sqrt(POINTS), float(np.sqrt((residual**2).mean())))
    return worst


def _raw_asymmetry(solution: Solved) -> float:
    """Largest difference between both rows of a pair, over the mean of their diagonals."""
    rng = np.random.default_rng(21)
    rows = np.sort(
        rng.choice(solution.operator.size, min(64, solution.operator.size), replace=False)
    )
    block = solution.operator.near_rows(rows)[:, rows]
    root = np.sqrt(np.abs(np.diagonal(block)))
    return float((np.abs(block - block.T) / (root[:, None] * root)).max())


def _finding(value: float, limit: float) -> dict[str, Any]:
    return {"value": float(value), "limit": float(limit), "ok": bool(value <= limit)}


def _wrong_signs(found: Estimate) -> np.ndarray:
    """(k, k + 1) how far entries and row sums lie beyond their bars on the forbidden side."""
    beyond = found.value - found.bar
    np.fill_diagonal(beyond, 0.0)
    beyond[:, -1] = -found.value[:, -1] - found.bar[:, -1]
    return np.maximum(beyond, 0.0)


def audit(solution: Solved, found: Estimate) -> Audit:
    """Check a solution and its matrix."""
    count = len(found.value)
    mean, error, rms = _energy_check(solution)
    signs = _wrong_signs(found)
    largest = np.diagonal(found.value).max()
    findings = {
        "mean_residual": _finding(mean, max(WILD, 5.0 * error)),
        "rms_residual": _finding(rms, 0.5),
        "asymmetry_before_averaging": _finding(_raw_asymmetry(solution), ASYMMETRY),
        "positive_coupling": _finding(signs[:, :count].max() / largest, WRONG_SIGN),
        "negative_row_sum": _finding(signs[:, -1].max() / largest, WRONG_SIGN),
    }
    wild = tuple(
        f"{name.replace('_', ' ')} is {f['value']:.2g}, the limit is {f['limit']:.2g}"
        for name, f in findings.items()
        if not f["ok"]
    )
    extra = max(mean - 4.0 * error, 0.0)
    return Audit(findings, extra, signs, wild)
