"""How a value and its bar are written: no digit that the bar makes meaningless.

The bar gets two significant digits, rounded up so that it still bounds; the value ends at
the same decimal. Rounding is done on decimal digits, so that 1.2e-15 F is 0.0012 pF.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_CEILING, Context, Decimal

_WIDE = Context(prec=60)
_FINEST_STEP, _COARSEST_STEP = -8, 6
_NEGLIGIBLE = 1e-14
UNKNOWN = "?"


@dataclass(frozen=True)
class Reading:
    """A value and its bar as text, to be joined by a plus-minus sign; bar "" for none."""

    value: str
    bar: str = ""

    def joined(self, sign: str) -> str:
        """Return the two as one text."""
        return f"{self.value} {sign} {self.bar}" if self.bar else self.value


def reading(value: float, bar: float, power: int) -> Reading:
    """``value`` and ``bar`` as multiples of 10**power of their unit.

    Very fine or coarse digits take the form (1.2345 +- 0.0012)e-9. A bar that is not finite
    is shown as a question mark beside four digits of the value.
    """
    value, bar = float(value), float(bar)
    if not (math.isfinite(value) and math.isfinite(bar)):
        return Reading(_plain(value, power, 4), _plain(bar, power, 2))
    if bar <= _NEGLIGIBLE * abs(value):
        return Reading(_plain(value, power, 12), _plain(bar, power, 2))
    return _rounded(_scaled(value, power), _two_digits_up(_scaled(abs(bar), power)))


def _rounded(value: Decimal, bar: Decimal) -> Reading:
    step = Decimal((0, (1,), _step_of(bar)))
    value = value.quantize(step, context=_WIDE)
    if _FINEST_STEP <= _step_of(bar) <= _COARSEST_STEP:
        return Reading(_text(value), _text(bar))
    top = max(value.adjusted() if value else bar.adjusted(), bar.adjusted())
    return Reading(f"({_text(_shifted(value, top))}", f"{_text(_shifted(bar, top))})e{top}")


def _step_of(number: Decimal) -> int:
    return int(number.as_tuple().exponent)


def _scaled(value: float, power: int) -> Decimal:
    return _shifted(Decimal(repr(value)), power)


def _shifted(number: Decimal, power: int) -> Decimal:
    return number.scaleb(-power, context=_WIDE)


def _two_digits_up(bar: Decimal) -> Decimal:
    # nine digits first: the noise of float arithmetic is not a reason to round up
    bar = Context(prec=9).plus(bar)
    return _padded(Context(prec=2, rounding=ROUND_CEILING).plus(bar))


def _padded(bar: Decimal) -> Decimal:
    """Return the same number with exactly two significant digits: 0.001 becomes 0.0010."""
    return bar.quantize(Decimal((0, (1,), bar.adjusted() - 1)), context=_WIDE)


def _plain(value: float, power: int, digits: int) -> str:
    if not math.isfinite(value):
        return UNKNOWN
    return f"{float(_scaled(value, power)):.{digits}g}"


def _text(number: Decimal) -> str:
    return f"{number if number else abs(number):f}"  # no minus sign before zero
