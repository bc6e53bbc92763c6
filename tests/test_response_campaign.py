"""Drawn responses aimed at the awkward places, against mpmath at 90 digits.

Moments at a break and a step of the numbers beside it, equal and almost equal time constants,
ramps and periods far from tau on either side, millions of periods. A thousand cases a response
belong to every run, twenty thousand to the campaign.
"""

from __future__ import annotations

import math
import random
from collections.abc import Iterator

import exact_responses as book
import mpmath
import pytest
from mpmath import mpf

from tausheet import functions as fo


@pytest.fixture(autouse=True)
def _ninety_digits() -> Iterator[None]:
    with mpmath.workdps(90):
        yield


class Drawn:
    """Arguments after t and tau of each response: its levels come back a second time."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)

    def power(self, low: float, high: float) -> float:
        return 10.0 ** self.random.uniform(low, high)

    def level(self) -> float:
        sizes = [0.0, 1.0, -1.0, self.power(-6, 6), -self.power(-6, 6)]
        return self.random.choice(sizes)

    def beside(self, x: float) -> float:
        """x or one of its neighbours, never below 0."""
        for _ in range(self.random.choice([0, 0, 1, 2, 3])):
            x = math.nextafter(x, self.random.choice([-math.inf, math.inf]))
        return max(x, 0.0)

    def step(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        levels = [self.level(), self.level()]
        delay = self.random.choice([0.0, t * self.random.random(), self.beside(t)])
        return [*levels, delay], levels

    def ramp(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        levels = [self.level(), self.level(), self.level()]
        lengths = [0.0, self.beside(t), t * self.power(-15, 15), tau * self.power(-15, 15)]
        return [*levels, self.random.choice(lengths)], levels

    def sine(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        initial, amplitude, offset = self.level(), self.level(), self.level()
        frequency = self.random.choice(
            [
                self.power(-15, 15) / tau,
                self.power(-6, 6) / t,
                round(self.power(0, 6)) / t,
                self.beside(0.125 / t),
            ]
        )
        phase = self.random.choice([0.0, 30.0, 90.0, -90.0, 180.0, self.random.uniform(-1e4, 1e4)])
        return [initial, amplitude, frequency, phase, offset], [initial, amplitude, offset]

    def decay(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        initial, amplitude, offset = self.level(), self.level(), self.level()
        near = tau * (1 + self.power(-16, -0.1) * self.random.choice([-1, 1]))
        own = self.random.choice([tau, self.beside(tau), near, tau * self.power(-15, 15)])
        return [initial, amplitude, own, offset], [initial, amplitude, offset]

    def pulse(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        levels = [self.level(), self.level(), self.level()]
        delay = self.random.choice(
            [0.0, self.beside(t), t * self.random.random(), t * self.power(-9, 0)]
        )
        length = self.random.choice([0.0, self.beside(t - delay), t * self.power(-15, 1)])
        return [*levels, length, delay], levels

    def square(self, t: float, tau: float) -> tuple[list[float], list[float]]:
        levels = [self.level(), self.level(), self.level()]
        duty = self.random.choice([0.0, 1.0, self.random.random(), self.power(-18, 0)])
        periods = self.random.choice([1, 2, 3, 10, 1000, 10**6, 10**9])
        edge = self.random.choice([0.0, duty])
        period = self.random.choice(
            [self.beside(t / (periods + edge)), t * self.power(-12, 6), tau * self.power(-25, 6)]
        )
        return [*levels, period, duty], levels


def compare(name: str, cases: int, seed: int) -> None:
    drawn = Drawn(seed)
    for _ in range(cases):
        tau = drawn.power(-9, 9)
        t = drawn.power(-12, math.log10(700)) * tau
        arguments, levels = getattr(drawn, name)(t, tau)
        exact = getattr(book, name)(*map(mpf, (t, tau, *arguments)))
        got = getattr(fo, name)(t, tau, *arguments)
        off = abs(mpf(got) - exact)
        allowed = mpf(1e-13) * max(1.0, t / (350 * tau))
        # nothing cancels where all levels have one sign; a sine has both
        one_sign = min(levels) >= 0 or max(levels) <= 0
        if one_sign and name != "sine":
            assert off <= allowed * abs(exact), (t, tau, arguments)
        else:
            scale = max(*map(abs, levels), abs(exact))
            assert off <= allowed / 50 * scale, (t, tau, arguments)


NAMES = ["step", "ramp", "sine", "decay", "pulse", "square"]


@pytest.mark.parametrize("name", NAMES)
def test_awkward_places(name: str) -> None:
    compare(name, 1000, 1)


@pytest.mark.campaign
@pytest.mark.parametrize("name", NAMES)
def test_many_awkward_places(name: str) -> None:
    compare(name, 20_000, 2)
