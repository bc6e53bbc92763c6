"""Crossings of a switching sequence."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from decimal import Decimal
from itertools import pairwise

import numpy as np

from tausheet.functions.arguments import Finite, Numbers
from tausheet.functions.catalogue import Answer, cell_function
from tausheet.functions.crossing import (
    NEVER,
    UNDECIDED,
    WAYS,
    Count,
    Direction,
    crossing_of,
    each,
)
from tausheet.functions.digits import fifty_digits, span
from tausheet.functions.errors import DomainError, NotAvailable
from tausheet.functions.forcing import Forcing
from tausheet.functions.roots import Path
from tausheet.functions.stages import Stage, Stages, runs

_SHORT = 1 - 2.0**-50
"""A stage that stops by itself ends a hair early, so that rounding does not carry it past."""


def _lengths(starts: Sequence[float]) -> list[float]:
    exact = [*map(Decimal, starts), Decimal("Infinity")]
    return [span(a, b) for a, b in pairwise(exact)]


@fifty_digits
def _later(start: float, s: float) -> Decimal:
    return Decimal(start) + Decimal(s)


def paths_of(stages: Sequence[Stage], initial: float) -> Iterator[Path]:
    """The stages as paths; one that stops by itself is followed by its rest."""
    sequence = runs(stages, initial)
    lengths = _lengths([stage.start for stage in stages])
    for number, (run, length) in enumerate(zip(sequence, lengths, strict=True)):
        stage = run.stage
        start = run.value if number == 0 or stage.jump is not None else None
        tau = math.inf if stage.tau is None else stage.tau
        level = stage.rate if stage.tau is None else stage.heads
        origin = Decimal(stage.start)
        stops = run.stopped < length
        moving = run.stopped * _SHORT if stops else length
        if moving > 0:
            yield Path(origin, moving, tau, Forcing(level), (level,), None, start)
        if stops:
            at = _later(stage.start, run.stopped)
            yield Path(at, length - run.stopped, math.inf, Forcing(), (0.0,), None, stage.stop)


@cell_function("FO_STAGES_CROSSING", "Crossing time")
def stages_crossing(
    level: Finite,
    initial: Finite,
    stages: Stages,
    direction: Direction = "either",
    count: Count = 1,
    after: Finite = 0.0,
) -> Numbers:
    """The count-th moment after `after` at which y of a switching sequence passes a level.

        in a stage y - level = heads - level + (y0 - heads) exp(-(t - t0) / tau) has one zero at
        most; a jump across the level counts at its moment

    A touch, or a stretch at the level, counts only when y leaves on the other side, at the moment
    it arrived.

    Arguments:
        level: value of y to be passed; any number
        initial: value of y until t = 0; any number
        stages: table with the columns Starts at, Time constant, Heads for, Jump to, Stops at; a
            stage table: Starts at, Time constant, Heads for, Jump to, Stops at
        direction: which passages count; "either", "rising", "falling"
        count: which of them is asked for, 1 when left out; whole number >= 1
        after: time after which they count (s), 0 when left out; any number

    Result: time (s), in the broadcast shape of level, initial, count and after.

    Errors: #N/A when y does not pass the level so often; #NUM! outside the ranges; #VALUE! for a
    blank, a text, an unknown word or a malformed table.

    Assumes: one energy store in each stage, constant parts.

    Example:
        >>> round(stages_crossing(2.5, 0.0, [[0.0, 1.0, 5.0], [2.0, "hold", None]]), 12)
        0.69314718056

    References: closed form of tau dy/dt + y = x in each stage.
    """
    way = WAYS[direction]

    def one(level: float, initial: float, count: float, after: float) -> float | None:
        return crossing_of(paths_of(stages, initial), level, way, count, after, initial)

    values, never, undecided = each(one, *np.broadcast_arrays(level, initial, count, after))
    return (
        Answer(values).unless(undecided, DomainError, UNDECIDED).unless(never, NotAvailable, NEVER)
    )
