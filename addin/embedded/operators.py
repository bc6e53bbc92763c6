"""The operators of formulas, on single values."""

from __future__ import annotations

import math
import operator
from collections.abc import Callable

from tausheet.addin.embedded.values import (
    NotHere,
    Scalar,
    compared,
    finite,
    in_order,
    nearly_equal,
    number,
    text,
)
from tausheet.functions.errors import ErrorKind

LONGEST_TEXT = 32_767


def _added(a: float, b: float) -> float:
    # a sum that all but cancels is 0: spreadsheets hide the last bits so
    return 0.0 if a * b < 0 and nearly_equal(a, -b) else a + b


def subtracted(a: float, b: float) -> float:
    """a - b, or 0 when they all but agree."""
    return 0.0 if a * b > 0 and nearly_equal(a, b) else a - b


def _divided(a: float, b: float) -> float | ErrorKind:
    return ErrorKind.DIV0 if b == 0 else a / b


def _raised(a: float, b: float) -> float | ErrorKind:
    root = 1 / b if b else 0.0
    odd = a < 0 and abs(root) < 2.0**31 and round(root) % 2 and nearly_equal(1 / round(root), b)
    try:
        power = -math.pow(-a, b) if odd else math.pow(a, b)
    except (OverflowError, ValueError):
        return ErrorKind.NUM
    # too small for a number counts as an error, as in LibreOffice
    return power if power or not a else ErrorKind.NUM


def _arithmetic(function: Callable[[float, float], float | ErrorKind]) -> Callable[..., Scalar]:
    def on_values(a: Scalar, b: Scalar) -> Scalar:
        if type(a) is float and type(b) is float:  # most are, and this is the quickest way
            quick = function(a, b)
            if type(quick) is float and math.isfinite(quick):
                return quick
        x, y = number(a), number(b)
        if isinstance(x, ErrorKind):
            return x
        if isinstance(y, ErrorKind):
            return y
        result = function(x, y)
        return result if isinstance(result, ErrorKind) else finite(result)

    return on_values


def _comparison(
    decide: Callable[[int, int], bool], order: Callable[..., int | ErrorKind] = compared
) -> Callable[..., Scalar]:
    def on_values(a: Scalar, b: Scalar) -> Scalar:
        side = order(a, b)
        return side if isinstance(side, ErrorKind) else decide(side, 0)

    return on_values


def _joined(a: Scalar, b: Scalar) -> Scalar:
    left, right = text(a), text(b)
    if isinstance(right, ErrorKind):
        return right
    if isinstance(left, ErrorKind):
        return left
    if len(left) + len(right) > LONGEST_TEXT:
        raise NotHere(f"a text of more than {LONGEST_TEXT} characters, the most a cell holds")
    return left + right


def negated(value: Scalar) -> Scalar:
    """Minus in front of a value."""
    result = number(value)
    return result if isinstance(result, ErrorKind) else -result


def plus(value: Scalar) -> Scalar:
    """Plus in front of a value, which changes nothing."""
    return value


def percent(value: Scalar) -> Scalar:
    """A hundredth."""
    result = number(value)
    return result if isinstance(result, ErrorKind) else result / 100


def _raised_elements(a: Scalar, b: Scalar) -> Scalar:
    """In arrays LibreOffice has results of its own for blanks, texts and errors."""
    if type(a) is not float or type(b) is not float:
        raise NotHere("^ of a range with anything but numbers")
    return BINARY["^"](a, b)


BINARY: dict[str, Callable[..., Scalar]] = {
    "+": _arithmetic(_added),
    "-": _arithmetic(subtracted),
    "*": _arithmetic(operator.mul),
    "/": _arithmetic(_divided),
    "^": _arithmetic(_raised),
    "&": _joined,
    "=": _comparison(operator.eq),
    "<>": _comparison(operator.ne),
    "<": _comparison(operator.lt, in_order),
    ">": _comparison(operator.gt, in_order),
    "<=": _comparison(operator.le, in_order),
    ">=": _comparison(operator.ge, in_order),
}

OF_ELEMENTS = {**BINARY, "^": _raised_elements}
"""The operators inside arrays."""

BINDING = {
    "prefix": 7,
    "^": 6,
    "*": 5,
    "/": 5,
    "+": 4,
    "-": 4,
    "&": 3,
    **dict.fromkeys(("=", "<>", "<", ">", "<=", ">="), 2),
}
"""How tightly each binds: -2^2 is 4."""
