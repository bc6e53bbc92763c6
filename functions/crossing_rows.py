"""Crossings of many rows of arguments at once, where the forcing is straight lines and one sine.

On each stretch the zeros of forcing - level are known in closed form, so the moments between
which y passes the level at most once are too. A row that doubles cannot decide is left to the
search of `roots`.
"""

from __future__ import annotations

import math
from abc import ABC, abstractmethod
from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Any, TypeAlias, TypeVar

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.exact import Array, two_sum
from tausheet.functions.pairs import Pair, add, exponential_fall, less, over, quick_sum, times

NOISE = 1e-13
"""Share of the scale within which a double does not tell the side of the level."""
_FINE = 5e-18
"""Share of the largest term by which nineteen digits may be off."""
_RIGHT = 2e-16
"""Share of the scale by which y may miss the level at a crossing."""
_LEAST = 1e-250
"""Below this pairs of doubles lose their second double, above its inverse they overflow."""
_SERIES = 0.02
"""Below this share of tau a series stands for s - tau (1 - exp(-s / tau))."""

Mask = NDArray[np.bool_]
Where: TypeAlias = Any
"""Row numbers, or a slice for all rows."""
T = TypeVar("T")


@dataclass
class Rows:
    """Arguments of some rows, one-dimensional arrays of one length; direction 0 is either."""

    level: Array
    tau: Array
    initial: Array
    count: Array
    after: Array


@dataclass
class Bracket:
    """Where the crossing asked for lies, for each row of a stretch."""

    hit: Mask
    doubt: Mask
    left: Array
    right: Array
    side: Array
    left_over: Array
    """How many crossings are still to be counted after the stretch."""


def pick(values: T, where: Where) -> T:
    """The same with some of the rows of every array."""
    return type(values)(*(getattr(values, f.name)[where] for f in fields(values)))  # type: ignore[arg-type]


def pick_pair(pair: Pair, where: Where) -> Pair:
    """Some of the rows of a pair."""
    return pair[0][where], pair[1][where]


def rows_of(mask: Mask) -> Where:
    """The rows of a mask; a slice when it is all of them, so that nothing is copied."""
    return slice(None) if mask.all() else np.flatnonzero(mask)


class Stretch(ABC):
    """Rows on one stretch: tau h' + h = g, h = y - level, s from the stretch's start t0.

    drive: forcing - level without what changes with s, start: where the search begins.
    """

    def __init__(self, t0: float, t1: float, forcing: Pair, rows: Rows, y: Pair, way: int) -> None:
        self.t0, self.t1, self.forcing, self.way = t0, t1, forcing, way
        self.rows, self.y, self.tau = rows, y, rows.tau
        self.drive = add(forcing, (-rows.level, 0.0))
        self.first = add(y, (-rows.level, 0.0))
        self.scale = np.abs(y[0]) + np.abs(rows.level) + abs(forcing[0])
        self.start = np.maximum(rows.after - t0, 0.0)

    @abstractmethod
    def bracket(self) -> Bracket:
        """Where the crossing asked for lies."""

    @abstractmethod
    def rough(self, left: Array, right: Array, side: Array) -> Array:
        """The crossing between left and right to about ten digits."""

    @abstractmethod
    def fine(self, s: Pair) -> tuple[Array, Array]:
        """h to nineteen digits, and g."""

    @abstractmethod
    def bends(self, s: Array) -> tuple[float, Any]:
        """Bounds of the forcing's slope, and of the terms of `fine` beside the scale."""

    @abstractmethod
    def part(self, where: Where) -> Stretch:
        """Some of the rows."""

    @abstractmethod
    def end(self) -> Pair:
        """y at the end of the stretch."""

    def wanted(self, before: Array, behind: Array) -> Mask:
        """Whether passing from one side to another is a crossing that counts."""
        passed: Mask = before * behind < 0
        if self.way:
            passed &= behind == self.way
        return passed

    def side_at_start(self, h: Array) -> tuple[Array, Mask]:
        """Side where the search begins, and whether it is in doubt.

        A y that starts at the level has no side it came from.
        """
        resting = (self.start == 0) & (self.first[0] == 0) & (self.t0 == 0)
        doubt = ~(np.abs(h) > NOISE * self.scale) & ~resting
        doubt |= ~((self.scale > _LEAST) & (self.scale < 1 / _LEAST))
        return np.where(resting, 0.0, np.sign(h)), doubt

    def solve(self, where: Where, bracket: Bracket) -> tuple[Array, Mask]:
        """The crossings in their brackets, and whether each is right for sure."""
        part = self.part(where)
        left, right = bracket.left[where], bracket.right[where]
        guess = part.rough(left, right, bracket.side[where])
        s, rest, sure = part.polished(guess, np.zeros_like(left))
        if not sure.all():
            again = np.flatnonzero(~sure)
            s[again], rest[again], sure[again] = part.part(again).polished(s[again], rest[again])
        high, low = two_sum(self.t0, s)
        t = high + (low + rest)
        slack = 1e-15 * right
        sure &= (t > part.rows.after) & (s >= left - slack) & (s <= right + slack)
        return t, sure

    def polished(self, s: Array, rest: Array) -> tuple[Array, Array, Mask]:
        """One of Newton's steps to nineteen digits, and whether that settles it."""
        h, g = self.fine((s, rest))
        fall = h - g
        step = h * self.tau / fall
        slope, term = self.bends(s)
        size = np.abs(fall)
        next_step = step * step * (slope + size / self.tau) / size
        level = np.abs(self.rows.level)
        forced = np.maximum(level, np.maximum(np.abs(self.rows.initial), np.abs(g) - level))
        off = next_step * size / self.tau + _FINE * (term + self.scale)
        return *quick_sum(s, rest + step), off <= _RIGHT * forced


class Straight(Stretch):
    """The forcing a + b s."""

    def __init__(
        self, t0: float, t1: float, forcing: Pair, b: float, rows: Rows, y: Pair, way: int
    ) -> None:
        super().__init__(t0, t1, forcing, rows, y, way)
        self.b = b

    def part(self, where: Where) -> Straight:
        """Some of the rows."""
        y = pick_pair(self.y, where)
        return Straight(self.t0, self.t1, self.forcing, self.b, pick(self.rows, where), y, self.way)

    def bends(self, s: Array) -> tuple[float, Any]:
        """Bounds of the forcing's slope, and of the terms of `fine` beside the scale."""
        return abs(self.b), 8 * abs(self.b) * s

    def _value(self, s: Array) -> tuple[Array, Mask]:
        """h after s, and whether doubles do not tell its side."""
        u = s / self.tau
        h = _after(self.first[0], self.drive[0], self.b, s, self.tau, u)
        return h, ~(np.abs(h) > NOISE * (self.scale + abs(self.b) * s))

    def bracket(self) -> Bracket:
        """One turning point of h exp(s / tau) at most: where the line is at the level."""
        b, drive, length = self.b, self.drive[0], self.t1 - self.t0
        start = np.minimum(self.start, length)
        h, _ = self._value(start)
        side, doubt = self.side_at_start(h)
        turn, side_turn = start, side
        if b:
            turn = -drive / b
            there = (turn > start) & (turn < length)
            turn = np.where(there, turn, start)
            h, unsure = self._value(turn)
            side_turn = np.where(there, np.sign(h), side)
            doubt |= unsure & there
        else:
            doubt |= (np.abs(drive) <= NOISE * self.scale) & (drive != 0)
        if math.isinf(length):
            end, side_end = self._horizon(turn, side_turn)
        else:
            end = np.full_like(turn, length)
            h, unsure = self._value(end)
            side_end = np.where(end > start, np.sign(h), side_turn)
            doubt |= unsure & (end > start)
        one, two = self.wanted(side, side_turn), self.wanted(side_turn, side_end)
        count = self.rows.count
        at_once = one & (count <= 1)
        return Bracket(
            at_once | (two & (count - one <= 1)),
            doubt,
            np.where(at_once, start, turn),
            np.where(at_once, turn, end),
            np.where(at_once, side, side_turn),
            count - one - two,
        )

    def _horizon(self, turn: Array, side: Array) -> tuple[Array, Array]:
        """A moment by which y is on the side where it stays for ever, and that side."""
        drive = self.drive[0]
        if not self.b:
            ratio = np.abs((self.first[0] - drive) / np.where(drive == 0, 1.0, drive))
            end = turn + self.tau * (1 + np.log(np.maximum(ratio, 1.0)))
            return end, np.where(drive == 0, side, np.sign(drive))
        final = np.full_like(turn, math.copysign(1.0, self.b))
        end = turn + self.tau
        for _ in range(1100):  # doubling goes from the smallest double to the largest
            short = (np.sign(self._value(end)[0]) != final) & (side != final)
            if not short.any():
                break
            end = np.where(short, 2 * end, end)
        return end, final

    def rough(self, left: Array, right: Array, side: Array) -> Array:
        """The crossing between left and right to about ten digits."""
        width = right - left
        drive = self.drive[0] + self.b * left
        state = (width / self.tau, self._value(left)[0], drive, self.tau)
        return left + width * search(self._values, state, side, np.zeros_like(left))

    def _values(
        self, x: Array, u: Array, first: Array, drive: Array, tau: Array
    ) -> tuple[Array, Array]:
        """h and g at a share x of the width behind the left ends."""
        s = u * x * tau
        return _after(first, drive, self.b, s, tau, u * x), drive + self.b * s

    def fine(self, s: Pair) -> tuple[Array, Array]:
        """h to nineteen digits, and g."""
        h = self._fine(s)
        return h[0] + h[1], self.b * s[0] + self.drive[0]

    def _fine(self, s: Pair) -> Pair:
        tau = self.tau, np.zeros_like(self.tau)
        u = over(s, tau)
        fall = exponential_fall(u)
        value = add(times(add(self.first, less(self.drive)), fall), self.drive)
        if not self.b:
            return value
        near = _lagging(s[0], self.tau, u[0], -np.expm1(-u[0]))
        far = add(s, less(times(tau, add((1.0, 0.0), less(fall)))))
        small = u[0] < _SERIES
        slope = np.where(small, near, far[0]), np.where(small, 0.0, far[1])
        return add(value, times((self.b, 0.0), slope))

    def end(self) -> Pair:
        """y at the end of the stretch."""
        length = np.full_like(self.tau, self.t1 - self.t0)
        return add(self._fine((length, np.zeros_like(length))), (self.rows.level, 0.0))


def _after(first: Any, drive: Any, b: float, s: Array, tau: Array, u: Array) -> Array:
    """What starts as `first` and lags behind drive + b s, after s."""
    step = -np.expm1(-u)
    h: Array = first * np.exp(-u) + drive * step
    return h + b * _lagging(s, tau, u, step) if b else h


def _lagging(s: Array, tau: Array, u: Array, step: Array) -> Array:
    """s - tau (1 - exp(-s / tau)): the response to a forcing that rises by 1 a second."""
    series = s * u * (0.5 - u * (1 / 6 - u * (1 / 24 - u * (1 / 120 - u * (1 / 720 - u / 5040)))))
    return np.where(u < _SERIES, series, s - tau * step)


def search(
    values: Callable[..., tuple[Array, Array]], state: tuple[Array, ...], side: Array, x: Array
) -> Array:
    """The share of the width at which h changes its side, from a guess x.

    A step goes to where y would be at the level if the forcing were constant; where that leads
    astray the bracket is halved. The first of `state` is the width as a share of tau.
    """
    low, high = np.zeros_like(x), np.ones_like(x)
    last = high
    found = x.copy()
    live: NDArray[np.intp] = np.arange(x.size)
    for _ in range(200):
        h, g = values(x, *state)
        u = state[0]
        step = np.log1p(-h / g) / u
        before = h * side >= 0
        low, high = np.where(before, x, low), np.where(before, high, x)
        guess = x + step
        size = np.abs(step)
        near = size * np.maximum(u, 1.0) <= 1e-5
        steady = (guess >= low) & (guess <= high)
        near &= steady
        near |= high - low <= 1e-15 * high
        steady &= size < last
        last = np.where(steady, size / 2, high - low)
        x = np.where(steady, guess, (low + high) / 2)
        found[live] = x
        far = np.flatnonzero(~near)
        if not far.size:
            break
        if far.size < live.size:
            live, x, low, high = live[far], x[far], low[far], high[far]
            last, side = last[far], side[far]
            state = tuple(v[far] for v in state)
    return found
