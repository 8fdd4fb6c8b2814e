"""Digits: two for the bar, rounded up; the value to the same decimal."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from bem.exports.digits import reading

PICO = -12


def shown(value: float, bar: float, power: int = PICO) -> str:
    return reading(value, bar, power).joined("±")


@pytest.mark.parametrize(
    ("value", "bar", "expected"),
    [
        (12.3456789e-12, 1.2e-15, "12.3457 ± 0.0012"),
        (12.3456789e-12, 1.21e-15, "12.3457 ± 0.0013"),
        (12.3456789e-12, 9.91e-15, "12.346 ± 0.010"),
        (12.3456789e-12, 1e-15, "12.3457 ± 0.0010"),
        (12.3456789e-12, 0.3e-12, "12.35 ± 0.30"),
        (12.3456789e-12, 4e-12, "12.3 ± 4.0"),
        (12.3456789e-12, 40e-12, "12 ± 40"),
        (45678e-12, 1234e-12, "45700 ± 1300"),
        (-4.1e-12, 2e-15, "-4.1000 ± 0.0020"),
        (-1e-18, 2e-15, "0.0000 ± 0.0020"),
        (0.0, 2e-15, "0.0000 ± 0.0020"),
        (1.23456e-18, 1.2e-21, "(1.2346 ± 0.0012)e-6"),
        (1.23456e-18, 1.2e-19, "0.00000123 ± 0.00000012"),
        (1.23456e-18, 1.2e-23, "(1.234560 ± 0.000012)e-6"),
        (0.0, 1.2e-25, "(0.0 ± 1.2)e-13"),
        (3.21e-3, 4.5e-4, "(3.21 ± 0.45)e9"),
        (1.5e-12, 0.0, "1.5 ± 0"),
        (0.0, 0.0, "0 ± 0"),
        (1.23456e-12, math.inf, "1.235 ± ?"),
        (1.23456e-12, math.nan, "1.235 ± ?"),
        (math.nan, 1e-15, "? ± 0.001"),
    ],
)
def test_examples(value: float, bar: float, expected: str) -> None:
    assert shown(value, bar) == expected


def test_unit_changes_the_point_and_nothing_else() -> None:
    assert shown(1.23456e-12, 1.2e-15, -15) == "1234.6 ± 1.2"
    assert shown(1.23456e-12, 1.2e-15, -9) == "0.0012346 ± 0.0000012"


sizes = st.floats(min_value=1e-25, max_value=1e-3)


@given(value=sizes, bar=sizes, sign=st.sampled_from([1.0, -1.0]))
def test_the_bar_never_shrinks_and_the_value_moves_by_less_than_half_its_last_digit(
    value: float, bar: float, sign: float
) -> None:
    left, _, right = shown(sign * value, bar).partition(" ± ")
    scale, exponent = 1e-12, 0
    if left.startswith("("):
        left, (right, exponent) = left[1:], _split(right)
    scale *= 10.0**exponent
    if bar <= 1e-14 * value:
        return
    digits = [digit for digit in right if digit.isdigit()]
    assert int("".join(digits)) != 0
    assert bar * (1 - 1e-8) <= float(right) * scale <= bar * 1.1 + 1e-300
    assert abs(float(left) * scale - sign * value) <= 0.051 * float(right) * scale


def _split(right: str) -> tuple[str, int]:
    mantissa, _, exponent = right.partition(")e")
    return mantissa, int(exponent)
