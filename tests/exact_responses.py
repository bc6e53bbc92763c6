"""The responses as textbooks give them, in mpmath: exact with enough digits.

Arguments are mpmath numbers, t >= 0; the caller sets the digits. Each is checked against the
differential equation itself in test_against_scipy_response.py.
"""

from __future__ import annotations

from typing import Any

import mpmath
from mpmath import mpf


def exp(x: Any) -> Any:
    return mpmath.exp(x)


def natural(t: Any, tau: Any, y0: Any) -> Any:
    return y0 * exp(-t / tau)


def step(t: Any, tau: Any, y0: Any, y1: Any, delay: Any = 0) -> Any:
    return y0 if t <= delay else y1 + (y0 - y1) * exp(-(t - delay) / tau)


def ramp(t: Any, tau: Any, y0: Any, a: Any, b: Any, length: Any) -> Any:
    def line(s: Any) -> Any:
        slope = (b - a) / length
        return a + slope * (s - tau) + (y0 - a + slope * tau) * exp(-s / tau)

    if length == 0:
        return step(t, tau, y0, b)
    return line(t) if t <= length else step(t - length, tau, line(length), b)


def sine(t: Any, tau: Any, y0: Any, a: Any, f: Any, phase: Any, offset: Any) -> Any:
    w, p = 2 * mpmath.pi * f, mpmath.radians(phase)
    d = 1 + (w * tau) ** 2

    def settled(s: Any) -> Any:
        return a * (mpmath.sin(w * s + p) - w * tau * mpmath.cos(w * s + p)) / d

    return offset + settled(t) + (y0 - offset - settled(0)) * exp(-t / tau)


def decay(t: Any, tau: Any, y0: Any, a: Any, other: Any, offset: Any) -> Any:
    if other == tau:
        part = a * t / tau * exp(-t / tau)
    else:
        part = a * other / (other - tau) * (exp(-t / other) - exp(-t / tau))
    return offset + (y0 - offset) * exp(-t / tau) + part


def pulse(t: Any, tau: Any, y0: Any, rest: Any, level: Any, length: Any, delay: Any) -> Any:
    y = step(min(t, delay), tau, y0, rest)
    y = step(min(max(t - delay, 0), length), tau, y, level)
    return step(max(t - delay - length, 0), tau, y, rest)


def square(t: Any, tau: Any, y0: Any, low: Any, high: Any, period: Any, duty: Any) -> Any:
    whole = mpmath.floor(t / period)
    inside, on, off = t - whole * period, duty * period, (1 - duty) * period
    # start of a settled period: y = step(off, step(on, y, high), low)
    fall = exp(-period / tau)
    once = step(off, tau, step(on, tau, mpf(0), high), low)
    settled = once / (1 - fall)
    y = settled + (y0 - settled) * exp(-whole * period / tau)
    y = step(min(inside, on), tau, y, high)
    return step(max(inside - on, 0), tau, y, low)
