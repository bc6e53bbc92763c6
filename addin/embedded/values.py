"""Cell values inside the evaluator: turned into numbers and texts, and compared.

What a spreadsheet does with a blank, a text or TRUE where another kind belongs follows
LibreOffice, cell by cell (tests/test_evaluator_against_libreoffice.py).
"""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Callable, Iterator
from decimal import Decimal
from itertools import repeat
from typing import Any, TypeAlias

from tausheet.functions.errors import ErrorKind

Scalar: TypeAlias = float | str | bool | ErrorKind | None
Grid: TypeAlias = list[list[Scalar]]
Value: TypeAlias = Any
"""A scalar, or a grid: the rows of a range."""

_NUMBER = re.compile(r" *[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)? *")
_WORDS = re.compile(
    r"jan(uary)?|feb(ruary)?|mar(ch)?|apr(il)?|may|june?|july?|aug(ust)?|sep(t(ember)?)?"
    r"|oct(ober)?|nov(ember)?|dec(ember)?|(mon|tues?|wed(nes)?|thu(rs)?|fri|sat(ur)?|sun)(day)?"
    r"|(?<=[0-9 ])[ap]m|(?<=[0-9])t(?=[0-9])|(?<=[0-9. ])e(?=[ 0-9+-])"
)
_PERHAPS_A_NUMBER = re.compile(r"(?=.*\d)[\s\d+\-.,:/%()=$€£¥]+", re.DOTALL)


class NotHere(Exception):
    """A use of an operator or a function that this engine does not know."""


class PassedOn(float):
    """The 0 that a formula leaves which refers to an empty cell: to LibreOffice also empty."""


_CLOSE, _FAR = 2.0**-48, 2.0**-44


def number(value: Scalar) -> float | ErrorKind:
    """A value where a number belongs; a text that is a number in plain digits counts as it."""
    if type(value) is float:
        return value
    if value is None:
        return 0.0
    if isinstance(value, ErrorKind):
        return value
    if isinstance(value, str):
        plain = bool(_NUMBER.fullmatch(value))
        if plain and math.isfinite(float(value)):
            return float(value)
        if plain or _may_be_a_number(value):
            raise NotHere(f'the text "{value}" for a number')
        return ErrorKind.VALUE
    return float(value)


def _may_be_a_number(text: str) -> bool:
    """Whether some spreadsheet reads a text as a number: a percentage, a date, a sum of money."""
    text = unicodedata.normalize("NFKC", text).strip().lower()
    if text in ("true", "false"):
        return True
    return len(text) < 40 and bool(_PERHAPS_A_NUMBER.fullmatch(_WORDS.sub("", text)))


def text(value: Scalar) -> str | ErrorKind:
    """A value where a text belongs: a number with 15 digits at most, TRUE as 1."""
    if isinstance(value, (str, ErrorKind)):
        return value
    if value is None:
        return ""
    return digits(float(value))


def digits(value: float) -> str:
    """A number as the text that & makes of it, with LibreOffice's three digits of exponent."""
    if value == 0:
        return "0"
    rounded = Decimal(f"{value:.14e}").normalize()
    exponent = rounded.adjusted()
    whole_fits = exponent == 15 and float(rounded) == value
    if (-20 < exponent < 15 or whole_fits) and len(f"{rounded:f}".lstrip("-")) <= 22:
        return f"{rounded:f}"
    sign, figures, _ = rounded.as_tuple()
    mantissa = ".".join(
        filter(None, ("".join(map(str, figures[:1])), "".join(map(str, figures[1:]))))
    )
    return f"{'-' if sign else ''}{mantissa}E{exponent:+04d}"


def finite(value: float) -> float | ErrorKind:
    """A result, or #NUM! where it lies beyond the numbers."""
    return value if math.isfinite(value) else ErrorKind.NUM


def nearly_equal(a: float, b: float) -> bool:
    """Whether a spreadsheet takes two numbers for one: to 48 bits, whole numbers exactly."""
    if a == b:
        return True
    if a == 0 or b == 0:
        return False
    distance = abs(a - b)
    a, b = abs(a), abs(b)
    if not math.isfinite(distance) or distance > a * _FAR or distance > b * _FAR:
        return False
    if all(x < 2.0**53 and x == math.floor(x) for x in (distance, a, b)):
        return False
    return distance < a * _CLOSE and distance < b * _CLOSE


def folded(text: str) -> str:
    """A text without regard to case, letter by letter: ß stays one letter."""
    if text.isascii():
        return text.lower()
    return "".join(c if len(c.casefold()) > 1 else c.casefold() for c in text)


def compared(a: Scalar, b: Scalar) -> int | ErrorKind:
    """-1, 0 or 1: numbers before texts, texts without regard to case; TRUE and FALSE are 1, 0."""
    if type(a) is float and type(b) is float:
        return 0 if nearly_equal(a, b) else (a > b) - (a < b)
    for value in (a, b):
        if isinstance(value, ErrorKind):
            return value
    if isinstance(a, str) or isinstance(b, str):
        if isinstance(a, PassedOn) or isinstance(b, PassedOn):
            raise NotHere("a comparison of a text with a cell that refers to an empty one")
        if not isinstance(a, str) and a is not None:
            return -1
        if not isinstance(b, str) and b is not None:
            return 1
        left, right = folded(str(a or "")), folded(str(b or ""))
        return (left > right) - (left < right)
    x, y = float(a or 0.0), float(b or 0.0)  # type: ignore[arg-type]
    return 0 if nearly_equal(x, y) else (x > y) - (x < y)


def in_order(a: Scalar, b: Scalar) -> int | ErrorKind:
    """As `compared`, for < and >: of texts only plain letters and digits have a known order."""
    if isinstance(a, str) and isinstance(b, str) and folded(a) != folded(b):
        both = a + b
        if not (both.isascii() and both.isalnum()):
            raise NotHere("the order of texts other than plain letters and digits")
    return compared(a, b)


def truth(value: Scalar) -> bool | ErrorKind:
    """A value where a condition belongs."""
    if type(value) is bool:
        return value
    as_number = number(value)
    return as_number if isinstance(as_number, ErrorKind) else as_number != 0


def each(function: Callable[..., Scalar], *values: Value) -> Value:
    """A function of scalars, element by element where a value is a grid.

    A single row or column stretches; other shapes that differ are refused.
    """
    if not any(type(value) is list for value in values):
        return function(*values)
    grids = [value if type(value) is list else [[value]] for value in values]
    height = max(len(grid) for grid in grids)
    width = max(len(grid[0]) for grid in grids)
    if width == 1 and all(len(grid) in (1, height) for grid in grids):
        columns = [
            repeat(grid[0][0], height) if len(grid) == 1 else [row[0] for row in grid]
            for grid in grids
        ]
        return [[cell] for cell in map(function, *columns)]
    if any(len(g) not in (1, height) or len(g[0]) not in (1, width) for g in grids):
        raise NotHere("ranges of different sizes, element by element")

    def element(grid: Grid, row: int, column: int) -> Scalar:
        return grid[0 if len(grid) == 1 else row][0 if len(grid[0]) == 1 else column]

    return [
        [function(*(element(grid, row, column) for grid in grids)) for column in range(width)]
        for row in range(height)
    ]


def cells(value: Value) -> Iterator[Scalar]:
    """The scalars of a value in reading order."""
    if type(value) is list:
        for row in value:
            yield from row
    else:
        yield value


def top_left(value: Value) -> Scalar:
    """What a single cell shows of a result."""
    first: Scalar = value[0][0] if type(value) is list else value
    return first
