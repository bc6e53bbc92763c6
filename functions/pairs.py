"""Arrays of numbers as sums of two doubles, about nineteen digits where functions are involved.

Enough to say on which side of a level a response is to 1e-18 of its size, at the price of a few
dozen array operations. The second double is some last places of the first at most.
"""

from __future__ import annotations

import math
from decimal import Decimal
from functools import cache
from typing import Any, TypeAlias

import numpy as np

from tausheet.functions.digits import TURN, fall, sine_and_cosine
from tausheet.functions.exact import Array, two_sum

Pair: TypeAlias = tuple[Any, Any]

_STEPS = 64
"""Entries of the tables, per factor of two and per turn."""


_SPLITTER = 134217729.0
"""2^27 + 1, as in `exact`."""


def two_product(a: Any, b: Any) -> Pair:
    """a b and its rounding error as in `exact`, in as few arrays as it takes."""
    product = a * b
    a_high = a * _SPLITTER
    rest = a_high - a
    a_high -= rest
    b_high = b * _SPLITTER
    rest = b_high - b
    b_high -= rest
    a_low, b_low = a - a_high, b - b_high
    error = a_high * b_high
    error -= product
    a_high *= b_low
    error += a_high
    b_high *= a_low
    error += b_high
    a_low *= b_low
    error += a_low
    return product, error


def pair_of(number: Decimal) -> tuple[float, float]:
    """The two doubles next to a number of many digits."""
    high = float(number)
    return high, float(number - Decimal(high))


def quick_sum(a: Any, b: Any) -> Pair:
    """a + b and its rounding error, |a| not below |b|."""
    total = a + b
    return total, b - (total - a)


def add(a: Pair, b: Pair) -> Pair:
    """a + b."""
    total, error = two_sum(a[0], b[0])
    return total, error + (a[1] + b[1])


def less(a: Pair) -> Pair:
    """-a."""
    return -a[0], -a[1]


def times(a: Pair, b: Pair) -> Pair:
    """a b."""
    product, error = two_product(a[0], b[0])
    return product, error + (a[0] * b[1] + a[1] * b[0])


def over(a: Pair, b: Pair) -> Pair:
    """a / b."""
    first = a[0] / b[0]
    product, error = two_product(first, b[0])
    return first, (((a[0] - product) - error) + (a[1] - first * b[1])) / b[0]


_TURN = pair_of(TURN)
_LN2 = Decimal(
    "0.693147180559945309417232121458176568075500134360255254120680009493393621969694716"
)


@cache
def _powers() -> tuple[Array, Array, float, float, float]:
    """2^(-j/64) as pairs, and ln 2 / 64 in three parts, the first two of few bits."""
    rows = [pair_of(fall(_LN2 * j / _STEPS)) for j in range(_STEPS)]
    high, low = np.array(rows).T
    part = _LN2 / _STEPS
    first = math.ldexp(round(float(part) * 2**36), -36)
    second = math.ldexp(round(float(part - Decimal(first)) * 2**66), -66)
    return high, low, first, second, float(part - Decimal(first) - Decimal(second))


def exponential_fall(u: Pair) -> Pair:
    """exp(-u) for u >= 0, to 1e-18 of itself."""
    high, low, first, second, third = _powers()
    u0 = np.minimum(u[0], 744.0)
    n = np.rint(u0 * (1 / first))
    r0, r1 = two_sum(u0 - n * first, -(n * second))
    r1 = r1 + (u[1] - n * third)
    square = r0 * r0
    rest = square * (0.5 - r0 * (1 / 6 - r0 * (1 / 24 - r0 * (1 / 120 - r0 * (1 / 720)))))
    whole = n.astype(np.int64)
    j = whole & (_STEPS - 1)
    base = high[j]
    result = quick_sum(base, base * ((rest - r1 * (1 - r0)) - r0) + low[j])
    scale = -(whole >> 6)
    return np.ldexp(result[0], scale), np.ldexp(result[1], scale)


@cache
def _circle() -> tuple[Array, Array, Array, Array]:
    """Sine and cosine of j/64 turns as pairs."""
    rows = []
    for j in range(_STEPS):
        sine, cosine = sine_and_cosine(Decimal(j) / _STEPS)
        rows.append((*pair_of(sine), *pair_of(cosine)))
    columns = np.array(rows).T
    return columns[0], columns[1], columns[2], columns[3]


def turned(frequency: Any, s: Pair, phase: Pair) -> Pair:
    """frequency s + phase in turns, less the nearest whole number."""
    product, error = two_product(frequency, s[0])
    total = two_sum(product - np.rint(product), error + frequency * s[1])
    total = add(total, phase)
    return quick_sum(total[0] - np.rint(total[0]), total[1])


def sine_cosine(turns: Pair) -> tuple[Pair, Pair]:
    """Sine and cosine of an angle in turns (-1 to 1), to 1e-17."""
    sine_high, sine_low, cosine_high, cosine_low = _circle()
    n = np.rint(turns[0] * _STEPS)
    j = n.astype(np.int64) & (_STEPS - 1)
    angle, low = times((turns[0] - n / _STEPS, turns[1]), _TURN)
    square = angle * angle
    bend = angle * square * (1 / 6 - square * (1 / 120 - square * (1 / 5040)))
    sine = angle + (low - bend)  # of the small angle
    sine_rest = (angle - sine) + (low - bend)
    drop = square * (0.5 - square * (1 / 24 - square * (1 / 720 - square / 40320))) + angle * low
    s0, c0 = sine_high[j], cosine_high[j]
    up, up_error = two_product(c0, sine)
    across, across_error = two_product(s0, sine)
    return (
        _sum(s0, up, up_error + c0 * sine_rest - s0 * drop + sine_low[j] + cosine_low[j] * sine),
        _sum(
            c0,
            -across,
            -across_error - s0 * sine_rest - c0 * drop + cosine_low[j] - sine_low[j] * sine,
        ),
    )


def _sum(a: Any, b: Any, rest: Any) -> Pair:
    total, error = two_sum(a, b)
    return quick_sum(total, error + rest)
