"""Value and bar from made-up rounds whose limit is known; marking from made-up promises."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bem.extraction import estimate as module
from bem.extraction.estimate import Estimate, estimate, facet_doubt
from bem.extraction.marking import Goal, mark
from bem.extraction.solution import Sums

LIMIT = np.array([[2.0, -0.5], [-0.5, 1.5]])


def with_rows(square: np.ndarray) -> np.ndarray:
    return np.column_stack([square, square.sum(axis=1)])


def rounds_of(kappa: float, count: int = 6, rate: float = 0.5) -> list[Sums]:
    """Make rounds whose value misses the limit by exactly kappa times the signed indicator."""
    shape = np.array([[0.2, -0.06], [-0.06, 0.1]])
    made = []
    for k in range(count):
        signed = rate**k * shape
        value = LIMIT - kappa * signed
        zero = np.zeros((2, 3))
        fields = {
            "panels": 10 * 2**k,
            "value": with_rows(value),
            "signed": with_rows(signed),
            "absolute": with_rows(np.abs(signed)),
        }
        rest = {name: zero for name in Sums.__dataclass_fields__ if name not in fields}
        made.append(Sums(**fields, **rest))
    return made


def misses(found: Estimate) -> np.ndarray:
    return np.abs(found.value - with_rows(LIMIT))


@pytest.mark.parametrize("kappa", [0.8, 1.05, 1.5])
def test_extrapolation_gains_on_the_raw_value(kappa: float) -> None:
    """With an indicator that tells the error up to a factor, most of the error goes."""
    made = rounds_of(kappa)
    found = estimate(made)
    raw = np.abs(made[-1].value - with_rows(LIMIT))
    assert np.all(misses(found) <= 0.5 * raw)
    assert module.KAPPA_LOW <= found.kappa <= module.KAPPA_HIGH


def test_usual_slope_gives_the_limit() -> None:
    found = estimate(rounds_of(module.KAPPA_USUAL))
    assert found.kappa == pytest.approx(module.KAPPA_USUAL, rel=1e-6)
    assert misses(found).max() < 1e-9


@pytest.mark.parametrize("kappa", [0.7, 1.0, 1.3, 1.8])
@pytest.mark.parametrize("rate", [0.3, 0.6])
def test_bar_holds_the_error(kappa: float, rate: float) -> None:
    found = estimate(rounds_of(kappa, rate=rate))
    assert np.all(misses(found) <= found.bar)


@pytest.mark.parametrize("kappa", [-5.0, 50.0])
def test_slope_is_clamped(kappa: float) -> None:
    found = estimate(rounds_of(kappa))
    assert module.KAPPA_LOW <= found.kappa <= module.KAPPA_HIGH
    assert np.all(found.bar > 0.0)


@pytest.mark.parametrize("count", [1, 2, 3])
def test_few_rounds_give_wide_bars(count: int) -> None:
    """A first round knows no trend: its bar takes more than the whole indicator."""
    found = estimate(rounds_of(1.0, count))
    assert np.isfinite(found.value).all()
    assert np.all(misses(found) <= found.bar)
    absolute = rounds_of(1.0, count)[-1].absolute
    assert np.all(found.bar > absolute * (1.5 if count == 1 else 1.0))


def test_bar_is_the_sum_of_its_parts() -> None:
    found = estimate(rounds_of(1.2))
    assert found.bar == pytest.approx(sum(found.parts.values()))
    assert all(np.all(part >= 0.0) for part in found.parts.values())


def test_each_source_of_doubt_widens_the_bar() -> None:
    """Doubling a round's indicator, quadrature, or faceting never narrows a bar."""
    made = rounds_of(1.05)
    plain = estimate(made)
    for name in ("absolute", "quadrature", "faceting"):
        more = np.abs(getattr(made[-1], name)) + 1e-3
        doubted = estimate([*made[:-1], replace(made[-1], **{name: more})])
        assert np.all(doubted.bar > plain.bar), name


def test_parts_follow_their_formulas() -> None:
    """Discretisation: a share of the absolute indicator; trend: of the last change of value."""
    found = estimate(rounds_of(module.KAPPA_USUAL))
    last = rounds_of(module.KAPPA_USUAL)[-1]
    ratio = found.parts["discretisation"] / (module.SHARE * last.absolute)
    assert np.all(ratio > 0.999) and np.all(ratio < 1.001 * module.WIDEST)
    assert np.diagonal(ratio) == pytest.approx(1.0, rel=1e-3)
    moved = rounds_of(module.KAPPA_USUAL)
    moved[-1] = replace(moved[-1], value=moved[-1].value + 0.01)
    assert np.all(estimate(moved).parts["trend"] >= 0.9 * module.TREND * 0.01)


def test_faceting_shifts_the_value_and_is_doubted_by_its_root() -> None:
    made = rounds_of(module.KAPPA_USUAL)
    shift = with_rows(np.array([[0.02, -0.01], [-0.01, 0.015]]))
    curved = [replace(r, faceting=shift) for r in made]
    change = estimate(curved).value - estimate(made).value
    assert change == pytest.approx(shift, rel=1e-6)
    small, large = (facet_doubt(k * shift, with_rows(LIMIT)) for k in (1.0, 4.0))
    assert large == pytest.approx(2.0 * small)
    assert facet_doubt(1e6 * shift, with_rows(LIMIT)) == 1.0


def test_goal_compares_bars_with_what_is_allowed() -> None:
    bar = with_rows(np.array([[0.02, 0.01], [0.01, 0.03]]))
    found = Estimate(with_rows(LIMIT), bar, {}, 1.0, 0.0)
    size = np.sqrt(np.diag(LIMIT))
    plain = Goal(0.01).worst(found)
    assert plain == pytest.approx(bar[:, :2] / (0.01 * np.outer(size, size)))
    asked = Goal(0.01, ((0, 1, 0.004),)).worst(found)
    assert asked[0, 1] == asked[1, 0] == pytest.approx(0.01 / (0.004 * 0.5))
    assert np.diag(asked) == pytest.approx(np.diag(plain))
    lenient = Goal(0.01, ((1, 0, 0.9),)).worst(found)
    assert lenient == pytest.approx(plain)


@given(
    st.lists(st.tuples(st.floats(0, 1), st.floats(0, 1)), min_size=1, max_size=40),
    st.floats(0.1, 0.95),
    st.integers(1, 50),
)
@settings(max_examples=60, deadline=None, derandomize=True)
def test_marking_takes_the_fewest_panels_that_hold_the_bulk(
    pairs: list[tuple[float, float]], bulk: float, room: int
) -> None:
    promise = np.array(pairs).T + 1e-9
    marked, across = mark(promise, bulk, room)
    total = promise.sum(axis=0)
    assert 1 <= marked.sum() <= room
    assert np.array_equal(across, (promise[1] > promise[0]).astype(int))
    if not marked.all():
        assert total[marked].min() >= total[~marked].max()
    if marked.sum() < room:
        assert total[marked].sum() >= bulk * total.sum() * (1.0 - 1e-9)
        assert total[marked].sum() - total[marked].min() <= bulk * total.sum() * (1.0 + 1e-9)


@pytest.mark.parametrize(
    ("strength", "factor"), [(0.5, 1.0), (0.03, 1.0), (0.015, 1.75), (0.0, 2.5)]
)
def test_weak_couplings_get_wider_bars(strength: float, factor: float) -> None:
    """What leaks through a shield does not follow the common slope; diagonals are as they were."""
    value = np.array([[4.0, -6.0 * strength, 4.0], [-6.0 * strength, 9.0, 9.0]])
    wide = module.widening(value)
    assert wide[0, 1] == wide[1, 0] == pytest.approx(factor)
    assert np.all(np.diagonal(wide) == 1.0)


def test_row_sum_of_a_lone_body_has_the_bar_of_its_diagonal() -> None:
    """And one that a shield brings down to nothing has a wider one."""
    assert module.widening(np.array([[4.0, 4.0]]))[0, 1] == 1.0
    assert module.widening(np.array([[4.0, -4.0, 0.0], [-4.0, 9.0, 5.0]]))[0, 2] == module.WIDEST
