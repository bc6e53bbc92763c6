"""How much of each level is in y at time t: the shares that every response is a sum of.

tau dy/dt + y = x(t), with t >= 0 throughout. The share of the initial value is exp(-t/tau); what
is missing to 1 belongs to the forcing's levels. Each share is computed as a sum of positive terms
wherever there is one, so that none loses digits: t much smaller than tau, a source's time constant
equal or near to tau, a ramp much shorter than tau, a million periods.
"""

from __future__ import annotations

from functools import reduce
from typing import Any

import numpy as np

from tausheet.functions.exact import (
    Array,
    excess_over_sine,
    fraction_of_product,
    two_product,
    two_sum,
)

_STILL = 1e-17
"""Share of tau below which a period moves y by less than a rounding."""


def blend(*levels_and_shares: tuple[Array, Array]) -> Array:
    """Levels times shares that add up to 1: never outside the levels, though shares are rounded."""
    levels = [level for level, _ in levels_and_shares]
    total = sum(level * share for level, share in levels_and_shares)
    return np.clip(total, reduce(np.minimum, levels), reduce(np.maximum, levels))


def lag(u: Any) -> Array:
    """1 - exp(-u): the share of a constant level."""
    result: Array = -np.expm1(-u)
    return result


def fall_and_lag(t: Any, tau: Any) -> tuple[Array, Array]:
    """exp(-t/tau) and 1 - exp(-t/tau), with one exponential an element."""
    u = np.asarray(t / tau)
    fall = np.exp(-u)
    rest = 1.0 - fall
    early = u < 0.5
    if early.any():
        if early.all():
            rest = -np.expm1(-u)
        else:
            rest[early] = -np.expm1(-u[early])
    return fall, rest


def excess(u: Any) -> Array:
    """u - (1 - exp(-u)): tau times it is the response to a slope of 1 per second."""
    result = np.asarray(u + np.expm1(-u))
    small = u < 0.5
    if not small.any():
        return result
    s = np.minimum(u, 0.5)
    series = np.ones_like(s)
    for n in range(15, 2, -1):  # nested: u^2/2 (1 - u/3 (1 - u/4 (...)))
        series = 1 - s / n * series
    return np.where(small, s * s / 2 * series, result)


def ramp_shares(t: Any, tau: Any, duration: Any) -> tuple[Array, Array]:
    """Shares of the level at which a ramp begins and of the one at which it ends and holds."""
    d = duration / tau
    inside = np.minimum(t, duration)
    u = inside / tau
    part = np.where(duration > 0, inside / duration, 1.0)
    left = np.where(duration > 0, (duration - inside) / duration, 0.0)
    early = u < 1
    mean = np.where(d > 0, lag(u) / d, 1.0)
    end = np.where(early, np.where(d > 0, excess(np.minimum(u, 1.0)) / d, 0.0), part - mean)
    start = np.where(early, lag(u) - end, left + mean - np.exp(-u))
    after, held = fall_and_lag(np.maximum(t - duration, 0.0), tau)
    return start * after, end * after + held


def sine_share(t: Any, tau: Any, frequency: Any, phase: Any) -> Array:
    """Response from rest to sin(2 pi f t + phase), the phase in degrees."""
    from scipy.special import cosdg, sindg

    w = 2 * np.pi * (frequency * tau)
    # 1/(1 + w^2) and w/(1 + w^2), in a form that neither overflows nor loses the latter
    direct, across = 1 / (1 + w * w), 1 / (w + 1 / w)
    turns = fraction_of_product(frequency, t)
    angle = 2 * np.pi * turns
    sine, bend = np.sin(angle), 2 * np.sin(angle / 2) ** 2
    u = t / tau
    _, rest = fall_and_lag(t, tau)
    slow = (frequency * t < 1 / 8) & (u < 1)
    to_sine = direct * sine + across * (bend - rest)
    if slow.any():
        small = np.where(slow, angle, 0.0)
        early = across * (excess(np.minimum(u, 1.0)) + bend) - direct * excess_over_sine(small)
        to_sine = np.where(slow, early, to_sine)
    to_cosine = direct * (rest - bend) + across * sine
    turned = np.fmod(phase, 360.0)
    result: Array = cosdg(turned) * to_sine + sindg(turned) * to_cosine
    return result


def decay_share(t: Any, tau: Any, source_tau: Any) -> Array:
    """Response from rest to exp(-t / source_tau); source_tau may equal tau."""
    u, v = t / tau, t / source_tau
    apart = np.abs(source_tau - tau)
    # |u - v| from the difference of the time constants, which is exact where they are close
    between = np.maximum(u, v) * (apart / np.maximum(source_tau, tau))
    far = lag(between) * (source_tau / np.where(apart > 0, apart, 1.0))
    result: Array = np.exp(-np.minimum(u, v)) * np.where(apart > 0, far, np.minimum(u, 1e3))
    return result


def pulse_shares(t: Any, tau: Any, duration: Any, delay: Any) -> tuple[Array, Array]:
    """Shares of the resting level and of the pulse's level."""
    since, rounded_off = two_sum(t, -delay)
    past = (since - duration) + rounded_off
    over = past >= 0
    since, ended = np.maximum(since, 0.0), np.maximum(past, 0.0)
    before = lag(np.minimum(t, delay) / tau)
    fall_since, lag_since = fall_and_lag(since, tau)
    fall_ended, lag_ended = fall_and_lag(ended, tau)
    pulse = np.where(over, fall_ended * lag(duration / tau), lag_since)
    resting = np.where(over, lag_ended, 0.0) + fall_since * before
    return resting, pulse


def square_shares(t: Any, tau: Any, period: Any, duty: Any) -> tuple[Array, Array]:
    """Shares of the low and of the high level of a square that begins with high.

    The periods that are over are summed as a geometric series.
    """
    inside = np.fmod(t, period)
    on, on_rest = _exact_product(duty, period)
    off = (1 - duty) * period
    length = period / tau
    still = length < _STILL
    whole = lag(np.where(still, 1.0, length))
    per_high = np.where(still, duty, lag(on / tau) / whole)
    per_low = np.where(still, 1 - duty, lag(off / tau) / whole)
    fall_inside, lag_inside = fall_and_lag(inside, tau)
    # what the periods that are over have left
    left = fall_inside * lag((t - inside) / tau)
    past = (inside - on) - on_rest
    is_low = past >= 0
    fall_past, lag_past = fall_and_lag(np.maximum(past, 0.0), tau)
    high_now = np.where(is_low, fall_past * lag(on / tau), lag_inside)
    low_now = np.where(is_low, lag_past, 0.0)
    return left * per_low + low_now, left * np.exp(-off / tau) * per_high + high_now


def _exact_product(share: Any, number: Any) -> tuple[Any, Any]:
    """share x number and its rounding error, for a share up to 1 and any number."""
    digits, exponent = np.frexp(number)
    product, rest = two_product(share, digits)
    return np.ldexp(product, exponent), np.ldexp(rest, exponent)
