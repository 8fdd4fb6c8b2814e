"""Panels with their images behind grounded and mirror planes."""

from __future__ import annotations

import numpy as np

from bem.kernels.arrays import PanelArrays, panel_arrays
from bem.kernels.pairs import Sources

COINCIDENT = 1e-6
"""An image nearer to its panel than this part of the radius lies in the same place."""
BLOCK = 256
"""Panels handled together, so that memory stays small."""


def sources_of(images: np.ndarray, signs: np.ndarray) -> Sources:
    """Arrays of panels and their images.

    Args:
        images: (g, n, 4, 3) corners, those of the panels themselves first.
        signs: (g,) sign of the charge on each image.
    """
    return Sources(panel_arrays(images.reshape(-1, 4, 3)), np.asarray(signs, dtype=float))


def with_images(density: np.ndarray, signs: np.ndarray) -> np.ndarray:
    """Densities (g n, ...) of panels and images from those of the panels (n, ...)."""
    return np.concatenate([sign * density for sign in signs])


def own_images(sources: Sources, count: int) -> np.ndarray:
    """(count,) how many images of each panel lie where it lies itself, the panel among them.

    A sheet in a mirror plane is its own image, and its charge counts twice in its energy.
    """
    panels = sources.panels
    center = panels.center.reshape(-1, count, 3)
    apart = np.linalg.norm(center - center[0], axis=2)
    return (apart <= COINCIDENT * panels.radius[:count]).sum(axis=0)


def plain_energy(panels: PanelArrays, left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """(k, m) energy of charges of one sign on n panels, their images counted as positive too.

    Panels count as points, those nearer than a radius as that far: good to some ten per
    cent, and meant for error estimates.

    Args:
        panels: n panels, then their images.
        left: (n, k) densities.
        right: (n, m) densities.
    """
    count = len(left)
    copies = len(panels.area) // count
    charge = panels.area[:, None] * np.tile(right, (copies, 1))
    total = np.zeros((left.shape[1], right.shape[1]))
    for start in range(0, count, BLOCK):
        block = slice(start, min(start + BLOCK, count))
        apart = np.linalg.norm(panels.center[block, None] - panels.center, axis=2)
        inverse = 1.0 / np.maximum(apart, panels.radius[block, None])
        total += (panels.area[block, None] * left[block]).T @ (inverse @ charge)
    return total
