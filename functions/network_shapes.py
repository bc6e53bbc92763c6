"""What a network needs to know of a source's shape besides its value: rate, integral, jumps."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.exact import Array
from tausheet.functions.sources import Source, forcing


def scaled(source: Source, factor: float) -> Source:
    """The source times a factor."""
    amplitudes = 2 if source.shape == "square" else 1
    values = [factor * value for value in source.values[:amplitudes]]
    return replace(source, values=(*values, *source.values[amplitudes:]))


def slope(source: Source) -> Source | None:
    """The source's rate of change between its jumps; None when it has none."""
    values, start = source.values, source.start
    if source.shape == "ramp" and values[1]:
        return Source("pulse", (values[0] / values[1], values[1]), start)
    if source.shape == "slope":
        return Source("step", values, start)
    if source.shape == "sine":
        size, frequency, phase = values
        return Source("sine", (math.tau * frequency * size, frequency, phase + 90), start)
    if source.shape == "decay":
        return Source("decay", (-values[0] / values[1], values[1]), start)
    return None


def jump(t: float, source: Source) -> float:
    """By how much the source jumps at t."""
    values, s = source.values, t - source.start
    if s < 0:
        return 0.0
    if s == 0:
        return float(forcing(np.asarray(t), source))
    if source.shape == "pulse":
        return -values[0] if s == values[1] else 0.0
    if source.shape == "square":
        low, high, period, duty = values
        phase = math.fmod(s, period)
        if 0 < duty < 1 and phase in (0.0, duty * period):
            return low - high if phase else high - low
    return 0.0


def may_jump(t: Array, source: Source) -> NDArray[np.bool_]:
    """Where the source or its rate of change may jump: the moments worth a closer look."""
    values, s = source.values, t - source.start
    here = s == 0
    if source.shape in ("ramp", "pulse"):
        here = here | (s == values[1])
    if source.shape == "square":
        phase = np.fmod(s, values[2])
        here = here | ((s > 0) & ((phase == 0) | (phase == values[3] * values[2])))
    return np.asarray(here)


def settled(source: Source) -> float | None:
    """The value for t to infinity; None when there is none."""
    shape, values = source.shape, source.values
    if shape in ("constant", "step", "ramp"):
        return values[0]
    if shape in ("decay", "pulse") or (values[0] == 0 and shape in ("slope", "sine")):
        return 0.0
    if shape == "sine" and values[1] == 0:
        return float(forcing(np.asarray(source.start), source))
    if shape == "square":
        low, high, _, duty = values
        if low == high or duty in (0.0, 1.0):
            return high if duty else low
    return None


def integral_to_infinity(source: Source) -> float | None:
    """The integral over all time; None when it has no end."""
    if source.shape in ("decay", "pulse"):
        return source.values[0] * source.values[1]
    return 0.0 if settled(source) == 0 else None


def integral(t: Array, source: Source) -> Array:
    """The integral of the source from 0 to t."""
    s = np.maximum(t - source.start, 0.0)
    result: Array = np.asarray(_INTEGRALS[source.shape](s, *source.values))
    return result


def _ramp(s: Array, level: float, duration: float) -> Any:
    if not duration:
        return level * s
    inside = np.minimum(s, duration)
    return level * (inside * (inside / duration) / 2 + (s - inside))


def _sine(s: Array, size: float, frequency: float, phase: float) -> Any:
    # sin(wu + phase) from 0 to s: 2/w sin(w s/2) sin(w s/2 + phase)
    if not frequency:
        return forcing(s, Source("sine", (size, frequency, phase))) * s
    half = forcing(s / 2, Source("sine", (1.0, frequency, 0.0)))
    return half * forcing(s / 2, Source("sine", (size, frequency, phase))) / (math.pi * frequency)


def _square(s: Array, low: float, high: float, period: float, duty: float) -> Any:
    inside = np.fmod(s, period)
    on = np.minimum(inside, duty * period)
    return (s - inside) * (low + (high - low) * duty) + high * on + low * (inside - on)


_INTEGRALS: dict[str, Callable[..., Any]] = {
    "constant": lambda s, level: level * s,
    "step": lambda s, level: level * s,
    "ramp": _ramp,
    "slope": lambda s, rate: rate * s * s / 2,
    "sine": _sine,
    "decay": lambda s, size, own: -size * own * np.expm1(-s / own),
    "pulse": lambda s, level, length: level * np.minimum(s, length),
    "square": _square,
}
