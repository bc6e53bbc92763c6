"""Crossings of many rows of arguments at once while a sine goes on for ever.

Twice a period forcing - level is 0. At the n-th such moment of either kind
h = p + e exp(-(d + n period) / tau) with p and e known, so the side of the level changes there at
most once, at a known n. Runs of periods between such changes are alike, and the crossing asked
for is found by counting whole runs: the millionth costs as much as the first.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np

from tausheet.functions.crossing_rows import (
    NOISE,
    Bracket,
    Mask,
    Rows,
    Stretch,
    Where,
    pick,
    pick_pair,
    rows_of,
    search,
)
from tausheet.functions.digits import TURN
from tausheet.functions.exact import Array
from tausheet.functions.pairs import (
    Pair,
    add,
    exponential_fall,
    less,
    over,
    pair_of,
    sine_cosine,
    times,
    turned,
)

_TURN = pair_of(TURN)
_Wanted: TypeAlias = Callable[[Array, Array], Mask]
"""Whether passing from one side to another counts."""


class Sine(Stretch):
    """The forcing a + amplitude sin(2 pi frequency s + phase), phase a pair, in turns."""

    def __init__(
        self,
        t0: float,
        forcing: Pair,
        amplitude: float,
        frequency: float,
        phase: tuple[float, float],
        rows: Rows,
        y: Pair,
        way: int,
    ) -> None:
        super().__init__(t0, math.inf, forcing, rows, y, way)
        self.amplitude, self.frequency, self.phase = amplitude, frequency, phase
        self.scale = self.scale + abs(amplitude)
        self.k = math.tau * frequency * self.tau
        self.p = amplitude / (1 + self.k * self.k)
        self.q = -self.k * self.p
        angle = math.tau * phase[0]
        settled = self.p * math.sin(angle) + self.q * math.cos(angle)
        self.transient = (self.first[0] - self.drive[0]) - settled

    def part(self, where: Where) -> Sine:
        """Some of the rows."""
        if isinstance(where, slice):
            return self
        shape = self.amplitude, self.frequency, self.phase
        rows, y = pick(self.rows, where), pick_pair(self.y, where)
        return Sine(self.t0, self.forcing, *shape, rows, y, self.way)

    def bends(self, s: Array) -> tuple[float, float]:
        """Bounds of the forcing's slope, and of the terms of `fine` beside the scale."""
        return math.tau * self.frequency * abs(self.amplitude), 2 * abs(self.amplitude)

    def end(self) -> Pair:
        """A sine is always the last."""
        raise AssertionError("a sine has no end")

    def _turns(self, s: Array) -> Array:
        turns: Array = turned(self.frequency, (s, 0.0), self.phase)[0]
        return turns

    def bracket(self) -> Bracket:
        """Outside the sine's reach at most one crossing, on the way to the settled side."""
        start, drive, reach = self.start, self.drive[0], abs(self.amplitude)
        if start.any():
            turns, left = self._turns(start), self.transient * np.exp(-start / self.tau)
            angle = math.tau * turns
            h = self.p * np.sin(angle) + self.q * np.cos(angle) + drive + left
        else:
            turns, left, h = np.full_like(start, self.phase[0]), self.transient, self.first[0]
        side, doubt = self.side_at_start(h)
        noise = NOISE * self.scale
        beyond = np.abs(drive) - reach
        doubt |= ~(np.abs(beyond) > noise)
        inside = rows_of((beyond < 0) & ~doubt)
        if isinstance(inside, slice):
            return self._periods(side, left, turns)
        settled = np.sign(drive)
        gap = np.abs(drive) - np.hypot(self.p, self.q)
        ratio = np.maximum(2 * np.abs(left) / np.where(gap > 0, gap, 1.0), 1.0)
        counts = self.wanted(side, settled) & (self.rows.count <= 1)
        end = start + self.tau * (1 + np.log(ratio))
        bracket = Bracket(counts, doubt, start.copy(), end, side.copy(), self.rows.count.copy())
        if inside.size:
            periods = self.part(inside)._periods(side[inside], left[inside], turns[inside])
            for name, value in vars(periods).items():
                getattr(bracket, name)[inside] = value
        return bracket

    def _periods(self, side: Array, left: Array, turns: Array) -> Bracket:
        """Two moments a period, from the start on, when the sine is at the level."""
        start, k, period = self.start, self.k, 1 / self.frequency
        level = self.drive[0] / -self.amplitude
        up = np.arcsin(level) / math.tau
        first, second = up - turns, 0.5 - up - turns
        first, second = first - np.floor(first), second - np.floor(second)
        steep = np.sqrt((1 - level) * (1 + level))
        level = k * level
        h_up, h_down = self.q * (level + steep), self.q * (level - steep)
        swap = second < first
        d1, d2 = np.minimum(first, second) * period, np.maximum(first, second) * period
        p1, p2 = np.where(swap, h_down, h_up), np.where(swap, h_up, h_down)
        before1, n1, doubt1 = self._flip(p1, left, d1, period)
        before2, n2, doubt2 = self._flip(p2, left, d2, period)
        doubt = doubt1 | doubt2
        runs = _Runs(before1, np.sign(p1), n1, before2, np.sign(p2), n2)
        hit, n, on_second, side = runs.find(side, self.rows.count, self.wanted)
        base = start + n * period
        begin = np.where(n > 0, base + (d2 - period), start)
        return Bracket(
            hit,
            doubt,
            np.where(on_second, base + d1, begin),
            np.where(on_second, base + d2, base + d1),
            side,
            self.rows.count,
        )

    def _flip(self, p: Array, left: Array, d: Array, period: float) -> tuple[Array, Array, Mask]:
        """Side before the change, the period of the change, and whether that is in doubt."""
        doubt = ~(np.abs(p) > NOISE * self.scale)
        changes = p * left < 0
        ratio = np.abs(left / p)
        n = (self.tau * np.log(ratio) - d) / period
        unsure = self.tau / period * NOISE * (1 + self.scale / np.abs(left)) + 1e-12 * np.abs(n)
        changes &= n > -unsure - 1
        doubt |= changes & (np.abs(n - np.rint(n)) <= unsure)
        behind = np.sign(p)
        n = np.where(changes, np.maximum(np.ceil(n), 0.0), 0.0)
        return np.where(changes, -behind, behind), n, doubt

    def rough(self, left: Array, right: Array, side: Array) -> Array:
        """The crossing between left and right to about ten digits."""
        width = right - left
        u = width / self.tau
        size = 1 / self.scale
        transient = self.transient * size * np.exp(-left / self.tau)
        state: tuple[Any, ...] = (
            u,
            self.p * size,
            self.q * size,
            self.drive[0] * size,
            transient,
            self.amplitude * size,
            self._turns(left),
            self.frequency * width,
        )
        short = tuple(value.astype(np.float32) for value in state)
        x: Any = np.full(u.shape, 0.5, np.float32)
        for _ in range(7):  # single precision for a good guess: its sine is much quicker
            h, g = _values(x, *short)
            x = np.fmin(np.fmax(x + np.log1p(-h / g) / short[0], 0.5 * x), 0.5 * x + 0.5)
        x = x.astype(np.float64)
        h, g = _values(x, *state)
        step = np.log1p(-h / g) / u
        x = x + step
        astray = ~((np.abs(step) * np.maximum(u, 1.0) <= 1e-5) & (x >= 0) & (x <= 1))
        if astray.any():
            rest = np.flatnonzero(astray)
            again = x[rest] - step[rest]
            again = np.where((again >= 0) & (again <= 1), again, 0.5)
            x[rest] = search(_values, tuple(v[rest] for v in state), side[rest], again)
        crossing: Array = left + width * x
        return crossing

    def fine(self, s: Pair) -> tuple[Array, Array]:
        """h to nineteen digits, and g."""
        fall = exponential_fall(over(s, (self.tau, 0.0)))
        k = times(times(_TURN, (self.frequency, 0.0)), (self.tau, 0.0))
        share = over((self.amplitude, 0.0), add((1.0, 0.0), times(k, k)))
        sine, cosine = sine_cosine(turned(self.frequency, s, self.phase))
        sine_0, cosine_0 = sine_cosine((np.float64(self.phase[0]), np.float64(self.phase[1])))
        settled = times(share, add(sine, less(times(k, cosine))))
        settled_0 = times(share, add(sine_0, less(times(k, cosine_0))))
        transient = add(add(self.y, less(self.forcing)), less(settled_0))
        h = add(add(settled, times(transient, fall)), self.drive)
        return h[0] + h[1], self.amplitude * sine[0] + self.drive[0]


def _values(
    x: Any,
    u: Any,
    p: Any,
    q: Any,
    drive: Any,
    transient: Any,
    amplitude: Any,
    turns: Any,
    turned: Any,
) -> tuple[Any, Any]:
    """h and g, as shares of the scale, at a share x of the width behind the left ends."""
    angle = (turns + turned * x) * math.tau
    sine = np.sin(angle)
    h = p * sine + q * np.cos(angle) + drive + transient * np.exp(-u * x)
    return h, amplitude * sine + drive


@dataclass
class _Runs:
    """Sides at the first and the second moment of each period, changing in periods n1 and n2."""

    before1: Array
    behind1: Array
    n1: Array
    before2: Array
    behind2: Array
    n2: Array

    def sides(self, n: Array) -> tuple[Array, Array]:
        """The sides at both moments of period n."""
        first = np.where(n < self.n1, self.before1, self.behind1)
        return first, np.where(n < self.n2, self.before2, self.behind2)

    def find(self, side: Array, count: Array, wanted: _Wanted) -> tuple[Mask, Array, Mask, Array]:
        """Whether there is a count-th crossing, its period, whether it lies behind the first
        moment of it, and the side it comes from; `side` is the one at the start."""
        one, two = self.sides(np.zeros_like(count))
        first, second = wanted(side, one), wanted(one, two)
        on_second = ~first | (count > 1)
        n, come_from = np.zeros_like(count), np.where(on_second, one, side)
        each = first.astype(np.float64) + second
        hit = count <= each
        if not hit.all():
            rest = np.flatnonzero(~hit)
            later = pick(self, rest)._find_later(count[rest] - each[rest], wanted)
            for values, found in zip((hit, n, on_second, come_from), later, strict=True):
                values[rest] = found
        return hit, n, on_second, come_from

    def _find_later(self, count: Array, wanted: _Wanted) -> tuple[Mask, Array, Mask, Array]:
        """The same behind period 0."""
        early, late = np.minimum(self.n1, self.n2), np.maximum(self.n1, self.n2)
        middle = self.sides(early)[1]
        runs = (
            (np.ones_like(early), early - 1, self.before2),
            (early, np.minimum(early, 1), self.before2),
            (early + 1, late - early - 1, middle),
            (late, np.minimum(late - early, 1), middle),
            (late + 1, np.full_like(early, math.inf), self.behind2),
        )
        hit, on_second = np.zeros(count.shape, bool), np.zeros(count.shape, bool)
        n_hit, come_from = np.zeros_like(count), np.zeros_like(count)
        for n, length, previous in runs:
            one, two = self.sides(n)
            first, second = wanted(previous, one), wanted(one, two)
            each = first.astype(np.float64) + second
            there = np.where(each > 0, np.maximum(length, 0.0) * np.maximum(each, 1.0), 0.0)
            now = ~hit & (count <= there)
            periods = np.floor((count - 1) / np.maximum(each, 1.0))
            behind = ~first | (count - 1 > periods * each)
            n_hit = np.where(now, n + periods, n_hit)
            on_second = np.where(now, behind, on_second)
            come_from = np.where(now, np.where(behind, one, previous), come_from)
            hit |= now
            if hit.all():
                break
            count = np.where(hit, count, count - there)
        return hit, n_hit, on_second, come_from
