"""What a mesh file holds, before units, welding and choice of a part."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from bem.errors import InputError
from bem.geometry.wording import counted, listed


@dataclass(frozen=True)
class MeshData:
    """Faces of a file as they stand in it.

    Args:
        vertices: (v, 3) float64, in the file's unit.
        faces: (f, 4) int64; a triangle has -1 last.
        parts: faces (indices) of each named portion.
        bodies: the parts that stand for a body each, where the kind of file has such.
        changes: what was left out or reduced, one line each.
        rounding: half the spacing of the largest number the file can tell apart.
        unit: of the numbers, if the file itself states it; a name of ``bem.units``.
        whole: faces (indices) that make up the file as a whole; None is all of them.
        volumes: parts that are boundaries of volume cells; None stands for the whole.
        volume_cells: number of volume cells, which count only through these parts.
    """

    vertices: np.ndarray
    faces: np.ndarray
    parts: dict[str, np.ndarray] = field(default_factory=dict)
    bodies: tuple[str, ...] = ()
    changes: tuple[str, ...] = ()
    rounding: float = 0.0
    unit: str | None = None
    whole: np.ndarray | None = None
    volumes: tuple[str | None, ...] = ()
    volume_cells: int = 0

    def faces_of(self, part: str | None) -> np.ndarray:
        """Faces (n, 4) of a named portion, or all of them.

        Raises:
            InputError: there is no such part; the message lists those found.
        """
        if part is None:
            return self.faces if self.whole is None else self.faces[self.whole]
        if part not in self.parts:
            found = f"found {listed(self.parts)}" if self.parts else "the file names no parts"
            raise InputError(f"part {listed([part])} is not in the file; {found}")
        return self.faces[self.parts[part]]

    def changes_of(self, part: str | None) -> list[str]:
        """What reading a part, or all, left out or reduced, one line each."""
        if self.volume_cells == 0 or part in self.volumes:
            return list(self.changes)
        return [*self.changes, f"{counted(self.volume_cells, 'volume cell')} left out"]

    @property
    def outside_bodies(self) -> int:
        """Number of faces of the whole that belong to none of the bodies."""
        outside = np.ones(len(self.faces), dtype=bool)
        if self.whole is not None:
            outside[:] = False
            outside[self.whole] = True
        for name in self.bodies:
            outside[self.parts[name]] = False
        return int(outside.sum())

    def check(self) -> MeshData:
        """Return the data itself if its faces can be used.

        Raises:
            InputError: no faces, indices out of range, or coordinates that are not finite.
        """
        if len(self.faces_of(None)) == 0:
            lines = ["holds no triangle or quadrilateral", *self.changes_of(None)]
            raise InputError("; ".join([*lines, "mesh the surface"]))
        corners = self.faces[self.faces != -1]
        if corners.min() < 0 or corners.max() >= len(self.vertices):
            raise InputError(
                f"a face uses a corner beyond the {len(self.vertices):,} listed; mesh it again"
            )
        finite = np.isfinite(self.vertices).all(axis=1)
        bad = np.unique(corners[~finite[corners]])
        if len(bad):
            raise InputError(
                f"{counted(len(bad), 'corner')} not finite, the first is number {bad[0] + 1} at "
                f"{tuple(self.vertices[bad[0]].tolist())}; mesh it again"
            )
        return self
