"""The forcing on one stretch: a polynomial, sines and decays, with bounds over any window."""

from __future__ import annotations

import math
from dataclasses import dataclass

from tausheet.functions.exact import two_product

EPS = 2.0**-53
PAD = 16 * EPS
"""Share of the sum of magnitudes by which a value in doubles may be off."""


def turns_after(frequency: float, s: float, phase: float) -> float:
    """frequency s + phase less whole turns, however many."""
    product, error = two_product(frequency, s)
    return float((product - math.floor(product)) + error + phase)


@dataclass(frozen=True)
class Forcing:
    """a + b s + c s^2 + sines (amplitude, frequency, phase in turns) + decays (amplitude, T)."""

    a: float = 0.0
    b: float = 0.0
    c: float = 0.0
    sines: tuple[tuple[float, float, float], ...] = ()
    decays: tuple[tuple[float, float], ...] = ()

    def __call__(self, s: float) -> float:
        """The forcing after s."""
        x = self.a + s * (self.b + s * self.c)
        for amplitude, frequency, phase in self.sines:
            x += amplitude * math.sin(math.tau * turns_after(frequency, s, phase))
        for amplitude, source_tau in self.decays:
            x += amplitude * math.exp(-s / source_tau)
        return x

    def bounds(self, left: float, right: float) -> tuple[float, float]:
        """Numbers that the forcing stays between from left to right."""
        low, high = self.slow_bounds(left, right)
        size = 0.0
        for amplitude, frequency, phase in self.sines:
            down, up = _sine_bounds(turns_after(frequency, left, phase), frequency * (right - left))
            low += min(amplitude * down, amplitude * up)
            high += max(amplitude * down, amplitude * up)
            size += abs(amplitude)
        return low - PAD * size, high + PAD * size

    def slow_bounds(self, left: float, right: float) -> tuple[float, float]:
        """The same without the sines."""
        ends = [s * (self.b + s * self.c) for s in (left, right)]
        size = right * (abs(self.b) + right * abs(self.c))
        if self.c and left < (middle := -self.b / (2 * self.c)) < right:
            ends.append(middle * self.b / 2)
        low, high = min(ends), max(ends)
        for amplitude, source_tau in self.decays:
            first = amplitude * math.exp(-left / source_tau)
            last = amplitude * math.exp(-right / source_tau)
            low, high = low + min(first, last), high + max(first, last)
            size += abs(first) * (1 + left / source_tau)
        if size:
            size += abs(self.a)
        return self.a + low - PAD * size, self.a + high + PAD * size

    def slope(self) -> Forcing:
        """The forcing's rate of change."""
        return Forcing(
            self.b,
            2 * self.c,
            0.0,
            tuple((a * math.tau * f, f, phase + 0.25) for a, f, phase in self.sines),
            tuple((-a / source_tau, source_tau) for a, source_tau in self.decays),
        )

    def scaled(self, k: float) -> Forcing:
        """The forcing times k."""
        return Forcing(
            k * self.a,
            k * self.b,
            k * self.c,
            tuple((k * a, f, phase) for a, f, phase in self.sines),
            tuple((k * a, source_tau) for a, source_tau in self.decays),
        )


def _sine_bounds(start: float, turned: float) -> tuple[float, float]:
    """Bounds of the sine while it turns from `start`, in turns."""
    if not turned < 1:
        return -1.0, 1.0
    start -= math.floor(start)
    end = start + turned
    first, last = math.sin(math.tau * start), math.sin(math.tau * end)
    high = 1.0 if start <= 0.25 <= end or end >= 1.25 else max(first, last)
    low = -1.0 if start <= 0.75 <= end or end >= 1.75 else min(first, last)
    return low, high
