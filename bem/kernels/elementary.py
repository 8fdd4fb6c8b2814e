"""Logarithm and arctangent that the compiler can turn into vector instructions.

The library's log and atan2 are calls, and a loop with a call in it stays scalar. These
are straight-line polynomials (Chebyshev fits, error below 2e-16 before rounding).
"""

from __future__ import annotations

import math

from llvmlite import ir
from numba import types
from numba.extending import intrinsic

from bem.compiled import njit

_SQRT_HALF_BITS = 0x3FE6A09E667F3BCD
_TAN_PI_8 = math.sqrt(2.0) - 1.0
_HALF_PI = 0.5 * math.pi
_QUARTER_PI = 0.25 * math.pi
_LN2 = math.log(2.0)


@intrinsic
def _bits_of(typingctx, x):
    def codegen(context, builder, signature, args):
        return builder.bitcast(args[0], ir.IntType(64))

    return types.int64(types.float64), codegen


@intrinsic
def _from_bits(typingctx, bits):
    def codegen(context, builder, signature, args):
        return builder.bitcast(args[0], ir.DoubleType())

    return types.float64(types.int64), codegen


@njit(inline="always", error_model="numpy")
def log(x: float) -> float:
    """Natural logarithm of a positive, normal number."""
    exponent = (_bits_of(x) - _SQRT_HALF_BITS) >> 52  # type: ignore[call-arg]
    m = _from_bits(_bits_of(x) - (exponent << 52))
    f = (m - 1.0) / (m + 1.0)
    s = f * f
    series = 0.07404855180327638
    series = series * s + 0.07656264074182095
    series = series * s + 0.09091815840114664
    series = series * s + 0.11111098528363024
    series = series * s + 0.1428571438032084
    series = series * s + 0.1999999999965117
    series = series * s + 0.33333333333333826
    return exponent * _LN2 + 2.0 * f * (1.0 + s * series)


@njit(inline="always", error_model="numpy")
def atan2(y: float, x: float) -> float:
    """Angle of (x, y) in (-pi, pi]; zero for (0, 0)."""
    ax = abs(x)
    ay = abs(y)
    low = min(ax, ay)
    high = max(ax, ay)
    big = low > _TAN_PI_8 * high
    num = low - high if big else low
    den = low + high if big else high
    z = num / (den if den > 0.0 else 1.0)
    s = z * z
    series = 0.021135373157693246
    series = series * s - 0.04348052215716462
    series = series * s + 0.056883492268090106
    series = series * s - 0.06640233930429408
    series = series * s + 0.07689953496306857
    series = series * s - 0.09090773074808414
    series = series * s + 0.11111106180455946
    series = series * s - 0.14285714180976467
    series = series * s + 0.1999999999885511
    series = series * s - 0.3333333333332844
    angle = z + z * s * series + (_QUARTER_PI if big else 0.0)
    angle = _HALF_PI - angle if ay > ax else angle
    angle = math.pi - angle if x < 0.0 else angle
    return -angle if y < 0.0 else angle
