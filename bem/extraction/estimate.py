"""The reported value and its error bar, from the rounds so far.

    X   = L + kappa S + F
    bar = SHARE Sabs + TREND dX + DOUBT dk Sabs + q + facet_doubt |F| + RIM R
          + FLOOR sqrt(L_ii L_jj) + r + f

S and Sabs are the signed and absolute summed indicator, F the faceting effect, R its part at
curved free rims, q the quadrature effect, r that of rounded input, f that of facets in a file
that may stand for a smooth surface. One kappa serves the whole matrix: the slope of L against S
over the last rounds on the normalised trace, drawn toward its usual value. dX is the largest change
of X over the last rounds, dk the distance of kappa from raw slopes. The coefficients were chosen on
forty scenes; benchmarks/bench_bars.py reports how well they hold.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.extraction.solution import Sums

KAPPA_USUAL = 1.05
KAPPA_DRAW = 2.0
KAPPA_LOW, KAPPA_HIGH = 0.6, 3.0
SHARE, TREND, DOUBT, FACET = 0.2, 0.35, 0.4, 0.7
"""Factors of the parts of the bar, in the order of the formula above."""
FILES = 1.5
"""Factor on the first-order effect of facets that may stand for a smooth surface."""
RIM = 0.08
"""Part of the effect of curved free rims that may be wrong: polygons crowd charge at corners."""
WEAK, WEAK_ROW, WIDEST = 0.03, 0.3, 2.5
"""Couplings below WEAK sqrt(C_ii C_jj), and row sums below WEAK_ROW C_ii, get wider bars: up to
WIDEST times where they vanish beside it."""
FLOOR = 1e-6
ROUNDS = 4
"""Rounds before the trend is believed; until then the whole indicator stands for it."""


@dataclass(frozen=True)
class Estimate:
    """Value and bar of every entry, (k, k + 1) each; the last column is the row sum.

    Args:
        value: extrapolated L.
        bar: its error bar.
        parts: what the bar is made of.
        kappa: slope used.
        facet_doubt: part of the faceting effect that the bar holds.
        slope_doubt: how far raw slopes stray from kappa.
    """

    value: np.ndarray
    bar: np.ndarray
    parts: dict[str, np.ndarray]
    kappa: float
    facet_doubt: float
    slope_doubt: float = 0.0


def facet_doubt(faceting: np.ndarray, value: np.ndarray) -> float:
    """Part of the faceting effect that may be wrong: about the turn between neighbouring facets.

    The effect is of second order in that turn and what it leaves out is of third.
    """
    part = np.abs(np.diagonal(faceting)) / np.diagonal(value)
    return float(min(FACET * np.sqrt(part.max()), 1.0))


def _slope(steps: list[tuple[float, float]], anchor: float) -> float:
    """Least-squares slope of value against indicator, drawn to KAPPA_USUAL by ``anchor``."""
    over = sum(dc * ds for dc, ds in steps) + anchor * KAPPA_USUAL
    under = sum(ds * ds for _, ds in steps) + anchor
    return over / under if under > 0.0 else KAPPA_USUAL


def _steps(rounds: list[Sums]) -> list[tuple[float, float]]:
    """Changes of value (up) and of indicator (down) of the normalised trace between rounds."""
    size = np.diagonal(rounds[-1].value)
    c = [float((np.diagonal(r.value + r.faceting) / size).sum()) for r in rounds]
    s = [float((np.diagonal(r.signed) / size).sum()) for r in rounds]
    return [(c[k + 1] - c[k], s[k] - s[k + 1]) for k in range(len(rounds) - 1)]


def _faceting_steps(rounds: list[Sums]) -> float:
    """Summed squared changes of the faceting effect: where they are large, slopes say little."""
    size = np.diagonal(rounds[-1].value)
    f = np.array([(np.diagonal(r.faceting) / size).sum() for r in rounds])
    return float(np.sum(np.diff(f) ** 2))


def _kappa(rounds: list[Sums]) -> tuple[float, float]:
    """Kappa and how far raw slopes stray from it."""
    steps = _steps(rounds[-4:])
    if not steps:
        return KAPPA_USUAL, KAPPA_USUAL
    last = rounds[-1]
    s = float((np.diagonal(last.signed) / np.diagonal(last.value)).sum())
    anchor = KAPPA_DRAW * s * s + _faceting_steps(rounds[-4:])
    kappa = float(np.clip(_slope(steps, anchor), KAPPA_LOW, KAPPA_HIGH))
    raw = [_slope(steps[-n:], 1e-12 * s * s) for n in (2, 3)]
    return kappa, max(abs(kappa - np.clip(r, 0.0, KAPPA_HIGH)) for r in raw)


def _extrapolated(rounds: list[Sums]) -> np.ndarray:
    last = rounds[-1]
    return last.value + _kappa(rounds)[0] * last.signed + last.faceting


def widening(value: np.ndarray) -> np.ndarray:
    """(k, k + 1) factor on the bars of entries that are small differences of large ones.

    Couplings through gaps in a shield, and row sums of shielded bodies, depend on densities
    that the large entries hardly see, and their errors do not follow the common slope.
    """
    diagonal = np.diagonal(value)
    strong = WEAK * np.sqrt(diagonal[:, None] * diagonal)
    strong = np.concatenate([strong, WEAK_ROW * diagonal[:, None]], axis=1)
    return 1.0 + (WIDEST - 1.0) * np.clip(1.0 - np.abs(value) / strong, 0.0, 1.0)


def estimate(rounds: list[Sums]) -> Estimate:
    """Value and bar after the last of ``rounds``."""
    last = rounds[-1]
    value = _extrapolated(rounds)
    kappa, doubt = _kappa(rounds)
    earlier = [_extrapolated(rounds[:n]) for n in range(max(1, len(rounds) - 2), len(rounds))]
    drift = np.max([np.abs(value - x) for x in earlier], axis=0, initial=0.0)
    trend = TREND * drift
    if len(rounds) < ROUNDS:
        trend = np.maximum(trend, last.absolute)
    root = np.sqrt(np.diagonal(last.value))
    floor = FLOOR * root[:, None] * np.append(root, np.sqrt(max(last.value[:, -1].sum(), 0.0)))
    facets = facet_doubt(last.facet_moves, last.value)
    wide = widening(value)
    parts = {
        "discretisation": wide * (SHARE + DOUBT * doubt) * last.absolute,
        "trend": wide * trend,
        "quadrature": last.quadrature + floor,
        "input rounding": last.rounding,
        "facets of the file": FILES * last.files,
        "faceting": wide * (facets * last.facet_moves + RIM * last.rims),
    }
    return Estimate(value, sum(parts.values()), parts, kappa, facets, doubt)
