"""Functions of the wave number as sums of decaying exponentials, each of which is an image.

    c(k) = sum over n of b_n exp(-k beta_n),    beta_n > 0

Coefficients follow from the lengths by least squares, the lengths by Gauss and Newton's method
on what that leaves (variable projection, Golub and Pereyra 1973), starting from geometric
series; one length more at a time until the accuracy is reached.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

COUNTS = range(1, 31)
"""Numbers of exponentials that are tried in turn."""
RANGES = 2.0 ** np.arange(1, 31)
"""Ratios of the longest length to the shortest that a series may have."""
STEPS, GAIN = 25, 0.02
"""Most steps of the improvement, and the least relative gain of one that is followed by more."""
LARGEST = 50.0
"""Coefficients may sum up to so many times the function; beyond, they only cancel."""
CUTOFF = 1e-12
"""Directions weaker than this part of the strongest are left out of the least squares."""


class Exponentials(NamedTuple):
    """A sum of exponentials.

    Args:
        length: (m,) beta.
        coefficient: (m,) b.
        error: largest weighted error at the samples.
    """

    length: np.ndarray
    coefficient: np.ndarray
    error: float


class Samples(NamedTuple):
    """A function of the wave number.

    Args:
        k: (n,).
        value: (n,).
        weight: (n,) what an error counts.
    """

    k: np.ndarray
    value: np.ndarray
    weight: np.ndarray


def exponentials(
    samples: Samples, shortest: float, longest: float, accuracy: float
) -> Exponentials:
    """Return a short sum that meets the accuracy, or the best that was found.

    Lengths in geometric series decide how many it takes; with lengths of their own fewer do.

    Args:
        samples: decaying towards large wave numbers.
        shortest: least length.
        longest: largest length.
        accuracy: of every sample, times its weight.
    """
    best = _sum(samples, np.empty(0))
    series = []
    for count in COUNTS:
        if best.error <= accuracy:
            break
        series.append(_series(samples, (shortest, longest), count))
        best = min(best, series[-1], key=lambda found: found.error)
    for start in series[-2::-1]:
        found = _improved(samples, start.length, accuracy)
        if found.error > accuracy:
            break
        best = found
    return best


def _series(samples: Samples, ends: tuple[float, float], count: int) -> Exponentials:
    """Best sum with lengths in a geometric series, among several ranges."""
    ratios = [ratio for ratio in RANGES if ratio * ends[0] < 4.0 * ends[1]]
    tried = [
        ends[0] * (np.sqrt([ratio]) if count == 1 else np.geomspace(1.0, ratio, count))
        for ratio in ratios
    ]
    return min((_sum(samples, lengths) for lengths in tried), key=lambda found: found.error)


def _sum(samples: Samples, length: np.ndarray) -> Exponentials:
    """Best sum with given lengths; one whose terms mostly cancel counts as no good."""
    _, coefficient, error = _fitted(samples, length)
    return Exponentials(length, coefficient, _judged(samples, coefficient, error))


def _judged(samples: Samples, coefficient: np.ndarray, error: np.ndarray) -> float:
    most = LARGEST * max(float(np.abs(samples.value).max(initial=0.0)), 1.0)
    if np.abs(coefficient).sum() > most:
        return np.inf
    return float(np.abs(error).max(initial=0.0))


def _fitted(samples: Samples, length: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Weighted exponentials (n, m), coefficients (m,) and errors (n,)."""
    base = samples.weight[:, None] * np.exp(-np.outer(samples.k, length))
    goal = samples.weight * samples.value
    coefficient = np.linalg.lstsq(base, goal, rcond=CUTOFF)[0]
    return base, coefficient, base @ coefficient - goal


def _improved(samples: Samples, length: np.ndarray, accuracy: float) -> Exponentials:
    """Move the lengths by damped Gauss-Newton steps on their logarithms."""
    log, damping = np.log(length), 1e-3
    least = log.min()
    base, coefficient, error = _fitted(samples, length)
    for _ in range(STEPS):
        if np.abs(error).max() <= accuracy:
            break
        slope = _slopes(samples, np.exp(log), base, coefficient)
        normal = slope.T @ slope
        normal += damping * np.diag(np.diagonal(normal) + 1e-30)
        step = np.clip(-np.linalg.solve(normal, slope.T @ error), -1.0, 1.0)
        moved = np.maximum(log + step, least)
        trial = _fitted(samples, np.exp(moved))
        gain = 1.0 - (trial[2] @ trial[2]) / (error @ error)
        damping *= 0.3 if gain > 0.0 else 10.0
        if gain > 0.0:
            log, (base, coefficient, error) = moved, trial
        if 0.0 < gain < GAIN or damping > 1e6:
            break
    return Exponentials(np.exp(log), coefficient, _judged(samples, coefficient, error))


def _slopes(
    samples: Samples, length: np.ndarray, base: np.ndarray, coefficient: np.ndarray
) -> np.ndarray:
    """(n, m) change of the error with the logarithm of each length (Kaufman 1975)."""
    slope = -samples.k[:, None] * base * (length * coefficient)
    basis = np.linalg.qr(base)[0]
    return slope - basis @ (basis.T @ slope)


def inverse_law(start: float, size: float) -> Exponentials:
    """exp(-k start) / k as a sum of exponentials, for sources whose total charge is zero.

    Their potential falls at least as the square of the length beyond ``size``, so that the
    tail is a smooth function of its inverse; before, the integral over all lengths from
    ``start`` is taken by Gauss's rule on intervals that grow.

    Args:
        start: least length, positive.
        size: largest distance and path that counts.
    """
    x, w = np.polynomial.legendre.leggauss(6)
    x, w = 0.5 * (x + 1.0), 0.5 * w
    lengths, coefficients, low = [], [], start
    while low < 2.0 * size + start:
        lengths.append(low * (1.0 + 2.0 * x))
        coefficients.append(2.0 * low * w)
        low *= 3.0
    x, w = np.polynomial.legendre.leggauss(8)
    x, w = 0.5 * (x + 1.0), 0.5 * w
    lengths.append(low / x)
    coefficients.append(low * w / x**2)
    return Exponentials(np.concatenate(lengths), np.concatenate(coefficients), 0.0)
