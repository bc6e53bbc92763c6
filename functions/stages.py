"""A switching sequence: stages with a time constant and a level to head for each."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Annotated, Any, TypeAlias

import numpy as np

from tausheet.functions.arguments import Finite, Numbers, Parameter, Table, shown
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import CellError, DomainError, InputError
from tausheet.functions.exact import Array

HEADINGS = ("Starts at", "Time constant", "Heads for", "Jump to", "Stops at")


@dataclass(frozen=True)
class Stage:
    """One row: y heads for `heads` with `tau`; tau None and rate 0 is a hold."""

    start: float
    tau: float | None
    heads: float
    rate: float
    jump: float | None
    stop: float | None


def read_stages(rows: Sequence[Sequence[Any]]) -> list[Stage]:
    """The stages of a table; the heading row is optional, blank rows do not count."""
    stages: list[Stage] = []
    for number, row in enumerate(rows, start=1):
        if all(cell is None for cell in row) or (number == 1 and row[0] == HEADINGS[0]):
            continue
        if any(cell is not None for cell in row[len(HEADINGS) :]):
            raise InputError(f"row {number} has more than the columns {', '.join(HEADINGS)}")
        cells = [*row[: len(HEADINGS)], *[None] * (len(HEADINGS) - len(row))]
        try:
            stages.append(_stage(cells, stages))
        except CellError as error:
            raise type(error)(f"row {number}: {error}") from None
    if not stages:
        raise InputError("there is no row with a stage; enter a start, a time constant and a level")
    return stages


def _stage(cells: Sequence[Any], before: Sequence[Stage]) -> Stage:
    start = _number(cells[0], 0)
    if not before and start != 0:
        raise DomainError(f"{HEADINGS[0]} is {shown(start)}; the first stage starts at 0")
    if before and start <= before[-1].start:
        raise DomainError(
            f"{HEADINGS[0]} is {shown(start)}, not after {shown(before[-1].start)}; put the stages "
            "in order"
        )
    jump = None if cells[3] is None else _number(cells[3], 3)
    stop = None if cells[4] is None else _number(cells[4], 4)
    kind = cells[1].casefold() if isinstance(cells[1], str) else None
    if kind == "hold":
        if cells[2] is not None:
            _number(cells[2], 2)
        return Stage(start, None, 0.0, 0.0, jump, stop)
    heads = _number(cells[2], 2)
    if kind == "rate":
        return Stage(start, None, 0.0, heads, jump, stop)
    if kind is not None:
        raise InputError(
            f'{HEADINGS[1]} is {shown(cells[1])}; enter a number of seconds, "hold" or "rate"'
        )
    tau = _number(cells[1], 1)
    if tau <= 0:
        raise DomainError(
            f'{HEADINGS[1]} is {shown(tau)}; allowed: number > 0, or the words "hold" and "rate"'
        )
    return Stage(start, tau, heads, 0.0, jump, stop)


def _number(cell: Any, column: int) -> float:
    if cell is None or isinstance(cell, str):
        found = "blank" if cell is None else shown(cell)
        raise InputError(f"{HEADINGS[column]} is {found}; enter a number")
    return float(cell)


class StageTable(Table):
    """A stage table, read into its stages."""

    text = "a stage table: " + ", ".join(HEADINGS)

    def element(self, raw: object, parameter: Parameter) -> Any:
        """The stages."""
        rows = super().element(raw, parameter)
        try:
            return read_stages(rows)
        except CellError as error:
            raise type(error)(f"{parameter.name}, {error}") from None


Stages: TypeAlias = Annotated[Any, StageTable()]


@dataclass(frozen=True)
class Run:
    """A stage as it runs: from which value, and when it stops by itself."""

    stage: Stage
    begins: float
    value: float
    stopped: float
    """Time after the start from which y stays at `stage.stop`; infinite when it does not."""

    def after(self, s: Array) -> Array:
        """y at s after the start of the stage."""
        stage = self.stage
        if stage.tau is None:
            y = self.value + stage.rate * s
        else:
            u = s / stage.tau
            y = self.value * np.exp(-u) - stage.heads * np.expm1(-u)
        return np.where(s >= self.stopped, 0.0 if stage.stop is None else stage.stop, y)


def runs(stages: Sequence[Stage], initial: float) -> list[Run]:
    """The stages one after the other from a value of y."""
    out: list[Run] = []
    y = initial
    for number, stage in enumerate(stages):
        y = y if stage.jump is None else stage.jump
        run = Run(stage, stage.start, y, _stops_after(stage, y))
        out.append(run)
        if number + 1 < len(stages):
            y = float(run.after(np.asarray(stages[number + 1].start - stage.start)))
    return out


def _stops_after(stage: Stage, y: float) -> float:
    if stage.stop is None:
        return math.inf
    if y == stage.stop:
        return 0.0
    to_go = stage.stop - y
    if stage.tau is None:
        return to_go / stage.rate if to_go * stage.rate > 0 else math.inf
    left = stage.heads - stage.stop
    return stage.tau * math.log1p(to_go / left) if to_go * left > 0 else math.inf


@cell_function("FO_STAGES", "Response")
def stages(t: Finite, initial: Finite, stages: Stages) -> Numbers:
    """Response through a switching sequence: each stage with its own time constant and level.

    y is continuous from stage to stage unless a stage has a Jump to. Time constant may be the
    word hold (y frozen) or rate (y changes by Heads for per second). Stops at: once y reaches this
    value it stays there until the stage ends.

    Arguments:
        t: time after the first switching (s); any number
        initial: value of y until t = 0; any number
        stages: table with the columns Starts at, Time constant, Heads for, Jump to, Stops at; a
            stage table: Starts at, Time constant, Heads for, Jump to, Stops at

    Result: y(t) just after t, in the unit of initial, in the broadcast shape of t and initial.

    Errors: #VALUE! for a blank, a text, an unknown word or a malformed table; #NUM! outside the
    ranges, when the first stage does not start at 0 or the starts do not rise.

    Assumes: one energy store in each stage, constant parts.

    Example:
        >>> round(stages(3.0, 0.0, [[0.0, 1.0, 5.0], [2.0, "hold", None]]), 12)
        4.323323583817

    References: closed form of tau dy/dt + y = x in each stage.
    """
    shape = np.broadcast_shapes(np.shape(t), np.shape(initial))
    starts = np.array([stage.start for stage in stages])
    t, initial = np.broadcast_to(t, shape), np.broadcast_to(initial, shape)
    result = np.array(initial, dtype=np.float64)
    for value in np.unique(initial).tolist():
        sequence = runs(stages, value)
        mine = (initial == value) & (t >= 0)
        which = np.searchsorted(starts, t, side="right") - 1
        for number, run in enumerate(sequence):
            mask = mine & (which == number)
            if mask.any():
                result[mask] = run.after(t[mask] - run.begins)
    return result
