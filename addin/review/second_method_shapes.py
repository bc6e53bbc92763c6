"""Forcings of the second method: what the arguments of a call say that x(t) is."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from tausheet.addin.review.second_method_course import Forcing


def step(level: float, start: float, before: float = 0.0) -> Forcing:
    """A level from a moment on."""
    scale = max(abs(level), abs(before))
    return Forcing(lambda t: np.where(t < start, before, level), [start], scale=scale)


def ramp(first: float, last: float, duration: float) -> Forcing:
    """A straight line from one level to another, which then holds."""
    scale = max(abs(first), abs(last))
    if duration == 0:
        return step(last, 0.0, first)
    return Forcing(
        lambda t: first + (last - first) * np.clip(t / duration, 0.0, 1.0), [duration], scale=scale
    )


def sine(amplitude: float, frequency: float, phase: float, offset: float) -> Forcing:
    """A sine about an offset."""
    return Forcing(
        lambda t: offset + amplitude * np.sin(2 * np.pi * frequency * t + np.radians(phase)),
        quick=1 / frequency if frequency else math.inf,
        scale=abs(amplitude) + abs(offset),
    )


def decay(amplitude: float, source_tau: float, offset: float) -> Forcing:
    """A decay: the source of the equation, not its solution."""
    return Forcing(
        lambda t: offset + amplitude * np.exp(-t / source_tau),
        quick=4 * source_tau,
        scale=abs(amplitude) + abs(offset),
    )


def pulse(resting: float, level: float, duration: float, delay: float) -> Forcing:
    """A level for a while."""
    end = delay + duration
    scale = max(abs(level), abs(resting))
    return Forcing(
        lambda t: np.where((t >= delay) & (t < end), level, resting), [delay, end], scale=scale
    )


def square(low: float, high: float, period: float, duty: float) -> Forcing:
    """High for a share of each period, then low."""

    def level(t: Any) -> Any:
        return np.where(t - period * np.floor(t / period) < duty * period, high, low)

    scale = max(abs(low), abs(high))
    return Forcing(level, period=period, marks=[0.0, duty * period], scale=scale)


def delayed(forcing: Forcing, start: float) -> Forcing:
    """0 before a moment, from which the forcing's clock runs."""
    if start == 0:
        return forcing
    if math.isfinite(forcing.period):
        raise ValueError("a square that starts late")
    return Forcing(
        lambda t: np.where(t < start, 0.0, forcing.level(np.maximum(t - start, 0.0))),
        [start, *(start + moment for moment in forcing.breaks)],
        quick=forcing.quick,
        scale=forcing.scale,
    )


def of_table(rows: Sequence[Sequence[Any]]) -> Forcing:
    """The sum of the shapes of a source table."""
    parts = []
    for row in rows:
        cells = [None if cell == "" else cell for cell in row]
        if all(cell is None for cell in cells) or cells[0] == "Shape":
            continue
        parts.append(_shape(cells[0], [0.0 if cell is None else float(cell) for cell in cells[1:]]))
    periods = [part for part in parts if math.isfinite(part.period)]
    if len(periods) > 1:
        raise ValueError("several squares")
    return Forcing(
        lambda t: sum(part.level(t) for part in parts),
        [moment for part in parts for moment in part.breaks],
        periods[0].period if periods else math.inf,
        periods[0].marks if periods else (),
        min(part.quick for part in parts),
        sum(part.scale for part in parts),
    )


def _shape(shape: Any, given: list[float]) -> Forcing:
    a, b, c, d, e = (given + [0.0] * 5)[:5]
    if shape == "constant":
        return step(a, -math.inf)
    if shape == "step":
        return step(a, b)
    if shape == "ramp":
        return delayed(ramp(0.0, a, b), c)
    if shape == "slope":
        return delayed(Forcing(lambda t: a * t, scale=abs(a)), b)
    if shape == "sine":
        return delayed(sine(a, b, c, 0.0), d)
    if shape == "decay":
        return delayed(decay(a, b, 0.0), c)
    if shape == "pulse":
        return pulse(0.0, a, b, c)
    if shape == "square":
        return delayed(square(a, b, c, d), e)
    raise ValueError("a shape that is not known here")


def of_points(times: Sequence[float], levels: Sequence[float], held: bool) -> Forcing:
    """Straight lines between points, or levels held; the ends go on."""
    when, what = np.array(times, float), np.array(levels, float)

    def level(t: Any) -> Any:
        place = np.clip(np.searchsorted(when, t, side="right") - 1, 0, len(when) - 1)
        if held:
            return what[place]
        following = np.minimum(place + 1, len(when) - 1)
        width = when[following] - when[place]
        share = np.clip((t - when[place]) / np.where(width > 0, width, 1.0), 0.0, 1.0)
        return what[place] + share * (what[following] - what[place])

    scale = float(np.max(np.abs(what)))
    return Forcing(level, [float(t) for t in when], scale=scale)
