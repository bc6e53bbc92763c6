"""Numerical integration of tau dy/dt + y = x(t), on its own: nothing of tausheet is imported.

Gauss collocation with four stages (order 8, A-stable): E. Hairer, S. P. Norsett, G. Wanner,
Solving Ordinary Differential Equations I, II.7. No exponential is taken anywhere.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.polynomial import legendre

FORGOTTEN = 60.0
"""Time constants after which an initial value has no digit left in the result."""
MOST_STEPS = 200_000
MOST_PIECES = 5_000


Expected = tuple[float, float]
"""A value expected, and how near to it counts as the same."""
NEAR = 1e-12
"""Share of the size of a course within which values near zero count as the same."""


class TooLong(Exception):
    """An integration that would take more steps than are worth their time."""


def _collocation(stages: int) -> tuple[Any, Any, Any]:
    """Nodes, matrix and weights of Gauss collocation on 0..1."""
    roots = (legendre.leggauss(stages)[0] + 1) / 2
    powers = np.vander(roots, increasing=True)
    orders = np.arange(1, stages + 1)
    integrals = roots[:, None] ** orders / orders
    inverse = np.linalg.inv(powers)
    return roots, integrals @ inverse, (1 / orders) @ inverse


_NODES, _MATRIX, _WEIGHTS = _collocation(4)


@dataclass
class Forcing:
    """x(t): a function that takes an array of times, smooth between the breaks."""

    level: Callable[[Any], Any]
    breaks: Sequence[float] = ()
    period: float = math.inf
    """Breaks repeat with it, from `first` on: at each of `marks` after the start of a period."""
    marks: Sequence[float] = ()
    quick: float = math.inf
    """The shortest time in which x changes much between breaks."""
    scale: float = 1.0

    def between(self, start: float, end: float) -> list[float]:
        """The moments from start to end at which pieces begin and end."""
        inside = {b for b in self.breaks if start < b < end}
        if math.isfinite(self.period):
            first, last = math.floor(start / self.period), math.ceil(end / self.period)
            if (last - first) * max(1, len(self.marks)) > MOST_PIECES:
                raise TooLong
            for number in range(first, last + 1):
                moments = (number * self.period + mark for mark in self.marks)
                inside |= {moment for moment in moments if start < moment < end}
        return [start, *sorted(inside), end]


def constant(level: float) -> Forcing:
    """A forcing that holds."""
    return Forcing(lambda t: np.full(np.shape(t), level), scale=abs(level))


@dataclass
class Course:
    """y(t) of one equation, from y = initial at t = 0, where it has rested."""

    tau: float
    initial: float
    forcing: Forcing
    trail: list[tuple[Any, Any]] = field(default_factory=list)

    @property
    def scale(self) -> float:
        """The size of what y is made of."""
        return max(abs(self.initial), self.forcing.scale)

    def at(self, t: float, keep: bool = False) -> float:
        """y at t; keep: leave the times and values of every step in `trail`."""
        if t <= 0:
            return self.initial
        start = 0.0 if keep else max(0.0, t - FORGOTTEN * self.tau)
        y = self.initial if start == 0 else float(self.forcing.level(np.array([start]))[0])
        moments = self.forcing.between(start, t)
        for begin, end in itertools.pairwise(moments):
            y = self._piece(y, begin, end, keep)
        return y

    def rate(self, t: float) -> float:
        """dy/dt just after t, by the equation."""
        x = float(self.forcing.level(np.array([t * (1 + 1e-15)]))[0])
        return (x - self.at(t)) / self.tau

    def _piece(self, y: float, begin: float, end: float, keep: bool) -> float:
        starts, h, levels, solved = self._steps(begin, end, 1)
        count = len(starts)
        z = h / self.tau
        kept = 1 - z * _WEIGHTS @ solved @ np.ones(4)
        gained = levels @ (z * _WEIGHTS @ solved)
        values = np.empty(count)
        for number, gain in enumerate(gained.tolist()):
            y = kept * y + gain
            values[number] = y
        if keep:
            self.trail.append((np.append(starts[1:], end), values))
        return y

    def _steps(self, begin: float, end: float, finer: int) -> tuple[Any, float, Any, Any]:
        """The starts of equal steps, their length, x at their nodes, and the stages solved."""
        longest = min(self.tau / 4, self.forcing.quick / 16) / finer
        count = max(1, math.ceil((end - begin) / longest))
        if count > MOST_STEPS:
            raise TooLong
        h = (end - begin) / count
        starts = begin + h * np.arange(count)
        levels = self.forcing.level(starts[:, None] + h * _NODES)
        return starts, h, levels, np.linalg.inv(np.eye(4) + h / self.tau * _MATRIX)

    def _squared(self, y: float, begin: float, end: float, power: int) -> tuple[float, float]:
        """y at the end, and the integral of its power: a second equation, q' = y^power."""
        starts, h, levels, solved = self._steps(begin, end, 4)
        z = h / self.tau
        kept = 1 - z * _WEIGHTS @ solved @ np.ones(4)
        gained = levels @ (z * _WEIGHTS @ solved)
        first = np.empty(len(starts))
        for number, gain in enumerate(gained.tolist()):
            first[number] = y
            y = kept * y + gain
        slopes = (levels - first[:, None]) @ solved.T
        inner = first[:, None] + z * slopes @ _MATRIX.T
        return y, float(h * np.sum(inner**power @ _WEIGHTS))

    def passages(self, level: float, until: float, after: float, direction: str) -> int:
        """How often y passes a level between two moments, as far as the steps show it."""
        self.trail.clear()
        self.at(until, keep=True)
        times = np.concatenate([[0.0], *(t for t, _ in self.trail)])
        values = np.concatenate([[self.initial], *(y for _, y in self.trail)])
        above = values[np.abs(values - level) > 1e-12 * self.scale] > level
        when = times[np.abs(values - level) > 1e-12 * self.scale]
        rises = (~above[:-1] & above[1:]) & (when[1:] > after)
        falls = (above[:-1] & ~above[1:]) & (when[1:] > after)
        found = {"rising": rises, "falling": falls}.get(direction, rises | falls)
        return int(np.count_nonzero(found))

    def integral(self, start: float, end: float, power: int) -> float:
        """The integral of y or of its square, integrated along with y."""
        before = max(0.0, min(end, 0.0) - start) * self.initial**power
        if end <= 0:
            return before
        y, total = self.initial, 0.0
        moments = sorted({*self.forcing.between(0.0, end), *([start] if 0 < start < end else [])})
        for begin, finish in itertools.pairwise(moments):
            y, gained = self._squared(y, begin, finish, power)
            total += gained if begin >= start else 0.0
        return before + total


def arrival(r: float, course: Course, level: float) -> Expected | None:
    """The moment at which y is at a level, from one that is near."""
    if r <= 0:
        return (0.0, 0.0) if course.initial == level else None
    slope = course.rate(r)
    if slope == 0:
        return None
    near = 1e-13 * course.scale / abs(slope)
    return r - (course.at(r) - level) / slope, near
