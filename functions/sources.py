"""Source tables: a forcing as a sum of shapes, and the response to it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Annotated, Any, TypeAlias

import numpy as np

from tausheet.functions.arguments import Finite, Number, Numbers, Positive, Table, shown
from tausheet.functions.catalogue import cell_function
from tausheet.functions.errors import CellError, DomainError, InputError
from tausheet.functions.exact import Array, fraction_of_product
from tausheet.functions.from_rest import (
    decay_share,
    excess,
    fall_and_lag,
    lag,
    pulse_shares,
    ramp_shares,
    sine_share,
    square_shares,
)

HEADINGS = ("Shape", "A", "B", "C", "D", "E")


ANY = Number()


@dataclass(frozen=True)
class Cell:
    """What one of the columns A to E means for a shape."""

    name: str
    number: Number = ANY
    optional: bool = False


_START = Cell("start (s)", Number(low=0), optional=True)
_PERIOD = Number(low=0, low_open=True)

SHAPES: dict[str, tuple[Cell, ...]] = {
    "constant": (Cell("level"),),
    "step": (Cell("level"), _START),
    "ramp": (Cell("final level"), Cell("duration (s)", Number(low=0)), _START),
    "slope": (Cell("rate per second"), _START),
    "sine": (
        Cell("amplitude"),
        Cell("frequency (Hz)", Number(low=0)),
        Cell("phase (degrees)", optional=True),
        _START,
    ),
    "decay": (Cell("amplitude"), Cell("source time constant (s)", _PERIOD), _START),
    "pulse": (Cell("level"), Cell("duration (s)", Number(low=0)), _START),
    "square": (
        Cell("low"),
        Cell("high"),
        Cell("period (s)", _PERIOD),
        Cell("duty", Number(low=0, high=1)),
        _START,
    ),
}
"""The columns A to E of each shape; what is optional is 0 when left blank."""


@dataclass(frozen=True)
class Source:
    """One row of a source table: 0 before its start, its clock runs from there."""

    shape: str
    values: tuple[float, ...]
    start: float = 0.0


def read_source(cells: Sequence[Any]) -> Source:
    """The source in the cells Shape, A to E; a CellError says what is wrong with them."""
    shape = cells[0]
    rest: list[Any] = [*cells[1:], *[None] * (6 - len(cells))]
    if shape is None:
        raise InputError("the shape is blank; enter one of: " + ", ".join(SHAPES))
    columns = SHAPES.get(shape.casefold()) if isinstance(shape, str) else None
    if columns is None:
        raise InputError(f"the shape is {shown(shape)}; enter one of: {', '.join(SHAPES)}")
    values = [
        _value(shape, letter, column, cell)
        for letter, column, cell in zip("ABCDE", columns, rest, strict=False)
    ]
    for letter, cell in list(zip("ABCDE", rest, strict=False))[len(columns) :]:
        if cell is not None:
            raise InputError(
                f"{letter} is {shown(cell)}, but a {shape.casefold()} has nothing there; leave it "
                "blank"
            )
    start = values.pop() if columns[-1] is _START else 0.0
    return Source(shape.casefold(), tuple(values), start)


def _value(shape: str, letter: str, column: Cell, cell: Any) -> float:
    if cell is None:
        if column.optional:
            return 0.0
        raise InputError(f"{letter} is blank; enter the {column.name} of the {shape.casefold()}")
    what = f"enter the {column.name} of the {shape.casefold()}"
    if isinstance(cell, str):
        raise InputError(f"{letter} is {shown(cell)}; {what}")
    if not column.number.allows(float(cell)):
        raise DomainError(f"{letter} is {shown(cell)}; allowed: {column.number.text}; {what}")
    return float(cell)


def read_sources(rows: Sequence[Sequence[Any]]) -> list[Source]:
    """The sources of a table; the heading row is optional, blank rows do not count."""
    heading = rows[0][0] == HEADINGS[0]
    width = len(HEADINGS)
    sources = []
    for number, row in enumerate(rows, start=1):
        if all(cell is None for cell in row) or (heading and number == 1):
            continue
        if any(cell is not None for cell in row[width:]):
            raise InputError(f"row {number} has more than the columns Shape and A to E")
        try:
            sources.append(read_source(row[:width]))
        except CellError as error:
            raise type(error)(f"row {number}: {error}") from None
    if not sources:
        raise InputError("there is no row with a source; enter a shape and its values a row")
    return sources


class SourceTable(Table):
    """A source table, read into its sources."""

    text = "a source table: Shape, A to E"

    def element(self, raw: object, parameter: Any) -> Any:
        """The sources."""
        try:
            return read_sources(super().element(raw, parameter))
        except CellError as error:
            if str(error).startswith(parameter.name):
                raise
            raise type(error)(f"{parameter.name}, {error}") from None


Sources: TypeAlias = Annotated[Any, SourceTable()]


def superposed(t: Array, tau: Array, initial: Array, sources: Sequence[Source]) -> Array:
    """y(t) for t >= 0: the shares of all sources, each from its own start."""
    y = np.asarray(initial * np.exp(-t / tau))
    for source in sources:
        s = np.maximum(t - source.start, 0.0)
        y = y + _RESPONSES[source.shape](s, tau, *source.values)
    return y


def _square(s: Array, tau: Array, low: float, high: float, period: float, duty: float) -> Array:
    of_low, of_high = square_shares(s, tau, period, duty)
    return low * of_low + high * of_high


_RESPONSES: dict[str, Callable[..., Array]] = {
    "constant": lambda s, tau, level: level * lag(s / tau),
    "step": lambda s, tau, level: level * lag(s / tau),
    "ramp": lambda s, tau, level, duration: level * ramp_shares(s, tau, duration)[1],
    "slope": lambda s, tau, rate: rate * (tau * excess(s / tau)),
    "sine": lambda s, tau, size, f, phase: size * sine_share(s, tau, f, phase),
    "decay": lambda s, tau, size, own: size * decay_share(s, tau, own),
    "pulse": lambda s, tau, level, length: level * pulse_shares(s, tau, length, 0.0)[1],
    "square": _square,
}


def forcing(t: Array, source: Source) -> Array:
    """x(t) of one source just after t, for t >= 0."""
    s = t - source.start
    result: Array = np.where(
        s >= 0, _FORCINGS[source.shape](np.maximum(s, 0.0), *source.values), 0.0
    )
    return result


def _sine_itself(s: Array, size: float, frequency: float, phase: float) -> Array:
    from scipy.special import cosdg, sindg

    turn = 2 * np.pi * fraction_of_product(frequency, s)
    turned = np.fmod(phase, 360.0)
    result: Array = size * (np.sin(turn) * cosdg(turned) + np.cos(turn) * sindg(turned))
    return result


_FORCINGS: dict[str, Callable[..., Any]] = {
    "constant": lambda s, level: level,
    "step": lambda s, level: level,
    "ramp": lambda s, level, length: np.where(
        s < length, level * (s / (length if length else 1.0)), level
    ),
    "slope": lambda s, rate: rate * s,
    "sine": _sine_itself,
    "decay": lambda s, size, own: size * np.exp(-s / own),
    "pulse": lambda s, level, length: np.where(s < length, level, 0.0),
    "square": lambda s, low, high, period, duty: np.where(
        np.fmod(s, period) < duty * period, high, low
    ),
}


@cell_function("FO_SUPERPOSE", "Response")
def superpose(t: Finite, tau: Positive, initial: Finite, sources: Sources) -> Numbers:
    """Response to a sum of shapes: steps, ramps, slopes, sines, decays, pulses, squares.

    Each shape is 0 before its start, and its clock (phase, period) runs from its start.

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E

    Result: y(t), in the broadcast shape of t, tau and initial.

    Errors: #VALUE! for a blank, a text, an unknown shape or a malformed table; #NUM! outside the
    ranges, in the table as well.

    Assumes: one energy store, constant parts.

    Example:
        >>> round(superpose(2.0, 1.0, 0.0, [["step", 5.0, None], ["step", -5.0, 1.0]]), 12)
        1.162720789674

    References: superposition; closed form of tau dy/dt + y = x for each shape.
    """
    return np.where(t <= 0, initial, superposed(np.maximum(t, 0.0), tau, initial, sources))


@cell_function("FO_RATE", "Response")
def rate(t: Finite, tau: Positive, initial: Finite, sources: Sources) -> Numbers:
    """Rate of change of y just after t; times C a capacitor's current, times L a coil's voltage.

        dy/dt = (x(t) - y(t)) / tau

    Before t = 0 y rests, and its rate is 0.

    Arguments:
        t: time after switching (s); any number
        tau: time constant (s); number > 0
        initial: value of y until t = 0; any number
        sources: table with the columns Shape, A, B, C, D, E; a source table: Shape, A to E

    Result: dy/dt in the unit of y per second, in the broadcast shape of t, tau and initial.

    Errors: #VALUE! for a blank, a text, an unknown shape or a malformed table; #NUM! outside the
    ranges, in the table as well.

    Assumes: one energy store, constant parts.

    Example:
        >>> rate(0.0, 2.0, 0.0, [["step", 5.0]])
        2.5

    References: tau dy/dt + y = x.
    """
    late = np.maximum(t, 0.0)
    change = -initial * np.exp(-late / tau) / tau
    for source in sources:
        s = late - source.start
        begun = np.maximum(s, 0.0)
        own = _RATES.get(source.shape, _rate_by_difference)(begun, tau, source)
        change = change + np.where(s >= 0, own, 0.0)
    return np.where(t < 0, 0.0, change)


def _rate_by_difference(s: Array, tau: Array, source: Source) -> Array:
    here = Source(source.shape, source.values)
    result: Array = (forcing(s, here) - _RESPONSES[source.shape](s, tau, *source.values)) / tau
    return result


def _rate_of_pulse(s: Array, tau: Array, source: Source) -> Array:
    level, length = source.values
    since = np.maximum(s - length, 0.0)
    fall, _ = fall_and_lag(s, tau)
    after = -np.exp(-since / tau) * lag(length / tau)
    result: Array = level / tau * np.where(s < length, fall, after)
    return result


def _rate_of_ramp(s: Array, tau: Array, source: Source) -> Array:
    level, length = source.values
    if length == 0:
        result: Array = level / tau * np.exp(-s / tau)
        return result
    since = np.maximum(s - length, 0.0)
    result = level / length * np.exp(-since / tau) * lag(np.minimum(s, length) / tau)
    return result


_RATES: dict[str, Callable[..., Array]] = {
    "constant": lambda s, tau, source: source.values[0] / tau * np.exp(-s / tau),
    "step": lambda s, tau, source: source.values[0] / tau * np.exp(-s / tau),
    "slope": lambda s, tau, source: source.values[0] * lag(s / tau),
    "ramp": _rate_of_ramp,
    "pulse": _rate_of_pulse,
}
