"""Media with losses: the same panels and integrals, with complex permittivities.

The real extraction comes first; its last mesh serves every frequency, and is refined further
where that frequency needs it (at low ones conduction moves the field elsewhere).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

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
from bem.operators.mixed import MixedOperator, MixedReuse
from bem.panels.mesh import Mesh
from bem.results.lossy import Lossy

MOST_ROUNDS = 8
"""Rounds of one frequency beyond the mesh of the real extraction."""
SLOPE_DOUBT = 0.5
"""How far the slope of L against the indicator may be from its usual value."""


@dataclass
class LossyRun:
    """The rounds of one frequency.

    Args:
        run: the real extraction, done.
        permittivity: (r,) complex, of each region over the real one of the surroundings.
        mesh: to start from.
        rounds: what each said.
        solution: the last one.
    """

    run: Run
    permittivity: np.ndarray
    mesh: Mesh
    rounds: list[Sums] = field(default_factory=list)
    solution: MixedSolution | None = None

    def go(self, operator: MixedOperator | None) -> tuple[Estimate, bool]:
        """Value and bars, and whether they are small enough.

        Args:
            operator: of the mesh to start from, if there is one.
        """
        origin = np.arange(len(self.mesh.conductor))
        while True:
            found = self._round(None if operator is None else operator.given(origin))
            done = float(self.run.goal.worst(_moduli(found)).max()) <= 1.0
            room = self.run.limits.max_panels - len(self.mesh.conductor)
            if done or room <= 0 or len(self.rounds) >= MOST_ROUNDS:
                return found, done
            promise = indicator(self._solved(), self.run.goal, _moduli(found))
            finer, origin = self.mesh.refine(*mark(promise, BULK_NEAR, room))
            if not self.run.limits.fits(finer, self.mesh):
                return found, done
            operator, self.mesh = self._solved().operator, finer

    def _solved(self) -> MixedSolution:
        if self.solution is None:
            raise TypeError("nothing has been solved yet")
        return self.solution

    def _round(self, reuse: MixedReuse | None) -> Estimate:
        self.run.tell("solving with losses", len(self.mesh.conductor))
        far = self.run.rounds[-1].solution.operator.far
        self.solution = solve_dielectric(self.mesh, self.run.count, far, reuse, self.permittivity)
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
    count = len(value)
    root = np.sqrt(np.abs(np.diagonal(value)))
    facets = facet_doubt(np.abs(last.faceting[:, :count]), np.abs(last.value))
    parts = {
        "discretisation": (SHARE + DOUBT * SLOPE_DOUBT) * last.absolute,
        "trend": trend,
        "quadrature": last.quadrature + FLOOR * root[:, None] * np.append(root, root.max()),
        "input rounding": last.rounding,
        "facets of the file": FILES * last.files,
        "faceting": facets * np.abs(last.faceting) + RIM * last.rims,
    }
    return Estimate(value, sum(parts.values()), parts, KAPPA_USUAL, facets)


def with_losses(
    run: Run, permittivity: Sequence[np.ndarray], frequencies: Sequence[float], farad: float
) -> tuple[Lossy, ...]:
    """Matrices at each frequency.

    Args:
        run: the real extraction, done.
        permittivity: (r,) complex at each frequency, over the real one of the surroundings.
        frequencies: Hz.
        farad: capacitance of one unit of L.
    """
    last = run.rounds[-1].solution
    mesh, operator = last.mesh, last.operator
    out = []
    for frequency, rho in zip(frequencies, permittivity, strict=True):
        lossy = LossyRun(run, rho, mesh)
        found, done = lossy.go(operator if isinstance(operator, MixedOperator) else None)
        mesh, operator = lossy.mesh, lossy._solved().operator
        out.append(_result(frequency, found, farad, (done, len(mesh.conductor))))
    return tuple(out)


def _result(frequency: float, found: Estimate, farad: float, state: tuple[bool, int]) -> Lossy:
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
        *state,
    )
