"""Media with losses: the same panels and integrals, with complex permittivities.

The real extraction comes first; its last mesh serves every frequency, and is refined further
where that frequency needs it (at low ones conduction moves the field elsewhere).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import NamedTuple

import numpy as np

from bem.errors import UsageError
from bem.extraction.estimate import (
    DOUBT,
    FILES,
    FLOOR,
    KAPPA_USUAL,
    RIM,
    SHARE,
    TREND,
    Estimate,
    facet_doubt,
)
from bem.extraction.loop import BULK_NEAR, Run
from bem.extraction.marking import indicator, mark
from bem.extraction.mixed import MixedSolution, solve_dielectric
from bem.extraction.solution import Sums
from bem.panels.mesh import Mesh
from bem.results.lossy import Lossy
from bem.scene.material import Material
from bem.scene.scene import Scene

MOST_ROUNDS = 8
"""Rounds of one frequency beyond the mesh of the real extraction."""
SLOPE_DOUBT = 0.5
"""How far the slope of L against the indicator may be from its usual value."""


class Reached(NamedTuple):
    """Whether the bars are small enough, and the number of panels that it took."""

    converged: bool
    panels: int


@dataclass
class LossyRun:
    """The rounds of one frequency.

    Args:
        run: the real extraction, done.
        permittivity: (r,) complex, of each region over the real one of the surroundings.
        solution: the last one; its mesh is where to start from.
        rounds: what each said.
    """

    run: Run
    permittivity: np.ndarray
    solution: MixedSolution
    rounds: list[Sums] = field(default_factory=list)

    def go(self) -> tuple[Estimate, Reached]:
        """Value and bars, refined until they are small enough or a limit is met."""
        mesh, limits = self.solution.mesh, self.run.limits
        origin = np.arange(len(mesh.conductor))
        while True:
            found = self._round(mesh, origin)
            done = float(self.run.goal.worst(_moduli(found)).max()) <= 1.0
            reached = Reached(done, len(mesh.conductor))
            room = limits.max_panels - reached.panels
            if done or room <= 0 or len(self.rounds) >= MOST_ROUNDS:
                return found, reached
            promise = indicator(self.solution, self.run.goal, _moduli(found))
            finer, origin = mesh.refine(*mark(promise, BULK_NEAR, room))
            if len(finer.conductor) > limits.max_panels or not limits.fits(finer, mesh):
                return found, reached
            mesh = finer

    def _round(self, mesh: Mesh, origin: np.ndarray) -> Estimate:
        self.run.tell("solving with losses", len(mesh.conductor))
        operator = self.solution.operator
        reuse, rho = operator.given(origin), self.permittivity
        self.solution = solve_dielectric(mesh, self.run.count, operator.far, reuse, rho)
        self.rounds.append(self.solution.sums())
        return complex_estimate(self.rounds)


def _moduli(found: Estimate) -> Estimate:
    """The estimate with moduli as values, for what only asks for sizes."""
    return Estimate(np.abs(found.value), found.bar, {}, found.kappa, found.facet_doubt)


def complex_estimate(rounds: Sequence[Sums]) -> Estimate:
    """Value and bar, of real and imaginary part alike, by the formula of ``estimate``.

    The slope is the usual one; until there is a trend the whole indicator stands for it.
    """
    values = [r.value + KAPPA_USUAL * r.signed + r.faceting for r in rounds[-3:]]
    last, value = rounds[-1], values[-1]
    trend = last.absolute
    if len(values) > 1:
        trend = TREND * np.max([np.abs(value - x) for x in values[:-1]], axis=0)
    root = np.sqrt(np.abs(np.diagonal(value)))
    facets = facet_doubt(last.facet_moves, np.abs(last.value))
    parts = {
        "discretisation": (SHARE + DOUBT * SLOPE_DOUBT) * last.absolute,
        "trend": trend,
        "quadrature": last.quadrature + FLOOR * root[:, None] * np.append(root, root.max()),
        "input rounding": last.rounding,
        "facets of the file": FILES * last.files,
        "faceting": facets * last.facet_moves + RIM * last.rims,
    }
    return Estimate(value, sum(parts.values()), parts, KAPPA_USUAL, facets)


def media_of(scene: Scene) -> list[Material]:
    """Return the media of a scene: surroundings, dielectric bodies, flat layers."""
    layers = [] if scene.stack is None else list(scene.stack.materials)
    return [scene.surroundings, *(d.material for d in scene.dielectrics), *layers]


def check_losses(scene: Scene) -> None:
    """Refuse frequencies that nothing depends on, and losses that are not solved.

    Raises:
        UsageError: no medium has losses, or there are flat layers.
    """
    if scene.stack is not None:
        raise UsageError(
            "frequencies: found some with flat layers, which have no losses here; drop them"
        )
    if not any(medium.lossy for medium in media_of(scene)):
        raise UsageError(
            "frequencies: found some, but no medium has losses; give a loss_tangent or a "
            "conductivity, or leave the frequencies out"
        )


def with_losses(
    run: Run, scene: Scene, frequencies: Sequence[float], farad: float
) -> tuple[Lossy, ...]:
    """Matrices of a scene at each frequency.

    Args:
        run: the real extraction, done.
        scene: with the losses of its media.
        frequencies: Hz.
        farad: capacitance of one unit of L.
    """
    media = media_of(scene)
    solution = run.rounds[-1].solution
    out = []
    for frequency in frequencies:
        rho = np.array([medium.at(frequency) for medium in media]) / scene.relative_permittivity
        if not isinstance(solution, MixedSolution):
            out.append(_result(frequency, *_uniform(run, rho[0]), farad))
            continue
        lossy = LossyRun(run, rho, solution)
        out.append(_result(frequency, *lossy.go(), farad))
        solution = lossy.solution
    return tuple(out)


def _uniform(run: Run, rho: complex) -> tuple[Estimate, Reached]:
    """The real matrix times the complex permittivity of a single medium."""
    last = run.rounds[-1]
    found = replace(last.found, value=rho * last.found.value, bar=abs(rho) * last.found.bar)
    return found, Reached(run.stopped_by == "tolerance", last.sums.panels)


def _result(frequency: float, found: Estimate, reached: Reached, farad: float) -> Lossy:
    count = len(found.value)
    omega = 2.0 * np.pi * frequency
    value, bar = farad * found.value, farad * found.bar
    square = slice(None), slice(count)
    real, loss = value.real, 0.0 - omega * value.imag
    return Lossy(
        frequency,
        real[square],
        bar[square],
        loss[square],
        omega * bar[square],
        real[:, -1],
        bar[:, -1],
        loss[:, -1],
        omega * bar[:, -1],
        *reached,
    )
