"""Flat layers without panels: images against integrals, and against exact and published values."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import j0

from bem.geometry.layers import Layers
from bem.kernels.exponentials import Samples, exponentials, inverse_law
from bem.kernels.layered import ACCURACY, LayerImages, layer_images

SLAB = Layers(2, (0.0, 0.05), (1.0, 4.0, 1.0))
STRIP = Layers(2, (0.0, 0.05), (1.0, 4.0, 1.0), grounded_below=True)
BOARD = Layers(2, (0.0, 0.01, 0.07), (3.6, 3.6, 4.4, 1.0), grounded_below=True)
BOX = Layers(2, (0.0, 0.05, 0.12), (2.0, 2.0, 5.0, 5.0), grounded_below=True, grounded_above=True)


def of_images(images: LayerImages, pair: tuple[int, int], at: tuple[float, float, float]) -> float:
    """Potential at distance rho and height z of a unit charge at height z'."""
    rho, z, source = at
    apart = np.hypot(rho, z - images.flip * source - images.shift)
    weight = images.weight[pair]
    return float((weight[weight != 0.0] / apart[weight != 0.0]).sum())


class Waves:
    """Twin: potentials of all layers at wave numbers k (m,), from one linear system of conditions.

    In layer l it is a exp(-k (z - low)) + b exp(-k (high - z)), and exp(-k |z - z'|)/e more in
    that of the source; half-spaces are cut far away, at potential zero.
    """

    def __init__(self, layers: Layers, k: np.ndarray, source: float) -> None:
        far = 1e12 * np.ptp(layers.planes)
        self.ends = np.array([layers.planes[0] - far, *layers.planes, layers.planes[-1] + far])
        self.k, self.source, self.value = k, source, layers.permittivity
        self.home = int(np.searchsorted(layers.planes, source))
        n, self.rows, self.right = layers.count, [], []
        for p in range(1, n):
            here = [(p - 1, -1.0), (p, 1.0)]
            grounded = (p == 1 and layers.grounded_below) or (p == n - 1 and layers.grounded_above)
            if grounded:
                for side, _ in here:
                    self._condition([(side, 1.0)], p, 0)
            else:
                self._condition(here, p, 0)
                self._condition([(side, sign * self.value[side]) for side, sign in here], p, 1)
        self._condition([(0, 1.0)], 0, 0)
        self._condition([(n - 1, 1.0)], n, 0)
        matrix = np.moveaxis(np.array(self.rows), 2, 0)
        self.found = np.linalg.solve(matrix, np.array(self.right).T[:, :, None])[:, :, 0]

    def _waves(self, layer: int, z: float, order: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Both waves and the source's own, or their derivatives over k."""
        low, high = self.ends[layer : layer + 2]
        up, down = np.exp(-self.k * (z - low)), np.exp(-self.k * (high - z))
        own = np.exp(-self.k * abs(z - self.source)) / self.value[layer]
        own = own if layer == self.home else np.zeros_like(own)
        return (up, down, own) if order == 0 else (-up, down, -np.sign(z - self.source) * own)

    def _condition(self, sides: list[tuple[int, float]], plane: int, order: int) -> None:
        row = np.zeros((2 * len(self.value), len(self.k)))
        right = np.zeros(len(self.k))
        for layer, factor in sides:
            up, down, own = self._waves(layer, self.ends[plane], order)
            row[2 * layer], row[2 * layer + 1] = factor * up, factor * down
            right -= factor * own
        self.rows.append(row)
        self.right.append(right)

    def at(self, layer: int, z: float) -> np.ndarray:
        """(m,) potential at height z in a layer."""
        up, down, own = self._waves(layer, z, 0)
        return self.found[:, 2 * layer] * up + self.found[:, 2 * layer + 1] * down + own


def integral(layers: Layers, at: tuple[float, float, float]) -> float:
    """Twin: the inverse transform by Gauss's rule on short intervals."""
    rho, z, source = at
    x, w = np.polynomial.legendre.leggauss(16)
    ends = np.concatenate(
        [np.geomspace(1e-4, 1.0, 30), np.arange(2.0, 40.0 / abs(z - source), 1.0)]
    )
    half = 0.5 * np.diff(ends)[:, None]
    k = (ends[:-1, None] + half * (1.0 + x)).ravel()
    value = Waves(layers, k, source).at(int(np.searchsorted(layers.planes, z)), z)
    return float((half * w).ravel() @ (j0(k * rho) * value)) + 1e-4 * value[0]


@pytest.mark.parametrize("layers", [SLAB, STRIP, BOARD, BOX])
def test_images_give_the_inverse_transform(layers: Layers) -> None:
    """Against the conditions at all planes solved as they stand, and integrated."""
    inner = range(1 if layers.grounded_below else 0, layers.count - int(layers.grounded_above))
    images = layer_images(layers, tuple(inner), 1.0)
    assert images.error < 2.0 * ACCURACY
    for at in ((0.04, 0.061, 0.02), (0.1, 0.02, 0.061), (0.03, 0.03, 0.008), (0.3, 0.11, 0.02)):
        pair = tuple(int(np.searchsorted(layers.planes, height)) for height in at[1:])
        scale = np.hypot(at[0], at[1] - at[2]) * layers.permittivity[pair[1]]
        found = of_images(images, pair, at)
        assert found == pytest.approx(integral(layers, at), abs=3.0 * ACCURACY / scale), at


def test_one_plane_has_its_exact_images() -> None:
    """Textbook: -k = (1 - e)/(1 + e) in the mirror, 2/(1 + e) across; and no error."""
    images = layer_images(Layers(2, (0.5,), (4.0, 1.0)), (0, 1), 1.0)
    assert images.error == 0.0 and len(images.flip) == 2
    assert images.weight[:, :, 0] == pytest.approx(np.array([[0.25, 0.4], [0.4, 1.0]]))
    assert images.weight[:, :, 1] == pytest.approx(np.diag([0.25 * 0.6, -0.6]))
    assert (images.flip[1], images.shift[1]) == (-1.0, 1.0)


def test_a_grounded_layer_is_the_textbook_series() -> None:
    """(1 + r) (1/rho - (1 - r) sum r^(n - 1) / |(rho, 2 n d)|), with r = (1 - e)/(1 + e)."""
    images, d, r = layer_images(STRIP, (2,), 1.0), 0.05, -0.6
    n = np.arange(1, 60)
    for rho in (0.01, 0.1, 1.0):
        series = (1.0 - r) * r ** (n - 1.0) / np.hypot(rho, 2.0 * n * d)
        want = (1.0 + r) * (1.0 / rho - series.sum())
        assert of_images(images, (2, 2), (rho, d, d)) == pytest.approx(want, abs=ACCURACY / rho)


def test_two_grounded_planes_are_the_endless_series() -> None:
    """Images at 2 n h + z' and 2 n h - z' of either sign (Thomson 1848)."""
    layers = Layers(2, (0.0, 0.1), (1.0, 1.0, 1.0), True, True)
    images = layer_images(layers, (1,), 1.0)
    n = 0.2 * np.arange(-200000, 200001)
    for rho, z, source in ((0.02, 0.03, 0.06), (0.3, 0.09, 0.05), (1.0, 0.05, 0.05)):
        want = (1.0 / np.hypot(rho, z - source - n) - 1.0 / np.hypot(rho, z + source - n)).sum()
        found = of_images(images, (1, 1), (rho, z, source))
        assert found == pytest.approx(want, abs=ACCURACY / np.hypot(rho, z - source))


@pytest.mark.parametrize("layers", [SLAB, BOARD, BOX])
def test_source_and_target_may_change_places(layers: Layers) -> None:
    inner = range(1 if layers.grounded_below else 0, layers.count - int(layers.grounded_above))
    images = layer_images(layers, tuple(inner), 1.0)
    random = np.random.default_rng(7)
    for rho, z, source in random.uniform(0.001, 0.1, (20, 3)):
        a, b = (int(np.searchsorted(layers.planes, height)) for height in (z, source))
        there, back = (
            of_images(images, pair, at)
            for pair, at in (((a, b), (rho, z, source)), ((b, a), (rho, source, z)))
        )
        assert there == pytest.approx(back, rel=1e-9)


def test_equal_layers_are_no_layers() -> None:
    images = layer_images(Layers(1, (0.0, 0.1, 0.3), (1.0,) * 4), (0, 1, 2, 3), 1.0)
    assert len(images.flip) == 1 and np.array_equal(images.weight, np.ones((4, 4, 1)))


def test_exponentials_meet_their_accuracy_with_few_terms() -> None:
    k = np.geomspace(1e-6, 200.0, 200)
    samples = Samples(k, 1.0 / (1.0 + k) ** 2 * np.exp(-0.1 * k), np.ones(200))
    found = exponentials(samples, 0.1, 1e3, 1e-6)
    value = np.exp(-np.outer(k, found.length)) @ found.coefficient
    assert np.abs(value - samples.value).max() == pytest.approx(found.error, rel=1e-6)
    assert found.error <= 1e-6 and len(found.length) <= 12


def test_the_inverse_law_serves_sources_without_total_charge() -> None:
    """Integral over all b >= 0.1 of 1/|(rho, b + 0.3)| - 1/|(rho, b + 0.1)|, in closed form."""
    law = inverse_law(0.1, 1.0)
    for rho in (0.01, 0.3, 1.0):
        apart = [1.0 / np.hypot(rho, law.length + h) for h in (0.3, 0.1)]
        want = np.arcsinh(0.2 / rho) - np.arcsinh(0.4 / rho)
        assert law.coefficient @ (apart[0] - apart[1]) == pytest.approx(want, abs=2e-7)
