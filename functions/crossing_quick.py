"""Crossings of many rows of arguments under one source table, where it lets the quick way work."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal

import numpy as np

from tausheet.functions.course import Course
from tausheet.functions.crossing_rows import Mask, Rows, Straight, Stretch, pick, pick_pair, rows_of
from tausheet.functions.crossing_sine import Sine
from tausheet.functions.digits import fifty_digits, turns_of
from tausheet.functions.exact import Array
from tausheet.functions.pairs import Pair, pair_of
from tausheet.functions.shapes import NEVER
from tausheet.functions.sources import Source

_BLOCK = 10_000
"""Rows at a time: their arrays stay in the processor's cache."""
_STRETCHES = 30


@dataclass(frozen=True)
class Line:
    """A stretch with the forcing a + b s, and on the last perhaps a sine for ever.

    a and the sine's phase (in turns) are each the two doubles next to them.
    """

    t0: float
    t1: float
    a: tuple[float, float]
    b: float
    sine: tuple[float, float, tuple[float, float]] | None

    def rows(self, rows: Rows, y: Pair, way: int) -> Stretch:
        """Some rows on it, which start at y."""
        if self.sine:
            return Sine(self.t0, self.a, *self.sine, rows, y, way)
        return Straight(self.t0, self.t1, self.a, self.b, rows, y, way)


@fifty_digits
def lines_of(sources: Sequence[Source]) -> list[Line] | None:
    """The stretches of a source table, None when it has others than straight lines and a sine."""
    if any(source.shape in ("decay", "square") for source in sources):
        return None
    course = Course(sources, 1.0, 0.0)
    sines = [source for source in sources if source.shape == "sine"]
    lines: list[Line] = []
    origin = Decimal(0)
    while origin < NEVER:
        end = course.next_change(origin)
        path = course.path(origin, end)
        sine = None
        if path.forcing.sines:
            if len(sines) > 1 or end < NEVER or path.forcing.b:
                return None
            size, frequency, phase = sines[0].values
            turns = turns_of(Decimal(frequency), origin - Decimal(sines[0].start))
            sine = size, frequency, pair_of((turns + Decimal(phase) / 360) % 1)
        a = pair_of(sum((Decimal(level) for level in path.levels), Decimal(0)))
        t0, t1 = float(origin), float(end)
        if Decimal(t0) != origin or (end < NEVER and Decimal(t1) != end):
            return None
        lines.append(Line(t0, t1, a, path.forcing.b, sine))
        if len(lines) > _STRETCHES:
            return None
        origin = end
    return lines


def quick_crossings(lines: Sequence[Line], rows: Rows, way: int) -> tuple[Array, Mask]:
    """Crossing times (infinite: never), and for which rows they are decided."""
    size = rows.level.size
    found, decided = np.empty(size), np.empty(size, bool)
    for start in range(0, size, _BLOCK):
        part = slice(start, start + _BLOCK)
        found[part], decided[part] = _block(lines, pick(rows, part), way)
    return found, decided


def _block(lines: Sequence[Line], rows: Rows, way: int) -> tuple[Array, Mask]:
    size = rows.level.size
    found, decided = np.full(size, math.inf), np.ones(size, bool)
    live = np.arange(size)
    y: Pair = rows.initial, np.zeros(size)
    for line in lines:
        stretch = line.rows(rows, y, way)
        bracket = stretch.bracket()
        there = bracket.hit & ~bracket.doubt
        if there.any():
            where = rows_of(there)
            found[live[where]], decided[live[where]] = stretch.solve(where, bracket)
        decided[live[bracket.doubt]] = False
        rest = np.flatnonzero(~(bracket.hit | bracket.doubt))
        if not rest.size or math.isinf(line.t1):
            break
        y = pick_pair(stretch.end(), rest)
        rows = pick(rows, rest)
        rows.count = bracket.left_over[rest]
        live = live[rest]
    return found, decided
