"""Time constants of parts and networks, and resistance at a conductor's temperature."""

from __future__ import annotations

import math
from typing import Annotated, Any

import numpy as np

from tausheet.functions.arguments import (
    Column,
    Finite,
    NonNegative,
    Number,
    Numbers,
    Positive,
    words,
)
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.errors import NotAvailable
from tausheet.functions.exact import quotient
from tausheet.functions.step_times import lags_to


def _tau_rc_scalar(resistance: float, capacitance: float) -> float | None:
    if not (type(resistance) is type(capacitance) is float and resistance >= 0 <= capacitance):
        return None
    tau = resistance * capacitance
    return tau if math.isfinite(tau) else None


@cell_function("FO_TAU_RC", "Time constants", scalar=_tau_rc_scalar)
def tau_rc(resistance: NonNegative, capacitance: NonNegative) -> Numbers:
    """Time constant of a resistor and a capacitor.

        tau = R C

    Arguments:
        resistance: resistance seen by the capacitor (ohm); number >= 0
        capacitance: capacitance (F); number >= 0

    Result: time constant (s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> tau_rc(47e3, 100e-6)
        4.7

    References: definition.
    """
    return resistance * capacitance


@cell_function("FO_TAU_RL", "Time constants")
def tau_rl(resistance: Positive, inductance: NonNegative) -> Numbers:
    """Time constant of a resistor and an inductor.

        tau = L / R

    Arguments:
        resistance: resistance seen by the inductor (ohm); number > 0
        inductance: inductance (H); number >= 0

    Result: time constant (s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> tau_rl(20.0, 1.0)
        0.05

    References: definition.
    """
    return inductance / resistance


@cell_function("FO_TAU_RX", "Time constants")
def tau_rx(resistance: Positive, reactance: NonNegative, frequency: Positive) -> Numbers:
    """Time constant of a resistance and a reactance that is known at a frequency.

        tau = X / (2 pi f R)

    Arguments:
        resistance: resistance (ohm, or any unit that reactance has too); number > 0
        reactance: inductive reactance at the frequency, same unit; number >= 0
        frequency: frequency at which the reactance holds (Hz); number > 0

    Result: time constant (s), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges, #VALUE! for a blank or a text.

    Assumes: resistance and reactance in series, constant.

    Example:
        >>> round(tau_rx(1.0, 14.137166941154069, 50.0), 12)
        0.045

    References: definition, X = 2 pi f L.
    """
    return quotient(reactance, resistance, frequency, 2 * np.pi)


@cell_function("FO_PARALLEL", "Time constants", matrix=True)
def parallel(values: Annotated[Any, Column(Number(low=0), blanks="ignore")]) -> Numbers:
    """Resistors or inductors in parallel, or capacitors in series.

        1 / (1/a + 1/b + ...)

    Arguments:
        values: the parts, blanks ignored; a range, each number >= 0

    Result: one number, in the unit of the values; 0 when one of them is 0.

    Errors: #NUM! for a negative number, #VALUE! for a text or when all are blank.

    Assumes: nothing.

    Example:
        >>> parallel([30.0, 60.0, None])
        20.0

    References: Kirchhoff's laws.
    """
    least = values.min()
    if least == 0:
        return 0.0
    return float(least / math.fsum((least / values).tolist()))


@cell_function("FO_TAU_FOR", "Time constants")
def tau_for(level: Finite, t: Positive, initial: Finite, final: Finite) -> Numbers:
    """Time constant with which a step response is at a level at a time.

        tau = t / ln((final - initial) / (final - level))

    Arguments:
        level: value reached at time t, strictly between initial and final; any number
        t: time at which it is reached (s); number > 0
        initial: value at t = 0; any number
        final: value that it heads for; any number

    Result: time constant (s), in the broadcast shape of the arguments.

    Errors: #N/A when level is not strictly between initial and final; #NUM! outside the ranges,
    #VALUE! for a blank or a text.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(tau_for(60.0, 5.0, 680.0, 0.0), 9)
        2.059521628

    References: closed form of the step response, solved for tau.
    """
    lags, between = lags_to(level, initial, final)
    return Answer(t / lags).unless(
        ~between,
        NotAvailable,
        "level is {level}, which is not strictly between initial, {initial}, and final, {final}; "
        "enter a level between them",
    )


_COEFFICIENTS = {"copper": 0.00393, "aluminium": 0.00403}
"""Temperature coefficients of resistance at 20 C (1/K)."""


@cell_function("FO_RESISTANCE_AT", "Time constants")
def resistance_at(
    resistance_20: NonNegative,
    temperature: Annotated[Any, Number(low=-200, high=1000)],
    material: Annotated[str, words("copper", "aluminium")] = "copper",
) -> Numbers:
    """Resistance at a conductor temperature, from its value at 20 C.

        R = R20 (1 + a (T - 20)),   a = 0.00393 (copper), 0.00403 (aluminium) per kelvin

    Arguments:
        resistance_20: resistance at 20 C (ohm); number >= 0
        temperature: conductor temperature (degC); number >= -200 and <= 1000
        material: conductor, copper when left out; "copper", "aluminium"

    Result: resistance (ohm), in the broadcast shape of the arguments.

    Errors: #NUM! outside the ranges; #VALUE! for a blank, a text where a number belongs, or an
    unknown word.

    Assumes: the straight line of the standards, which holds best from -50 to 200 C (common
    practice); soft copper of full conductivity, hard-drawn aluminium.

    Example:
        >>> round(resistance_at(10.0, 120.0), 6)
        13.93

    References: IEC 60028 for copper (1/0.00393 = 254.45 = 234.5 + 20); IEC 60889 for aluminium,
    from memory. IEC 60034-1 rounds the two lines to 235 + T and 225 + T.
    """
    return resistance_20 * (1 + _COEFFICIENTS[material] * (temperature - 20))
