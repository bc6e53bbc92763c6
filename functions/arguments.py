"""What an argument may be, and how whatever a caller passes becomes that.

A specification (Number, Word, Texts, Flag, Column, Table) stands in the annotation of a
cell function's parameter. Its `convert` never raises: it returns the converted value together
with an error code for each element that is wrong, so that the rest of a range computes.
Its `element` raises the error, with the sentence, for one value.
"""

from __future__ import annotations

import math
import numbers
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from decimal import Decimal
from itertools import chain
from typing import Annotated, Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.errors import (
    CellError,
    DomainError,
    ErrorKind,
    InputError,
    PassedOn,
    carried_kind,
    error_codes,
)

PASSED = 0x8000
"""Set in an error code when the error value stood in the argument itself."""

REQUIRED: Any = object()
"""The default of a parameter that has none."""


@dataclass(frozen=True)
class Parameter:
    """One parameter of a cell function."""

    name: str
    spec: Spec
    default: Any
    help: str

    @property
    def required(self) -> bool:
        """Whether a blank here is an error."""
        return self.default is REQUIRED

    @property
    def meaning(self) -> str:
        """What the argument is, without the allowed range that follows the semicolon."""
        return self.help.split(";")[0]


@dataclass
class Argument:
    """A converted argument: `value` for the kernel, `codes` where elements are wrong."""

    value: Any
    source: Any
    codes: NDArray[np.uint16] | None = None
    whole: bool = False
    """Taken as one thing (a column, a table, a single cell) that does not broadcast."""

    def element(self, index: tuple[int, ...], shape: tuple[int, ...]) -> object:
        """What the caller passed for one element of the broadcast shape."""
        if self.whole or not isinstance(self.source, np.ndarray):
            return self.source
        return np.broadcast_to(self.source, shape)[index]


def shown(value: object) -> str:
    """A value as a message shows it."""
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, (int, float)):
        return f"{float(value):.15g}" if abs(value) < 1e308 else str(value)[:40]
    if isinstance(value, ErrorKind):
        return value.text
    text = str(value)
    return f'the text "{text[:40]}{"..." if len(text) > 40 else ""}"'


def is_blank(raw: object) -> bool:
    """Whether a cell value counts as blank: nothing, or an empty text."""
    return raw is None or (isinstance(raw, str) and raw == "")


def is_range(raw: object) -> bool:
    """Whether a value is a range rather than a single cell."""
    return isinstance(raw, (list, tuple)) or (isinstance(raw, np.ndarray) and raw.ndim > 0)


def grid(raw: Any, copy: bool = True) -> NDArray[Any]:
    """A range as an array: float64 when every element is a plain number, else objects."""
    if isinstance(raw, np.ndarray):
        if not raw.size:
            raise InputError("a range must have at least one cell")
        return raw.astype(np.float64 if raw.dtype.kind in "fiub" else object, copy=copy)
    rows = list(raw)
    nested = bool(rows) and all(is_range(row) for row in rows)
    if nested:
        width = len(rows[0])
        if any(len(row) != width for row in rows):
            raise InputError("the rows of a range must be equally long")
        flat: list[Any] = list(chain.from_iterable(rows))
        shape: tuple[int, ...] = (len(rows), width)
    else:
        flat, shape = rows, (len(rows),)
    if not flat:
        raise InputError("a range must have at least one cell")
    if all(issubclass(kind, (float, int)) for kind in set(map(type, flat))):
        try:
            return np.fromiter(flat, dtype=np.float64, count=len(flat)).reshape(shape)
        except OverflowError:  # an integer beyond the floats: judged one by one below
            pass
    objects = np.empty(len(flat), dtype=object)
    objects[:] = flat
    return objects.reshape(shape)


def single(raw: object) -> object:
    """The value of a single cell or a 1 x 1 range; anything larger is refused."""
    if not is_range(raw):
        return raw.item() if isinstance(raw, (np.ndarray, np.generic)) else raw
    cells = grid(raw)
    if cells.size != 1:
        size = " x ".join(map(str, cells.shape))
        raise InputError(f"is a range of {size} cells, but must be a single cell")
    return cells.ravel().tolist()[0]


_NO_ARTICLE = {"a", "digits", "how", "its", "ohm", "one", "the", "true", "what", "which"}


def asked(parameter: Parameter) -> str:
    """What to enter, to follow the word enter: "the time constant (s)", "which passages count"."""
    bare = parameter.meaning.split(" ", 1)[0].lower() in _NO_ARTICLE
    return parameter.meaning if bare else f"the {parameter.meaning}"


class Spec:
    """Base of the argument specifications."""

    elementwise = False
    text = ""

    def element(self, raw: object, parameter: Parameter) -> object:
        """One value, converted; raises CellError with the sentence."""
        raise AssertionError("each specification says how")

    def convert(self, raw: object, parameter: Parameter) -> Argument:
        """Whatever the caller passed, converted as a whole."""
        try:
            return Argument(self.element(raw, parameter), raw, whole=True)
        except CellError as error:
            return Argument(None, raw, _code(error), whole=True)

    def wrong(self, raw: object, parameter: Parameter, kind: type[CellError]) -> CellError:
        """The error that names the argument, the value, what is allowed and what to do."""
        found = "blank" if is_blank(raw) else shown(raw)
        allowed = f"; allowed: {self.text}" if self.text else ""
        return kind(f"{parameter.name} is {found}{allowed}; enter {asked(parameter)}")

    def pass_on(self, raw: object, parameter: Parameter) -> None:
        """Raise an error value that stands in an argument, unchanged."""
        kind = carried_kind(raw)
        if kind is not None:
            name = parameter.name
            raise PassedOn(f"{name} holds the error {kind.text}; mend the cell it comes from", kind)


def _code(error: CellError) -> NDArray[np.uint16]:
    passed = PASSED if isinstance(error, PassedOn) else 0
    return np.array(error.kind.value | passed, dtype=np.uint16)


@dataclass(frozen=True)
class Number(Spec):
    """A number or a range of numbers, within bounds."""

    low: float = -math.inf
    high: float = math.inf
    low_open: bool = False
    high_open: bool = False
    whole: bool = False
    one_cell: bool = False
    zero_is_a_value: bool = False
    """Only t_from and t_to: a 0 is a time although the default is not 0."""

    @property
    def elementwise(self) -> bool:  # type: ignore[override]
        """Whether ranges broadcast here."""
        return not self.one_cell

    @property
    def text(self) -> str:  # type: ignore[override]
        """The allowed range in words; docstrings end their argument lines with it."""
        kind = "whole number" if self.whole else "number"
        bounds = []
        if self.low > -math.inf:
            bounds.append(f"{'>' if self.low_open else '>='} {self.low:g}")
        if self.high < math.inf:
            bounds.append(f"{'<' if self.high_open else '<='} {self.high:g}")
        return f"{kind} {' and '.join(bounds)}" if bounds else f"any {kind}"

    @property
    def safe(self) -> float:
        """A value inside the bounds, put in place of a wrong one while the rest computes."""
        if self.low > -math.inf and self.high < math.inf:
            return (self.low + self.high) / 2
        return self.low + 1 if self.low > -math.inf else min(self.high - 1, 1.0)

    def _zero_refused(self, parameter: Parameter) -> bool:
        return not (parameter.required or self.zero_is_a_value or parameter.default == 0)

    def element(self, raw: object, parameter: Parameter) -> float:
        """One number within the bounds."""
        raw = single(raw)
        self.pass_on(raw, parameter)
        if is_blank(raw):
            if parameter.required:
                raise self.wrong(raw, parameter, InputError)
            return parameter.default  # type: ignore[no-any-return]
        if not isinstance(raw, (numbers.Real, Decimal)):
            raise self.wrong(raw, parameter, InputError)
        try:
            value = float(raw)
        except OverflowError:
            raise self.wrong(raw, parameter, DomainError) from None
        if not self.allows(value):
            raise self.wrong(value, parameter, DomainError)
        if value == 0 and self._zero_refused(parameter):
            raise DomainError(
                f"{parameter.name} is 0, which here cannot be told from an empty cell; "
                f"leave the argument out for {parameter.default:g}, "
                f"or enter {asked(parameter)}"
            )
        return value

    def allows(self, value: float) -> bool:
        """Whether a number lies within the bounds."""
        return bool(
            math.isfinite(value)
            and (value > self.low if self.low_open else value >= self.low)
            and (value < self.high if self.high_open else value <= self.high)
            and (not self.whole or value == math.floor(value))
        )

    def convert(self, raw: object, parameter: Parameter) -> Argument:
        """A float64 array, 0-dimensional for a single cell, with codes for its wrong elements."""
        if self.one_cell or not is_range(raw):
            try:
                value: Any = self.element(raw, parameter)
            except CellError as error:
                return Argument(np.float64(self.safe), raw, _code(error), whole=True)
            return Argument(np.float64(value), raw, whole=True)
        try:
            cells = grid(raw, copy=False)
        except CellError as error:
            return Argument(np.float64(self.safe), raw, _code(error))
        if cells.dtype == object:
            return self._convert_objects(cells, parameter)
        if self._plainly_allowed(cells, parameter):
            return Argument(cells, cells)
        ok = np.isfinite(cells)
        for bound, test in (
            (self.low, np.greater if self.low_open else np.greater_equal),
            (self.high, np.less if self.high_open else np.less_equal),
        ):
            if math.isfinite(bound):
                ok &= test(cells, bound)
        if self.whole:
            ok &= np.floor(cells) == cells
        if self._zero_refused(parameter):
            ok &= cells != 0
        if ok.all():
            return Argument(cells, cells)
        codes = np.where(ok, 0, ErrorKind.NUM.value).astype(np.uint16)
        nan = np.isnan(cells)
        if nan.any():
            kinds = error_codes(cells)
            passed = nan & ((cells.view(np.uint64) & np.uint64(0xFFFF)) == kinds)
            codes[passed] = kinds[passed] | PASSED
        return Argument(np.where(ok, cells, self.safe), cells, codes)

    def _plainly_allowed(self, cells: NDArray[np.float64], parameter: Parameter) -> bool:
        """Whether a sum or the extremes alone show every number to be allowed."""
        if self.whole or self._zero_refused(parameter):
            return False
        with np.errstate(all="ignore"):
            if self.low == -math.inf and self.high == math.inf:
                return math.isfinite(cells.sum())
            return self.allows(float(cells.min())) and self.allows(float(cells.max()))

    def _convert_objects(self, cells: NDArray[Any], parameter: Parameter) -> Argument:
        values = np.full(cells.shape, self.safe, dtype=np.float64)
        codes = np.zeros(cells.shape, dtype=np.uint16)
        for index, raw in np.ndenumerate(cells):
            try:
                values[index] = self.element(raw, parameter)
            except CellError as error:
                codes[index] = _code(error)
        return Argument(values, cells, codes if codes.any() else None)


@dataclass(frozen=True)
class Word(Spec):
    """A single cell that chooses one of a few words, in any case; blank or 0 is the default."""

    choices: tuple[str, ...]

    @property
    def text(self) -> str:  # type: ignore[override]
        """The words allowed."""
        return ", ".join(f'"{choice}"' for choice in self.choices)

    def element(self, raw: object, parameter: Parameter) -> str | None:
        """The word chosen, as the catalogue spells it."""
        try:
            raw = single(raw)
        except InputError as error:
            raise InputError(f"{parameter.name} {error}") from None
        self.pass_on(raw, parameter)
        zero = isinstance(raw, (int, float)) and raw == 0  # FALSE too: LibreOffice hands over 0
        if (is_blank(raw) or zero) and not parameter.required:
            return parameter.default  # type: ignore[no-any-return]
        if isinstance(raw, str):
            for choice in self.choices:
                if choice.casefold() == raw.strip().casefold():
                    return choice
        raise self.wrong(raw, parameter, InputError)


@dataclass(frozen=True)
class Texts(Spec):
    """A text or a range of texts (units, codes)."""

    elementwise = True
    text = "a text"

    def element(self, raw: object, parameter: Parameter) -> str:
        """One text, without surrounding spaces."""
        raw = single(raw)
        self.pass_on(raw, parameter)
        if not isinstance(raw, str) or not raw.strip():
            raise self.wrong(raw, parameter, InputError)
        return raw.strip()

    def convert(self, raw: object, parameter: Parameter) -> Argument:
        """An object array of texts, 0-dimensional for a single cell."""
        try:
            cells = grid(raw) if is_range(raw) else np.array(raw, dtype=object)
        except CellError as error:
            return Argument(np.array("", dtype=object), raw, _code(error))
        values = np.full(cells.shape, "", dtype=object)
        codes = np.zeros(cells.shape, dtype=np.uint16)
        for index, cell in np.ndenumerate(cells):
            try:
                values[index] = self.element(cell, parameter)
            except CellError as error:
                codes[index] = _code(error)
        return Argument(values, cells, codes if codes.any() else None)


@dataclass(frozen=True)
class Flag(Spec):
    """A single cell, TRUE or FALSE; a number counts as TRUE unless it is 0."""

    text = "TRUE or FALSE"

    def element(self, raw: object, parameter: Parameter) -> bool:
        """The truth value."""
        try:
            raw = single(raw)
        except InputError as error:
            raise InputError(f"{parameter.name} {error}") from None
        self.pass_on(raw, parameter)
        if is_blank(raw) and not parameter.required:
            return bool(parameter.default)
        if isinstance(raw, (bool, numbers.Real)):
            if not math.isfinite(raw):
                raise self.wrong(raw, parameter, DomainError)
            return bool(raw)
        raise self.wrong(raw, parameter, InputError)


@dataclass(frozen=True)
class Column(Spec):
    """A whole row or column of numbers, taken in reading order and never broadcast.

    blanks: "refuse" them, "ignore" them, or "keep" them as NaN for the kernel to judge.
    """

    number: Number = Number()
    blanks: str = "refuse"

    @property
    def text(self) -> str:  # type: ignore[override]
        """The allowed range of each number in words."""
        return f"a range, each {self.number.text}"

    def element(self, raw: object, parameter: Parameter) -> NDArray[np.float64]:
        """The numbers, one-dimensional."""
        try:
            cells = grid(raw, copy=False).ravel() if is_range(raw) else grid([raw])
        except InputError as error:
            raise InputError(f"{parameter.name}: {error}") from None
        each = Parameter(parameter.name, self.number, REQUIRED, parameter.help)
        if cells.dtype != object:
            converted = self.number.convert(cells, each)
            if converted.codes is not None:
                self._raise_first(cells, each)
            return cells
        for cell in cells:
            self.pass_on(cell, parameter)
        blank = np.fromiter(map(is_blank, cells), dtype=bool, count=cells.size)
        if self.blanks == "ignore":
            cells, blank = cells[~blank], blank[~blank]
            if not cells.size:
                raise self.wrong(None, parameter, InputError)
        keep = blank if self.blanks == "keep" else np.zeros_like(blank)
        values = np.full(cells.shape, np.nan)
        for index in np.flatnonzero(~keep):
            values[index] = self.number.element(cells[index], each)
        return values

    def _raise_first(self, cells: Iterable[Any], each: Parameter) -> None:
        for cell in cells:
            self.number.element(float(cell), each)


@dataclass(frozen=True)
class Anything(Spec):
    """Handed through as it came: the arguments that FO_REASON passes on."""


@dataclass(frozen=True)
class Table(Spec):
    """A range read as a table of cell values; the cell function says what its columns mean."""

    text = "a table"

    def element(self, raw: object, parameter: Parameter) -> list[list[Any]]:
        """The rows; None for a blank cell, numbers as float, texts without surrounding spaces."""
        if not is_range(raw):
            raw = [[raw]]
        cells = grid(raw)
        if cells.ndim == 1:
            cells = cells.reshape(1, -1)
        return [[self._cell(cell, parameter) for cell in row] for row in cells.tolist()]

    def _cell(self, cell: Any, parameter: Parameter) -> Any:
        self.pass_on(cell, parameter)
        if isinstance(cell, str):
            return cell.strip() or None
        if isinstance(cell, (bool, numbers.Real)):
            if not math.isfinite(cell):
                raise self.wrong(cell, parameter, DomainError)
            return float(cell)
        if cell is not None:
            raise self.wrong(cell, parameter, InputError)
        return None


Numbers: TypeAlias = Any
"""A result: a float for single cells, a float64 array where an argument is a range."""

Finite: TypeAlias = Annotated[Any, Number()]
Positive: TypeAlias = Annotated[Any, Number(low=0, low_open=True)]
NonNegative: TypeAlias = Annotated[Any, Number(low=0)]
OpenFraction: TypeAlias = Annotated[Any, Number(low=0, low_open=True, high=1, high_open=True)]
ClosedFraction: TypeAlias = Annotated[Any, Number(low=0, high=1)]
Time: TypeAlias = Annotated[Any, Number(zero_is_a_value=True)]
"""A limit of a window, for which 0 is a time although its default is another."""
Code: TypeAlias = Annotated[Any, Texts()]


def words(*choices: str) -> Word:
    """The specification of a word that chooses: `kind: Annotated[str, words("max", "min")]`."""
    return Word(choices)


def as_objects(values: Sequence[Any]) -> NDArray[Any]:
    """A one-dimensional object array of anything."""
    objects = np.empty(len(values), dtype=object)
    objects[:] = values
    return objects
