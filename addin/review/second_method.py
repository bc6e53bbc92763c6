"""Results of cell functions by a second method; imports nothing that computed them the first time.

Arguments and results are plain: floats, texts, TRUE and FALSE, None for what was left out, lists
of rows for ranges; anything else is an error value, which has no second method.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from tausheet.addin.review.second_method_course import TooLong
from tausheet.addin.review.second_method_results import METHODS

CLOSE = 1e-9
"""Relative difference from which a result is another one."""
_SEVERAL = {
    "FO_RIPPLE": (5, ("min", "max", "pp", "mean")),
    "FO_FIT": (
        2,
        ("tau", "initial", "final", "tau error", "initial error", "final error", "residual"),
    ),
}
"""Functions that give several results in a row when a word is left out: its place, the words."""


@dataclass(frozen=True)
class Outcome:
    """One result by a second method."""

    checked: bool
    """False: there is no second method for it."""
    agrees: bool = True
    found: float = 0.0
    expected: float = 0.0


NONE = Outcome(checked=False)
_NO_ANSWER = (
    *(TooLong, ArithmeticError, LookupError, StopIteration),
    *(RuntimeError, TypeError, ValueError),
)


def how(name: str) -> str:
    """In words how a function is checked, "" when it is recomputed only."""
    return METHODS[name][2] if name in METHODS else ""


def check(name: str, arguments: Sequence[Any], result: Any) -> Iterator[Outcome]:
    """One outcome for each value of a result."""
    if name not in METHODS:
        yield NONE
        return
    if name in _SEVERAL and isinstance(result, list):
        place, words = _SEVERAL[name]
        if len(arguments) <= place or arguments[place] is None:
            given = [*arguments, *[None] * (place - len(arguments))][:place]
            rest = arguments[place + 1 :]
            for word, value in zip(words, result[0], strict=False):
                yield _one(name, [*given, word, *rest], value)
            return
    if name in ("FO_PEAK", "FO_NETWORK_PEAK"):
        if isinstance(result, list) and len(result) == 1 and len(result[0]) == 2:
            yield _one(name, arguments, tuple(result[0]))
        else:
            yield NONE
        return
    tables = METHODS[name][1]
    if not isinstance(result, list):
        yield _one(name, [_single(a, i in tables) for i, a in enumerate(arguments)], result)
        return
    for row, values in enumerate(result):
        for place, value in enumerate(values):
            given = [
                argument if number in tables else _element(argument, row, place)
                for number, argument in enumerate(arguments)
            ]
            yield _one(name, given, value)


def _single(argument: Any, is_table: bool) -> Any:
    return argument if is_table else _element(argument, 0, 0)


def _element(argument: Any, row: int, column: int) -> Any:
    if not isinstance(argument, list):
        return argument
    line = argument[0 if len(argument) == 1 else row]
    return line[0 if len(line) == 1 else column]


def _one(name: str, arguments: Sequence[Any], result: Any) -> Outcome:
    method, tables, _ = METHODS[name]
    given = list(arguments)
    while given and given[-1] is None:
        given.pop()
    plain = all(isinstance(a, (float, int, str)) for i, a in enumerate(given) if i not in tables)
    main = result[0] if isinstance(result, tuple) else result
    if not plain or not isinstance(main, float) or not math.isfinite(main):
        return NONE
    try:
        answer = method(result, *given)
    except (
        TooLong,
        ArithmeticError,
        ValueError,
        TypeError,
        RuntimeError,
        LookupError,
        StopIteration,
    ):
        return NONE
    if answer is None:
        return NONE
    expected, near = answer
    apart = abs(main - expected)
    agrees = bool(apart <= max(CLOSE * max(abs(main), abs(expected)), near, 1e-290))
    return Outcome(True, agrees, main, expected)
