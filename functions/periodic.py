"""Settled response to a forcing that repeats."""

from __future__ import annotations

from typing import Annotated, Any, NamedTuple

import numpy as np

from tausheet.functions.arguments import ClosedFraction, Finite, Positive, words
from tausheet.functions.catalogue import cell_function
from tausheet.functions.exact import Array


class Ripple(NamedTuple):
    """Settled response to a square forcing."""

    minimum: Any
    maximum: Any
    peak_to_peak: Any
    mean: Any


@cell_function("FO_RIPPLE", "Periodic and frequency")
def ripple(
    tau: Positive,
    low: Finite,
    high: Finite,
    period: Positive,
    duty: ClosedFraction,
    what: Annotated[str | None, words("min", "max", "pp", "mean")] = None,
) -> Any:
    """Ripple that is left when a square forcing has settled: minimum, maximum, peak-to-peak, mean.

        maximum = low + (high - low) (1 - exp(-a)) / (1 - exp(-a - b))
        minimum = low + (high - low) (1 - exp(-a)) exp(-b) / (1 - exp(-a - b))
        mean = low + (high - low) duty
        a = duty period / tau,   b = (1 - duty) period / tau

    For high below low the two extremes change places.

    Arguments:
        tau: time constant (s); number > 0
        low: level for the rest of each period; any number
        high: level for duty x period; any number
        period: period of the forcing (s); number > 0
        duty: share of the period at high, a fraction; number >= 0 and <= 1
        what: one result alone, all four when left out; "min", "max", "pp", "mean"

    Result: minimum, maximum, peak-to-peak and mean, in the unit of low and high.

    Errors: #NUM! outside the ranges, #VALUE! for a blank, a text or an unknown word.

    Assumes: one energy store, constant parts, a response free to follow in both directions.

    Example:
        >>> round(ripple(1.0, 0.0, 10.0, 0.2, 0.5, "pp"), 12)
        0.499583749579

    References: closed form of the periodic solution of tau dy/dt + y = x.
    """
    on, off = duty, 1 - duty
    cycles = period / tau
    rise, fall = -np.expm1(-on * cycles), -np.expm1(-off * cycles)
    whole = -np.expm1(-cycles)
    tiny = whole == 0  # a period that is nothing against tau: the response does not move
    whole = np.where(tiny, 1.0, whole)
    swing = high - low
    # distance of each extreme from low, as a share of the swing, and its distance from high
    top = np.where(tiny, on, rise / whole), np.where(tiny, off, np.exp(-on * cycles) * fall / whole)
    bottom = (
        np.where(tiny, on, np.exp(-off * cycles) * rise / whole),
        np.where(tiny, off, fall / whole),
    )
    after_high = _between(low, high, *top)
    after_low = _between(low, high, *bottom)
    results = Ripple(
        np.where(swing < 0, after_high, after_low),
        np.where(swing < 0, after_low, after_high),
        np.abs(swing) * rise * (fall / whole),
        _between(low, high, on, off),
    )
    picked = {"min": 0, "max": 1, "pp": 2, "mean": 3}
    return results if what is None else results[picked[what]]


def _between(low: Array, high: Array, from_low: Array, from_high: Array) -> Array:
    """The level at a share of the way, measured from the nearer end."""
    swing = high - low
    level: Array = np.where(from_low < from_high, low + swing * from_low, high - swing * from_high)
    return level
