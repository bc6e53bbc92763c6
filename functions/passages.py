"""Passages of y from one side of a level to the other, path after path."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from typing import TypeVar

from tausheet.functions.roots import Lag, Mark, Path

T = TypeVar("T")
_EPS = 2.0**-53


@dataclass(frozen=True)
class Passage:
    """One passage: its way (1 rising, -1 falling), bounds of its moment, the moment itself."""

    way: int
    earliest: float
    latest: float
    moment: Callable[[], float]


class Watch:
    """Remembers on which side y was last, and since when it has been at the level.

    A touch, or a stretch at the level, is a passage only when y leaves it on the other side, and
    then at the moment it arrived.
    """

    def __init__(self) -> None:
        self.side = 0
        self.arrived: float | None = None

    def see(
        self, side: int, before: float | None, now: float, solve: Callable[[], float]
    ) -> Passage | None:
        """The passage that a look at y on `side` proves; `before`: the last look, None: a jump."""
        arrived = self.arrived
        if side == 0:
            if arrived is None:
                self.arrived = now
            return None
        came_from, self.side, self.arrived = self.side, side, None
        if came_from in (0, side):
            return None
        if arrived is not None:
            return Passage(side, arrived, arrived, lambda: arrived)
        if before is None:
            return Passage(side, now, now, lambda: now)
        return Passage(side, before, now, solve)


def follow(path: Path, level: float, last: Lag | None) -> Lag:
    """y - level on a path, from its own start or from where the last one ended."""
    if path.start is not None:
        error = _EPS * abs(path.start) if path.exact else 0.0
        return Lag(path, level, path.start - level, error)
    assert last is not None, "the first path has a start of its own"
    start, error, _ = last.at(last.path.length)
    return Lag(path, level, start, error)


def along(lag: Lag, t_from: float, watch: Watch) -> Iterator[Passage]:
    """The passages on one path behind t_from, in order, until y keeps its side for ever.

    Starting in the middle is safe: a passage needs a side to come from.
    """
    moment = lag.path.moment
    begin = max(t_from - moment(0), 0.0) if t_from > -math.inf else 0.0
    if begin >= lag.path.length:
        return
    before: Mark | None = None
    for mark in _marks(lag, begin):
        left = before
        earliest = None if left is None else moment(left.s)

        def solve(left: Mark | None = left, mark: Mark = mark) -> float:
            assert left is not None
            return moment(lag.root(left.s, mark.s, left.side))

        found = watch.see(mark.side, earliest, moment(mark.s), solve)
        if found:
            yield found
        before = mark


def _marks(lag: Lag, begin: float) -> Iterator[Mark]:
    """Marks to the end of the path, or as far as anything can happen."""
    end = lag.path.length
    if math.isfinite(end):
        yield from lag.marks(begin, end)
        return
    settled = lag.settles()
    if settled is not None:
        yield from lag.marks(begin, max(begin, settled))
        return
    width = max(1 / max(f for _, f, _ in lag.g.sines), begin * 1e-9)
    while True:
        yield from lag.marks(begin, begin + width)
        begin += width
        width *= 2


class Wanted:
    """Counts down to the passage asked for."""

    def __init__(self, way: int, count: float, after: float) -> None:
        self.way, self.count, self.after = way, count, after

    def counts(self, passage: Passage) -> bool:
        """Whether a passage is of the kind asked for, and behind `after`."""
        if self.way * passage.way < 0 or passage.latest <= self.after:
            return False
        if passage.earliest > self.after:
            return True
        return passage.moment() > self.after

    def take(self, found: Iterable[Passage]) -> float | None:
        """The moment of the passage asked for, None when it is not among these."""
        for passage in found:
            if self.counts(passage):
                self.count -= 1
                if self.count <= 0:
                    return passage.moment()
        return None
