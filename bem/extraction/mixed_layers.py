"""Dielectric bodies among flat layers: the layer of each panel, and permittivities over it.

In layer b the images carry 1 over its permittivity e_b, and the double layer of the mixed system
is taken as e_b dG/dn, so that a body of permittivity e counts as e / e_b. The flux of e_b dG/dn
does not jump at a plane: a panel in a plane belongs to the layer of the body that it bounds.
"""

from __future__ import annotations

import numpy as np

from bem.errors import GeometryError
from bem.geometry.layers import Layers
from bem.panels.mesh import Mesh

IN_PLANE = 1e-7
"""A panel whose corners are nearer to a plane than this part of the size lies in it."""


def layers_of_regions(mesh: Mesh, count: int) -> np.ndarray:
    """(count,) layer that each region lies in, -1 where it has no panel or has them in several.

    Args:
        mesh: n panels with regions on both sides.
        count: number of regions, the surroundings first, which lie in all layers.
    """
    layers = mesh.planes.layers
    if layers is None:
        return np.zeros(count, dtype=np.int64)
    layer, flush = layers.layer_of(mesh.corners.mean(axis=1)), _flush(layers, mesh.corners)
    out = np.full(count, -1)
    for region in range(1, count):
        here = (mesh.regions == region).any(axis=1)
        found = np.unique(layer[here & ~flush])
        if len(found) == 1 and not layers.crossed(mesh.corners[here], IN_PLANE).any():
            out[region] = found[0]
    return out


def _flush(layers: Layers, corners: np.ndarray) -> np.ndarray:
    """(n,) whether each panel lies in a plane."""
    at = corners[..., layers.axis]
    apart = np.abs(at[..., None] - np.array(layers.planes))
    return (apart.max(axis=1) <= IN_PLANE).any(axis=1)


def panel_layers(mesh: Mesh, regions: np.ndarray) -> np.ndarray:
    """(n,) layer of each panel, that of a body it bounds where there is one.

    Args:
        mesh: n panels.
        regions: (r,) layer of each region.
    """
    layer = mesh.planes.layer_of(mesh.corners.mean(axis=1))
    for side in (1, 0):
        inside = mesh.regions[:, side] > 0
        layer[inside] = regions[mesh.regions[inside, side]]
    return layer


def flux_shares(mesh: Mesh) -> np.ndarray:
    """(n, 2) part of the flux from a point on each panel that goes to the back, and to the front.

    From a charge in a plane it goes to both sides as their permittivities; elsewhere in halves.
    """
    out = np.full((len(mesh.conductor), 2), 0.5)
    layers = mesh.planes.layers
    if layers is None:
        return out
    corners = mesh.corners
    normal = np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])
    upward = (normal[:, layers.axis] > 0.0).astype(int)
    for k, plane in enumerate(layers.planes):
        there = np.abs(corners[..., layers.axis] - plane).max(axis=1) <= IN_PLANE
        below, above = layers.permittivity[k : k + 2]
        share = np.array([above, below]) / (below + above)
        out[there] = np.stack([share[upward], share[1 - upward]], axis=1)[there]
    return out


def relative(permittivity: np.ndarray, regions: np.ndarray, mesh: Mesh) -> np.ndarray:
    """(r,) permittivity of each region over that of its layer; 1 for the surroundings.

    Args:
        permittivity: (r,) over that of the surroundings.
        regions: (r,) layer of each region.
        mesh: whose planes hold the layers.
    """
    layers = mesh.planes.layers
    if layers is None:
        return permittivity
    out = permittivity / np.array(layers.permittivity)[regions]
    out[0] = 1.0
    return out


def check_regions(mesh: Mesh, names: list[str]) -> None:
    """Refuse dielectric bodies that planes between layers cut.

    Args:
        mesh: with regions on both sides of its panels.
        names: of the dielectrics, regions 1, 2, ...

    Raises:
        GeometryError: names one of them.
    """
    present = np.unique(mesh.regions[mesh.regions > 0])
    found = layers_of_regions(mesh, len(names) + 1)
    for region in present:
        if found[region] < 0:
            raise GeometryError(
                f'"{names[region - 1]}" crosses a plane between layers; cut the dielectric '
                "there, into one body on each side"
            )
