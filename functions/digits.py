"""Responses to fifty digits, for the few points where doubles cannot decide.

Decimal arithmetic on the doubles as given: which side of a level y is on, and the last digits
of a crossing, then follow from the arguments alone and not from rounding on the way.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from decimal import ROUND_FLOOR, Context, Decimal, localcontext
from functools import wraps
from typing import ParamSpec, TypeVar

P = ParamSpec("P")
R = TypeVar("R")

_CONTEXT = Context(prec=50, Emax=10**9, Emin=-(10**9), traps=[])
ZERO = Decimal(0)
_ONE = Decimal(1)
_SMALL = Decimal("1e-5")
"""Below this a series of eight terms replaces a difference that would cancel."""
_ROOT_HALF = Decimal("0.70710678118654752440084436210484903928483593768847403658833987")

TURN = Decimal("6.283185307179586476925286766559005768394338798750211641949889184615632812572")
"""Radians in a turn."""


def fifty_digits(function: Callable[P, R]) -> Callable[P, R]:
    """Run a function with the digits that this module counts on."""

    @wraps(function)
    def inside(*args: P.args, **kwargs: P.kwargs) -> R:
        with localcontext(_CONTEXT):
            return function(*args, **kwargs)

    return inside


@fifty_digits
def span(begin: Decimal, end: Decimal) -> float:
    """The double next below end - begin: a stretch of that length does not reach past its end."""
    exact = end - begin
    length = float(exact)
    return length if length <= exact else math.nextafter(length, 0.0)


@fifty_digits
def fall(u: Decimal) -> Decimal:
    """exp(-u) for u >= 0."""
    return (-u).exp()


@fifty_digits
def lag(u: Decimal) -> Decimal:
    """1 - exp(-u) for u >= 0."""
    if u > _SMALL:
        return _ONE - (-u).exp()
    total = term = u
    for n in range(2, 10):
        term *= -u / n
        total += term
    return total


@fifty_digits
def sine_and_cosine(turns: Decimal) -> tuple[Decimal, Decimal]:
    """Sine and cosine of an angle given in turns."""
    eighths = (turns * 8).to_integral_value()
    x = (turns - eighths / 8) * TURN
    square = x * x
    sine = power = x
    cosine = even = _ONE
    for n in range(1, 17):  # 0.4^33 / 33! is below 1e-50
        even *= -square / (2 * n * (2 * n - 1))
        power *= -square / (2 * n * (2 * n + 1))
        cosine += even
        sine += power
    octant = int(eighths % 8)
    if octant % 2:
        sine, cosine = (sine + cosine) * _ROOT_HALF, (cosine - sine) * _ROOT_HALF
    for _ in range(octant // 2 % 4):
        sine, cosine = cosine, -sine
    return sine, cosine


def turns_of(frequency: Decimal, s: Decimal) -> Decimal:
    """The fraction of a turn after s, however many whole turns went before."""
    digits = max(0, frequency.adjusted() + s.adjusted() + 2)
    with localcontext(Context(prec=50 + min(digits, 700), Emax=10**9, Emin=-(10**9), traps=[])):
        return (frequency * s) % 1


@fifty_digits
def to_step(s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for the forcing 1."""
    return lag(s / tau)


@fifty_digits
def to_slope(s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for the forcing s."""
    return s - tau * lag(s / tau)


@fifty_digits
def to_square_of_time(s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for the forcing s^2."""
    return s * s - 2 * tau * to_slope(s, tau)


@fifty_digits
def to_sine(frequency: Decimal, phase: Decimal, s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for the forcing sin(2 pi frequency s + phase), phase in turns."""
    k = TURN * frequency * tau
    sine, cosine = sine_and_cosine(turns_of(frequency, s) + phase)
    sine_0, cosine_0 = sine_and_cosine(phase)
    settled = sine - k * cosine
    return (settled - (sine_0 - k * cosine_0) * fall(s / tau)) / (1 + k * k)


@fifty_digits
def to_decay(source_tau: Decimal, s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for the forcing exp(-s / source_tau)."""
    if source_tau == tau:
        return s / tau * fall(s / tau)
    return source_tau / (source_tau - tau) * (fall(s / source_tau) - fall(s / tau))


@fifty_digits
def to_ramp(duration: Decimal, s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for a forcing that rises from 0 to 1 over duration."""
    if s < duration:
        return to_slope(s, tau) / duration
    return 1 - fall((s - duration) / tau) * lag(duration / tau) * tau / duration


@fifty_digits
def to_square(period: Decimal, duty: Decimal, s: Decimal, tau: Decimal) -> Decimal:
    """y after s, from rest, for a forcing that is 1 for duty x period, 0 for the rest, again."""
    on = duty * period
    passed = (s / period).to_integral_value(ROUND_FLOOR)
    into = s - passed * period
    now = fall(max(into - on, ZERO) / tau) * lag(min(into, on) / tau)
    before = lag(on / tau) * fall((into + period - on) / tau)
    return now + before * lag(passed * period / tau) / lag(period / tau)
