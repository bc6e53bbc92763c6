"""What repeats for ever: the side of a level at the marks of one period, period after period.

When the forcing repeats and only exp(-t / tau) is left of the start, h = y - level at a fixed phase
is p + e q^n in period n: its sign changes at most once, at an n that a logarithm gives. Between
such changes all periods are alike, so a passage is found by counting whole runs of periods.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal

from tausheet.functions.digits import fall, fifty_digits, lag
from tausheet.functions.passages import Passage, Wanted, Watch
from tausheet.functions.roots import Lag, Path

_NOTHING = Decimal("1e-38")


@dataclass(frozen=True)
class _Phase:
    """A mark of the period: path number, moment on it, p, and e of h = p + e q^n."""

    path: int
    s: float
    settled: Decimal
    transient: Decimal

    def side(self, left: Decimal) -> int:
        """The side of the level when `left` of the transient is left."""
        h = self.settled + self.transient * left
        return (h > 0) - (h < 0)


class Cycle:
    """y - level from paths[0].origin on, for paths that together last one period and repeat.

    Each path's `exact` must hold in later periods as well.
    """

    @fifty_digits
    def __init__(self, paths: Sequence[Path], level: float, period: Decimal) -> None:
        self.paths, self.level, self.period = paths, level, period
        tau = paths[0].tau
        start = self._exact(0, Decimal(0))
        if math.isinf(tau):
            self._rate, whole = Decimal(0), Decimal(0)
        else:
            self._rate = period / Decimal(tau)
            whole = (start - self._exact(0, period)) / lag(self._rate)
        self._phases: list[_Phase] = []
        self.changes: set[int] = set()
        for number, path in enumerate(paths):
            turns = Lag(path, level, float(self._exact(number, Decimal(0)))).turns(0.0, path.length)
            for s in (0.0, *turns, path.length):
                h = self._exact(number, Decimal(s))
                passed = path.origin - paths[0].origin + Decimal(s)
                left = whole if math.isinf(tau) else whole * fall(passed / Decimal(tau))
                settled = h - left
                nothing = _NOTHING * (abs(h) + abs(Decimal(level)))
                settled = settled if abs(settled) > nothing else Decimal(0)
                left = left if abs(left) > nothing else Decimal(0)
                phase = _Phase(number, s, settled, left)
                self._phases.append(phase)
                if left * settled < 0 and abs(left) > abs(settled):
                    self._note_change(phase)

    def _exact(self, number: int, s: Decimal) -> Decimal:
        exact = self.paths[number].exact
        assert exact is not None
        return exact(s) - Decimal(self.level)

    def _left(self, n: int) -> Decimal:
        return fall(n * self._rate)

    def _note_change(self, phase: _Phase) -> None:
        """The first period in which the settled part decides."""
        ratio = abs(phase.transient / phase.settled).ln()
        n = int(ratio / self._rate)
        while phase.side(self._left(n)) * phase.settled <= 0:
            n += 1
        self.changes.add(n)

    @fifty_digits
    def number(self, t: float) -> int:
        """The period in which a moment lies, 0 for an earlier one."""
        if not t > float(self.paths[0].origin):
            return 0
        return max(0, int((Decimal(t) - self.paths[0].origin) / self.period))

    def runs(self, first: int) -> Iterator[tuple[int, float]]:
        """Periods from `first` on in runs that are alike: number of the first, and of the next."""
        bounds = sorted({first, *(n for n in self.changes if n > first)})
        yield from zip(bounds, [*bounds[1:], math.inf], strict=True)

    @fifty_digits
    def period_passages(self, n: int, watch: Watch) -> list[Passage]:
        """The passages in period n."""
        left = self._left(n)
        found = []
        before: _Phase | None = None
        for phase in self._phases:
            inside = before is not None and before.path == phase.path
            last = before if inside else None
            earliest = None if last is None else self._moment(n, last)
            now = self._moment(n, phase)
            passage = watch.see(phase.side(left), earliest, now, self._solver(n, last, phase, left))
            if passage:
                found.append(passage)
            before = phase
        return found

    @fifty_digits
    def _moment(self, n: int, phase: _Phase) -> float:
        return float(self.paths[phase.path].origin + n * self.period + Decimal(phase.s))

    def _solver(
        self, n: int, last: _Phase | None, phase: _Phase, left: Decimal
    ) -> Callable[[], float]:
        def solve() -> float:
            assert last is not None
            lag_, path = self._lag(n, phase.path)
            return path.moment(lag_.root(last.s, phase.s, last.side(left)))

        return solve

    @fifty_digits
    def _lag(self, n: int, number: int) -> tuple[Lag, Path]:
        """y - level on a path of period n."""
        path = self.paths[number]
        behind = n * self.period
        exact = path.exact
        assert exact is not None
        start = exact(behind)
        moved = replace(path, origin=path.origin + behind, exact=lambda s: exact(s + behind))
        h = start - Decimal(self.level)
        return Lag(moved, self.level, float(h)), moved

    def take(self, wanted: Wanted, watch: Watch, first: int) -> float | None:
        """The moment of the passage asked for, None when there is none."""
        for start, stop in self.runs(first):
            moment = wanted.take(self.period_passages(start, watch))
            if moment is not None:
                return moment
            n = start + 1
            if n >= stop:
                continue
            alike = [p for p in self.period_passages(n, watch) if wanted.counts(p)]
            if not alike:
                if stop == math.inf:
                    return None
                continue
            whole = (int(wanted.count) - 1) // len(alike)
            if n + whole < stop:
                wanted.count -= whole * len(alike)
                again = Watch()
                self.period_passages(n + whole - 1, again)
                return wanted.take(self.period_passages(n + whole, again))
            wanted.count -= int(stop - n) * len(alike)
            self._renew(watch, int(stop) - 1)
        return None

    def _renew(self, watch: Watch, n: int) -> None:
        """The watch after period n, as if it had looked on all the way."""
        self.period_passages(n - 1, watch)
        self.period_passages(n, watch)

    def last(self, ways: int, watch: Watch, first: int, t_end: float) -> Passage | None:
        """The last passage in a way not behind t_end."""
        end = self.number(t_end)
        found = None
        for start, stop in self.runs(first):
            if start > end:
                break
            until = min(int(stop) if stop < math.inf else end + 1, end + 1)
            for n in sorted({start, start + 1, until - 2, until - 1}):
                if start <= n < until:
                    for passage in self.period_passages(n, watch):
                        if (
                            passage.way == ways
                            and passage.earliest <= t_end
                            and (passage.latest <= t_end or passage.moment() <= t_end)
                        ):
                            found = passage
        return found
