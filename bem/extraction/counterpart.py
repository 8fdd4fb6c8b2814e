"""Two scenes side by side: their conductors matched by name, in lengths of the first."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from bem.errors import UsageError
from bem.extraction.scaled import ScaledScene
from bem.geometry.surface import Surface
from bem.geometry.wording import listed
from bem.panels.mesh import Body, Mesh
from bem.panels.motion import ByFaces, Motion, loosened, motion_of, same_vertices
from bem.panels.transport import transported
from bem.scene.scene import Conductor, Scene


def check_names(before: list[str], after: list[str]) -> None:
    """Require the same conductors on both sides, in any order.

    Raises:
        UsageError: names those that only one side has.
    """
    gone = [name for name in before if name not in after]
    new = [name for name in after if name not in before]
    if gone or new:
        parts = [
            f"only in the {side}: {listed(names)}"
            for side, names in (("first", gone), ("second", new))
            if names
        ]
        raise UsageError(
            f"the two scenes have different conductors ({'; '.join(parts)}); "
            "give them the same names, or compare the matrices by hand"
        )


@dataclass(frozen=True)
class Counterparts:
    """Both scenes in one frame.

    Args:
        first: the first scene, scaled.
        second: surfaces of the second one, in the order and the frame of the first.
        hollow: conductors that are shells, of the first and of the second scene.
        motions: per conductor, how it goes over; None where that is not possible.
    """

    first: ScaledScene
    second: list[Surface]
    hollow: tuple[list[int], list[int]]
    motions: list[Motion | None]

    @classmethod
    def of(cls, before: Scene, after: Scene) -> Counterparts:
        """Match two scenes with the same names of conductors."""
        first = ScaledScene.of(before)
        theirs = [in_order(after)[c.name] for c in before.conductors]
        matrix, shift = np.eye(3) / first.length, -first.center / first.length
        second = [c.surface.placed(matrix, shift) for c in theirs]
        hollow = _shells(before.conductors), _shells(theirs)
        return cls(first, second, hollow, list(map(motion_of, first.surfaces, second)))

    @property
    def motionless(self) -> list[int]:
        """Conductors whose panels cannot be carried over."""
        return [k for k, motion in enumerate(self.motions) if motion is None]

    @property
    def redrawn(self) -> np.ndarray:
        """(k,) bool, conductors whose numbers are not the same in both scenes."""
        return np.array([not same_vertices(a, b) for a, b in zip(self.first.surfaces, self.second, strict=True)])

    def start(self, accept) -> Mesh:
        """Starting mesh of the first scene, whose panels can be carried over."""
        surfaces = [
            loosened(surface) if isinstance(motion, ByFaces) and motion.loose else surface
            for surface, motion in zip(self.first.surfaces, self.motions, strict=True)
        ]
        mesh = Mesh.start(surfaces, self.hollow[0], accept)
        return mesh

    def carry(self, mesh: Mesh) -> Mesh:
        """The panels of the first scene carried over to the second."""
        bodies = tuple(Body.of(s, k in self.hollow[1]) for k, s in enumerate(self.second))
        return transported(mesh, [m for m in self.motions if m is not None], bodies)


def in_order(scene: Scene) -> dict[str, Conductor]:
    """Conductors by name."""
    return {conductor.name: conductor for conductor in scene.conductors}


def _shells(conductors: list[Conductor]) -> list[int]:
    return [k for k, c in enumerate(conductors) if c.body == "shell"]
