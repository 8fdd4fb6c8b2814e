"""The result of an extraction: the Maxwell matrix, its error bars, and how it was reached.

Signs and units: Q = C V with Q in coulomb, V in volt, C in farad. Diagonal entries are
positive, the others negative or zero. The sum of a row is the capacitance of that conductor
to the surroundings; minus an off-diagonal entry is the capacitance between two conductors.

The matrix of an extraction holds all conductors. What is grounded, floating or tied is kept
beside it, and ``terminals`` and ``reduced`` give the smaller matrix that follows.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from os import PathLike
from typing import Any

import numpy as np

from bem.results.lossy import Lossy


@dataclass(frozen=True, eq=False)
class Round:
    """Record of one refinement round.

    Args:
        panels: number of panels.
        capacitance: (n, n) F, the value reported if this were the last round.
        error: (n, n) F, its bars.
        worst: largest bar divided by what the tolerance allows for it (1 or less: done).
        seconds: since the start of the extraction.
    """

    panels: int
    capacitance: np.ndarray
    error: np.ndarray
    worst: float
    seconds: float


@dataclass(frozen=True)
class Reduction:
    """What was done with the conductors of the full matrix, by their names.

    Args:
        terminals: {name of the terminal: its conductors, tied if several}.
        grounded: conductors held at 0 V.
        floating: conductors of each node without net charge.
    """

    terminals: dict[str, tuple[str, ...]]
    grounded: tuple[str, ...] = ()
    floating: tuple[tuple[str, ...], ...] = ()


@dataclass(frozen=True, eq=False, repr=False)
class CapacitanceResult:
    """Maxwell capacitance matrix with error bars.

    Args:
        conductors: names, in the order of rows and columns.
        capacitance: (n, n) F, Maxwell signs: Q = C V.
        error: (n, n) F, bar of each entry: meant to hold in at least 95 % of entries.
        row_sum: (n,) F, capacitance to the surroundings and to all that is grounded.
        row_sum_error: (n,) F, its own bar (correlated with those of the row).
        tolerance: what was asked: every bar at most this times sqrt(C_ii C_jj).
        pairs: {(name, name): relative accuracy asked for that coupling}.
        converged: whether all that was asked was reached.
        stopped_by: "tolerance", "max-panels", "memory", "rounds", "breakdown",
            "input-rounding", "faceting" or "interrupt".
        rounds: one record per round.
        budget: parts of the largest bars, {part name: (n, n) F}.
        audit: findings of the audit, {check name: {"value": float, "limit": float, "ok": bool}}.
        warnings: lines for the user.
        inputs: one dict per conductor: name, file, sha256, unit, part, changes.
        settings: all that determines the run.
        seconds: {phase: seconds}.
        version: version of bem that made the result.
        states: of each conductor, "terminal", "grounded" or "floating"; empty: all terminals.
        nodes: of each conductor, the node that it is tied to, or None; empty: none is tied.
        reduction: how this matrix came from a larger one, or None.
        panel_corners: (p, 4, 3) m, the last mesh; a triangle repeats its last corner.
        panel_conductor: (p,) index of the conductor that owns each panel, -1 on the faces of
            dielectrics; after a reduction also for grounded and floating ones.
        density: (p, n) C/m^2 per volt: column j for 1 V on conductor j, 0 V on the others.
        lossy: C and G at each frequency that was asked for.
    """

    conductors: tuple[str, ...]
    capacitance: np.ndarray
    error: np.ndarray
    row_sum: np.ndarray
    row_sum_error: np.ndarray
    tolerance: float
    converged: bool
    stopped_by: str
    rounds: tuple[Round, ...]
    pairs: dict[tuple[str, str], float] = field(default_factory=dict)
    budget: dict[str, np.ndarray] = field(default_factory=dict)
    audit: dict[str, dict[str, Any]] = field(default_factory=dict)
    warnings: tuple[str, ...] = ()
    inputs: tuple[dict[str, Any], ...] = ()
    settings: dict[str, Any] = field(default_factory=dict)
    seconds: dict[str, float] = field(default_factory=dict)
    version: str = ""
    states: tuple[str, ...] = ()
    nodes: tuple[str | None, ...] = ()
    reduction: Reduction | None = None
    panel_corners: np.ndarray | None = None
    panel_conductor: np.ndarray | None = None
    density: np.ndarray | None = None
    lossy: tuple[Lossy, ...] = ()

    @property
    def panels(self) -> int:
        """Number of panels of the last round."""
        return self.rounds[-1].panels

    @property
    def mutual(self) -> np.ndarray:
        """(n, n) F: -C_ij between two conductors; on the diagonal, to the surroundings."""
        between = 0.0 - self.capacitance
        np.fill_diagonal(between, self.row_sum)
        return between

    @property
    def allowance(self) -> np.ndarray:
        """(n, n) F: largest bar that was asked for: t sqrt(C_ii C_jj), or less for a pair."""
        size = np.sqrt(np.abs(np.diagonal(self.capacitance)))
        allowed = self.tolerance * np.outer(size, size)
        for pair, accuracy in self.pairs.items():
            i, j = map(self.conductors.index, pair)
            allowed[i, j] = min(allowed[i, j], accuracy * abs(self.capacitance[i, j]))
            allowed[j, i] = min(allowed[j, i], accuracy * abs(self.capacitance[j, i]))
        return allowed

    @property
    def used(self) -> np.ndarray:
        """(n, n): each bar over what is allowed for it; 1 or less is good enough."""
        allowed = self.allowance
        nothing = np.where(self.error == 0.0, 0.0, np.inf)
        return np.divide(self.error, allowed, out=nothing, where=allowed > 0.0)

    @property
    def terminals(self) -> CapacitanceResult:
        """The result as its scene asks for it: grounded, floating and tied conductors reduced.

        Raises:
            SolutionError: the potential of a floating conductor is not known within the bars.
        """
        return self.reduced()

    def reduced(
        self,
        ground: Iterable[str] = (),
        floating: Iterable[str] = (),
        tie: Iterable[Iterable[str]] = (),
        free: Iterable[str] = (),
    ) -> CapacitanceResult:
        """Ground, float and tie conductors after the solve, beside what their scene says.

        Bars are carried through; see ``bem.results.reduction`` for the formulas. What is tied
        to ground is grounded, and a floating conductor tied to a terminal belongs to it.

        Args:
            ground: conductors or nodes to hold at 0 V.
            floating: conductors or nodes to leave without net charge.
            tie: groups of conductors to connect, or {name of the new node: group}.
            free: nodes, or single conductors of them, to make terminals of their own again.

        Returns:
            The result of the terminals, with ``reduction`` to say what was done; ``converged``
            is that of the full matrix.

        Raises:
            UsageError: a name is unknown or told two things, or no terminal is left.
            SolutionError: the potential of a floating conductor is not known within the bars.
        """
        from bem.results.reduction import reduced
        from bem.results.wiring import Wiring

        wiring = Wiring.of(self.conductors, self.states, self.nodes)
        return reduced(self, wiring.changed(ground, floating, tie, free))

    def to_json(self, path: str | PathLike[str], arrays: bool = True) -> None:
        """Save everything; ``load_result`` reads it back without loss.

        Args:
            path: file to write; it appears complete or not at all.
            arrays: also save the panels and densities.

        Raises:
            InputError: the file cannot be written.
        """
        from bem.exports.json_file import save_json

        save_json(self, path, arrays)

    def to_csv(self, path: str | PathLike[str]) -> None:
        """Save entries and row sums of the terminals with their bars, one line each.

        Raises:
            InputError: the file cannot be written.
            SolutionError: as for ``terminals``.
        """
        from bem.exports.csv_file import save_csv

        save_csv(self.terminals, path)

    def __str__(self) -> str:
        from bem.exports.text import report
        from bem.results.reduction import presented

        return report(presented(self))

    def __repr__(self) -> str:
        reached = "reached" if self.converged else "not reached"
        return (
            f"<CapacitanceResult: {len(self.conductors)} conductors, {self.panels} panels, "
            f"tolerance {self.tolerance:g} {reached}>"
        )

    def _repr_html_(self) -> str:
        from bem.exports.html import report
        from bem.results.reduction import presented

        return report(presented(self))


def load_result(path: str | PathLike[str]) -> CapacitanceResult:
    """Read a result that ``CapacitanceResult.to_json`` saved.

    Raises:
        InputError: the file is missing, damaged, or not a saved result.
    """
    from bem.exports.json_file import load_json

    return load_json(path)
