"""The extreme values of y in a window of time."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from decimal import Decimal
from functools import partial
from heapq import heappop, heappush
from itertools import pairwise
from typing import Annotated, Any, NamedTuple

import numpy as np

from tausheet.functions.arguments import Finite, Positive, words
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.course import Course
from tausheet.functions.crossing import PATHS, UNDECIDED
from tausheet.functions.digits import fifty_digits
from tausheet.functions.errors import DomainError
from tausheet.functions.passages import follow
from tausheet.functions.paths import Repeating, to_all_digits
from tausheet.functions.roots import Lag, Path, Undecided
from tausheet.functions.sources import Sources

_TIE = 4e-16
"""Share of the larger by which two extremes must differ for the later one to be taken."""
_SETTLED = 45
"""Time constants after which one period is like the next to rounding."""
_WINDOWS = 50_000


class Peak(NamedTuple):
    """An extreme value and the earliest moment at which y has it."""

    value: Any
    time: Any


class _Best:
    """The largest of sign y (of |y| for sign 0) seen so far."""

    def __init__(self, sign: int) -> None:
        self.sign = sign
        self.size, self.time = -math.inf, math.nan
        self.value: Callable[[], float] = lambda: math.nan

    def measure(self, y: float) -> float:
        """How large y counts."""
        return self.sign * y if self.sign else abs(y)

    def offer(self, y: float, t: float, exact: Callable[[], float]) -> None:
        """Look at a value in doubles; `exact` gives all its digits should it win."""
        size = self.measure(y)
        tie = _TIE * max(abs(size), abs(self.size)) if self.time == self.time else 0.0
        if size > self.size + tie or (size >= self.size - tie and t < self.time):
            self.size, self.value, self.time = size, exact, t


def peak_of(
    paths: Iterable[Path | Repeating],
    t_from: float,
    t_to: float,
    kind: str = "max",
    before: float | None = None,
) -> Peak:
    """Extreme value of y from t_from to t_to, both ends and both sides of every jump included.

    kind: "max", "min" or "abs". before: the constant value of y until the first path.
    """
    best = _Best({"max": 1, "min": -1, "abs": 0}[kind])
    last: Lag | None = None
    for walked, path in enumerate(_through(to_all_digits(paths), t_from, t_to)):
        if walked > PATHS:
            raise Undecided(UNDECIDED)
        if last is None and before is not None and t_from < path.moment(0):
            best.offer(before, t_from, partial(float, before))
        if path.moment(0) > t_to:
            break
        last = follow(path, 0.0, last)
        if path.moment(path.length) >= t_from:
            _along(last, t_from, t_to, best)
    # a moment told back from its path may be rounded past the end of the window
    return Peak(best.value(), min(max(best.time, t_from), t_to))


def _through(paths: Iterable[Path | Repeating], t_from: float, t_to: float) -> Iterator[Path]:
    """The paths that matter for the window: of what repeats the first and the last period.

    At a fixed phase of the period y changes in one direction only from period to period.
    """
    for path in paths:
        if isinstance(path, Repeating):
            yield from _repeated(path, t_from, t_to)
        else:
            yield path


@fifty_digits
def _periods(repeating: Repeating, t_from: float, t_to: float) -> list[int]:
    origin = repeating.paths[0].origin
    first = max(0, int((Decimal(t_from) - origin) / repeating.period))
    last = max(first, int((Decimal(t_to) - origin) / repeating.period))
    tau = repeating.paths[0].tau
    settled = 1 if math.isinf(tau) else int(_SETTLED * Decimal(tau) / repeating.period) + 1
    last = min(last, first + settled)
    return sorted({n for n in (first, first + 1, last - 1, last) if first <= n <= last})


def _repeated(repeating: Repeating, t_from: float, t_to: float) -> Iterator[Path]:
    for n in _periods(repeating, t_from, t_to):
        for path in repeating.paths:
            yield _moved(path, n * repeating.period)


@fifty_digits
def _moved(path: Path, behind: Decimal) -> Path:
    """A path of a later period."""
    exact = path.exact
    assert exact is not None
    return replace(
        path,
        origin=path.origin + behind,
        start=float(exact(behind)),
        exact=lambda s: exact(s + behind),
    )


def _along(lag: Lag, t_from: float, t_to: float, best: _Best) -> None:
    """Offer the extremes of y on a path, as far as it lies in the window."""
    path = lag.path
    start = path.moment(0)
    left = max(t_from - start, 0.0)
    right = min(t_to - start, path.length)
    low, high = lag.reach(left, right)
    if max(best.measure(low), best.measure(high)) < best.size:
        return
    for s in _candidates(lag, left, right, best):
        best.offer(lag.at(s)[0], path.moment(s), partial(_exact, path, s))


def _candidates(lag: Lag, left: float, right: float, best: _Best) -> Iterator[float]:
    yield left
    yield from _turning_points(lag, left, right, best)
    yield right


def _exact(path: Path, s: float) -> float:
    exact = path.exact
    assert exact is not None
    return float(exact(Decimal(s)))


def _turning_points(lag: Lag, left: float, right: float, best: _Best) -> Iterator[float]:
    """Where y turns between left and right, the most promising windows first.

    Those that cannot hold a better value than the best so far are left out.

    tau y' lags behind tau x': between two zeros of x' it has one zero at most.
    """
    fastest = max((frequency for _, frequency, _ in lag.g.sines), default=0.0)
    windows = [(-math.inf, left, right)]
    for _ in range(_WINDOWS):
        if not windows:
            return
        promise, left, right = heappop(windows)
        if -promise < best.size:
            return
        if fastest * (right - left) <= 2:
            yield from _zeros_of_rate(lag, left, right)
            continue
        middle = left + (right - left) / 2
        for window in ((left, middle), (middle, right)):
            heappush(windows, (-max(map(best.measure, lag.reach(*window))), *window))
    raise Undecided(UNDECIDED)


def _zeros_of_rate(lag: Lag, left: float, right: float) -> Iterator[float]:
    path, tau = lag.path, lag.tau
    if math.isinf(tau):
        yield from lag.turns(left, right)
        return
    forcing = path.forcing.slope().scaled(tau)
    moving = Path(path.origin, path.length, tau, forcing, (forcing.a,))
    rate = Lag(moving, 0.0, lag.g(0.0) - lag.start, lag.error)
    marks = list(rate.marks(left, right))
    for a, b in pairwise(marks):
        if a.side * b.side < 0:
            yield float(rate.root(a.s, b.s, a.side))
        elif b.side == 0:
            yield b.s


@cell_function("FO_PEAK", "Crossing time")
def peak(
    tau: Positive,
    initial: Finite,
    sources: Sources,
    t_from: Finite,
    t_to: Finite,
    kind: Annotated[str, words("max", "min", "abs")] = "max",
) -> Any:
    """The extreme value of y in a window of time, and when y has it.

        dy/dt = (x - y) / tau is 0 at most once between two moments at which dx/dt is 0 or x jumps

    Both ends of the window are looked at as well. Of equal extremes the earliest counts.

    Arguments:
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E
        t_from: start of the window (s); any number
        t_to: end of the window (s), not before t_from; any number
        kind: largest, smallest, or largest magnitude (with its sign); "max", "min", "abs"

    Result: value (in the unit of initial) and time (s), each in the broadcast shape of the
    arguments.

    Errors: #NUM! outside the ranges, for t_to before t_from, or when too many turning points
    have to be told apart; #VALUE! for a blank, a text, an unknown word or a malformed table.

    Assumes: one energy store, constant parts.

    Example:
        >>> value, time = peak(1.0, 0.0, [["pulse", 5.0, 1.0]], 0.0, 10.0)
        >>> round(value, 12), time
        (3.160602794143, 1.0)

    References: closed form of tau dy/dt + y = x for each shape.
    """
    columns = np.broadcast_arrays(tau, initial, t_from, t_to)
    shape = columns[0].shape
    found = Peak(np.zeros(shape), np.zeros(shape))
    undecided = np.zeros(shape, bool)
    backward = columns[3] < columns[2]
    for index in np.ndindex(shape):
        if backward[index]:
            continue
        own_tau, start, begin, end = (float(column[index]) for column in columns)
        course = Course(sources, own_tau, start)
        try:
            one = peak_of(course.paths(begin), begin, end, kind, start)
        except Undecided:
            undecided[index] = True
            continue
        found.value[index], found.time[index] = one
    return (
        Answer(found)
        .unless(
            backward,
            DomainError,
            "t_to is {t_to}, before t_from, {t_from}; enter a t_to that is not before t_from",
        )
        .unless(undecided, DomainError, UNDECIDED)
    )
