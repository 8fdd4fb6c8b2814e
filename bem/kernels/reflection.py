"""Potential between flat layers in the transform domain: what planes send back and let through.

With k >= 0 the radial wave number, the potential at height z of a unit charge at z' is

    G = integral over k of J0(k rho) g(k, z, z'),    g = exp(-k |z - z'|) in one medium of unit
                                                     permittivity, which gives 1/|x - y|

In a stack g is a sum of exponentials of four paths: up or down from the source and up or down
into the target, with coefficients that depend on k alone. They follow from the reflection of
all that lies above or below a layer, taken together by the recursion

    R = (r + R' x') / (1 + r R' x'),    r = (e - e') / (e + e'),    x' = exp(-2 k d')

with e', d', R' those of the next layer; R = -1 at a grounded plane (Sommerfeld 1909 for one
plane; the recursion is that of any layered medium, Wait 1962).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from bem.geometry.layers import Layers


class Path(NamedTuple):
    """Length of a path, ``target * z + source * z' + offset``, and its coefficient.

    Args:
        target: 1 or -1.
        source: 1 or -1.
        offset: length.
        coefficient: (m,) at m wave numbers.
        pole: residue of the coefficient at k = 0.
    """

    target: float
    source: float
    offset: float
    coefficient: np.ndarray
    pole: float

    def mirrored(self) -> Path:
        """The same path from target to source."""
        return self._replace(target=self.source, source=self.target)


class Reflections(NamedTuple):
    """What m waves see from each of the layers.

    Args:
        echo: (l, m) decay over a layer and back, 0 in a half-space.
        below: (l, m) reflection of all that lies below.
        above: (l, m) of all that lies above.
    """

    echo: np.ndarray
    below: np.ndarray
    above: np.ndarray


def reflections_of(layers: Layers, k: np.ndarray) -> Reflections:
    """Reflections at wave numbers k (m,), which may be infinite."""
    thick = np.diff(np.array([-np.inf, *layers.planes, np.inf]))
    with np.errstate(invalid="ignore"):
        echo = np.where(np.isinf(thick[:, None]), 0.0, np.exp(-2.0 * thick[:, None] * k))
    below = _upward(layers.permittivity, echo, layers.grounded_below)
    above = _upward(layers.permittivity[::-1], echo[::-1], layers.grounded_above)[::-1]
    return Reflections(echo, below, above)


def _upward(permittivity: tuple[float, ...], echo: np.ndarray, grounded: bool) -> np.ndarray:
    """(l, m) reflection of what lies below each layer, layers counted away from there."""
    found = [np.zeros(echo.shape[1])]
    for k in range(1, len(permittivity)):
        if k == 1 and grounded:
            found.append(np.full(echo.shape[1], -1.0))
            continue
        step = _step(permittivity[k], permittivity[k - 1])
        back = found[k - 1] * echo[k - 1]
        found.append((step + back) / (1.0 + step * back))
    return np.array(found)


def _step(here: float, there: float) -> float:
    """Reflection at one plane, seen from ``here``."""
    return (here - there) / (here + there)


def direct(layers: Layers, layer: int) -> float:
    """Coefficient of the path straight from source to target in one layer."""
    return 1.0 / layers.permittivity[layer]


def paths(layers: Layers, target: int, source: int, k: np.ndarray) -> list[Path]:
    """All paths but the straight one within a layer, with coefficients at k (m,).

    Args:
        layers: the stack.
        target: layer of the target.
        source: layer of the source.
        k: wave numbers, above 0; they may be infinite.
    """
    if target < source:
        return [path.mirrored() for path in paths(layers, source, target, k)]
    seen = reflections_of(layers, k)
    floor, ceiling = layers.ends(source)[0], layers.ends(target)[1]
    below, above = seen.below[source], seen.above[target]
    through = _through(layers, (source, target), seen)
    pole = _pole(layers, source, target)
    found = []
    if np.isfinite(floor):
        found.append(Path(1.0, 1.0, -2.0 * floor, through * below, -pole))
    if np.isfinite(ceiling):
        found.append(Path(-1.0, -1.0, 2.0 * ceiling, through * above, -pole))
    if np.isfinite(floor) and np.isfinite(ceiling):
        both = through * below * above
        found.append(Path(-1.0, 1.0, 2.0 * (ceiling - floor), both, pole))
        if target == source:
            found.append(Path(1.0, -1.0, 2.0 * (ceiling - floor), both, pole))
    if target != source:
        found.append(Path(1.0, -1.0, 0.0, through, pole))
    return found


def _through(layers: Layers, ends: tuple[int, int], seen: Reflections) -> np.ndarray:
    """(m,) what a wave from the first of two layers is in the last, above it or the same."""
    first, last = ends
    permittivity = layers.permittivity
    found = 1.0 / (1.0 - seen.below[first] * seen.above[first] * seen.echo[first])
    found = found / permittivity[first]
    for k in range(first + 1, last + 1):
        step = _step(permittivity[k], permittivity[k - 1])
        found = found * (1.0 - step) / (1.0 - step * seen.above[k] * seen.echo[k])
    return found


def _pole(layers: Layers, a: int, b: int) -> float:
    """Residue at k = 0: between two grounded planes charge sees a plate capacitor."""
    if not (layers.grounded_below and layers.grounded_above):
        return 0.0
    inner = np.diff(layers.planes) / np.array(layers.permittivity[1:-1])
    return float(0.5 / (layers.permittivity[a] * layers.permittivity[b] * inner.sum()))
