"""When y passes from one side of a level to the other."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from typing import Annotated, Any, TypeAlias

import numpy as np

from tausheet.functions.arguments import Finite, NonNegative, Number, Numbers, Positive, words
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.course import Course
from tausheet.functions.crossing_quick import lines_of, quick_crossings
from tausheet.functions.crossing_rows import Rows
from tausheet.functions.cycle import Cycle
from tausheet.functions.errors import DomainError, NotAvailable
from tausheet.functions.exact import Array
from tausheet.functions.passages import Passage, Wanted, Watch, along, follow
from tausheet.functions.paths import Repeating, to_all_digits
from tausheet.functions.roots import Lag, Path, Undecided
from tausheet.functions.sources import Sources

WAYS = {"either": 0, "rising": 1, "falling": -1}

Direction: TypeAlias = Annotated[str, words("either", "rising", "falling")]
Count: TypeAlias = Annotated[Any, Number(low=1, whole=True)]

PATHS = 20_000
"""Stretches walked along before a search is given up."""

NEVER = (
    "y does not pass the level, {level}, so often after the time after, {after}; enter a level "
    "that y passes, a smaller count or an earlier after"
)
UNDECIDED = (
    "more turning points of y have to be looked at than can be told apart; ask for fewer passages "
    "or a shorter time"
)


def crossing_of(
    paths: Iterable[Path | Repeating],
    level: float,
    way: int = 0,
    count: float = 1,
    after: float = 0.0,
    before: float | None = None,
    quiet_after: float = math.inf,
) -> float | None:
    """The count-th moment behind `after` at which y passes the level; None when there is none.

    way: 1 rising, -1 falling, 0 either. before: the constant value of y until the first path.
    quiet_after: a moment behind which y is known not to pass the level.
    """
    watch, wanted = _watch(before, level), Wanted(way, count, after)
    last: Lag | None = None
    for walked, path in enumerate(to_all_digits(paths)):
        if isinstance(path, Repeating):
            cycle = Cycle(path.paths, level, path.period)
            first = cycle.number(after)
            return cycle.take(wanted, Watch() if first else watch, first)
        if path.moment(0) > quiet_after:
            return None
        if walked > PATHS:
            raise Undecided(UNDECIDED)
        last = follow(path, level, last)
        moment = wanted.take(along(last, after, watch))
        if moment is not None:
            return moment
    return None


def _watch(before: float | None, level: float) -> Watch:
    watch = Watch()
    if before is not None:
        watch.side = (before > level) - (before < level)
    return watch


def last_passage(
    paths: Iterable[Path | Repeating], level: float, way: int, t_end: float
) -> float | None:
    """The last moment not behind t_end at which y passes the level that way."""
    watch, found = Watch(), None
    last: Lag | None = None
    for walked, path in enumerate(to_all_digits(paths)):
        if walked > PATHS:
            raise Undecided(UNDECIDED)
        if isinstance(path, Repeating):
            cycle = Cycle(path.paths, level, path.period)
            found = cycle.last(way, watch, 0, t_end) or found
            break
        if path.moment(0) > t_end:
            break
        last = follow(path, level, last)
        for passage in along(last, -math.inf, watch):
            if passage.earliest > t_end:
                break
            if passage.way == way and not_behind(passage, t_end):
                found = passage
    return None if found is None else found.moment()


def not_behind(passage: Passage, t: float) -> bool:
    """Whether a passage is at t or before."""
    return passage.latest <= t or passage.moment() <= t


def each(compute: Callable[..., float | None], *arguments: Any) -> tuple[Array, Array, Array]:
    """One answer an element: values, and masks of what never happens and what is undecided."""
    columns = np.broadcast_arrays(*arguments)
    shape = columns[0].shape
    values = np.zeros(shape)
    never, undecided = np.zeros(shape, bool), np.zeros(shape, bool)
    for index in np.ndindex(shape):
        try:
            value = compute(*(float(column[index]) for column in columns))
        except Undecided:
            undecided[index] = True
            continue
        if value is None:
            never[index] = True
        else:
            values[index] = value
    return values, never, undecided


@cell_function("FO_CROSSING", "Crossing time")
def crossing(
    level: Finite,
    tau: Positive,
    initial: Finite,
    sources: Sources,
    direction: Direction = "either",
    count: Count = 1,
    after: Finite = 0.0,
) -> Numbers:
    """The count-th moment after `after` at which y passes from one side of a level to the other.

        (y - level) exp(t / tau) is monotonic while x - level keeps its sign: between the zeros of
        x - level, which bound the search, y passes the level at most once

    A touch, or a stretch at the level, counts only when y leaves on the other side, at the moment
    it arrived.

    Arguments:
        level: value of y to be passed; any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E
        direction: which passages count; "either", "rising", "falling"
        count: which of them is asked for, 1 when left out; whole number >= 1
        after: time after which they count (s), 0 when left out; any number

    Result: time (s), in the broadcast shape of level, tau, initial, count and after.

    Errors: #N/A when y does not pass the level so often; #NUM! outside the ranges, or when too
    many turning points have to be told apart; #VALUE! for a blank, a text, an unknown word
    or a malformed table.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(crossing(2.5, 1.0, 0.0, [["step", 5.0]]), 12)
        0.69314718056

    References: closed form of tau dy/dt + y = x for each shape.
    """
    way = WAYS[direction]
    arguments = np.broadcast_arrays(level, tau, initial, count, after)
    values, never = np.zeros(arguments[0].size), np.zeros(arguments[0].size, bool)
    undecided, slow = never.copy(), np.arange(values.size)
    columns = [column.ravel() for column in arguments]
    lines = lines_of(sources)
    if lines is not None:
        values, decided = quick_crossings(lines, Rows(*columns), way)
        never = np.isinf(values) & decided
        slow = np.flatnonzero(~decided)

    def one(level: float, tau: float, initial: float, count: float, after: float) -> float | None:
        course = Course(sources, tau, initial)
        quiet = course.quiet_after(level)
        return crossing_of(course.paths(after), level, way, count, after, quiet_after=quiet)

    if slow.size:
        values[slow], never[slow], undecided[slow] = each(one, *(c[slow] for c in columns))
    shape = arguments[0].shape
    return (
        Answer(values.reshape(shape))
        .unless(undecided.reshape(shape), DomainError, UNDECIDED)
        .unless(never.reshape(shape), NotAvailable, NEVER)
    )


@cell_function("FO_STAYS_WITHIN", "Crossing time")
def stays_within(
    low: Finite,
    high: Finite,
    tau: Positive,
    initial: Finite,
    sources: Sources,
    t_end: NonNegative,
) -> Numbers:
    """The first moment from which y stays inside low..high until t_end.

        the last moment before t_end at which y comes in through low or through high; 0 when y is
        inside from the start

    Arguments:
        low: lower limit of y; any number
        high: upper limit of y, not below low; any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E
        t_end: time until which y is watched (s); number >= 0

    Result: time (s), in the broadcast shape of the arguments.

    Errors: #N/A when y is outside at t_end; #NUM! outside the ranges, for high below low, or when
    too many turning points have to be told apart; #VALUE! for a blank, a text or a
    malformed table.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(stays_within(4.9, 5.1, 1.0, 0.0, [["step", 5.0]], 20.0), 12)
        3.912023005428

    References: closed form of tau dy/dt + y = x for each shape.
    """

    def one(low: float, high: float, tau: float, initial: float, t_end: float) -> float | None:
        course = Course(sources, tau, initial)
        if low > high or not course.inside(low, high, t_end):
            return None
        inwards = [
            last_passage(course.paths(), level, way, t_end) for level, way in ((low, 1), (high, -1))
        ]
        return max([0.0, *(moment for moment in inwards if moment is not None)])

    values, never, undecided = each(one, low, high, tau, initial, t_end)
    return (
        Answer(values)
        .unless(
            np.broadcast_to(low > high, values.shape),
            DomainError,
            "high is {high}, below low, {low}; enter a high that is not below low",
        )
        .unless(undecided, DomainError, UNDECIDED)
        .unless(
            never,
            NotAvailable,
            "y is outside low, {low}, to high, {high}, at t_end, {t_end}; enter a later t_end or "
            "wider limits",
        )
    )
