"""The course of y under a source table: stretch by stretch from any moment on, and to fifty digits.

Moments are decimals here, so that the millionth edge of a square lies where its period puts it.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from decimal import Decimal

from tausheet.functions.digits import ZERO, fall, fifty_digits, span
from tausheet.functions.forcing import Forcing
from tausheet.functions.paths import DEAD, Repeating, common_period
from tausheet.functions.roots import Path
from tausheet.functions.shapes import NEVER, SHAPES
from tausheet.functions.sources import Source

_SAME = Decimal("1e-40")
"""Moments this close, as a share of themselves, are one."""


class Course:
    """y under `sources`, with tau dy/dt + y = x(t) from y(0) = initial."""

    def __init__(self, sources: Sequence[Source], tau: float, initial: float) -> None:
        self.sources, self.tau, self.initial = sources, tau, initial
        self._tau = Decimal(tau)
        self._shapes = [SHAPES[row.shape](*row.values) for row in sources]
        self._starts = [Decimal(row.start) for row in sources]

    @fifty_digits
    def value(self, t: Decimal) -> Decimal:
        """y at t to fifty digits."""
        if t <= 0:
            return Decimal(self.initial)
        y = Decimal(self.initial) * fall(t / self._tau)
        for shape, start in zip(self._shapes, self._starts, strict=True):
            if t > start:
                y += shape.response(t - start, self._tau)
        return y

    @fifty_digits
    def inside(self, low: float, high: float, t: float) -> bool:
        """Whether y is from low to high at t."""
        return Decimal(low) <= self.value(Decimal(t)) <= Decimal(high)

    @fifty_digits
    def next_change(self, t: Decimal) -> Decimal:
        """The first moment after t at which a formula changes; infinite when there is none."""
        behind = t + abs(t) * _SAME
        first = NEVER
        for shape, start in zip(self._shapes, self._starts, strict=True):
            if start > behind:
                first = min(first, start)
            else:
                first = min(first, start + shape.next_change(behind - start))
        return first

    @fifty_digits
    def path(self, origin: Decimal, end: Decimal) -> Path:
        """The stretch between two moments without a change of formula in between."""
        middle = origin + 1 if end == NEVER else (origin + end) / 2
        levels: list[float] = []
        b = 0.0
        sines: list[tuple[float, float, float]] = []
        decays: list[tuple[float, float]] = []
        for shape, start in zip(self._shapes, self._starts, strict=True):
            if middle > start:
                part = shape.forcing(origin - start, middle - start)
                levels.append(part.a)
                b += part.b
                sines += part.sines
                decays += part.decays
        forcing = Forcing(math.fsum(levels), b, 0.0, tuple(sines), tuple(decays))
        return Path(
            origin,
            span(origin, end),
            self.tau,
            forcing,
            tuple(levels),
            lambda s: self.value(origin + s),
        )

    def quiet_after(self, level: float) -> float:
        """A moment behind which y keeps its side of a level for ever; infinite when unknown."""
        size = abs(self.initial) + abs(level)
        rate, low, high, begun, longest = 0.0, 0.0, 0.0, 0.0, self.tau
        for source in self.sources:
            v, begins = source.values, source.start
            ends = (v[0], v[0])  # what its share of y lies between when it has settled
            if source.shape == "slope":
                rate += v[0]
                size += abs(v[0]) * (begins + self.tau)
                ends = (0.0, 0.0)
            elif source.shape == "square":
                size += max(abs(v[0]), abs(v[1]))
                ends = _settled_square(v[0], v[1], v[2] / self.tau, v[3])
            elif source.shape == "sine":
                size += abs(v[0])
                swing = 1.000001 * abs(v[0]) / math.hypot(1.0, 2 * math.pi * v[1] * self.tau)
                ends = (-swing, swing)
            elif source.shape in ("pulse", "decay"):
                size += abs(v[0])
                ends = (0.0, 0.0)
            if source.shape in ("ramp", "pulse"):
                begins += v[1]
            if source.shape == "decay":
                longest = max(longest, v[1])
            size += max(map(abs, ends))
            low, high, begun = low + min(ends), high + max(ends), max(begun, begins)
        if rate:  # y is within `size` of rate x t
            return max(begun, 1.01 * size / abs(rate))
        gap = max(low - level, level - high)
        if not gap > 1e-12 * size:
            return math.inf
        u = 2.0  # what is left of the start and of decays is below size (2 + u) exp(-u)
        while size * (2 + u) * math.exp(-u) * (longest / self.tau) >= gap:
            u += 1.0
        return begun + u * longest

    @fifty_digits
    def repetition(self) -> tuple[Decimal, Decimal] | None:
        """From when on the forcing repeats and its period, None when it never does."""
        begin, periods, frequencies = ZERO, [], []
        for source, shape, start in zip(self.sources, self._shapes, self._starts, strict=True):
            values, last = source.values, start
            if source.shape == "slope" and values[0]:
                return None
            if source.shape in ("ramp", "pulse"):
                last += Decimal(values[1])
            if source.shape == "decay" and values[0]:
                last += Decimal(values[1]) * DEAD
            if source.shape == "sine" and values[0] and values[1]:
                frequencies.append(values[1])
            if source.shape == "square" and shape.next_change(ZERO) < NEVER:
                periods.append(values[2])
            begin = max(begin, last)
        period = common_period(periods, frequencies) if periods or frequencies else None
        return None if period is None else (begin, period)

    def _between(self, origin: Decimal, end: Decimal) -> Iterator[Path]:
        while origin < end:
            change = min(self.next_change(origin), end)
            yield self.path(origin, change)
            origin = change

    def paths(self, t_from: float = 0.0) -> Iterator[Path | Repeating]:
        """Stretch by stretch from t_from on, and what repeats when all else is over."""
        origin = Decimal(max(t_from, 0.0))
        repetition = self.repetition()
        end = repetition[0] if repetition else NEVER
        first = float(self.value(origin))
        for path in self._between(origin, end):
            yield replace(path, start=first) if path.origin == origin else path
        if repetition:
            begin, period = repetition
            yield Repeating(list(self._between(begin, begin + period)), period)


def _settled_square(low: float, high: float, length: float, duty: float) -> tuple[float, float]:
    """Bounds of the settled response to a square whose period is `length` time constants."""
    margin = 1e-6 * (abs(low) + abs(high))
    if length < 1e-6:
        mean = low + duty * (high - low)
        return mean - margin, mean + margin
    whole = -math.expm1(-length)
    on, off = -math.expm1(-duty * length) / whole, -math.expm1(-(1 - duty) * length) / whole
    ends = (low + (high - low) * (1 - off), low + (high - low) * on)
    return min(ends) - margin, max(ends) + margin
