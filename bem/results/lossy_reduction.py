"""Grounded, floating and tied conductors at a frequency, where the matrix is complex.

With Y = C - j G / w the condensation is that of the real matrix (Kron 1939), W transposed without
conjugation. Bars are moduli: |W|^T E |W| to first order; where nodes float, the bound on the
charges they should not have, through the inverse of their own matrix, to second.
"""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np

from bem.errors import SolutionError
from bem.results.lossy import Lossy


class Selection(NamedTuple):
    """Incidence of conductors (n) on terminals (n, k) and on floating nodes (n, f)."""

    kept: np.ndarray
    floating: np.ndarray


def reduced_lossy(entry: Lossy, nodes: Selection) -> Lossy:
    """C and G of the terminals at one frequency.

    Raises:
        SolutionError: floating nodes have no solution there.
    """
    omega = 2.0 * np.pi * entry.frequency
    value = entry.capacitance - 1j * entry.conductance / omega
    weights = _weights(value, nodes, entry.frequency)
    found = weights.T @ value @ weights
    bars = [
        np.abs(weights).T @ bar @ np.abs(weights)
        for bar in (entry.error, entry.conductance_error / omega)
    ]
    if nodes.floating.shape[1]:
        both = sum(bars) + _second_order(
            entry.error + entry.conductance_error / omega, value, nodes, weights
        )
        bars = [both, both]
    capacitance, conductance = found.real, -omega * found.imag
    return replace(
        entry,
        capacitance=_symmetric(capacitance),
        error=_symmetric(bars[0]),
        conductance=_symmetric(conductance),
        conductance_error=omega * _symmetric(bars[1]),
        row_sum=capacitance.sum(axis=1),
        row_sum_error=_row_bar(bars[0], entry.row_sum_error, nodes),
        row_conductance=conductance.sum(axis=1),
        row_conductance_error=_row_bar(omega * bars[1], entry.row_conductance_error, nodes),
    )


def _weights(value: np.ndarray, nodes: Selection, frequency: float) -> np.ndarray:
    """(n, k) complex potentials of all conductors for 1 V on each terminal."""
    inner = nodes.floating.T @ value @ nodes.floating
    drive = nodes.floating.T @ value @ nodes.kept
    try:
        return np.asarray(nodes.kept - nodes.floating @ np.linalg.solve(inner, drive))
    except np.linalg.LinAlgError:
        raise SolutionError(
            f"the potential of floating conductors is not known at {frequency:g} Hz; "
            "ask for a smaller tolerance"
        ) from None


def _second_order(
    bar: np.ndarray, value: np.ndarray, nodes: Selection, weights: np.ndarray
) -> np.ndarray:
    moved = nodes.floating.T @ bar @ np.abs(weights)
    inverse = np.abs(np.linalg.inv(nodes.floating.T @ value @ nodes.floating))
    return np.asarray(moved.T @ inverse @ moved)


def _row_bar(bar: np.ndarray, own: np.ndarray, nodes: Selection) -> np.ndarray:
    """Bars of row sums; those that were found stay where conductors are only tied."""
    summed = bar.sum(axis=1)
    if nodes.kept.sum() < len(nodes.kept):
        return np.asarray(summed)
    return np.minimum(summed, nodes.kept.T @ own)


def _symmetric(value: np.ndarray) -> np.ndarray:
    return np.asarray(0.5 * (value + value.T))


def lossy_in_order(entry: Lossy, order: list[int]) -> Lossy:
    """The same with conductors in another order."""
    grid = np.ix_(order, order)
    return replace(
        entry,
        capacitance=entry.capacitance[grid],
        error=entry.error[grid],
        conductance=entry.conductance[grid],
        conductance_error=entry.conductance_error[grid],
        row_sum=entry.row_sum[order],
        row_sum_error=entry.row_sum_error[order],
        row_conductance=entry.row_conductance[order],
        row_conductance_error=entry.row_conductance_error[order],
    )
