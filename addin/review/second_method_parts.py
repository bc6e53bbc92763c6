"""Second methods of time constants, energies, faults, ripple, frequency and fits.

Each gives the value expected, and how near counts as the same, as in second_method_results.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from scipy.integrate import quad
from scipy.optimize import curve_fit, minimize_scalar

from tausheet.addin.review import second_method_shapes as shapes
from tausheet.addin.review.second_method_course import (
    NEAR,
    Course,
    Expected,
    arrival,
    constant,
)


def tau_rc(r: float, resistance: float, capacitance: float) -> Expected | None:
    """C dv/dt = (1 V - v) / R: the initial slope, 1 V over tau, measured over a short time."""
    return _by_slope(r, resistance * capacitance)


def tau_rl(r: float, resistance: float, inductance: float) -> Expected | None:
    """L di/dt = 1 V - R i, in units of the final current."""
    return _by_slope(r, inductance / resistance)


def tau_rx(r: float, resistance: float, reactance: float, frequency: float) -> Expected | None:
    """L di/dt = 1 V - R i, with L = X / (2 pi f)."""
    return _by_slope(r, reactance / (2 * math.pi * frequency) / resistance)


def _by_slope(r: float, tau: float) -> Expected | None:
    """y from 0 towards 1 for the time r is at 1 - 1/e when r is the time constant."""
    if tau <= 0 or r <= 0:
        return tau, 0.0
    return arrival(r, Course(tau, 0.0, constant(1.0)), -math.expm1(-1))


def energy(r: float, store: float, end: float) -> Expected:
    """The integral of v dq = C v dv, or of i L di."""
    return store * quad(lambda value: value, 0.0, end)[0], 0.0


def c_for_energy(r: float, energy: float, v_from: float, v_to: float) -> Expected:
    """The energy that 1 F gives up, v dv integrated, into the energy wanted."""
    return energy / quad(lambda v: v, v_to, v_from)[0], 0.0


def i2t(
    r: float, tau: float, initial: float, final: float, t_from: float = 0.0,
    t_to: float = math.inf,
) -> Expected:  # fmt: skip
    """y squared integrated along with the equation."""
    course = Course(tau, initial, constant(final))
    end = min(t_to, max(t_from, 0.0) + 40 * tau) if final == 0 else t_to
    return course.integral(t_from, end, 2), NEAR * course.scale**2 * tau


def dissipated(
    r: float, resistance: float, quantity: str, tau: float, initial: float, final: float,
    t_from: float = 0.0, t_to: float = math.inf,
) -> Expected:  # fmt: skip
    """R i^2 or v^2 / R integrated along with the equation."""
    value, near = i2t(r, tau, initial, final, t_from, t_to)
    factor = resistance if quantity == "current" else 1 / resistance
    return factor * value, factor * near


def mean(
    r: float, tau: float, initial: float, sources: Any, t_from: float, t_to: float
) -> Expected:
    """y integrated along with the equation, over the window."""
    course = Course(tau, initial, shapes.of_table(sources))
    return course.integral(t_from, t_to, 1) / (t_to - t_from), 1e-10 * course.scale


def rms(r: float, tau: float, initial: float, sources: Any, t_from: float, t_to: float) -> Expected:
    """The root of the mean of y squared, integrated along with the equation."""
    course = Course(tau, initial, shapes.of_table(sources))
    mean_square = course.integral(t_from, t_to, 2) / (t_to - t_from)
    return math.sqrt(mean_square), 1e-9 * course.scale


def ride_through(
    r: float, capacitance: float, v_from: float, v_to: float, demand: float, kind: str,
    series: float = 0.0,
) -> Expected | None:  # fmt: skip
    """The integral of C du / i(u) over the voltage u inside the capacitor."""

    def current(u: float) -> float:
        if kind == "resistance":
            return u / (series + demand)
        if kind == "current":
            return demand
        if series == 0:
            return demand / u
        # u i - R i^2 = P: the smaller root, written so that nothing cancels
        return 2 * demand / (u + math.sqrt(max(u * u - 4 * demand * series, 0.0)))

    drop = {"resistance": series * v_to / demand, "current": series * demand}.get(kind)
    if drop is None:
        drop = series * demand / v_to if series else 0.0
    if v_to + drop >= v_from:
        return 0.0, NEAR * capacitance * v_from / current(v_from)
    value, error = quad(lambda u: 1 / current(u), v_to + drop, v_from, epsrel=1e-12, limit=200)
    return capacitance * value, capacitance * error


def _fault(
    t: float, rms: float, resistance: float, reactance: float, frequency: float, angle: float
) -> Course:
    """L di/dt + R i = sqrt(2) V sin(w t + angle), from i = 0."""
    voltage = math.sqrt(2) * rms * math.hypot(resistance, reactance)
    tau = reactance / (2 * math.pi * frequency * resistance)
    return Course(tau, 0.0, shapes.sine(voltage / resistance, frequency, angle, 0.0))


def fault_current(
    r: float, t: float, rms: float, resistance: float, reactance: float, frequency: float,
    angle: float = 0.0,
) -> Expected | None:  # fmt: skip
    """The circuit integrated from i = 0."""
    if not resistance or not reactance:
        return None
    return _fault(t, rms, resistance, reactance, frequency, angle).at(t), NEAR * 10 * rms


def dc_offset(
    r: float, t: float, rms: float, resistance: float, reactance: float, frequency: float,
    angle: float,
) -> Expected | None:  # fmt: skip
    """What is needed at t = 0 besides the settled current, dying away without a source."""
    if not resistance or not reactance:
        return None
    settled = math.sqrt(2) * rms * np.exp(1j * math.radians(angle))
    settled *= abs(complex(resistance, reactance)) / complex(resistance, reactance)
    tau = reactance / (2 * math.pi * frequency * resistance)
    if t < 0:
        return 0.0, 0.0
    return Course(tau, -float(settled.imag), constant(0.0)).at(t), NEAR * rms


def dc_worst(
    r: float, t: float, rms: float, resistance: float, reactance: float, frequency: float
) -> Expected | None:
    """The largest that can be needed at t = 0, dying away without a source."""
    if not resistance or not reactance or t < 0:
        return None
    tau = reactance / (2 * math.pi * frequency * resistance)
    return Course(tau, math.sqrt(2) * rms, constant(0.0)).at(t), NEAR * rms


def peak_factor(r: float, resistance: float, reactance: float) -> Expected | None:
    """The circuit integrated for closing at 0 and at 90 degrees; any angle is a mix of both."""
    if not resistance or not reactance:
        return None
    frequency = 1 / (2 * math.pi)
    both = [_fault(0, math.sqrt(0.5), resistance, reactance, frequency, a) for a in (0.0, 90.0)]

    def lower(u: float) -> float:
        return -math.hypot(*(course.at(u) for course in both))

    found = minimize_scalar(lower, bounds=(math.pi / 2, math.pi), method="bounded",
                            options={"xatol": 1e-6})  # fmt: skip
    return -float(found.fun), 1e-10


def fault_i2t(
    r: float, rms: float, resistance: float, reactance: float, frequency: float, angle: float,
    t_to: float,
) -> Expected | None:  # fmt: skip
    """i squared integrated along with the circuit."""
    if not resistance or not reactance:
        return None
    course = _fault(0, rms, resistance, reactance, frequency, angle)
    return course.integral(0.0, t_to, 2), 0.0


def ripple(
    r: float, tau: float, low: float, high: float, period: float, duty: float, what: str
) -> Expected | None:
    """One period integrated from two values; the value that comes back to itself."""
    on, off = duty * period, (1 - duty) * period

    def over(y: float) -> tuple[float, float]:
        end_of_high = Course(tau, y, constant(high)).at(on)
        return end_of_high, Course(tau, end_of_high, constant(low)).at(off)

    (_, zero), (_, one) = over(0.0), over(1.0)
    kept = one - zero
    if kept >= 1 or period / tau < 1e-5:
        return None
    end_of_low = zero / (1 - kept)
    end_of_high, _ = over(end_of_low)
    scale = max(abs(low), abs(high))
    values = {
        "min": min(end_of_low, end_of_high),
        "max": max(end_of_low, end_of_high),
        "pp": abs(end_of_high - end_of_low),
        "mean": quad(lambda t: high if t < duty else low, 0.0, 1.0, points=[duty])[0],
    }
    return values[what], 1e-12 * scale / (1 - kept)


def _steady(frequency: float, tau: float, kind: str) -> complex:
    """Gain and phase of a sine that has been on for long, from y at two moments of it."""
    w = 2 * math.pi * frequency
    long = 50 * tau
    y = [Course(tau, 0.0, shapes.sine(1.0, frequency, a - math.degrees(w * long) % 360, 0.0))
         .at(long) for a in (90.0, 0.0)]  # fmt: skip
    low_pass = complex(*y)
    return low_pass if kind == "low-pass" else 1 - low_pass


def gain(r: float, frequency: float, tau: float, kind: str = "low-pass") -> Expected | None:
    """The amplitude of a sine that has settled, in decibels."""
    gain = abs(_steady(frequency, tau, kind))
    return (20 * math.log10(gain), 1e-7) if gain > 1e-6 else None


def phase(r: float, frequency: float, tau: float, kind: str = "low-pass") -> Expected | None:
    """The angle of a sine that has settled."""
    steady = _steady(frequency, tau, kind)
    return math.degrees(math.atan2(steady.imag, steady.real)), 1e-7


def corner(r: float, other: float) -> Expected:
    """At the corner the power that passes is a half; r and the argument are f and tau."""
    gain = abs(_steady(r, other, "low-pass")) ** 2
    return r * (1 - (gain - 0.5) * -2.0), 1e-9 * r


def tau_at(r: float, frequency: float) -> Expected:
    """As `corner`, for the time constant."""
    gain = abs(_steady(frequency, r, "low-pass")) ** 2
    return r * (1 - (gain - 0.5) * -2.0), 1e-9 * r


def noise(r: float, tau: float) -> Expected:
    """The integral of the power gain over all frequencies."""
    value, error = quad(lambda x: 1 / (1 + (2 * math.pi * x) ** 2), 0, math.inf, epsrel=1e-11)
    return value / tau, error / tau


def fit(
    r: float, times: Any, values: Any, what: str, t_from: float = -math.inf,
    t_to: float = math.inf,
) -> Expected | None:  # fmt: skip
    """scipy's least squares, from a start of its own, in scaled times and values."""
    rows = [
        (float(t), float(v))
        for t, v in zip(_cells(times), _cells(values), strict=True)
        if not (t in (None, "") and v in (None, "")) and t_from <= t <= t_to
    ]
    t, y = np.array(sorted(rows)).T
    span, swing = float(np.ptp(t)), float(np.ptp(y))
    u, v = (t - t[0]) / span, (y - y.mean()) / swing

    def model(u: Any, tau: float, initial: float, final: float) -> Any:
        return final + (initial - final) * np.exp(-u / tau)

    start = [0.3, float(v[:3].mean()), float(v[-3:].mean())]
    found, covariance = curve_fit(model, u, v, start, xtol=1e-13, ftol=1e-13, gtol=1e-13,
                                  maxfev=5000)  # fmt: skip
    errors = np.sqrt(np.diag(covariance))
    left = float(np.sqrt(np.sum((model(u, *found) - v) ** 2) / (len(t) - 3)))
    result = {
        "tau": found[0] * span,
        "initial": found[1] * swing + y.mean(),
        "final": found[2] * swing + y.mean(),
        "tau error": errors[0] * span,
        "initial error": errors[1] * swing,
        "final error": errors[2] * swing,
        "residual": left * swing,
    }
    size = span if what.startswith("tau") else swing
    # the Jacobian of curve_fit is by differences, so the errors are known to some digits only
    return float(result[what]), (1e-4 * abs(result[what]) if "error" in what else 1e-7 * size)


def _cells(grid: Any) -> list[Any]:
    rows = grid if isinstance(grid, list) else [[grid]]
    return [cell for row in rows for cell in row]
