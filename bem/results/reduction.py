"""The matrix of the terminals: conductors grounded, floating, or tied, after the solve.

With W_ij the potential of conductor i when terminal j has 1 V and the other terminals 0 V,

    C' = W^T C W

A tied conductor has the potential of its node, a grounded one 0 V, and floating nodes (index f)
those at which they hold no net charge: C_ff V_f = - C_fk V_k (static condensation, Guyan 1965;
for networks Kron 1939). Since floating nodes hold no charge, (C W)_f = 0, and an error D of C,
which also moves their potentials, changes C' by exactly

    W^T D W - (D W)_f^T (C_ff + D_ff)^-1 (D W)_f

so that to first order the change of W drops out. The bar is a bound on both terms for |D| <= E:
the inverse is bounded, entry by entry, by that of the comparison matrix less E_ff (Ostrowski
1937), as long as that is an M-matrix; if not, the floating potentials are not known.

The row sums g of C have bars of their own, which are smaller than the sum of those of the row,
and C w = s g + C (w - s) for every number s: where a column w of W has about one potential on
most conductors, that gives the tighter bound. The best s of a row is a weighted median.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from bem.errors import SolutionError
from bem.geometry.wording import shown
from bem.results.lossy_reduction import Selection, reduced_lossy
from bem.results.result import CapacitanceResult, Reduction, Round
from bem.results.wiring import Wiring
from bem.scene.states import FLOATING, GROUNDED, TERMINAL

SECOND_ORDER = "floating, second order"
"""Part of the bars that stems from the errors of the potentials of floating nodes."""


class Matrix(NamedTuple):
    """A capacitance matrix with bars on its entries and its row sums.

    Args:
        value: (n, n) F.
        bar: (n, n) F.
        row_bar: (n,) F.
    """

    value: np.ndarray
    bar: np.ndarray
    row_bar: np.ndarray


@dataclass(frozen=True)
class Nodes:
    """Which conductors make up each node.

    Args:
        kept: (n, k) 1 where a conductor belongs to a terminal, else 0.
        floating: (n, f) the same for floating nodes.
    """

    kept: np.ndarray
    floating: np.ndarray

    @classmethod
    def of(cls, wiring: Wiring) -> Nodes:
        """Terminals and floating nodes in the order of their first conductors."""
        count = len(wiring.conductors)
        groups = [wiring.nodes_in(state).values() for state in (TERMINAL, FLOATING)]
        return cls(*(_incidence(list(members), count) for members in groups))

    def weights(self, value: np.ndarray) -> np.ndarray:
        """(n, k) W of the matrix ``value`` (n, n); NaN where floating nodes have no solution."""
        inner = self.floating.T @ value @ self.floating
        drive = self.floating.T @ value @ self.kept
        try:
            return self.kept - self.floating @ np.linalg.solve(inner, drive)
        except np.linalg.LinAlgError:
            return np.full(self.kept.shape, np.nan)


def _incidence(members: list[tuple[int, ...]], count: int) -> np.ndarray:
    table = np.zeros((count, len(members)))
    for column, rows in enumerate(members):
        table[list(rows), column] = 1.0
    return table


class Bars(NamedTuple):
    """Bounds on C' and its row sums, by order in the bars of C.

    Args:
        first: (k, k) F.
        second: (k, k) F, zero if nothing floats.
        row: (k,) F, both orders.
    """

    first: np.ndarray
    second: np.ndarray
    row: np.ndarray


def bars(matrix: Matrix, nodes: Nodes, weights: np.ndarray) -> Bars:
    """Bounds for ``weights`` (n, k), as the module describes them; infinite if there is none."""
    total = weights.sum(axis=1, keepdims=True)
    applied = _applied_bar(matrix, np.hstack([weights, total]))
    first = np.abs(weights).T @ applied
    second = _second_order(matrix, nodes.floating, nodes.floating.T @ applied)
    entries = np.minimum(first[:, :-1], first[:, :-1].T)
    return Bars(entries, second[:, :-1], first[:, -1] + second[:, -1])


def _second_order(matrix: Matrix, floating: np.ndarray, moved: np.ndarray) -> np.ndarray:
    """(k, k + 1) second-order bound from that on the charges (f, k + 1) of floating nodes."""
    inverse = _inverse_bound(matrix, floating)
    if inverse is None:
        return np.full((moved.shape[1] - 1, moved.shape[1]), np.inf)
    return np.asarray(moved[:, :-1].T @ inverse @ moved)


def _applied_bar(matrix: Matrix, weights: np.ndarray) -> np.ndarray:
    """(n, m) bound on the error of C w for each column w of ``weights`` (n, m)."""
    return np.column_stack([_column_bar(matrix, column) for column in weights.T])


def _column_bar(matrix: Matrix, column: np.ndarray) -> np.ndarray:
    """(n,) smallest over s of row_bar |s| + bar |w - s|; one conductor keeps its own bars."""
    if np.count_nonzero(column) == 1:
        return matrix.bar @ np.abs(column)
    points = np.append(column, 0.0)
    sizes = np.column_stack([matrix.bar, matrix.row_bar])
    order = np.argsort(points)
    held = np.cumsum(sizes[:, order], axis=1)
    middle = np.argmax(held >= 0.5 * held[:, -1:], axis=1)
    distance = np.abs(points - points[order][middle, None])
    return np.einsum("ij,ij->i", sizes, distance)


def _inverse_bound(matrix: Matrix, floating: np.ndarray) -> np.ndarray | None:
    """(f, f) bound on the entries of the inverse of C_ff, or None if there is none."""
    inner = floating.T @ matrix.value @ floating
    diagonal = np.diag(np.diagonal(inner))
    comparison = diagonal - np.abs(inner - diagonal) - floating.T @ matrix.bar @ floating
    try:
        inverse = np.linalg.inv(comparison)
    except np.linalg.LinAlgError:
        return None
    return inverse if (inverse >= 0.0).all() else None


def reduced(result: CapacitanceResult, wiring: Wiring) -> CapacitanceResult:
    """Return the result of the terminals of ``wiring``.

    Raises:
        SolutionError: the potential of a floating node is not known within the bars.
    """
    if wiring.plain:
        return replace(result, states=(), nodes=()) if result.states or result.nodes else result
    nodes = Nodes.of(wiring)
    full = Matrix(result.capacitance, result.error, result.row_sum_error)
    weights = nodes.weights(full.value)
    found = bars(full, nodes, weights)
    _check_floating(full, wiring, found)
    terminals = wiring.nodes_in(TERMINAL)
    small = replace(
        result,
        conductors=tuple(terminals),
        capacitance=_symmetric(weights.T @ full.value @ weights),
        error=found.first + found.second,
        row_sum=_row_sum(result, weights),
        row_sum_error=found.row,
        pairs=_pairs(result, wiring),
        budget=_budget(result, weights, found),
        states=(),
        nodes=(),
        reduction=_record(result, wiring),
        panel_conductor=_owners(result, wiring),
        density=None if result.density is None else result.density @ weights,
        lossy=tuple(reduced_lossy(e, Selection(nodes.kept, nodes.floating)) for e in result.lossy),
    )
    *earlier, last = result.rounds
    rounds = [_round(entry, entry.error.sum(axis=1), nodes, small) for entry in earlier]
    return replace(small, rounds=(*rounds, _round(last, full.row_bar, nodes, small)))


def presented(result: CapacitanceResult) -> CapacitanceResult:
    """Return the terminals to print, or, where they cannot be known, all conductors and why."""
    try:
        return result.terminals
    except SolutionError as problem:
        warnings = (*result.warnings, f"this is the full matrix; {problem}")
        return replace(result, states=(), nodes=(), warnings=warnings)


def _symmetric(value: np.ndarray) -> np.ndarray:
    return 0.5 * (value + value.T)


def _row_sum(result: CapacitanceResult, weights: np.ndarray) -> np.ndarray:
    """C' 1 by way of the row sums, which lose no digits where they are small."""
    return weights.T @ (result.row_sum + result.capacitance @ (weights.sum(axis=1) - 1.0))


def _check_floating(full: Matrix, wiring: Wiring, found: Bars) -> None:
    if not np.isfinite(full.bar).all() or np.isfinite(found.second).all():
        return
    labels = list(wiring.nodes_in(FLOATING))
    inner = Nodes.of(wiring).floating
    ratio = np.diagonal(inner.T @ full.bar @ inner) / np.diagonal(inner.T @ full.value @ inner)
    label = labels[int(np.argmax(ratio))]
    raise SolutionError(
        f"floating: the potential of {shown(label)} is not known within the bars of the matrix; "
        "extract again to a smaller tolerance, or leave it a terminal"
    )


def _pairs(result: CapacitanceResult, wiring: Wiring) -> dict[tuple[str, str], float]:
    """Pairs asked for whose two conductors are terminals by themselves."""
    alone = {
        wiring.conductors[members[0]]: label
        for label, members in wiring.nodes_in(TERMINAL).items()
        if len(members) == 1
    }
    return {
        (alone[a], alone[b]): accuracy
        for (a, b), accuracy in result.pairs.items()
        if a in alone and b in alone
    }


def _budget(result: CapacitanceResult, weights: np.ndarray, found: Bars) -> dict[str, np.ndarray]:
    """Parts of the reduced bars: each in proportion to what it alone would give."""
    size = np.abs(weights)
    plain = size.T @ result.error @ size
    share = np.divide(found.first, plain, out=np.zeros_like(plain), where=plain > 0.0)
    parts = {name: share * (size.T @ part @ size) for name, part in result.budget.items()}
    if parts and found.second.any():
        parts[SECOND_ORDER] = parts.get(SECOND_ORDER, 0.0) + found.second
    return parts


def _record(result: CapacitanceResult, wiring: Wiring) -> Reduction:
    """Name what was done, by the conductors of the full matrix."""
    before = result.reduction
    origin: Mapping[str, tuple[str, ...]] = before.terminals if before else {}

    def named(members: tuple[int, ...]) -> tuple[str, ...]:
        found = [result.conductors[k] for k in members]
        return tuple(name for one in found for name in origin.get(one, (one,)))

    grounded = [name for m in wiring.nodes_in(GROUNDED).values() for name in named(m)]
    floating = [named(m) for m in wiring.nodes_in(FLOATING).values()]
    return Reduction(
        terminals={label: named(m) for label, m in wiring.nodes_in(TERMINAL).items()},
        grounded=(*(before.grounded if before else ()), *grounded),
        floating=(*(before.floating if before else ()), *floating),
    )


def _owners(result: CapacitanceResult, wiring: Wiring) -> np.ndarray | None:
    """(p,) terminal that owns each panel, -1 for grounded and floating ones."""
    if result.panel_conductor is None:
        return None
    owner = np.full(len(wiring.conductors) + 1, -1)  # the last entry serves panels without one
    for terminal, members in enumerate(wiring.nodes_in(TERMINAL).values()):
        owner[list(members)] = terminal
    return owner[result.panel_conductor]


def _round(entry: Round, row_bar: np.ndarray, nodes: Nodes, small: CapacitanceResult) -> Round:
    """Reduce a round by its own matrix; its bars are infinite where floating ones are unknown."""
    weights = nodes.weights(entry.capacitance)
    found = bars(Matrix(entry.capacitance, entry.error, row_bar), nodes, weights)
    value = weights.T @ entry.capacitance @ weights
    there = replace(small, capacitance=value, error=found.first + found.second)
    worst = float(there.used.max())
    return replace(entry, capacitance=value, error=there.error, worst=worst)
