"""The shapes of a source table to fifty digits: response, forcing, and when its formula changes.

Each counts s from its own start; before that it is 0. tau dy/dt + y = x(s), y(0) = 0.
"""

from __future__ import annotations

from decimal import ROUND_FLOOR, Decimal
from typing import Protocol

from tausheet.functions.digits import (
    fall,
    lag,
    sine_and_cosine,
    to_decay,
    to_ramp,
    to_sine,
    to_slope,
    to_square,
    turns_of,
)
from tausheet.functions.forcing import Forcing

NEVER = Decimal("Infinity")


class Shape(Protocol):
    """One row of a source table."""

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""

    def next_change(self, s: Decimal) -> Decimal:
        """The first moment after s >= 0 at which the formula changes."""

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """The forcing counted from s, on the stretch in which `inside` lies."""


class Constant:
    """A level from the start on."""

    def __init__(self, level: float) -> None:
        self.level = level

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        return Decimal(self.level) * lag(s / tau)

    def next_change(self, s: Decimal) -> Decimal:
        """Never."""
        return NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """The level."""
        return Forcing(self.level)


class Ramp:
    """From 0 to a level over a duration, then held."""

    def __init__(self, level: float, duration: float) -> None:
        self.level, self.duration = level, Decimal(duration)

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        if not self.duration:
            return Decimal(self.level) * lag(s / tau)
        return Decimal(self.level) * to_ramp(self.duration, s, tau)

    def next_change(self, s: Decimal) -> Decimal:
        """When the level is reached."""
        return self.duration if s < self.duration else NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """A straight line, then the level."""
        if inside > self.duration:
            return Forcing(self.level)
        slope = Decimal(self.level) / self.duration
        return Forcing(float(slope * s), float(slope))


class Slope:
    """A forcing that rises for ever."""

    def __init__(self, rate: float) -> None:
        self.rate = rate

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        return Decimal(self.rate) * to_slope(s, tau)

    def next_change(self, s: Decimal) -> Decimal:
        """Never."""
        return NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """A straight line."""
        return Forcing(float(Decimal(self.rate) * s), self.rate)


class Sine:
    """A sine, phase in degrees."""

    def __init__(self, amplitude: float, frequency: float, phase: float) -> None:
        self.amplitude, self.frequency = amplitude, frequency
        self.turns = Decimal(phase) % 360 / 360

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        return Decimal(self.amplitude) * to_sine(Decimal(self.frequency), self.turns, s, tau)

    def next_change(self, s: Decimal) -> Decimal:
        """Never."""
        return NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """The sine with the phase it has at s."""
        if not self.frequency:
            return Forcing(float(Decimal(self.amplitude) * sine_and_cosine(self.turns)[0]))
        phase = (turns_of(Decimal(self.frequency), s) + self.turns) % 1
        return Forcing(sines=((self.amplitude, self.frequency, float(phase)),))


class Decay:
    """An amplitude that dies away."""

    def __init__(self, amplitude: float, source_tau: float) -> None:
        self.amplitude, self.source_tau = amplitude, source_tau

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        return Decimal(self.amplitude) * to_decay(Decimal(self.source_tau), s, tau)

    def next_change(self, s: Decimal) -> Decimal:
        """Never."""
        return NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """What is left of it at s."""
        left = Decimal(self.amplitude) * fall(s / Decimal(self.source_tau))
        return Forcing(decays=((float(left), self.source_tau),))


class Pulse:
    """A level for a duration, then 0 again."""

    def __init__(self, level: float, duration: float) -> None:
        self.level, self.duration = level, Decimal(duration)

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        on = min(s, self.duration)
        return Decimal(self.level) * lag(on / tau) * fall((s - on) / tau)

    def next_change(self, s: Decimal) -> Decimal:
        """The end of the pulse."""
        return self.duration if s < self.duration else NEVER

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """The level, then 0."""
        return Forcing(self.level if inside < self.duration else 0.0)


class Square:
    """Two levels in turn, the high one first."""

    def __init__(self, low: float, high: float, period: float, duty: float) -> None:
        self.low, self.high, self.period, self.duty = low, high, Decimal(period), Decimal(duty)
        self.on = self.duty * self.period

    def response(self, s: Decimal, tau: Decimal) -> Decimal:
        """y at s > 0, from rest."""
        low, high = Decimal(self.low), Decimal(self.high)
        share = to_square(self.period, self.duty, s, tau)
        return low * lag(s / tau) + (high - low) * share

    def next_change(self, s: Decimal) -> Decimal:
        """The next edge."""
        if self.low == self.high or self.duty in (0, 1):
            return NEVER
        begun = (s / self.period).to_integral_value(ROUND_FLOOR) * self.period
        return begun + self.on if s < begun + self.on else begun + self.period

    def forcing(self, s: Decimal, inside: Decimal) -> Forcing:
        """One of the levels."""
        into = inside - (inside / self.period).to_integral_value(ROUND_FLOOR) * self.period
        return Forcing(self.high if into < self.on else self.low)


SHAPES = {
    "constant": Constant,
    "step": Constant,
    "ramp": Ramp,
    "slope": Slope,
    "sine": Sine,
    "decay": Decay,
    "pulse": Pulse,
    "square": Square,
}
