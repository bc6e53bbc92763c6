"""Response y(t) of tau dy/dt + y = x(t) for one forcing that starts at t = 0."""

from __future__ import annotations

import math

import numpy as np

from tausheet.functions.arguments import (
    ClosedFraction,
    Finite,
    NonNegative,
    Numbers,
    Positive,
)
from tausheet.functions.blocks import in_blocks
from tausheet.functions.catalogue import cell_function
from tausheet.functions.exact import Array
from tausheet.functions.from_rest import (
    blend,
    decay_share,
    fall_and_lag,
    pulse_shares,
    ramp_shares,
    sine_share,
    square_shares,
)


def _step_scalar(
    t: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> float | None:
    if not (
        type(t) is type(tau) is type(initial) is type(final) is type(delay) is float
        and tau > 0.0 <= delay
        and tau + delay < math.inf
        and math.isfinite(t)
        and math.isfinite(initial)
        and math.isfinite(final)
    ):
        return None
    u, fall = (delay - t) / tau, initial - final
    if math.isinf(fall):
        return None
    if u > -0.5:
        return initial + fall * math.expm1(min(u, 0.0))
    return final + fall * math.exp(u)


def _natural_scalar(t: float, tau: float, initial: float) -> float | None:
    return _step_scalar(t, tau, initial, 0.0)


@cell_function("FO_NATURAL", "Response", scalar=_natural_scalar)
def natural(t: Finite, tau: Positive, initial: Finite) -> Numbers:
    """Natural response: y decays to 0 from its initial value.

        y(t) = initial exp(-t / tau)    for t > 0

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number

    Result: y(t) in the unit of initial, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(natural(1.0, 1.0, 5.0), 12)
        1.839397205857

    References: closed form of tau dy/dt + y = 0.
    """
    return in_blocks(_natural, t, tau, initial)


def _natural(out: Array, t: Array, tau: Array, initial: Array) -> None:
    np.maximum(t, 0.0, out=out)
    np.divide(out, -tau, out=out)
    np.exp(out, out=out)
    np.multiply(out, initial, out=out)


@cell_function("FO_STEP", "Response", scalar=_step_scalar)
def step(
    t: Finite, tau: Positive, initial: Finite, final: Finite, delay: NonNegative = 0.0
) -> Numbers:
    """Step response: y rests at `initial` until `delay`, then heads for `final`.

        y(t) = final + (initial - final) exp(-(t - delay) / tau)    for t > delay

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until the delay has passed; any number
        final: value that y heads for; any number
        delay: time from t = 0 until the step (s); number >= 0

    Result: y(t) in the unit of initial and final, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(step(1.0, 1.0, 0.0, 5.0), 12)
        3.160602794143

    References: closed form of tau dy/dt + y = x.
    """
    return _step_response(t - delay if np.any(delay) else t, tau, initial, final)


def _step_response(t: Array, tau: Array, initial: Array, final: Array) -> Array:
    fall = initial - final
    if np.isinf(fall).any():
        return 2 * _step_response(t, tau, initial / 2, final / 2)
    rate = -1 / tau
    if np.isinf(rate).any():
        return in_blocks(_step_divided, t, -tau, initial, final, fall)
    return in_blocks(_step, t, rate, initial, final, fall)


def _step_divided(
    out: Array, t: Array, less_tau: Array, initial: Array, final: Array, fall: Array
) -> None:
    _step(out, t / less_tau, np.asarray(1.0), initial, final, fall)


def _step(out: Array, t: Array, rate: Array, initial: Array, final: Array, fall: Array) -> None:
    # a product takes a third of a division's time; its second rounding puts exp off by 4e-14 at
    # 350 time constants, of the 1e-13 allowed
    np.multiply(t, rate, out=out)
    early = None
    if out.max() > -0.5:
        early = out > -0.5
        soon = initial + fall * np.expm1(np.minimum(out, 0.0))
    np.exp(out, out=out)
    np.multiply(out, fall, out=out)
    np.add(out, final, out=out)
    if early is not None:
        np.copyto(out, soon, where=early)


@cell_function("FO_RAMP", "Response")
def ramp(
    t: Finite,
    tau: Positive,
    initial: Finite,
    level_from: Finite,
    level_to: Finite,
    duration: NonNegative,
) -> Numbers:
    """Response to a straight line from one level to another, which then holds.

        x(t) = level_from + (level_to - level_from) t / duration,   level_to from duration on

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        level_from: level of the forcing at t = 0; any number
        level_to: level of the forcing from duration on; any number
        duration: time that the line takes (s), 0 for a step; number >= 0

    Result: y(t) in the unit of the levels, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(ramp(1.0, 1.0, 0.0, 0.0, 5.0, 1.0), 12)
        1.839397205857

    References: closed form of tau dy/dt + y = x.
    """
    return in_blocks(_ramp, t, tau, initial, level_from, level_to, duration)


def _ramp(
    out: Array, t: Array, tau: Array, initial: Array, start: Array, end: Array, length: Array
) -> None:
    t = np.maximum(t, 0.0)
    of_start, of_end = ramp_shares(t, tau, length)
    out[...] = blend((initial, np.exp(-t / tau)), (start, of_start), (end, of_end))


@cell_function("FO_SINE", "Response")
def sine(
    t: Finite,
    tau: Positive,
    initial: Finite,
    amplitude: Finite,
    frequency: NonNegative,
    phase: Finite = 0.0,
    offset: Finite = 0.0,
) -> Numbers:
    """Response to a sine, switched on at t = 0.

        x(t) = offset + amplitude sin(2 pi frequency t + phase)

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        amplitude: amplitude of the sine; any number
        frequency: frequency (Hz); number >= 0
        phase: phase at t = 0 (degrees); any number
        offset: level about which the sine swings; any number

    Result: y(t) in the unit of the amplitude, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(sine(0.01, 0.01, 0.0, 325.0, 50.0), 9)
        128.48940491

    References: closed form of tau dy/dt + y = x.
    """
    return in_blocks(_sine, t, tau, initial, amplitude, frequency, phase, offset)


def _sine(
    out: Array,
    t: Array,
    tau: Array,
    initial: Array,
    amplitude: Array,
    frequency: Array,
    phase: Array,
    offset: Array,
) -> None:
    t = np.maximum(t, 0.0)
    fall, rest = fall_and_lag(t, tau)
    swing = amplitude * sine_share(t, tau, frequency, phase)
    out[...] = blend((initial, fall), (offset, rest)) + swing


@cell_function("FO_DECAY", "Response")
def decay(
    t: Finite,
    tau: Positive,
    initial: Finite,
    amplitude: Finite,
    source_tau: Positive,
    offset: Finite = 0.0,
) -> Numbers:
    """Response to a forcing that decays with a time constant of its own.

        x(t) = offset + amplitude exp(-t / source_tau)

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        amplitude: what decays, at t = 0; any number
        source_tau: time constant of the source (s), which may equal tau; number > 0
        offset: level that the forcing decays to; any number

    Result: y(t) in the unit of the amplitude, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(decay(1.0, 1.0, 0.0, 5.0, 1.0), 12)
        1.839397205857

    References: closed form of tau dy/dt + y = x.
    """
    return in_blocks(_decay, t, tau, initial, amplitude, source_tau, offset)


def _decay(
    out: Array,
    t: Array,
    tau: Array,
    initial: Array,
    amplitude: Array,
    source_tau: Array,
    offset: Array,
) -> None:
    t = np.maximum(t, 0.0)
    fall, rest = fall_and_lag(t, tau)
    share = decay_share(t, tau, source_tau)
    out[...] = blend((initial, fall), (offset, rest)) + amplitude * share


@cell_function("FO_PULSE", "Response")
def pulse(
    t: Finite,
    tau: Positive,
    initial: Finite,
    resting: Finite,
    level: Finite,
    duration: NonNegative,
    delay: NonNegative = 0.0,
) -> Numbers:
    """Response to one pulse: y heads for `resting`, during the pulse for `level`.

        x(t) = level from delay to delay + duration, resting before and after

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        resting: level of the forcing before and after the pulse; any number
        level: level of the forcing during the pulse; any number
        duration: length of the pulse (s); number >= 0
        delay: time from t = 0 until the pulse (s); number >= 0

    Result: y(t) in the unit of the levels, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(pulse(2.0, 1.0, 0.0, 0.0, 5.0, 1.0), 12)
        1.162720789674

    References: closed form of tau dy/dt + y = x.
    """
    return in_blocks(_pulse, t, tau, initial, resting, level, duration, delay)


def _pulse(
    out: Array,
    t: Array,
    tau: Array,
    initial: Array,
    resting: Array,
    level: Array,
    duration: Array,
    delay: Array,
) -> None:
    t = np.maximum(t, 0.0)
    of_resting, of_level = pulse_shares(t, tau, duration, delay)
    out[...] = blend((initial, np.exp(-t / tau)), (resting, of_resting), (level, of_level))


@cell_function("FO_SQUARE", "Response")
def square(
    t: Finite,
    tau: Positive,
    initial: Finite,
    low: Finite,
    high: Finite,
    period: Positive,
    duty: ClosedFraction,
) -> Numbers:
    """Response to a square that repeats from t = 0: high for duty x period, then low.

    The periods that are over are summed as a geometric series: exact at any number of them.

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        low: level for the rest of each period; any number
        high: level for duty x period; any number
        period: period (s); number > 0
        duty: share of the period at high, a fraction; number >= 0 and <= 1

    Result: y(t) in the unit of the levels, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts, a response free to follow in both directions.

    Example:
        >>> round(square(1.0, 1.0, 0.0, 0.0, 5.0, 2.0, 0.5), 12)
        3.160602794143

    References: closed form of tau dy/dt + y = x, geometric series over the periods.
    """
    return in_blocks(_square, t, tau, initial, low, high, period, duty)


def _square(
    out: Array,
    t: Array,
    tau: Array,
    initial: Array,
    low: Array,
    high: Array,
    period: Array,
    duty: Array,
) -> None:
    t = np.maximum(t, 0.0)
    of_low, of_high = square_shares(t, tau, period, duty)
    out[...] = blend((initial, np.exp(-t / tau)), (low, of_low), (high, of_high))
