"""Responses against the differential equation itself, solved by scipy.

Two ways that share nothing with the closed forms: integrating tau dy/dt = x(t) - y step by step,
and the convolution y(t) = initial exp(-t/tau) + integral of x(s) exp(-(t - s)/tau) / tau.
The textbook forms of exact_responses.py are checked in the same cases.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import exact_responses as book
import mpmath
import pytest
from scipy.integrate import quad, solve_ivp

from tausheet import functions as fo


@dataclass(frozen=True)
class Case:
    """A response, its forcing written down anew, and the moments where that forcing breaks."""

    name: str
    tau: float
    arguments: tuple[float, ...]
    forcing: Callable[[float], float]
    breaks: tuple[float, ...] = ()

    @property
    def initial(self) -> float:
        return self.arguments[0]


def triangle_like(t: float) -> float:
    return 2.0 - 5.0 * t / 1.5 if t < 1.5 else -3.0


def burst(t: float) -> float:
    return 7.0 if 0.4 <= t < 1.1 else -1.0


def chopped(t: float) -> float:
    return 9.0 if t % 0.5 < 0.15 else 1.0


EDGES = (0.15, 0.5, 0.65, 1.0, 1.15, 1.5, 1.65)
CASES = [
    Case("natural", 0.8, (4.0,), lambda t: 0.0),
    Case("step", 0.8, (4.0, -3.0, 0.0), lambda t: -3.0),
    Case("step", 0.3, (4.0, -3.0, 0.7), lambda t: 4.0 if t < 0.7 else -3.0, (0.7,)),
    Case("ramp", 0.6, (1.0, 2.0, -3.0, 1.5), triangle_like, (1.5,)),
    Case("ramp", 20.0, (1.0, 2.0, -3.0, 1.5), triangle_like, (1.5,)),
    Case(
        "sine",
        0.25,
        (1.0, 3.0, 1.7, 40.0, -2.0),
        lambda t: -2.0 + 3.0 * math.sin(2 * math.pi * 1.7 * t + 40.0 * math.pi / 180),
    ),
    Case(
        "sine",
        5.0,
        (0.0, 3.0, 4.0, -100.0, 0.0),
        lambda t: 3.0 * math.sin(2 * math.pi * 4.0 * t - 100.0 * math.pi / 180),
    ),
    Case("decay", 0.5, (1.0, 4.0, 0.5, 2.0), lambda t: 2.0 + 4.0 * math.exp(-t / 0.5)),
    Case("decay", 0.5, (1.0, 4.0, 0.50001, 0.0), lambda t: 4.0 * math.exp(-t / 0.50001)),
    Case("decay", 0.5, (1.0, 4.0, 3.0, -2.0), lambda t: -2.0 + 4.0 * math.exp(-t / 3.0)),
    Case("pulse", 0.35, (2.0, -1.0, 7.0, 0.7, 0.4), burst, (0.4, 1.1)),
    Case("square", 0.2, (3.0, 1.0, 9.0, 0.5, 0.3), chopped, EDGES),
    Case("square", 6.0, (3.0, 1.0, 9.0, 0.5, 0.3), chopped, EDGES),
]
TIMES = [0.01, 0.15, 0.2, 0.4, 0.9, 1.1, 1.3, 1.5, 1.7, 1.99]


@pytest.mark.parametrize("case", CASES, ids=lambda case: f"{case.name}-{case.tau}")
def test_the_differential_equation(case: Case) -> None:
    y, checked = case.initial, 0
    edges = [0.0, *case.breaks, 2.0]
    for begin, end in pairwise(edges):

        def rate(t: float, y: list[float], begin: float = begin, end: float = end) -> list[float]:
            inside = min(max(t, begin + 1e-9 * (end - begin)), end - 1e-9 * (end - begin))
            return [(case.forcing(inside) - y[0]) / case.tau]

        own = [t for t in TIMES if begin < t < end]
        solved = solve_ivp(rate, (begin, end), [y], "DOP853", [*own, end], rtol=1e-12, atol=1e-13)
        assert solved.success
        for t, value in zip(own, solved.y[0], strict=False):
            assert getattr(fo, case.name)(t, case.tau, *case.arguments) == pytest.approx(
                value, rel=1e-8, abs=1e-8
            )
            checked += 1
        y = solved.y[0][-1]
    assert checked >= len(TIMES) - len(case.breaks)


@pytest.mark.parametrize("case", CASES, ids=lambda case: f"{case.name}-{case.tau}")
@pytest.mark.parametrize("t", TIMES)
def test_the_convolution_integral(case: Case, t: float) -> None:
    edges = [0.0, *(b for b in case.breaks if b < t), t]
    integral = math.fsum(
        quad(
            lambda s: case.forcing(s) * math.exp(-(t - s) / case.tau) / case.tau,
            begin,
            end,
            epsabs=1e-13,
            epsrel=1e-13,
            limit=200,
        )[0]
        for begin, end in pairwise(edges)
    )
    expected = case.initial * math.exp(-t / case.tau) + integral
    got = getattr(fo, case.name)(t, case.tau, *case.arguments)
    assert got == pytest.approx(expected, rel=1e-12, abs=1e-12)
    with mpmath.workdps(30):
        textbook = getattr(book, case.name)(*map(mpmath.mpf, (t, case.tau, *case.arguments)))
        assert abs(textbook - expected) < 1e-12
