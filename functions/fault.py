"""Fault current: a sine voltage switched onto a resistance and an inductance in series.

With phi = arctan(X/R), beta = closing_angle - phi, tau = X/(2 pi f R), w = 2 pi f:

    i(t) = sqrt(2) rms (sin(w t + beta) - sin(beta) exp(-t/tau))

Resistance 0 leaves a direct-current part that never dies away, reactance 0 has none.
"""

from __future__ import annotations

import math
from functools import cache
from typing import Any

import numpy as np

from tausheet.functions.arguments import Finite, NonNegative, Numbers, Positive
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError
from tausheet.functions.exact import (
    Array,
    excess_over_sine,
    fraction_of_product,
    lag_integrals,
)


@cell_function("FO_FAULT_CURRENT", "Fault current")
def fault_current(
    t: Finite,
    rms: Positive,
    resistance: NonNegative,
    reactance: NonNegative,
    frequency: Positive,
    closing_angle: Finite = 0.0,
) -> Numbers:
    """Fault current at a time after a sine voltage is switched onto R and L in series.

        i(t) = sqrt(2) rms (sin(w t + angle - phi) - sin(angle - phi) exp(-t / tau))
        w = 2 pi f,   phi = arctan(X / R),   tau = X / (w R)

    Arguments:
        t: time after switching (s); any number
        rms: settled symmetrical current (A); number > 0
        resistance: resistance of the circuit (ohm), not 0 together with reactance; number >= 0
        reactance: reactance of the circuit at the frequency (ohm); number >= 0
        frequency: frequency of the source (Hz); number > 0
        closing_angle: angle of the voltage sine at switching (degrees); any number

    Result: i(t) (A), 0 before t = 0, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or for a circuit of no resistance and no reactance, #VALUE!
    for a blank or a text.

    Assumes: no current before t = 0; a source voltage that does not sag; constant R and L.

    Example:
        >>> round(fault_current(0.01, 10000.0, 0.1, 1.0, 50.0), 3)
        24350.142

    References: closed form of L di/dt + R i = sqrt(2) V sin(w t + angle).
    """
    sine, cosine = _sine_cosine(closing_angle)
    to_cosine, to_sine = _responses(np.maximum(t, 0.0), resistance, reactance, frequency)
    current = math.sqrt(2) * rms * (sine * to_cosine + cosine * to_sine)
    return _circuit_checked(np.where(t < 0, 0.0, current), resistance, reactance)


@cell_function("FO_DC_OFFSET", "Fault current")
def dc_offset(
    t: Finite,
    rms: Positive,
    resistance: NonNegative,
    reactance: NonNegative,
    frequency: Positive,
    closing_angle: Finite,
) -> Numbers:
    """Decaying direct-current part of a fault current, with its sign.

        i_dc(t) = -sqrt(2) rms sin(angle - phi) exp(-t / tau)
        phi = arctan(X / R),   tau = X / (2 pi f R)

    Arguments:
        t: time after switching (s); any number
        rms: settled symmetrical current (A); number > 0
        resistance: resistance of the circuit (ohm), not 0 together with reactance; number >= 0
        reactance: reactance of the circuit at the frequency (ohm); number >= 0
        frequency: frequency of the source (Hz); number > 0
        closing_angle: angle of the voltage sine at switching (degrees); any number

    Result: direct-current part (A), 0 before t = 0, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or for a circuit of no resistance and no reactance, #VALUE!
    for a blank or a text.

    Assumes: no current before t = 0; a source voltage that does not sag; constant R and L.

    Example:
        >>> round(dc_offset(0.01, 10000.0, 0.1, 1.0, 50.0, 0.0), 3)
        10278.191

    References: closed form of L di/dt + R i = sqrt(2) V sin(w t + angle).
    """
    sine, cosine = _sine_cosine(closing_angle)
    impedance = np.hypot(resistance, reactance)
    against = (cosine * reactance - sine * resistance) / impedance
    decay = np.exp(-_decay_lengths(np.maximum(t, 0.0), resistance, reactance, frequency))
    part = math.sqrt(2) * rms * against * decay
    return _circuit_checked(np.where(t < 0, 0.0, part), resistance, reactance)


@cell_function("FO_DC_WORST", "Fault current")
def dc_worst(
    t: Finite,
    rms: Positive,
    resistance: NonNegative,
    reactance: NonNegative,
    frequency: Positive,
) -> Numbers:
    """Largest direct-current part of a fault current over all closing angles.

        sqrt(2) rms exp(-t / tau),   tau = X / (2 pi f R)

    Arguments:
        t: time after switching (s); any number
        rms: settled symmetrical current (A); number > 0
        resistance: resistance of the circuit (ohm), not 0 together with reactance; number >= 0
        reactance: reactance of the circuit at the frequency (ohm); number >= 0
        frequency: frequency of the source (Hz); number > 0

    Result: direct-current part (A), 0 before t = 0, in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or for a circuit of no resistance and no reactance, #VALUE!
    for a blank or a text.

    Assumes: no current before t = 0; a source voltage that does not sag; constant R and L.

    Example:
        >>> round(dc_worst(0.01, 10000.0, 0.1, 1.0, 50.0), 3)
        10329.454

    References: dc_offset at the closing angle phi - 90 degrees.
    """
    decay = np.exp(-_decay_lengths(np.maximum(t, 0.0), resistance, reactance, frequency))
    part = math.sqrt(2) * rms * decay
    return _circuit_checked(np.where(t < 0, 0.0, part), resistance, reactance)


@cell_function("FO_PEAK_FACTOR", "Fault current")
def peak_factor(resistance: NonNegative, reactance: NonNegative) -> Numbers:
    """Highest first peak of a fault current over all closing angles, over sqrt(2) rms.

    Over all angles the current at w t = u is at most sqrt(1 - 2 cos(u) e + e^2), e = exp(-u R/X);
    its highest value lies where sin(u) = (R/X) (e - cos(u)), with u from pi/2 to pi.

    Arguments:
        resistance: resistance of the circuit (ohm), not 0 together with reactance; number >= 0
        reactance: reactance of the circuit at the frequency (ohm); number >= 0

    Result: factor from 2 (no resistance) to 1 (no reactance), in the broadcast shape of the
    arguments.

    Errors: #NUM! outside the ranges or for a circuit of no resistance and no reactance, #VALUE!
    for a blank or a text.

    Assumes: no current before t = 0; a source voltage that does not sag; constant R and L.

    Example:
        >>> peak_factor(0.0, 1.0), round(peak_factor(0.1, 1.0), 6), peak_factor(1.0, 0.0)
        (2.0, 1.736773, 1.0)

    References: maximum over t and angle of the closed form; compared with the approximation
    1.02 + 0.98 exp(-3 R/X) of IEC 60909-0.
    """
    ratio = resistance / reactance
    cosine = resistance / np.hypot(resistance, reactance)
    lead = np.arctan2(resistance, reactance)
    u = math.pi - lead
    for _ in range(14):  # each pass divides the error by 7 or more, and it counts squared
        u = math.pi - lead - np.arcsin(cosine * np.exp(-ratio * u))
    return _circuit_checked(
        np.hypot(np.cos(u) - np.exp(-ratio * u), np.sin(u)), resistance, reactance
    )


@cell_function("FO_FAULT_I2T", "Fault current")
def fault_i2t(
    rms: Positive,
    resistance: NonNegative,
    reactance: NonNegative,
    frequency: Positive,
    closing_angle: Finite,
    t_to: Positive,
) -> Numbers:
    """Integral of the square of a fault current from switching to a time.

        integral from 0 to t_to of i(t)^2 dt,   i(t) as in FO_FAULT_CURRENT

    Arguments:
        rms: settled symmetrical current (A); number > 0
        resistance: resistance of the circuit (ohm), not 0 together with reactance; number >= 0
        reactance: reactance of the circuit at the frequency (ohm); number >= 0
        frequency: frequency of the source (Hz); number > 0
        closing_angle: angle of the voltage sine at switching (degrees); any number
        t_to: end of the integral (s); number > 0

    Result: the integral (A^2 s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or for a circuit of no resistance and no reactance, #VALUE!
    for a blank or a text.

    Assumes: no current before t = 0; a source voltage that does not sag; constant R and L.

    Example:
        >>> round(fault_i2t(10000.0, 0.1, 1.0, 50.0, 0.0, 0.02), 1)
        4254612.4

    References: closed form of the integral; for less than half a period, where its terms cancel,
    Gauss-Legendre quadrature of the square, which is exact to rounding there.
    """
    names = (resistance, reactance, frequency, closing_angle, t_to)
    early = 2 * math.pi * frequency * t_to < 3.0
    share = np.where(early, 0.0, _late_square_integral(*names))
    if early.any():
        broadcast = np.broadcast_arrays(*names, early)
        chosen = broadcast[-1]
        share = np.array(np.broadcast_to(share, chosen.shape))
        share[chosen] = _early_square_integral(*(values[chosen] for values in broadcast[:-1]))
    return _circuit_checked(2 * rms * rms * share, resistance, reactance)


def _circuit_checked(values: Any, resistance: Array, reactance: Array) -> Answer:
    return Answer(values).unless(
        (resistance == 0) & (reactance == 0),
        DomainError,
        "resistance and reactance are both 0, which limits no current; enter at least one of them",
    )


def _sine_cosine(degrees: Array) -> tuple[Array, Array]:
    from scipy.special import cosdg, sindg

    part = np.fmod(degrees, 360.0)
    return sindg(part), cosdg(part)


def _decay_lengths(t: Array, resistance: Array, reactance: Array, frequency: Array) -> Array:
    """t/tau; without reactance the decay is over at once."""
    return np.where(reactance == 0, np.inf, 2 * math.pi * frequency * t * resistance / reactance)


def _responses(
    t: Array, resistance: Array, reactance: Array, frequency: Array
) -> tuple[Array, Array]:
    """i(t)/(sqrt(2) rms) for a cosine voltage (angle 90) and a sine voltage (angle 0).

    Both are parts of exp(-j phi) (exp(j w t) - exp(-t/tau)). The first terms of the sine's
    response cancel for small t; there (w t) cos(phi) = (t/tau) sin(phi) is taken out of them.
    """
    impedance = np.hypot(resistance, reactance)
    cosine, sine = resistance / impedance, reactance / impedance
    h = _decay_lengths(t, resistance, reactance, frequency)
    gone = -np.expm1(-h)
    angle = 2 * math.pi * frequency * t
    part = 2 * math.pi * fraction_of_product(frequency, t)
    swing = np.sin(np.where(angle < 1, angle, part))
    half = np.sin(np.where(angle < 1, angle, part) / 2)
    real = gone - 2 * half * half
    short, _ = lag_integrals(np.minimum(h, 1.0))
    slow = sine * (short + 2 * half * half) - cosine * excess_over_sine(angle)
    to_sine = np.where((angle < 1) & (h < 1), slow, cosine * swing - sine * real)
    return cosine * real + sine * swing, to_sine


@cache
def _gauss() -> tuple[Array, Array]:
    """Nodes and weights from 0 to 1 of a Gauss-Legendre rule of 20 points."""
    nodes, weights = np.polynomial.legendre.leggauss(20)
    return (nodes + 1) / 2, weights / 2


_EDGES = np.array([2.0, 5.0, 10.0, 20.0, 40.0])
"""Ends of the panels in time constants; from the last on the decay is below rounding."""


def _early_square_integral(
    resistance: Array, reactance: Array, frequency: Array, angle: Array, t_to: Array
) -> Array:
    """Integral of (i / (sqrt(2) rms))^2 over less than half a period, panel by panel."""
    nodes, weights = _gauss()
    lengths = _decay_lengths(t_to, resistance, reactance, frequency)
    ends = np.ones((t_to.size, _EDGES.size + 2))
    ends[:, 0] = 0.0
    ends[:, 1:-1] = np.minimum(_EDGES / lengths[:, np.newaxis], 1.0)
    starts, widths = ends[:, :-1, np.newaxis], np.diff(ends)[:, :, np.newaxis]
    along = (starts + widths * nodes).reshape(t_to.size, -1)
    weight = (widths * weights).reshape(t_to.size, -1)
    column = (resistance[:, np.newaxis], reactance[:, np.newaxis], frequency[:, np.newaxis])
    to_cosine, to_sine = _responses(along * t_to[:, np.newaxis], *column)
    sine, cosine = _sine_cosine(angle[:, np.newaxis])
    current = sine * to_cosine + cosine * to_sine
    integral: Array = t_to * np.sum(weight * current * current, axis=1)
    return integral


def _late_square_integral(
    resistance: Array, reactance: Array, frequency: Array, angle: Array, t_to: Array
) -> Array:
    """Integral of (i / (sqrt(2) rms))^2 in closed form."""
    w = 2 * math.pi * frequency
    impedance = np.hypot(resistance, reactance)
    cosine, sine = resistance / impedance, reactance / impedance
    sin_a, cos_a = _sine_cosine(angle)
    sin_b, cos_b = sin_a * cosine - cos_a * sine, cos_a * cosine + sin_a * sine
    turn = 2 * math.pi * fraction_of_product(frequency, t_to)
    sin_t, cos_t = np.sin(turn), np.cos(turn)
    h = _decay_lengths(t_to, resistance, reactance, frequency)
    steady = t_to / 2 - (cos_t * (cos_b**2 - sin_b**2) - sin_t * 2 * sin_b * cos_b) * sin_t / (
        2 * w
    )
    mixed = -2 * sin_b * sine / w * (sin_a - np.exp(-h) * (sin_t * cos_a + cos_t * sin_a))
    decayed = sin_b**2 * t_to * np.where(h == 0, 1.0, -np.expm1(-2 * h) / (2 * h))
    result: Array = steady + mixed + decayed
    return result
