"""Images that stand for flat layers: for each pair of layers, every panel at several heights.

In the transform domain each path between two layers has a coefficient that is a sum of decaying
exponentials of the wave number, exactly (one plane) or to a stated accuracy; an exponential
makes a path longer, which is an image farther away. The error is measured in space.
"""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple

import numpy as np
from scipy.special import j0

from bem.geometry.layers import Layers
from bem.kernels.exponentials import Exponentials, Samples, exponentials, inverse_law
from bem.kernels.reflection import Path, direct, paths

ACCURACY = 1e-6
"""Error of the potential over that of the source itself that images are made for."""
LOWEST, PER_DECADE = 1e-7, 10
"""Least wave number over the inverse size, and samples in each decade."""
DECAYED = 20.0
"""Paths longer by the thinnest layer do not count where k times their length exceeds this."""
ALIKE = 1e-12
"""Images closer than this part of the size are one."""


class LayerImages(NamedTuple):
    """Images along the axis of the layers; the first is the panel itself.

    Args:
        flip: (g,) -1 where the coordinate is mirrored.
        shift: (g,) added to it.
        weight: (l, l, g) by the layers of target and source.
        error: of the potential over that of the source itself, as measured.
    """

    flip: np.ndarray
    shift: np.ndarray
    weight: np.ndarray
    error: float


class _Image(NamedTuple):
    """One image: where it is, its charge, and the layers of target and source."""

    flip: float
    shift: float
    charge: float
    pair: tuple[int, int]

    def back(self) -> _Image:
        """The image for the way from target to source."""
        return self._replace(shift=-self.flip * self.shift, pair=self.pair[::-1])


@lru_cache(maxsize=64)
def layer_images(layers: Layers, occupied: tuple[int, ...], size: float) -> LayerImages:
    """Images for targets and sources in some layers.

    Args:
        layers: the stack.
        occupied: layers that hold panels.
        size: largest distance between two panels.
    """
    size = max(size, np.ptp(layers.planes))
    pairs = [(a, b) for a in occupied for b in occupied]
    images = [_Image(1.0, 0.0, direct(layers, a), (a, a)) for a in occupied]
    for pair in pairs:
        if pair[0] >= pair[1]:
            there = _images_of_pair(layers, pair, size)
            images += there
            if pair[0] > pair[1]:
                images += [image.back() for image in there]
    flip, shift, weight = _merged(images, layers.count, ALIKE * size)
    found = LayerImages(flip, shift, weight, 0.0)
    if len(layers.planes) > 1:
        found = found._replace(error=max(_error(layers, found, pair, size) for pair in pairs))
    return found


def _images_of_pair(layers: Layers, pair: tuple[int, int], size: float) -> list[_Image]:
    wave = _wave_numbers(layers, size)
    known: dict[bytes, list[Exponentials]] = {}
    found = []
    for path in paths(layers, *pair, np.append(wave, np.inf)):
        key = path.coefficient.tobytes()
        if key not in known:
            known[key] = _expanded(layers, path, wave, size)
        fits = known[key]
        lengths, charges = (np.concatenate([f[k] for f in fits]) for k in (0, 1))
        found += [_placed(path, b, c, pair) for b, c in zip(lengths, charges, strict=True)]
    return found


def _placed(path: Path, length: float, charge: float, pair: tuple[int, int]) -> _Image:
    """The path ``target (z - flip z' - shift)`` made longer by ``length``."""
    flip = -path.target * path.source
    shift = -path.target * (path.offset + length)
    return _Image(flip, float(shift), float(charge), pair)


def _wave_numbers(layers: Layers, size: float) -> np.ndarray:
    """(m,) samples, in a geometric series; none for a single plane, whose images are exact."""
    if len(layers.planes) == 1:
        return np.empty(0)
    low, high = LOWEST / size, DECAYED / (2.0 * np.diff(layers.planes).min())
    return np.geomspace(low, high, int(PER_DECADE * np.log10(high / low)) + 1)


def _expanded(layers: Layers, path: Path, wave: np.ndarray, size: float) -> list[Exponentials]:
    """Sums of exponentials that make up the coefficient of a path."""
    limit = path.coefficient[-1]
    found = [Exponentials(np.zeros(1), np.array([limit]), 0.0)]
    rest = path.coefficient[:-1] - limit
    if path.pole != 0.0:
        start = _shortest(layers)
        law = inverse_law(start, size)
        rest = rest - path.pole * np.exp(-wave * start) / wave
        found.append(law._replace(coefficient=path.pole * law.coefficient))
    if len(wave):
        found.append(_fit(layers, Samples(wave, rest, np.minimum(1.0, wave * size)), size))
    return found


def _fit(layers: Layers, samples: Samples, size: float) -> Exponentials:
    accuracy = 0.3 * ACCURACY / max(layers.permittivity)
    return exponentials(samples, _shortest(layers), size / LOWEST, accuracy)


def _shortest(layers: Layers) -> float:
    """The way through the thinnest layer and back: no exponential is shorter."""
    return 2.0 * float(np.diff(layers.planes).min())


def _merged(
    images: list[_Image], count: int, tolerance: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Flips, shifts and weights with every place counted once, and without zeros."""
    place: dict[tuple[float, int], int] = {(1.0, 0): 0}
    kept = [image for image in images if image.charge != 0.0]
    for image in kept:
        place.setdefault(_key(image, tolerance), len(place))
    flip, shift = np.ones(len(place)), np.zeros(len(place))
    weight = np.zeros((count, count, len(place)))
    for image in kept:
        k = place[_key(image, tolerance)]
        flip[k], shift[k] = image.flip, image.shift
        weight[(*image.pair, k)] += image.charge
    return flip, shift, weight


def _key(image: _Image, tolerance: float) -> tuple[float, int]:
    return image.flip, round(image.shift / tolerance)


# ---------------------------------------------------------------- the error in space


def _error(layers: Layers, images: LayerImages, pair: tuple[int, int], size: float) -> float:
    """Largest error of the potential over that of the source itself, at heights of both layers.

    The transform of the error is integrated at many wave numbers against J0.
    """
    top = DECAYED / np.diff(layers.planes).min()
    wave = np.concatenate([np.geomspace(LOWEST / size, 1.0 / size, 200)[:-1], _dense(top, size)])
    rho = np.geomspace(1e-3, 1.0, 7) * size
    worst = 0.0
    terms = paths(layers, *pair, wave)
    for target in _heights(layers, pair[0], size):
        for source in _heights(layers, pair[1], size):
            exact = sum(
                t.coefficient * np.exp(-wave * (t.target * target + t.source * source + t.offset))
                for t in terms
            )
            if pair[0] == pair[1]:
                exact = exact + direct(layers, pair[0]) * np.exp(-wave * abs(target - source))
            off = exact - _transform(images, pair, (target, source), wave)
            found = np.trapezoid(j0(np.outer(rho, wave)) * off, wave, axis=1)
            scale = np.hypot(rho, target - source) * layers.permittivity[pair[1]]
            worst = max(worst, float(np.abs(found * scale).max()))
    return worst


def _dense(top: float, size: float) -> np.ndarray:
    """Wave numbers from 1 / size on: even steps, then a series that grows by 1 %."""
    even = np.arange(1.0, 200.0, 0.1) / size
    grown = np.geomspace(200.0, max(top * size, 201.0), 600) / size
    return np.concatenate([even, grown])


def _heights(layers: Layers, layer: int, size: float) -> list[float]:
    """Lowest, middle and highest coordinate in a layer that matter."""
    low, high = layers.ends(layer)
    low = low if np.isfinite(low) else high - 0.5 * size
    high = high if np.isfinite(high) else low + 0.5 * size
    return [low, low + 0.4 * (high - low), high]


def _transform(
    images: LayerImages, pair: tuple[int, int], heights: tuple[float, float], wave: np.ndarray
) -> np.ndarray:
    """(m,) sum over the images in the transform domain."""
    weight = images.weight[pair]
    some = np.flatnonzero(weight)
    apart = np.abs(heights[0] - images.flip[some] * heights[1] - images.shift[some])
    return weight[some] @ np.exp(-np.outer(apart, wave))
