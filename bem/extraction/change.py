"""The change between two scenes solved on the same panels, and its error bar.

    dX  = dL + kappa dS + dF
    bar = w ((SHARE + DOUBT dk) D + TREND drift + facet_doubt |dF|) + q + r + FILES f + floor

d is the difference between the scenes after one and the same round, D the sum over all panels
and tests of the absolute change of each product of residuals, kappa and dk the slope of the first
scene and its doubt, w wider where the entry is weak. The coefficients were chosen on thirty pairs
of scenes; benchmarks/bench_compare.py reports how well they hold. What is wrong alike in both
scenes drops out of every term.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from bem.extraction.estimate import FILES, ROUNDS, Estimate, widening
from bem.extraction.solution import Solution, Sums, file_facet_factors, rounding_effect, with_all

SHARE, TREND, DOUBT = 0.4, 0.5, 0.4
"""Factors of the parts of the bar, in the order of the formula above."""
FAR_CHANGE = 10.0
"""How much faster expansions may change than the energies that they serve."""
FLOOR, RELATIVE_FLOOR = 3e-8, 1e-4
"""Of sqrt(L_ii L_jj), for what rounding does where anything moved; and of the largest change."""


@dataclass(frozen=True)
class ChangeSums:
    """What one round says of the change of every entry, (k, k + 1); the last is the row sum.

    Args:
        value: change of L from the density.
        signed: change of the summed indicator.
        absolute: summed absolute change of each product of residuals.
        quadrature: change of the quadrature effect.
        faceting: change of the faceting effect.
        rounding: largest effect of rounded input on either side, where it is not the same.
        files: largest change of the effect of curves that facets of files may stand for.
    """

    value: np.ndarray
    signed: np.ndarray
    absolute: np.ndarray
    quadrature: np.ndarray
    faceting: np.ndarray
    rounding: np.ndarray
    files: np.ndarray


@dataclass(frozen=True)
class Change:
    """Change and bar of every entry, (k, k + 1) each; the last column is the row sum.

    Args:
        value: extrapolated change of L.
        bar: its error bar.
        parts: what the bar is made of.
    """

    value: np.ndarray
    bar: np.ndarray
    parts: dict[str, np.ndarray]


def change_sums(
    before: tuple[Solution, Sums], after: tuple[Solution, Sums], redrawn: np.ndarray
) -> ChangeSums:
    """Collect the sums of one round of both scenes, solved on the same panels.

    Args:
        before: of the first scene.
        after: of the second.
        redrawn: (k,) bool, conductors whose numbers were rounded anew.
    """
    (first, sums_first), (second, sums_second) = before, after
    unsure = np.sqrt(first.mesh.unsure())[:, None]
    far = np.abs(_far_effect(second) - _far_effect(first))
    rows = with_all(np.abs(_row_effect(second) - _row_effect(first)))
    return ChangeSums(
        value=sums_second.value - sums_first.value,
        signed=sums_second.signed - sums_first.signed,
        absolute=product_changes(first.residual * unsure, second.residual * unsure),
        quadrature=rows + FAR_CHANGE * far,
        faceting=sums_second.faceting - sums_first.faceting,
        rounding=_rounding(first, redrawn) + _rounding(second, redrawn),
        files=_file_facets(first, second),
    )


def _file_facets(first: Solution, second: Solution) -> np.ndarray:
    """(k, k + 1) sum of the absolute changes of what ``file_facet_bound`` sums."""
    count = first.density.shape[1]
    if first.mesh.doubtful().exact and second.mesh.doubtful().exact:
        return np.zeros((count, count + 1))
    a, b = file_facet_factors(first), file_facet_factors(second)
    found = np.array(
        [
            np.abs(second.density[:, i, None] * b - first.density[:, i, None] * a).sum(axis=(0, 1))
            for i in range(count)
        ]
    )
    found[:, :-1] = 0.5 * (found[:, :-1] + found[:, :-1].T)
    return found


def _rounding(solution: Solution, redrawn: np.ndarray) -> np.ndarray:
    """Effect of the rounded input of those conductors that were rounded anew."""
    bodies = tuple(
        body if fresh else replace(body, rounding=0.0)
        for body, fresh in zip(solution.mesh.bodies, redrawn, strict=True)
    )
    return rounding_effect(replace(solution, mesh=replace(solution.mesh, bodies=bodies)))


def _row_effect(solution: Solution) -> np.ndarray:
    return solution.operator.asymmetry(solution.density)


def _far_effect(solution: Solution) -> np.ndarray:
    operator, density = solution.operator, solution.density
    return 2.0 * operator.far_error * operator.magnitude(density, with_all(density))


def product_changes(before: np.ndarray, after: np.ndarray) -> np.ndarray:
    """(k, k + 1) sum of |b_i b_j - a_i a_j| over panels and tests of residuals (4, n, k)."""
    a, b = (w.reshape(-1, w.shape[-1]) for w in (before, after))
    all_a, all_b = with_all(a), with_all(b)
    return np.array(
        [
            np.abs(b[:, i, None] * all_b - a[:, i, None] * all_a).sum(axis=0)
            for i in range(a.shape[1])
        ]
    )


def _values(rounds: list[ChangeSums], kappa: float) -> list[np.ndarray]:
    return [r.value + kappa * r.signed + r.faceting for r in rounds]


def estimate_change(rounds: list[ChangeSums], before: Estimate) -> Change:
    """Change and bar after the last of ``rounds``.

    Args:
        rounds: so far.
        before: estimate of the first scene after the same rounds.
    """
    last = rounds[-1]
    *earlier, value = _values(rounds[-3:], before.kappa)
    drift = np.max([np.abs(value - x) for x in earlier], axis=0, initial=0.0)
    trend = TREND * drift
    if len(rounds) < ROUNDS:
        trend = np.maximum(trend, last.absolute)
    wide = widening(before.value)
    parts = {
        "discretisation": wide * (SHARE + DOUBT * before.slope_doubt) * last.absolute,
        "trend": wide * trend,
        "quadrature": last.quadrature + _floor(last, value, before.value),
        "input rounding": last.rounding,
        "facets of the file": FILES * last.files,
        "faceting": wide * before.facet_doubt * np.abs(last.faceting),
    }
    return Change(value, sum(parts.values()), parts)


def _floor(last: ChangeSums, change: np.ndarray, before: np.ndarray) -> np.ndarray:
    """(k, k + 1) what may be wrong with any change; nothing where all integrals are the same."""
    root = np.sqrt(np.diagonal(before))
    scale = root[:, None] * np.append(root, np.sqrt(max(before[:, -1].sum(), 0.0)))
    if not (last.value.any() or last.absolute.any()):
        return np.zeros_like(scale)
    largest = np.abs(change[:, :-1] / scale[:, :-1]).max()
    return (FLOOR + RELATIVE_FLOOR * largest) * scale
