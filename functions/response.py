"""Response y(t) of tau dy/dt + y = x(t) for one forcing that starts at t = 0."""

from __future__ import annotations

import math

import numpy as np

from tausheet.functions.arguments import Finite, NonNegative, Numbers, Positive
from tausheet.functions.catalogue import cell_function


def _step_scalar(
    t: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> float | None:
    if not (
        type(t) is type(tau) is type(initial) is type(final) is type(delay) is float
        and tau > 0.0 <= delay
        and tau + delay < math.inf
        and math.isfinite(t + initial + final)
    ):
        return None
    if t <= delay:
        return initial
    u = (delay - t) / tau
    if u > -0.5:
        return initial - (final - initial) * math.expm1(u)
    return final + (initial - final) * math.exp(u)


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
    u = -np.maximum(t - delay, 0.0) / tau
    early = initial - (final - initial) * np.expm1(u)
    return np.where(u > -0.5, early, final + (initial - final) * np.exp(u))
