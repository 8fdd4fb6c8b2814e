"""Where the matrices keep the integrals of one target with one source or a block of sources.

The lanes of a block lie in one row of each matrix, which is written lane by lane: a value costs
little more than its store.
"""

from __future__ import annotations

from bem.compiled import njit
from bem.kernels.mixed_arrays import LINEAR, QUADRATIC, TESTS


@njit(inline="always")
def _spread(array, row, first, offset, values, source, slots, factor):
    """Put one row of values, each lane at its column; the original starts the sum over images."""
    for k in range(slots.size):
        if slots[k] >= 0:
            if first:
                array[row, slots[k] + offset] = factor[k] * values[source, k]
            else:
                array[row, slots[k] + offset] += factor[k] * values[source, k]


@njit(cache=True, error_model="numpy")
def _from_conductors(rows, first, slots, factors, single, double, new):
    row, test, own, tests = rows
    v, w = factors
    for t in range(own):
        _spread(new.single, row + t, first, 0, single, 3 * t, slots, v)
        _spread(new.double, row + t, first, 0, double, 6 * t, slots, w)
    for t in range(tests):
        _spread(new.single_tests, test + t, first, 0, single, 3 * (own + t), slots, v)
        _spread(new.double_tests, test + t, first, 0, double, 6 * (own + t), slots, w)


@njit(cache=True, error_model="numpy")
def _from_interfaces(rows, metal, first, slots, factors, single, double, new):
    row, test, own, tests = rows
    v, w = factors
    for b in range(LINEAR):
        at = metal + b
        for t in range(own):
            _spread(new.double, row + t, first, at, double, 6 * t + b, slots, w)
            _spread(new.quadratic, row + t, first, b, double, 6 * t + LINEAR + b, slots, w)
        for t in range(tests):
            _spread(new.double_tests, test + t, first, at, double, 6 * (own + t) + b, slots, w)
        for t in range(tests if own == 1 else 0):
            _spread(new.linear, test + t, first, b, single, 3 * (own + t) + b, slots, v)


@njit(inline="always")
def _rows(i, metal):
    """First number of target i among unknowns and tests, and how many it has of them."""
    if i < metal:
        return i, TESTS * i, 1, TESTS
    k = i - metal
    return metal + LINEAR * k, TESTS * metal + QUADRATIC * k, LINEAR, QUADRATIC


@njit(cache=True, error_model="numpy")
def put(i, conductors, metal, first, slots, factors, single, double, new):
    """Store what the matrices keep of target i with the sources of some lanes.

    Args:
        i: target.
        conductors: whether the sources are conductors.
        metal: number of conductors.
        first: whether these are the panels themselves, not images, whose values are added.
        slots: (k,) ``slot`` of the source in each lane, or -1 if the lane is not stored.
        factors: (k,) of V and (k,) of K.
        single: (18, k), row 3 t + b is test t against V of function b.
        double: (36, k), row 6 t + b is test t against K of function b.
        new: the matrices.
    """
    rows = _rows(i, metal)
    if conductors:
        _from_conductors(rows, first, slots, factors, single, double, new)
    else:
        _from_interfaces(rows, metal, first, slots, factors, single, double, new)


@njit(inline="always")
def slot(j, metal):
    """First column of source j among its kind."""
    return j if j < metal else LINEAR * (j - metal)
