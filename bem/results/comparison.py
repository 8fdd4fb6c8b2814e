"""The change between two capacitance matrices, with a bar of its own on every entry."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from os import PathLike

import numpy as np

from bem.errors import UsageError
from bem.results.lossy_reduction import lossy_in_order
from bem.results.result import CapacitanceResult, Round


@dataclass(frozen=True)
class Excess:
    """An entry whose change is, or may be, above a limit.

    Args:
        pair: names of row and column.
        change: |change| / sqrt(C_ii C_jj).
        bar: its bar, in the same units.
        certain: whether the change exceeds the limit by more than its bar.
    """

    pair: tuple[str, str]
    change: float
    bar: float
    certain: bool


@dataclass(frozen=True, eq=False, repr=False)
class Comparison:
    """What changed from one scene to another.

    Args:
        before: of the first scene.
        after: of the second, its conductors in the order of the first.
        change: (n, n) F, after less before.
        change_error: (n, n) F, bar of each change: meant to hold in at least 95 % of entries.
        row_sum_change: (n,) F, change of the capacitance to the surroundings.
        row_sum_change_error: (n,) F, its own bar.
        tolerance: what was asked of the bars of both matrices, as in ``extract``.
        change_accuracy: what was asked of the changes: each bar at most this times the
            largest change, both over sqrt(C_ii C_jj).
        correlated: whether both were solved on the same panels, so that their errors cancel;
            otherwise the bars of both add up.
        converged: whether all that was asked was reached.
        stopped_by: why it ended; see ``bem.results.outcome``.
        notes: lines for the user.
        seconds: {phase: seconds}.
        version: version of bem that made the comparison.
    """

    before: CapacitanceResult
    after: CapacitanceResult
    change: np.ndarray
    change_error: np.ndarray
    row_sum_change: np.ndarray
    row_sum_change_error: np.ndarray
    tolerance: float
    change_accuracy: float
    correlated: bool
    converged: bool
    stopped_by: str
    notes: tuple[str, ...] = ()
    seconds: dict[str, float] = field(default_factory=dict)
    version: str = ""

    @property
    def conductors(self) -> tuple[str, ...]:
        """Names, in the order of rows and columns."""
        return self.before.conductors

    @property
    def panels(self) -> int:
        """Number of panels of the last round, the larger one where they differ."""
        return max(self.before.panels, self.after.panels)

    @property
    def scale(self) -> np.ndarray:
        """(n, n) F: sqrt(C_ii C_jj) of the first scene."""
        root = np.sqrt(np.abs(np.diagonal(self.before.capacitance)))
        return np.outer(root, root)

    @property
    def relative_change(self) -> np.ndarray:
        """(n, n): change over the value before, NaN where that is zero."""
        before = self.before.capacitance
        return np.divide(self.change, before, out=np.full_like(before, np.nan), where=before != 0)

    def exceeding(self, limit: float) -> list[Excess]:
        """Entries with |change| + bar above ``limit`` sqrt(C_ii C_jj), the largest first.

        Args:
            limit: positive, as a fraction: 0.01 for 1 %.

        Raises:
            UsageError: the limit is not positive and finite.
        """
        if not 0.0 < limit < np.inf:
            raise UsageError(f"limit: found {limit!r}, needs a fraction above 0, such as 0.01")
        size, bar = np.abs(self.change) / self.scale, self.change_error / self.scale
        found = [
            Excess(
                (self.conductors[i], self.conductors[j]),
                float(size[i, j]),
                float(bar[i, j]),
                bool(size[i, j] - bar[i, j] > limit),
            )
            for i, j in zip(*np.triu_indices(len(size)), strict=True)
            if not size[i, j] + bar[i, j] <= limit
        ]
        return sorted(found, key=lambda excess: -excess.change - excess.bar)

    def to_json(self, path: str | PathLike[str]) -> None:
        """Save everything but the panels.

        Args:
            path: file to write; it appears complete or not at all.

        Raises:
            InputError: the file cannot be written.
        """
        from bem.exports.comparison_files import save_json

        save_json(self, path)

    def to_csv(self, path: str | PathLike[str]) -> None:
        """Save entries and row sums before and after and their changes, one line each.

        Raises:
            InputError: the file cannot be written.
        """
        from bem.exports.comparison_files import save_csv

        save_csv(self, path)

    def __str__(self) -> str:
        from bem.exports.comparison_text import report

        return report(self)

    def __repr__(self) -> str:
        reached = "reached" if self.converged else "not reached"
        return (
            f"<Comparison: {len(self.conductors)} conductors, {self.panels} panels, "
            f"accuracy {reached}>"
        )


def in_order(result: CapacitanceResult, names: Sequence[str]) -> CapacitanceResult:
    """The same result with its conductors in the order of ``names``."""
    if tuple(names) == result.conductors:
        return result
    order = [result.conductors.index(name) for name in names]
    grid = np.ix_(order, order)
    place = np.argsort(order)
    inputs = result.inputs
    owner, density = result.panel_conductor, result.density
    return replace(
        result,
        conductors=tuple(names),
        capacitance=result.capacitance[grid],
        error=result.error[grid],
        row_sum=result.row_sum[order],
        row_sum_error=result.row_sum_error[order],
        rounds=tuple(_round_in_order(entry, grid) for entry in result.rounds),
        budget={name: part[grid] for name, part in result.budget.items()},
        inputs=tuple(inputs[k] for k in order) if len(inputs) == len(order) else inputs,
        panel_conductor=None if owner is None else np.where(owner < 0, owner, place[owner]),
        density=None if density is None else density[:, order],
        states=tuple(result.states[k] for k in order) if result.states else (),
        nodes=tuple(result.nodes[k] for k in order) if result.nodes else (),
        lossy=tuple(lossy_in_order(entry, order) for entry in result.lossy),
    )


def _round_in_order(entry: Round, grid: tuple[np.ndarray, ...]) -> Round:
    return replace(entry, capacitance=entry.capacitance[grid], error=entry.error[grid])


def same_result(before: CapacitanceResult, after: CapacitanceResult) -> bool:
    """Whether two results are one and the same, number by number."""
    return all(
        np.array_equal(getattr(before, name), getattr(after, name))
        for name in ("capacitance", "error", "row_sum", "row_sum_error")
    )
