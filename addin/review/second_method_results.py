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

from tausheet.addin.review import second_method_network as network
from tausheet.addin.review import second_method_parts as parts
from tausheet.addin.review import second_method_shapes as shapes
from tausheet.addin.review.second_method_course import (
    NEAR,
    Course,
    Expected,
    Forcing,
    TooLong,
    arrival,
    constant,
)

Method = Callable[..., Expected | None]


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


def _time_to(
    r: float, level: float, tau: float, initial: float, final: float, delay: float = 0.0
) -> Expected | None:
    arrived = arrival(r - delay, Course(tau, initial, constant(final)), level)
    return None if arrived is None else (arrived[0] + delay, arrived[1])


def _until_below(
    r: float, level: float, tau: float, initial: float, final: float
) -> Expected | None:
    if initial <= level and final <= level:
        return 0.0, 0.0
    return arrival(r, Course(tau, initial, constant(final)), level)


def _until_above(
    r: float, level: float, tau: float, initial: float, final: float
) -> Expected | None:
    return _until_below(r, -level, tau, -initial, -final)


def _rise_time(r: float, tau: float, low: float = 0.1, high: float = 0.9) -> Expected | None:
    return arrival(r, Course(tau, low, constant(1.0)), high)


def _settling(r: float, tau: float, tolerance: float) -> Expected | None:
    return arrival(r, Course(tau, 1.0, constant(0.0)), tolerance)


def _trip(r: float, pickup: float, tau: float, prior: float, current: float) -> Expected | None:
    """tau d(theta)/dt + theta = I^2, from Ip^2 to Ik^2."""
    if prior >= pickup:
        return 0.0, 0.0
    return arrival(r, Course(tau, prior**2, constant(current**2)), pickup**2)


def _tau_for(r: float, level: float, t: float, initial: float, final: float) -> Expected | None:
    """With the time constant found y is at the level at t; scaled, t / tau is what counts."""
    arrived = arrival(t / r, Course(1.0, initial, constant(final)), level)
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
    return arrival(r, course, level)


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
    "FO_MEAN": (parts.mean, (2,), "y integrated along with the equation"),
    "FO_RMS": (parts.rms, (2,), "y squared integrated along with the equation"),
    "FO_I2T": (parts.i2t, (), "y squared integrated along with the equation"),
    "FO_DISSIPATED": (parts.dissipated, (), "the power integrated along with the equation"),
    "FO_ENERGY_C": (parts.energy, (), "v dq integrated"),
    "FO_ENERGY_L": (parts.energy, (), "i dflux integrated"),
    "FO_C_FOR_ENERGY": (parts.c_for_energy, (), "v dq integrated"),
    "FO_RIDE_THROUGH": (parts.ride_through, (), "C du / i(u) integrated"),
    "FO_TRIP_TIME": (_trip, (), "the thermal equation integrated until pick-up"),
    "FO_FAULT_CURRENT": (parts.fault_current, (), "the circuit integrated"),
    "FO_DC_OFFSET": (parts.dc_offset, (), "the circuit integrated"),
    "FO_DC_WORST": (parts.dc_worst, (), "the circuit integrated"),
    "FO_PEAK_FACTOR": (parts.peak_factor, (), "the circuit integrated, the peak sought"),
    "FO_FAULT_I2T": (parts.fault_i2t, (), "the square integrated along with the circuit"),
    "FO_RIPPLE": (parts.ripple, (), "a period integrated, the value that repeats"),
    "FO_TAU_RC": (parts.tau_rc, (), "the circuit integrated until 1 - 1/e"),
    "FO_TAU_RL": (parts.tau_rl, (), "the circuit integrated until 1 - 1/e"),
    "FO_TAU_RX": (parts.tau_rx, (), "the circuit integrated until 1 - 1/e"),
    "FO_GAIN_DB": (parts.gain, (), "a sine integrated until it has settled"),
    "FO_PHASE": (parts.phase, (), "a sine integrated until it has settled"),
    "FO_CORNER_FREQUENCY": (parts.corner, (), "a sine integrated until it has settled"),
    "FO_TAU_AT": (parts.tau_at, (), "a sine integrated until it has settled"),
    "FO_NOISE_BANDWIDTH": (parts.noise, (), "the power gain integrated"),
    "FO_NETWORK": (network.of_store, (0,), "all circuit equations stepped, one store"),
    "FO_NETWORK_AT": (network.value, (1,), "all circuit equations stepped"),
    "FO_NETWORK_CROSSING": (network.crossing, (1,), "all circuit equations stepped"),
    "FO_NETWORK_PEAK": (network.peak, (0,), "all circuit equations stepped"),
    "FO_FIT": (parts.fit, (0, 1), "scipy's least squares"),
}

__all__ = ["METHODS", "TooLong"]
