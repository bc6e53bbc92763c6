"""When a step response reaches a level, and how long it takes to rise and to settle."""

from __future__ import annotations

import math
from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import (
    Finite,
    NonNegative,
    Number,
    Numbers,
    OpenFraction,
    Positive,
)
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError, NotAvailable
from tausheet.functions.exact import Array

Share = Annotated[Any, Number(low=0, low_open=True, high=1)]


def lags_to(level: Any, initial: Any, final: Any) -> tuple[Array, Any]:
    """Time constants that a step response takes to a level, and whether it lies strictly between.

    ln((final - initial) / (final - level)); any number where the level does not lie between.
    """
    done, left = level - initial, final - level
    if not np.isfinite(done + left).all():
        done, left = level / 2 - initial / 2, final / 2 - level / 2
    between = ((initial < level) & (level < final)) | ((initial > level) & (level > final))
    ratio = np.where(between, done, 1.0) / np.where(between, left, 1.0)
    lags: Array = np.log1p(ratio)
    if np.isinf(ratio).any():
        lags = np.where(np.isinf(ratio), np.log(np.abs(done)) - np.log(np.abs(left)), lags)
    return lags, between


def _time_to_scalar(
    level: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> float | None:
    if not (
        type(level) is type(tau) is type(initial) is type(final) is type(delay) is float
        and 0.0 < tau < math.inf
        and 0.0 <= delay < math.inf
        and (initial < level < final or initial > level > final)
    ):
        return None
    done, left = level - initial, final - level
    if not math.isfinite(done + left):
        return None
    t = delay + tau * math.log1p(done / left)
    return t if math.isfinite(t) else None


@cell_function("FO_TIME_TO", "Crossing time", scalar=_time_to_scalar)
def time_to(
    level: Finite, tau: Positive, initial: Finite, final: Finite, delay: NonNegative = 0.0
) -> Numbers:
    """First time at which a step response is at a level.

        t = delay + tau ln((final - initial) / (final - level)),   0 when it starts there

    Arguments:
        level: value to be reached; any number
        tau: time constant (s); number > 0
        initial: value of y until the delay has passed; any number
        final: value that y heads for; any number
        delay: time from t = 0 until the step (s); number >= 0

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when the level is never reached: beyond initial or final, or final itself, which
    y only approaches. #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(time_to(60.0, 220.9, 680.0, 0.0), 3)
        536.29

    References: closed form of the step response, solved for t.
    """
    there = level == initial
    lags, between = lags_to(level, initial, final)
    return Answer(np.where(there, 0.0, delay + tau * lags)).unless(
        ~there & ~between,
        NotAvailable,
        "level is {level}, which is never reached on the way from initial, {initial}, to final, "
        "{final}; enter a level between them (final itself is only approached)",
    )


def _until_below_scalar(level: float, tau: float, initial: float, final: float) -> float | None:
    if final < level < initial:
        return _time_to_scalar(level, tau, initial, final)
    return None


def _until_above_scalar(level: float, tau: float, initial: float, final: float) -> float | None:
    if initial < level < final:
        return _time_to_scalar(level, tau, initial, final)
    return None


@cell_function("FO_TIME_UNTIL_BELOW", "Crossing time", scalar=_until_below_scalar)
def time_until_below(level: Finite, tau: Positive, initial: Finite, final: Finite) -> Numbers:
    """Time from which a step response stays at or below a level.

        0 when it does from the start, else tau ln((final - initial) / (final - level))

    Arguments:
        level: value to stay at or below; any number
        tau: time constant (s); number > 0
        initial: value of y at t = 0; any number
        final: value that y heads for; any number

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when it never stays there: final above the level, or equal to it while y comes
    from above, which it only approaches. #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(time_until_below(60.0, 220.9, 680.0, 0.0), 3)
        536.29
        >>> time_until_below(60.0, 1.0, 12.0, 0.0)
        0.0

    References: closed form of the step response, solved for t.
    """
    return _until(level, tau, initial, final, initial <= level, final <= level, "below")


@cell_function("FO_TIME_UNTIL_ABOVE", "Crossing time", scalar=_until_above_scalar)
def time_until_above(level: Finite, tau: Positive, initial: Finite, final: Finite) -> Numbers:
    """Time from which a step response stays at or above a level.

        0 when it does from the start, else tau ln((final - initial) / (final - level))

    Arguments:
        level: value to stay at or above; any number
        tau: time constant (s); number > 0
        initial: value of y at t = 0; any number
        final: value that y heads for; any number

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when it never stays there: final below the level, or equal to it while y comes
    from below, which it only approaches. #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(time_until_above(3.0, 0.1, 0.0, 5.0), 6), time_until_above(3.0, 1.0, 3.0, 5.0)
        (0.091629, 0.0)

    References: closed form of the step response, solved for t.
    """
    return _until(level, tau, initial, final, initial >= level, final >= level, "above")


def _until(
    level: Array, tau: Array, initial: Array, final: Array, starts: Any, ends: Any, side: str
) -> Answer:
    lags, between = lags_to(level, initial, final)
    always = starts & ends
    return Answer(np.where(always, 0.0, tau * lags)).unless(
        ~always & ~(between & ends),
        NotAvailable,
        f"y never stays at or {side} level, {{level}}, on its way from initial, {{initial}}, to "
        f"final, {{final}}; enter a final on the other side of the level",
    )


@cell_function("FO_RISE_TIME", "Crossing time")
def rise_time(tau: Positive, low: OpenFraction = 0.1, high: OpenFraction = 0.9) -> Numbers:
    """Time that a step response takes from one share of the step to another.

        t = tau ln((1 - low) / (1 - high))

    Arguments:
        tau: time constant (s); number > 0
        low: share of the step at the start, 0.1 when left out; number > 0 and < 1
        high: share of the step at the end, 0.9 when left out; number > 0 and < 1

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or when high is not above low; #VALUE! for a text or a blank
    tau.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(rise_time(1.0), 6)
        2.197225

    References: common practice, ln 9 for 10 % to 90 %.
    """
    return Answer(tau * np.log1p((high - low) / (1 - high))).unless(
        high <= low,
        DomainError,
        "high is {high}, which is not above low, {low}; enter a high share above the low one",
    )


@cell_function("FO_SETTLING_TIME", "Crossing time")
def settling_time(tau: Positive, tolerance: Share) -> Numbers:
    """Time until a step response stays within a tolerance of its final level.

        t = tau ln(1 / tolerance)

    Arguments:
        tau: time constant (s); number > 0
        tolerance: distance allowed, as a share of the step; number > 0 and <= 1

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(settling_time(1.0, 0.01), 6)
        4.60517

    References: closed form of the step response, solved for t.
    """
    return -tau * np.log(tolerance) + 0.0
