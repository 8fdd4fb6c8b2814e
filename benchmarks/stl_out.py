"""Binary STL files, in single precision as everyone writes them."""

from __future__ import annotations

import numpy as np

from bem.geometry.surface import Surface


def binary_stl(surface: Surface, name: str) -> bytes:
    """Bytes of a binary STL file of the triangles of a surface, numbers in metres."""
    corners = surface.vertices[surface.triangles]
    facets = np.zeros(len(corners), dtype=[("numbers", "<f4", 12), ("attribute", "<u2")])
    facets["numbers"][:, 3:] = corners.reshape(-1, 9)
    count = np.uint32(len(corners)).astype("<u4").tobytes()
    return name.encode().ljust(80) + count + facets.tobytes()
