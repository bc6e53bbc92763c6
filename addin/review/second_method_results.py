"""For each function of first-order results: its value by integration of what defines it.

A method takes the arguments and the result to be checked, and gives the value expected, and how
near to it counts as the same beside the relative tolerance. Where a result is a moment, y is
integrated to it and corrected by what is missing there over the slope: one Newton step.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
from scipy.integrate import quad
from scipy.optimize import curve_fit, minimize_scalar

from tausheet.addin.review import second_method_shapes as shapes
from tausheet.addin.review.second_method_course import Course, Forcing, TooLong, constant

Expected = tuple[float, float]
Method = Callable[..., Expected | None]

NEAR = 1e-12
"""Share of the size of a course within which values near zero count as the same."""


def _value(t: float, course: Course) -> Expected:
    return course.at(t), NEAR * course.scale


def _natural(r: float, t: float, tau: float, initial: float) -> Expected:
    return _value(t, Course(tau, initial, constant(0.0)))


def _step(
    r: float, t: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> Expected:
    return _value(t - delay, Course(tau, initial, constant(final)))


def _ramp(
    r: float, t: float, tau: float, initial: float, first: float, last: float, duration: float
) -> Expected:
    return _value(t, Course(tau, initial, shapes.ramp(first, last, duration)))


def _sine(
    r: float, t: float, tau: float, initial: float, amplitude: float, frequency: float,
    phase: float = 0.0, offset: float = 0.0,
) -> Expected:  # fmt: skip
    return _value(t, Course(tau, initial, shapes.sine(amplitude, frequency, phase, offset)))


def _decay(
    r: float, t: float, tau: float, initial: float, amplitude: float, source_tau: float,
    offset: float = 0.0,
) -> Expected:  # fmt: skip
    return _value(t, Course(tau, initial, shapes.decay(amplitude, source_tau, offset)))


def _pulse(
    r: float, t: float, tau: float, initial: float, resting: float, level: float,
    duration: float, delay: float = 0.0,
) -> Expected:  # fmt: skip
    return _value(t, Course(tau, initial, shapes.pulse(resting, level, duration, delay)))


def _square(
    r: float, t: float, tau: float, initial: float, low: float, high: float, period: float,
    duty: float,
) -> Expected:  # fmt: skip
    return _value(t, Course(tau, initial, shapes.square(low, high, period, duty)))


def _superpose(r: float, t: float, tau: float, initial: float, sources: Any) -> Expected:
    return _value(t, Course(tau, initial, shapes.of_table(sources)))


def _rate(r: float, t: float, tau: float, initial: float, sources: Any) -> Expected:
    course = Course(tau, initial, shapes.of_table(sources))
    return (0.0 if t < 0 else course.rate(t)), NEAR * course.scale / tau


def _points(times: Any, levels: Any, held: Any) -> Forcing:
    return shapes.of_points(column(times), column(levels), bool(held))


def _table(
    r: float, t: float, tau: float, initial: float, times: Any, levels: Any, held: Any = False
) -> Expected:
    return _value(t, Course(tau, initial, _points(times, levels, held)))


def column(grid: Any) -> list[float]:
    """The numbers of a range."""
    if not isinstance(grid, list):
        return [float(grid)]
    return [float(cell) for row in grid for cell in (row if isinstance(row, list) else [row])]


def _arrival(r: float, course: Course, level: float) -> Expected | None:
    """The moment at which y is at a level, from one that is near."""
    if r <= 0:
        return (0.0, 0.0) if course.initial == level else None
    slope = course.rate(r)
    if slope == 0:
        return None
    near = 1e-13 * course.scale / abs(slope)
    return r - (course.at(r) - level) / slope, near


def _time_to(
    r: float, level: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> Expected | None:
    arrived = _arrival(r - delay, Course(tau, initial, constant(final)), level)
    return None if arrived is None else (arrived[0] + delay, arrived[1])


def _until_below(
    r: float, level: float, tau: float, initial: float, final: float
) -> Expected | None:
    if initial <= level and final <= level:
        return 0.0, 0.0
    return _arrival(r, Course(tau, initial, constant(final)), level)


def _until_above(
    r: float, level: float, tau: float, initial: float, final: float
) -> Expected | None:
    return _until_below(r, -level, tau, -initial, -final)


def _rise_time(r: float, tau: float, low: float = 0.1, high: float = 0.9) -> Expected | None:
    return _arrival(r, Course(tau, low, constant(1.0)), high)


def _settling(r: float, tau: float, tolerance: float) -> Expected | None:
    return _arrival(r, Course(tau, 1.0, constant(0.0)), tolerance)


def _trip(r: float, pickup: float, tau: float, prior: float, current: float) -> Expected | None:
    """tau d(theta)/dt + theta = I^2, from Ip^2 to Ik^2."""
    if prior >= pickup:
        return 0.0, 0.0
    return _arrival(r, Course(tau, prior**2, constant(current**2)), pickup**2)


def _tau_for(r: float, level: float, t: float, initial: float, final: float) -> Expected | None:
    """With the time constant found y is at the level at t; scaled, t / tau is what counts."""
    arrived = _arrival(t / r, Course(1.0, initial, constant(final)), level)
    return None if arrived is None or not arrived[0] else (t / arrived[0], 1e-13 * r)


def _crossing(
    r: float, level: float, tau: float, initial: float, sources: Any,
    direction: str = "either", count: float = 1, after: float = 0.0,
) -> Expected | None:  # fmt: skip
    return _counted(r, Course(tau, initial, shapes.of_table(sources)), level, direction, count,
                    after)  # fmt: skip


def _table_crossing(
    r: float, level: float, tau: float, initial: float, times: Any, levels: Any,
    held: Any = False, direction: str = "either", count: float = 1, after: float = 0.0,
) -> Expected | None:  # fmt: skip
    course = Course(tau, initial, _points(times, levels, held))
    return _counted(r, course, level, direction, count, after)


def _counted(
    r: float, course: Course, level: float, direction: str, count: float, after: float
) -> Expected | None:
    """The passage asked for: y is at the level, and has passed it one time less before."""
    if r <= 0:
        return None
    before = course.passages(level, r * (1 - 1e-9), max(after, 0.0), direction)
    if before >= count:
        return math.nan, 0.0  # it has passed so often already: whatever stands there is wrong
    if before < count - 1:
        return None  # two passages within one step are not told apart here
    return _arrival(r, course, level)


def _tau_rc(r: float, resistance: float, capacitance: float) -> Expected | None:
    """C dv/dt = (1 V - v) / R: the initial slope, 1 V over tau, measured over a short time."""
    return _by_slope(r, resistance * capacitance)


def _tau_rl(r: float, resistance: float, inductance: float) -> Expected | None:
    """L di/dt = 1 V - R i, in units of the final current."""
    return _by_slope(r, inductance / resistance)


def _tau_rx(r: float, resistance: float, reactance: float, frequency: float) -> Expected | None:
    return _by_slope(r, reactance / (2 * math.pi * frequency) / resistance)


def _by_slope(r: float, tau: float) -> Expected | None:
    """y from 0 towards 1 for the time r is at 1 - 1/e when r is the time constant."""
    if tau <= 0 or r <= 0:
        return tau, 0.0
    return _arrival(r, Course(tau, 0.0, constant(1.0)), -math.expm1(-1))


def _energy(r: float, store: float, end: float) -> Expected:
    """The integral of v dq = C v dv, or of i L di."""
    return store * quad(lambda value: value, 0.0, end)[0], 0.0


def _c_for_energy(r: float, energy: float, v_from: float, v_to: float) -> Expected:
    return energy / quad(lambda v: v, v_to, v_from)[0], 0.0


def _i2t(
    r: float, tau: float, initial: float, final: float, t_from: float = 0.0,
    t_to: float = math.inf,
) -> Expected:  # fmt: skip
    course = Course(tau, initial, constant(final))
    end = min(t_to, max(t_from, 0.0) + 40 * tau) if final == 0 else t_to
    return course.integral(t_from, end, 2), NEAR * course.scale**2 * tau


def _dissipated(
    r: float, resistance: float, quantity: str, tau: float, initial: float, final: float,
    t_from: float = 0.0, t_to: float = math.inf,
) -> Expected:  # fmt: skip
    value, near = _i2t(r, tau, initial, final, t_from, t_to)
    factor = resistance if quantity == "current" else 1 / resistance
    return factor * value, factor * near


def _mean(
    r: float, tau: float, initial: float, sources: Any, t_from: float, t_to: float
) -> Expected:
    course = Course(tau, initial, shapes.of_table(sources))
    return course.integral(t_from, t_to, 1) / (t_to - t_from), 1e-10 * course.scale


def _rms(
    r: float, tau: float, initial: float, sources: Any, t_from: float, t_to: float
) -> Expected:
    course = Course(tau, initial, shapes.of_table(sources))
    mean_square = course.integral(t_from, t_to, 2) / (t_to - t_from)
    return math.sqrt(mean_square), 1e-9 * course.scale


def _ride_through(
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


def _fault_current(
    r: float, t: float, rms: float, resistance: float, reactance: float, frequency: float,
    angle: float = 0.0,
) -> Expected | None:  # fmt: skip
    if not resistance or not reactance:
        return None
    return _fault(t, rms, resistance, reactance, frequency, angle).at(t), NEAR * 10 * rms


def _dc_offset(
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


def _dc_worst(
    r: float, t: float, rms: float, resistance: float, reactance: float, frequency: float
) -> Expected | None:
    if not resistance or not reactance or t < 0:
        return None
    tau = reactance / (2 * math.pi * frequency * resistance)
    return Course(tau, math.sqrt(2) * rms, constant(0.0)).at(t), NEAR * rms


def _peak_factor(r: float, resistance: float, reactance: float) -> Expected | None:
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


def _fault_i2t(
    r: float, rms: float, resistance: float, reactance: float, frequency: float, angle: float,
    t_to: float,
) -> Expected | None:  # fmt: skip
    if not resistance or not reactance:
        return None
    course = _fault(0, rms, resistance, reactance, frequency, angle)
    return course.integral(0.0, t_to, 2), 0.0


def _ripple(
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


def _gain(r: float, frequency: float, tau: float, kind: str = "low-pass") -> Expected | None:
    gain = abs(_steady(frequency, tau, kind))
    return (20 * math.log10(gain), 1e-7) if gain > 1e-6 else None


def _phase(r: float, frequency: float, tau: float, kind: str = "low-pass") -> Expected | None:
    steady = _steady(frequency, tau, kind)
    return math.degrees(math.atan2(steady.imag, steady.real)), 1e-7


def _corner(r: float, other: float) -> Expected:
    """At the corner the power that passes is a half; r and the argument are f and tau."""
    gain = abs(_steady(r, other, "low-pass")) ** 2
    return r * (1 - (gain - 0.5) * -2.0), 1e-9 * r


def _tau_at(r: float, frequency: float) -> Expected:
    gain = abs(_steady(frequency, r, "low-pass")) ** 2
    return r * (1 - (gain - 0.5) * -2.0), 1e-9 * r


def _noise(r: float, tau: float) -> Expected:
    """The integral of the power gain over all frequencies."""
    value, error = quad(lambda x: 1 / (1 + (2 * math.pi * x) ** 2), 0, math.inf, epsrel=1e-11)
    return value / tau, error / tau


def _fit(
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


def _peak(
    r: tuple[float, float], tau: float, initial: float, sources: Any, t_from: float, t_to: float,
    kind: str = "max",
) -> Expected | None:  # fmt: skip
    """y at the moment given, unless the course goes further somewhere in the window."""
    course = Course(tau, initial, shapes.of_table(sources))
    sign = {"max": 1.0, "min": -1.0}.get(kind)
    if sign is None:
        return None
    course.at(max(t_to, 0.0), keep=True)
    times = np.concatenate([[0.0], *(t for t, _ in course.trail)])
    values = np.concatenate([[initial], *(y for _, y in course.trail)])
    inside = sign * values[(times >= t_from) & (times <= t_to)]
    expected = course.at(r[1])
    further = float(inside.max()) if inside.size else -math.inf
    best = max(sign * expected, further)
    return sign * best, 1e-11 * course.scale


def _stages(r: float, t: float, initial: float, stages: Any) -> Expected:
    value, scale = _through(t, initial, stages)
    return value, NEAR * scale


def _stages_crossing(
    r: float, level: float, initial: float, stages: Any, direction: str = "either",
    count: float = 1, after: float = 0.0,
) -> Expected | None:  # fmt: skip
    """The passage asked for, told by points between the starts of the stages."""
    if r <= 0:
        return None
    starts = [0.0, *(row[0] for row in stages if isinstance(row[0], float) and 0 < row[0] < r), r]
    moments = [a + (b - a) * k / 25 for a, b in itertools.pairwise(starts) for k in range(25)]
    sides = [_through(moment, initial, stages)[0] > level for moment in [*moments, r * (1 - 1e-6)]]
    turns = [
        (later, moment)
        for side, later, moment in zip(sides, sides[1:], moments[1:], strict=False)
        if side != later and moment > after
    ]
    wanted = {"rising": (True,), "falling": (False,)}.get(direction, (True, False))
    if sum(side in wanted for side, _ in turns) != count - 1:
        return None
    here, scale = _through(r, initial, stages)
    h = 1e-6 * r
    slope = (_through(r + h, initial, stages)[0] - _through(r - h, initial, stages)[0]) / (2 * h)
    if slope == 0 or abs(slope) * r > 1e4 * scale:
        return None
    return r - (here - level) / slope, 1e-11 * scale / abs(slope)


def _through(t: float, initial: float, stages: Any) -> tuple[float, float]:
    """y just after t, stage by stage; and the size of what it is made of."""
    rows: list[list[Any]] = [
        [None if cell == "" else cell for cell in row] + [None] * 5 for row in stages
    ]
    rows = [row for row in rows if row[0] is not None and row[0] != "Starts at"]
    y, scale = initial, abs(initial)
    if t < 0:
        return y, scale
    for number, (start, tau, heads, jump, stop, *_) in enumerate(rows):
        if start > t:
            break
        end = min(t, rows[number + 1][0] if number + 1 < len(rows) else math.inf)
        y = y if jump is None else float(jump)
        scale = max(scale, abs(y), abs(heads or 0.0))
        before = y
        if tau == "rate":
            y = before + float(heads) * (end - start)
        elif tau != "hold":
            y = Course(float(tau), before, constant(float(heads))).at(end - start)
        if stop is not None and (before - stop) * (y - stop) <= 0:
            y = float(stop)
    return y, scale


METHODS: dict[str, tuple[Method, Sequence[int], str]] = {
    # the function, which of its arguments are tables, and in words how it is checked
    "FO_NATURAL": (_natural, (), "the equation integrated"),
    "FO_STEP": (_step, (), "the equation integrated"),
    "FO_RAMP": (_ramp, (), "the equation integrated"),
    "FO_SINE": (_sine, (), "the equation integrated"),
    "FO_DECAY": (_decay, (), "the equation integrated"),
    "FO_PULSE": (_pulse, (), "the equation integrated"),
    "FO_SQUARE": (_square, (), "the equation integrated"),
    "FO_SUPERPOSE": (_superpose, (3,), "the equation integrated"),
    "FO_RATE": (_rate, (3,), "the equation integrated"),
    "FO_TABLE": (_table, (3, 4), "the equation integrated"),
    "FO_STAGES": (_stages, (2,), "each stage integrated"),
    "FO_TIME_TO": (_time_to, (), "integrated until the level"),
    "FO_TIME_UNTIL_BELOW": (_until_below, (), "integrated until the level"),
    "FO_TIME_UNTIL_ABOVE": (_until_above, (), "integrated until the level"),
    "FO_RISE_TIME": (_rise_time, (), "integrated until the level"),
    "FO_SETTLING_TIME": (_settling, (), "integrated until the level"),
    "FO_TAU_FOR": (_tau_for, (), "integrated until the level"),
    "FO_CROSSING": (_crossing, (3,), "integrated until the passage, earlier ones counted"),
    "FO_TABLE_CROSSING": (_table_crossing, (3, 4), "integrated until the passage"),
    "FO_STAGES_CROSSING": (_stages_crossing, (2,), "integrated until the first passage"),
    "FO_PEAK": (_peak, (2,), "integrated through the window"),
    "FO_MEAN": (_mean, (2,), "y integrated along with the equation"),
    "FO_RMS": (_rms, (2,), "y squared integrated along with the equation"),
    "FO_I2T": (_i2t, (), "y squared integrated along with the equation"),
    "FO_DISSIPATED": (_dissipated, (), "the power integrated along with the equation"),
    "FO_ENERGY_C": (_energy, (), "v dq integrated"),
    "FO_ENERGY_L": (_energy, (), "i dflux integrated"),
    "FO_C_FOR_ENERGY": (_c_for_energy, (), "v dq integrated"),
    "FO_RIDE_THROUGH": (_ride_through, (), "C du / i(u) integrated"),
    "FO_TRIP_TIME": (_trip, (), "the thermal equation integrated until pick-up"),
    "FO_FAULT_CURRENT": (_fault_current, (), "the circuit integrated"),
    "FO_DC_OFFSET": (_dc_offset, (), "the circuit integrated"),
    "FO_DC_WORST": (_dc_worst, (), "the circuit integrated"),
    "FO_PEAK_FACTOR": (_peak_factor, (), "the circuit integrated, the peak sought"),
    "FO_FAULT_I2T": (_fault_i2t, (), "the square integrated along with the circuit"),
    "FO_RIPPLE": (_ripple, (), "a period integrated, the value that repeats"),
    "FO_TAU_RC": (_tau_rc, (), "the circuit integrated until 1 - 1/e"),
    "FO_TAU_RL": (_tau_rl, (), "the circuit integrated until 1 - 1/e"),
    "FO_TAU_RX": (_tau_rx, (), "the circuit integrated until 1 - 1/e"),
    "FO_GAIN_DB": (_gain, (), "a sine integrated until it has settled"),
    "FO_PHASE": (_phase, (), "a sine integrated until it has settled"),
    "FO_CORNER_FREQUENCY": (_corner, (), "a sine integrated until it has settled"),
    "FO_TAU_AT": (_tau_at, (), "a sine integrated until it has settled"),
    "FO_NOISE_BANDWIDTH": (_noise, (), "the power gain integrated"),
    "FO_FIT": (_fit, (0, 1), "scipy's least squares"),
}

__all__ = ["METHODS", "TooLong"]
