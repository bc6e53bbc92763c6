"""Energy in a store, heat in a resistor, and how long a store carries a load."""

from __future__ import annotations

import math
from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import (
    Finite,
    NonNegative,
    Numbers,
    Positive,
    Time,
    words,
)
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import DomainError, NotAvailable
from tausheet.functions.exact import Array, lag_integrals, sum_of_products


@cell_function("FO_ENERGY_C", "Energy and integrals")
def energy_c(capacitance: Positive, voltage: Finite) -> Numbers:
    """Energy stored in a capacitor.

        W = C V^2 / 2

    Arguments:
        capacitance: capacitance (F); number > 0
        voltage: voltage across the capacitor (V); any number

    Result: energy (J), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: a capacitance that does not change with voltage.

    Example:
        >>> round(energy_c(0.0047, 680.0), 6)
        1086.64

    References: definition.
    """
    return 0.5 * (capacitance * voltage) * voltage


@cell_function("FO_ENERGY_L", "Energy and integrals")
def energy_l(inductance: Positive, current: Finite) -> Numbers:
    """Energy stored in an inductor.

        W = L I^2 / 2

    Arguments:
        inductance: inductance (H); number > 0
        current: current through the inductor (A); any number

    Result: energy (J), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: an inductance that does not change with current (no saturation).

    Example:
        >>> energy_l(1.5, 8.0)
        48.0

    References: definition.
    """
    return 0.5 * (inductance * current) * current


@cell_function("FO_C_FOR_ENERGY", "Energy and integrals")
def c_for_energy(energy: Positive, v_from: Positive, v_to: NonNegative) -> Numbers:
    """Capacitance that gives up an energy while its voltage falls from one value to another.

        C = 2 W / ((v_from - v_to) (v_from + v_to))

    Arguments:
        energy: energy to be given up (J); number > 0
        v_from: voltage at the start (V), above v_to; number > 0
        v_to: voltage at the end (V); number >= 0

    Result: capacitance (F), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges or when v_from is not above v_to, #VALUE! for a blank or a
    text.

    Assumes: no series resistance, a capacitance that does not change with voltage.

    Example:
        >>> c_for_energy(32.0, 100.0, 60.0)
        0.01

    References: definition of the energy in a capacitor.
    """
    mean = v_from / 2 + v_to / 2
    return Answer(energy / mean / (v_from - v_to)).unless(
        v_from <= v_to,
        DomainError,
        "v_from is {v_from} and v_to is {v_to}, but a capacitor gives up energy only while its "
        "voltage falls; enter a v_from above v_to",
    )


@cell_function("FO_I2T", "Energy and integrals")
def i2t(
    tau: Positive, initial: Finite, final: Finite, t_from: Time = 0.0, t_to: Time = math.inf
) -> Numbers:
    """Integral of the square of a step response over a window: A^2 s when y is a current.

        integral from t_from to t_to of y(t)^2 dt,   y = final + (initial - final) exp(-t / tau)

    Before t = 0, y rests at initial, so a window that begins earlier includes initial^2 times
    the time before 0.

    Arguments:
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        final: value that y heads for; any number
        t_from: start of the window (s), 0 when left out; any number
        t_to: end of the window (s), for ever when left out, possible only when final is 0; any
            number

    Result: the integral (unit of y, squared, times s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, when t_to is not after t_from, or when t_to is left out and
    final is not 0; #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> i2t(0.5, 10.0, 0.0)
        25.0

    References: closed form of the integral.
    """
    return _window_checked(square_integral(tau, initial, final, t_from, t_to), final, t_from, t_to)


@cell_function("FO_DISSIPATED", "Energy and integrals")
def dissipated(
    resistance: Positive,
    quantity: Annotated[str, words("current", "voltage")],
    tau: Positive,
    initial: Finite,
    final: Finite,
    t_from: Time = 0.0,
    t_to: Time = math.inf,
) -> Numbers:
    """Heat in a resistor whose current, or whose voltage, is a step response.

        W = R integral of i^2 dt,   or   W = integral of v^2 dt / R

    Before t = 0, y rests at initial, so a window that begins earlier includes the heat of the
    time before 0.

    Arguments:
        resistance: resistance (ohm); number > 0
        quantity: what initial and final are; "current", "voltage"
        tau: time constant (s); number > 0
        initial: current (A) or voltage (V) until t = 0; any number
        final: current (A) or voltage (V) that it heads for; any number
        t_from: start of the window (s), 0 when left out; any number
        t_to: end of the window (s), for ever when left out, possible only when final is 0; any
            number

    Result: heat (J), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, when t_to is not after t_from, or when t_to is left out and
    final is not 0; #VALUE! for a blank, a text where a number belongs, or an unknown word.

    Assumes: one energy store, constant parts.

    Example:
        >>> dissipated(100.0, "voltage", 2.0, 50.0, 0.0)
        25.0

    References: Joule's law and the closed form of the integral.
    """
    integral = square_integral(tau, initial, final, t_from, t_to)
    heat = resistance * integral if quantity == "current" else integral / resistance
    return _window_checked(heat, final, t_from, t_to)


def _window_checked(values: Any, final: Array, t_from: Array, t_to: Array) -> Answer:
    return (
        Answer(values)
        .unless(
            t_to <= t_from,
            DomainError,
            "t_to is {t_to}, which is not after t_from, {t_from}; enter a window that ends after "
            "it begins",
        )
        .unless(
            np.isinf(t_to) & (final != 0),
            DomainError,
            "t_to is left out while final is {final}, so that the integral grows without end; "
            "enter t_to, or a final of 0",
        )
    )


def square_integral(tau: Array, initial: Array, final: Array, t_from: Array, t_to: Array) -> Array:
    """Integral of y^2 for a step response that rests at `initial` before t = 0.

    With y0 the value where the window begins, h its length in time constants, G = final - y0:
    short windows: tau (y0^2 h + 2 y0 G p1(h) + G^2 p2(h)), p1 and p2 the integrals of 1 - exp(-s)
    and its square; long ones: final^2 T + tau (2 final (y0 - final) q + (y0 - final)^2 q (2-q)/2),
    q = 1 - exp(-h). Changing at h = 1.5 neither loses more than a decimal digit when y changes
    sign inside the window.
    """
    before = np.maximum(np.minimum(t_to, 0.0) - np.minimum(t_from, 0.0), 0.0)
    start = np.maximum(t_from, 0.0)
    length = np.maximum(t_to, 0.0) - start
    h = length / tau
    u = -start / tau
    y0 = np.where(
        u > -0.5,
        initial - (final - initial) * np.expm1(u),
        final + (initial - final) * np.exp(u),
    )
    gap = final - y0
    short = np.minimum(h, 1.5)
    p1, p2 = lag_integrals(short)
    in_short = y0 * y0 * (short * tau) + tau * gap * (2 * y0 * p1 + gap * p2)
    q = -np.expm1(-h)
    steady = np.where(final == 0, 0.0, final * final * length)
    in_long = steady - tau * gap * q * (2 * final - gap * (1 - q / 2))
    result: Array = initial * initial * before + np.where(h < 1.5, in_short, in_long)
    return result


@cell_function("FO_RIDE_THROUGH", "Energy and integrals")
def ride_through(
    capacitance: Positive,
    v_from: Positive,
    v_to: NonNegative,
    demand: Positive,
    kind: Annotated[str, words("resistance", "current", "power")],
    series_resistance: NonNegative = 0.0,
) -> Numbers:
    """Time that a capacitor feeds a load until the voltage at the load has fallen to v_to.

        resistance RL:  t = (R + RL) C ln(u0 / v_to),              u0 = v_from RL / (R + RL)
        current I:      t = C (u0 - v_to) / I,                     u0 = v_from - R I
        power P:        t = C (u0^2 - v_to^2) / (2 P) - R C ln(u0 / v_to),
                                            u0 = (v_from + sqrt(v_from^2 - 4 P R)) / 2

    u0 is the voltage at the load just after it takes over, R the series resistance.

    Arguments:
        capacitance: capacitance (F); number > 0
        v_from: voltage inside the capacitor at the start (V); number > 0
        v_to: lowest voltage at the load (V); number >= 0
        demand: what the load takes (ohm, A or W, as kind says); number > 0
        kind: what demand is; "resistance", "current", "power"
        series_resistance: resistance between capacitor and load (ohm); number >= 0

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when the load's voltage starts below v_to, when a constant power collapses
    through the series resistance at or above v_to, or when a resistive load would have to reach
    0 V; #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: a constant capacitance; a demand that stays what it is down to v_to.

    Example:
        >>> round(ride_through(0.01, 100.0, 60.0, 500.0, "power", 0.5), 5)
        0.05651

    References: C du/dt = -i with i = u/RL, I or P/u, integrated in closed form.
    """
    arguments = (capacitance, v_from, v_to, demand, series_resistance)
    if kind == "resistance":
        return _into_resistance(*arguments)
    return _at_current(*arguments) if kind == "current" else _at_power(*arguments)


_STARTS_BELOW = (
    "the voltage at the load starts below v_to, {v_to}, from v_from, {v_from}, with demand "
    "{demand} and series_resistance {series_resistance}; enter a lower v_to or a smaller load"
)


def _into_resistance(c: Array, v_from: Array, v_to: Array, load: Array, series: Array) -> Answer:
    excess = sum_of_products((v_from, load), (-v_to, load), (-v_to, series))
    total = series + load
    over = excess / total / v_to
    far = np.log(v_from * (load / total)) - np.log(v_to)
    return (
        Answer(total * c * np.where(np.isinf(over), far, np.log1p(over)))
        .unless(
            v_to == 0,
            NotAvailable,
            "v_to is 0, which the voltage at a resistive load never reaches; enter a v_to above 0",
        )
        .unless(excess < 0, NotAvailable, _STARTS_BELOW)
    )


def _at_current(c: Array, v_from: Array, v_to: Array, current: Array, series: Array) -> Answer:
    excess = sum_of_products((v_from, 1.0), (-v_to, 1.0), (-current, series))
    return Answer(c * excess / current).unless(excess < 0, NotAvailable, _STARTS_BELOW)


def _at_power(c: Array, v_from: Array, v_to: Array, power: Array, series: Array) -> Answer:
    """Time at constant power, free of cancellation.

    The load's voltage u solves u^2 - v u + P R = 0, v inside the capacitor. With d = u0 - v_to,
    d^2 + b d + e = 0, b = 2 v_to - v_from, e = v_to^2 - v_from v_to + P R <= 0 while the load
    starts at or above v_to. Then, with r = d / v_to, every term of
    t = C/P ((v_to^2 - P R) r + d^2 / 2 + P R (r - ln(1 + r))) is positive.
    """
    root_squared = sum_of_products((v_from, v_from), (-4 * power, series))
    above_collapse = sum_of_products((v_to, v_to), (-power, series))
    e = sum_of_products((v_to, v_to), (-v_from, v_to), (power, series))
    root = np.sqrt(np.maximum(root_squared, 0.0))
    b = 2 * v_to - v_from
    d = np.where(b > 0, -2 * e / (b + root), (root - b) / 2)
    fall = d / v_to
    held = above_collapse * fall + power * series * _excess_over_log(fall)
    energy = d * d / 2 + np.where(series == 0, v_to * d, held)
    return (
        Answer(c * energy / power)
        .unless(
            root_squared < 0,
            NotAvailable,
            "the load collapses at once: from v_from, {v_from}, no more than v_from^2 / (4 R) can "
            "be drawn through series_resistance, {series_resistance}, but demand is {demand}; "
            "enter a smaller demand or series_resistance, or a higher v_from",
        )
        .unless(
            above_collapse < 0,
            NotAvailable,
            "the load collapses before its voltage has fallen to v_to, {v_to}: demand {demand} "
            "through series_resistance {series_resistance} holds only down to sqrt(P R); enter a "
            "higher v_to",
        )
        .unless(e > 0, NotAvailable, _STARTS_BELOW)
    )


def _excess_over_log(r: Array) -> Array:
    """r - ln(1 + r) for r >= 0, to full relative precision."""
    s = np.minimum(r, 1.0) / (2 + np.minimum(r, 1.0))
    odd = np.zeros_like(s)
    for n in range(33, 1, -2):  # ln(1 + r) = 2 (s + s^3/3 + s^5/5 + ...)
        odd = (odd + 1.0 / n) * s * s
    result: Array = np.where(r < 1, r * s - 2 * s * odd, r - np.log1p(r))
    return result
