"""Two scenes side by side: their conductors matched by name, in lengths of the first."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from bem.errors import UsageError
from bem.extraction.scaled import ScaledScene
from bem.geometry.layers import Layers
from bem.geometry.surface import Surface
from bem.geometry.wording import listed
from bem.panels.mesh import Body, Mesh
from bem.panels.motion import ByFaces, Motion, loosened, motion_of, redrawn
from bem.panels.transport import Other, transported
from bem.scene.scene import Scene


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
    """Both scenes in the frame of the first.

    Args:
        first: the first scene, scaled.
        second: the second one, its conductors in the same order.
        hollow: conductors that are shells, of the first and of the second scene.
        motions: per conductor, how it goes over; None where that is not possible.
    """

    first: ScaledScene
    second: ScaledScene
    hollow: tuple[list[int], list[int]]
    motions: list[Motion | None]

    @classmethod
    def of(cls, before: Scene, after: Scene) -> Counterparts:
        """Match two scenes with the same conductors in the same order."""
        first = ScaledScene.of(before)
        second = ScaledScene.of(after, first)
        motions = [
            None if _cut_elsewhere((a, first.planes.layers), (b, second.planes.layers)) else motion
            for a, b in zip(first.surfaces, second.surfaces, strict=True)
            for motion in [motion_of(a, b)]
        ]
        return cls(first, second, (_shells(before), _shells(after)), motions)

    @property
    def motionless(self) -> list[int]:
        """Conductors whose panels cannot be carried over."""
        return [k for k, motion in enumerate(self.motions) if motion is None]

    @property
    def redrawn(self) -> np.ndarray:
        """(k,) bool, conductors whose numbers were rounded anew for the second scene."""
        return np.array(list(map(redrawn, self.first.surfaces, self.second.surfaces, self.motions)))

    def start(self, accept: Callable[[int], None]) -> Mesh:
        """Starting mesh of the first scene, of panels that can be carried over.

        Args:
            accept: told the number of panels; it may raise.
        """
        surfaces = [
            loosened(surface) if isinstance(motion, ByFaces) and motion.loose else surface
            for surface, motion in zip(self.first.surfaces, self.motions, strict=True)
        ]
        mesh = Mesh.start(surfaces, self.hollow[0], accept, self.first.planes)
        return replace(mesh, bodies=_bodies(mesh, self.first, self.hollow[0]))

    def carry(self, mesh: Mesh) -> Mesh:
        """The panels of the first scene carried over to the second."""
        motions = [motion for motion in self.motions if motion is not None]
        bodies = _bodies(mesh, self.second, self.hollow[1])
        return transported(mesh, Other(motions, bodies, self.second.planes))


def _cut_elsewhere(
    first: tuple[Surface, Layers | None], second: tuple[Surface, Layers | None]
) -> bool:
    """Whether planes between layers cut a body, in other places before than after."""
    (a, before), (b, after) = first, second
    crossed = [layers is not None and layers.cut(s.bounds) for s, layers in (first, second)]
    if not any(crossed) or before is None or after is None:
        return any(crossed)
    alike = np.array_equal(a.vertices, b.vertices) and before.planes == after.planes
    return not (alike and before.axis == after.axis)


def _bodies(mesh: Mesh, scaled: ScaledScene, hollow: list[int]) -> tuple[Body, ...]:
    """The bodies of a mesh, with what the surfaces of a scene say of them."""
    return tuple(
        replace(Body.of(surface, k in hollow, scaled.planes, k), sagitta=body.sagitta)
        for k, (body, surface) in enumerate(zip(mesh.bodies, scaled.surfaces, strict=True))
    )


def _shells(scene: Scene) -> list[int]:
    return [k for k, conductor in enumerate(scene.conductors) if conductor.body == "shell"]


def in_order(scene: Scene, names: list[str]) -> Scene:
    """The same scene with its conductors in the order of ``names``."""
    by_name = {conductor.name: conductor for conductor in scene.conductors}
    return replace(scene, conductors=[by_name[name] for name in names])
