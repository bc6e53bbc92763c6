"""How much of each level is in y at time t: the shares that every response is a sum of.

tau dy/dt + y = x(t), with t >= 0 throughout. The share of the initial value is exp(-t/tau); what
is missing to 1 belongs to the forcing's levels. Each share is computed as a sum of positive terms
wherever there is one, so that none loses digits: t much smaller than tau, a source's time constant
equal or near to tau, a ramp much shorter than tau, a million periods.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from tausheet.functions.exact import (
    Array,
    excess_over_sine,
    fraction_of_product,
    lag_integrals,
)

_FAST = 1e150
"""2 pi f tau beyond which a sine leaves nothing in y that a number could show."""


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
    return lag_integrals(u)[0]


def ramp_shares(t: Any, tau: Any, duration: Any) -> tuple[Array, Array]:
    """Shares of the level at which a ramp begins and of the one at which it ends and holds."""
    d = duration / tau
    inside = np.minimum(t, duration)
    u = inside / tau
    part = np.where(duration > 0, inside / duration, 1.0)
    left = np.where(duration > 0, (duration - inside) / duration, 0.0)
    early = u < 1
    mean = np.where(d > 0, lag(u) / d, 1.0)
    end = np.where(early, np.where(d > 0, excess(u) / d, 0.0), part - mean)
    start = np.where(early, lag(u) - end, left + mean - np.exp(-u))
    after, held = fall_and_lag(np.maximum(t - duration, 0.0), tau)
    return start * after, end * after + held


def sine_share(t: Any, tau: Any, frequency: Any, phase: Any) -> Array:
    """Response from rest to sin(2 pi f t + phase), the phase in degrees."""
    from scipy.special import cosdg, sindg

    w = np.minimum(2 * np.pi * frequency * tau, _FAST)
    u = t / tau
    turn = fraction_of_product(frequency, t)
    sine, cosine, half = (
        np.sin(2 * np.pi * turn),
        np.cos(2 * np.pi * turn),
        np.sin(np.pi * turn) ** 2,
    )
    fall, rest = fall_and_lag(t, tau)
    angle = np.minimum(2 * np.pi * frequency * t, _FAST)
    early = w * (excess(np.minimum(u, 1.0)) + 2 * half) - np.where(
        angle < 1, excess_over_sine(np.minimum(angle, 1.0)), angle - sine
    )
    to_sine = np.where(u < 1, early, sine - w * cosine + w * fall)
    to_cosine = np.where(u < 1, rest - 2 * half + w * sine, cosine + w * sine - fall)
    turned = np.fmod(phase, 360.0)
    result: Array = (cosdg(turned) * to_sine + sindg(turned) * to_cosine) / (1 + w * w)
    return result


def decay_share(t: Any, tau: Any, source_tau: Any) -> Array:
    """Response from rest to exp(-t / source_tau); source_tau may equal tau."""
    u = t / tau
    apart = np.abs(source_tau - tau)
    least = np.exp(-np.minimum(u, t / source_tau))
    far = lag(u * (apart / source_tau)) * (source_tau / np.where(apart > 0, apart, 1.0))
    result: Array = least * np.where(apart > 0, far, np.minimum(u, 1e3))
    return result


def pulse_shares(t: Any, tau: Any, duration: Any, delay: Any) -> tuple[Array, Array]:
    """Shares of the resting level and of the pulse's level."""
    since = np.maximum(t - delay, 0.0)
    ended = np.maximum(since - duration, 0.0)
    before = lag(np.minimum(t, delay) / tau)
    fall_since, lag_since = fall_and_lag(since, tau)
    fall_ended, lag_ended = fall_and_lag(ended, tau)
    over = since >= duration
    pulse = np.where(over, fall_ended * lag(duration / tau), lag_since)
    resting = np.where(over, lag_ended, 0.0) + fall_since * before
    return resting, pulse


def square_shares(t: Any, tau: Any, period: Any, duty: Any) -> tuple[Array, Array]:
    """Shares of the low and of the high level of a square that begins with high.

    The periods that are over are summed as a geometric series.
    """
    inside = np.fmod(t, period)
    on, off = duty * period, (1 - duty) * period
    over = (t - inside) / tau
    length = period / tau
    periods = np.where(length > 0, lag(over) / np.where(length > 0, lag(length), 1.0), 0.0)
    tiny = (length > 0) & (lag(length) == 0)
    periods = np.where(tiny | (length == 0), (t - inside) / period, periods)
    fall_inside, lag_inside = fall_and_lag(inside, tau)
    past_on = np.maximum(inside - on, 0.0)
    fall_past, lag_past = fall_and_lag(past_on, tau)
    is_low = inside >= on
    high_now = np.where(is_low, fall_past * lag(on / tau), lag_inside)
    low_now = np.where(is_low, lag_past, 0.0)
    high = fall_inside * np.exp(-off / tau) * lag(on / tau) * periods + high_now
    low = fall_inside * lag(off / tau) * periods + low_now
    return low, high
