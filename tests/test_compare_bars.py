"""The bar of a change: what is common drops out, and nothing else does."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from bem.extraction import change as module
from bem.extraction.change import ChangeSums, estimate_change
from bem.extraction.estimate import FILES, Estimate

SIZE = np.array([[1.0, -0.4, 0.6], [-0.4, 4.0, 3.6]])
ZERO = np.zeros((2, 3))


def before(doubt: float = 0.1, facets: float = 0.0) -> Estimate:
    """Estimate of a first scene with a slope of 1.2."""
    return Estimate(SIZE, 1e-3 * np.abs(SIZE), {}, 1.2, facets, doubt)


def of_round(value: float = 1e-3, absolute: float = 1e-5, **changes: np.ndarray) -> ChangeSums:
    """Sums of a round with one number in every entry."""
    one = np.ones((2, 3))
    sums = ChangeSums(value * one, ZERO, absolute * one, ZERO, ZERO, ZERO, ZERO)
    return replace(sums, **changes)


def floor(largest: float) -> np.ndarray:
    """What every bar holds for rounding, written out."""
    root = np.array([1.0, 2.0])
    scale = np.column_stack([np.outer(root, root), root * np.sqrt(4.2)])
    return (module.FLOOR + module.RELATIVE_FLOOR * largest) * scale


def test_value_is_the_change_extrapolated_and_corrected_for_facets() -> None:
    signed, faceting = np.full((2, 3), 5e-6), np.full((2, 3), 3e-6)
    found = estimate_change([of_round(signed=signed, faceting=faceting)], before())
    assert found.value == pytest.approx(np.full((2, 3), 1e-3 + 1.2 * 5e-6 + 3e-6), abs=0.0)


def test_bar_is_the_sum_of_its_parts() -> None:
    rest = {
        "quadrature": np.full((2, 3), 2e-7),
        "rounding": np.full((2, 3), 4e-7),
        "files": np.full((2, 3), 3e-7),
        "faceting": np.full((2, 3), -6e-6),
    }
    rounds = [of_round(1e-3 + drift) for drift in (9.0, 2e-6, 1e-6)]
    found = estimate_change([*rounds, of_round(**rest)], before(0.1, 0.5))
    drift = np.abs(2e-6 - -6e-6)
    share = module.SHARE + 0.1 * module.DOUBT
    expected = share * 1e-5 + module.TREND * drift + 0.5 * 6e-6 + 2e-7 + 4e-7 + FILES * 3e-7
    assert found.bar == pytest.approx(expected + floor(1e-3 - 6e-6), rel=1e-9, abs=0.0)
    assert found.bar == pytest.approx(sum(found.parts.values()), abs=0.0)


def test_few_rounds_are_not_believed() -> None:
    """Before a trend shows, the whole change of the indicator stands for it."""
    early = estimate_change([of_round()] * 3, before())
    late = estimate_change([of_round()] * 4, before())
    assert early.bar - late.bar == pytest.approx(np.full((2, 3), 1e-5), rel=1e-9, abs=0.0)


def test_weak_entries_get_wider_bars() -> None:
    weak = SIZE.copy()
    weak[0, 1] = weak[1, 0] = -1e-3
    estimated = replace(before(), value=weak)
    wide = estimate_change([of_round()] * 4, estimated).parts["discretisation"]
    plain = estimate_change([of_round()] * 4, before()).parts["discretisation"]
    assert wide[0, 1] > 2.0 * plain[0, 1]
    assert wide[0, 0] == plain[0, 0]


def test_equal_scenes_have_no_bar_at_all() -> None:
    found = estimate_change([of_round(0.0, 0.0)] * 5, before())
    assert not found.value.any()
    assert not found.bar.any()


def test_products_of_residuals_are_compared_panel_by_panel() -> None:
    """A plain loop is the twin; changes of opposite sign do not cancel."""
    random = np.random.default_rng(3)
    a, b = random.normal(size=(2, 4, 7, 2))
    found = module.product_changes(a, b)
    expected = np.zeros((2, 3))
    for test in range(4):
        for panel in range(7):
            old, new = a[test, panel], b[test, panel]
            for i in range(2):
                for j in range(2):
                    expected[i, j] += abs(new[i] * new[j] - old[i] * old[j])
                expected[i, 2] += abs(new[i] * new.sum() - old[i] * old.sum())
    assert found == pytest.approx(expected)
    assert not module.product_changes(a, a).any()
