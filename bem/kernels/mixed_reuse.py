"""Entries of the mixed matrices that an earlier mesh has given already."""

from __future__ import annotations

import numpy as np

from bem.compiled import njit
from bem.kernels.mixed_arrays import LINEAR, QUADRATIC, TESTS, MixedMatrices
from bem.kernels.parallel import sum_over_rows


@njit(cache=True, nogil=True, error_model="numpy")
def copy_block(
    first: int, last: int, rows: np.ndarray, columns: np.ndarray, old: np.ndarray, new: np.ndarray
) -> int:
    """Copy rows first to last (excluded) of ``new`` from ``old``; -1 marks what it lacks."""
    copied = 0
    for i in range(first, last):
        if rows[i] < 0:
            continue
        copied += 1
        for j in range(columns.size):
            if columns[j] >= 0:
                new[i, j] = old[rows[i], columns[j]]
    return copied


def _numbers(origin: np.ndarray, each: int) -> np.ndarray:
    """Old numbers of ``each`` consecutive functions of panels with old numbers ``origin``."""
    several = each * origin[:, None] + np.arange(each)
    return np.where(origin[:, None] >= 0, several, -1).ravel()


def _behind(numbers: np.ndarray, start: int) -> np.ndarray:
    return np.where(numbers >= 0, numbers + start, -1)


def take_over(origin: np.ndarray, old: MixedMatrices, new: MixedMatrices) -> None:
    """Copy to ``new`` all pairs of panels with origin (n,) >= 0 in the mesh of ``old``."""
    metal, before = new.single.shape[1], old.single.shape[1]
    conductors = origin[:metal]
    interfaces = np.where(origin[metal:] >= 0, origin[metal:] - before, -1)
    linear, quadratic = _numbers(interfaces, LINEAR), _numbers(interfaces, QUADRATIC)
    seen = _numbers(conductors, TESTS)
    unknowns = np.concatenate([conductors, _behind(linear, before)])
    tests = np.concatenate([seen, _behind(quadratic, TESTS * before)])
    maps = [
        (unknowns, conductors),
        (unknowns, unknowns),
        (tests, conductors),
        (tests, unknowns),
        (seen, linear),
        (unknowns, quadratic),
    ]
    for (rows, columns), source, target in zip(maps, old, new, strict=True):
        _copy(rows, columns, source, target)


def _copy(rows: np.ndarray, columns: np.ndarray, old: np.ndarray, new: np.ndarray) -> None:
    def block(first: int, last: int) -> int:
        return int(copy_block(first, last, rows, columns, old, new))

    sum_over_rows(len(rows), block)
