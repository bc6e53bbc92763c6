"""First-order low-pass and high-pass in the frequency domain."""

from __future__ import annotations

import math
from typing import Annotated, TypeAlias

import numpy as np

from tausheet.functions.arguments import NonNegative, Numbers, Positive, words
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError
from tausheet.functions.exact import Array

Kind: TypeAlias = Annotated[str, words("low-pass", "high-pass")]


@cell_function("FO_CORNER_FREQUENCY", "Periodic and frequency")
def corner_frequency(tau: Positive) -> Numbers:
    """Frequency at which a first-order low-pass or high-pass is 3 dB down.

        f = 1 / (2 pi tau)

    Arguments:
        tau: time constant (s); number > 0

    Result: corner frequency (Hz), in the shape of tau.

    Errors: #NUM! outside the range, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(corner_frequency(0.001), 6)
        159.154943

    References: definition.
    """
    return 1 / (2 * math.pi) / tau


@cell_function("FO_TAU_AT", "Periodic and frequency")
def tau_at(frequency: Positive) -> Numbers:
    """Time constant whose corner is at a frequency.

        tau = 1 / (2 pi f)

    Arguments:
        frequency: corner frequency (Hz); number > 0

    Result: time constant (s), in the shape of frequency.

    Errors: #NUM! outside the range, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(tau_at(50.0), 9)
        0.003183099

    References: definition.
    """
    return 1 / (2 * math.pi) / frequency


@cell_function("FO_GAIN_DB", "Periodic and frequency")
def gain_db(frequency: NonNegative, tau: Positive, kind: Kind = "low-pass") -> Numbers:
    """Gain of a first-order low-pass or high-pass, in decibels.

        low-pass: -10 log10(1 + w^2);   high-pass: -10 log10(1 + 1/w^2);   w = 2 pi f tau

    Arguments:
        frequency: frequency of a steady sine (Hz); number >= 0
        tau: time constant (s); number > 0
        kind: which of the two, low-pass when left out; "low-pass", "high-pass"

    Result: gain (dB), 0 or below, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges and for a high-pass at frequency 0, #VALUE! for a blank, a
    text where a number belongs or an unknown word.

    Assumes: one energy store, constant parts, a gain of 1 in the pass band.

    Example:
        >>> round(gain_db(1000.0, 0.001), 6)
        -16.072235

    References: magnitude of 1/(1 + jw) and jw/(1 + jw).
    """
    w = 2 * math.pi * frequency * tau
    log_w = np.where(
        (w > 1e-290) & (w < 1e290),
        np.log10(w),
        np.log10(frequency) + (np.log10(tau) + math.log10(2 * math.pi)),
    )
    if kind == "low-pass":
        return _loss(w, log_w)
    return Answer(_loss(1 / w, -log_w)).unless(
        frequency == 0,
        DomainError,
        "frequency is 0, at which a high-pass lets nothing through; enter a frequency above 0",
    )


def _loss(w: Array, log_w: Array) -> Array:
    """-10 log10(1 + w^2), from the far side where w is large."""
    small = np.minimum(w, 1.0)
    inverse = 1 / np.maximum(w, 1.0)
    per_neper = 10 / math.log(10)
    result: Array = np.where(
        w < 1,
        0.0 - per_neper * np.log1p(small * small),
        -20 * log_w - per_neper * np.log1p(inverse * inverse),
    )
    return result


@cell_function("FO_PHASE", "Periodic and frequency")
def phase(frequency: NonNegative, tau: Positive, kind: Kind = "low-pass") -> Numbers:
    """Phase of the output of a first-order low-pass or high-pass against its input.

        low-pass: -arctan(w);   high-pass: arctan(1/w);   w = 2 pi f tau

    Arguments:
        frequency: frequency of a steady sine (Hz); number >= 0
        tau: time constant (s); number > 0
        kind: which of the two, low-pass when left out; "low-pass", "high-pass"

    Result: phase (degrees), from -90 to 0 for a low-pass, 0 to 90 for a high-pass, in the
    broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank, a text where a number belongs or an
    unknown word.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(phase(1000.0, 0.001), 6)
        -80.956939

    References: angle of 1/(1 + jw) and jw/(1 + jw).
    """
    w = 2 * math.pi * frequency * tau
    if kind == "low-pass":
        return -np.degrees(np.arctan(w))
    return np.degrees(np.arctan2(1.0, w))


@cell_function("FO_NOISE_BANDWIDTH", "Periodic and frequency")
def noise_bandwidth(tau: Positive) -> Numbers:
    """Bandwidth of the ideal filter that lets as much white noise through as a first-order one.

        B = 1 / (4 tau)

    Arguments:
        tau: time constant of the low-pass (s); number > 0

    Result: bandwidth (Hz), in the shape of tau.

    Errors: #NUM! outside the range, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts, white noise.

    Example:
        >>> noise_bandwidth(0.001)
        250.0

    References: integral of 1/(1 + (2 pi f tau)^2) over f from 0 on.
    """
    return 0.25 / tau
