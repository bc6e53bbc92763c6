"""Paths to fifty digits, and where a course of paths begins to repeat."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal
from fractions import Fraction

from tausheet.functions.digits import (
    TURN,
    fall,
    fifty_digits,
    lag,
    sine_and_cosine,
    to_decay,
    to_sine,
    to_slope,
    turns_of,
)
from tausheet.functions.roots import Path

_TURNS = 500
"""Turning points in a common period beyond which it is not made use of."""
DEAD = 75
"""Time constants after which a decay is below 1e-32 of itself."""


@dataclass(frozen=True)
class Repeating:
    """Paths that fill one period and repeat for ever; only exp(-t / tau) of the start is left."""

    paths: Sequence[Path]
    period: Decimal


def common_period(periods: Sequence[float], frequencies: Sequence[float]) -> Decimal | None:
    """The shortest time in which all periods fit; None when it holds too many of them.

    Taken exactly as they are, or else as they were typed: 0.1 s and 50 Hz have one, although the
    double next to 0.1 has none with 50. What that shifts stays below the last place of t.
    """
    for exact in (Fraction, lambda number: Fraction(repr(number))):
        known = [*map(exact, periods), *(1 / exact(f) for f in frequencies)]
        whole = known[0]
        for period in known[1:]:
            (a, b), (c, d) = whole.as_integer_ratio(), period.as_integer_ratio()
            whole = Fraction(math.lcm(a * d, c * b), b * d)
        if sum(2 * whole / period for period in known) <= _TURNS:
            return decimal_of(whole)
    return None


@fifty_digits
def decimal_of(number: Fraction) -> Decimal:
    """A fraction to fifty digits."""
    return Decimal(number.numerator) / Decimal(number.denominator)


def to_all_digits(paths: Iterable[Path | Repeating]) -> Iterator[Path | Repeating]:
    """The same paths, each able to give y to fifty digits, and what repeats for ever as such."""
    before: Path | None = None
    for path in paths:
        if isinstance(path, Repeating):
            yield path
            return
        whole = path if path.exact else _with_digits(path, before)
        before = whole
        if math.isinf(whole.length):
            yield from _split(whole)
            return
        yield whole


def _with_digits(path: Path, before: Path | None) -> Path:
    begun: list[Decimal] = []

    def exact(s: Decimal) -> Decimal:
        if not begun:
            if path.start is not None:
                begun.append(Decimal(path.start))
            else:
                assert before is not None
                assert before.exact is not None
                begun.append(before.exact(_minus(path.origin, before.origin)))
        return value_after(path, begun[0], s)

    return replace(path, exact=exact)


@fifty_digits
def _minus(a: Decimal, b: Decimal) -> Decimal:
    return a - b


@fifty_digits
def value_after(path: Path, start: Decimal, s: Decimal) -> Decimal:
    """y after s on a path that starts at `start`."""
    g = path.forcing
    a, b, c = Decimal(g.a), Decimal(g.b), Decimal(g.c)
    if math.isinf(path.tau):
        y = start + s * (a + s * (b / 2 + s * c / 3))
        for size, frequency, phase in g.sines:
            turns = Decimal(phase)
            _, now = sine_and_cosine(turns_of(Decimal(frequency), s) + turns)
            _, first = sine_and_cosine(turns)
            y += Decimal(size) * (first - now) / (TURN * Decimal(frequency))
        for size, own in g.decays:
            y += Decimal(size) * Decimal(own) * lag(s / Decimal(own))
        return y
    tau = Decimal(path.tau)
    y = start * fall(s / tau) + a * lag(s / tau)
    slope = to_slope(s, tau)
    y += b * slope + c * (s * s - 2 * tau * slope)
    for size, frequency, phase in g.sines:
        y += Decimal(size) * to_sine(Decimal(frequency), Decimal(phase), s, tau)
    for size, own in g.decays:
        y += Decimal(size) * to_decay(Decimal(own), s, tau)
    return y


def _split(path: Path) -> Iterator[Path | Repeating]:
    """An endless path: itself, or until its decays are over and then what repeats."""
    g = path.forcing
    steady = math.isinf(path.tau) and g.a != 0
    if not g.sines or g.b or g.c or steady:
        yield path
        return
    period = common_period([], [frequency for _, frequency, _ in g.sines])
    if period is None:
        yield path
        return
    if not g.decays:
        yield Repeating([replace(path, length=float(period))], period)
        return
    length = DEAD * max(own for _, own in g.decays)
    yield replace(path, length=length)
    yield repeating_after(path, length, period)


@fifty_digits
def repeating_after(path: Path, length: float, period: Decimal) -> Repeating:
    """What repeats of a path when its decays are over, after `length`."""
    behind = Decimal(length)
    exact = path.exact
    assert exact is not None
    sines = tuple(
        (size, frequency, float((turns_of(Decimal(frequency), behind) + Decimal(phase)) % 1))
        for size, frequency, phase in path.forcing.sines
    )
    rest = replace(
        path,
        origin=path.origin + behind,
        length=float(period),
        forcing=replace(path.forcing, sines=sines, decays=()),
        exact=lambda s: exact(s + behind),
    )
    return Repeating([rest], period)
