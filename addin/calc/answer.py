"""Arguments as LibreOffice hands them over to cell values, and results as it takes them.

It hands over None for an argument left out, a float, a text, or a tuple of rows for a range, in
which a blank is an empty text. It takes rows of floats and texts, errors as NaNs with a payload.
"""

from __future__ import annotations

import functools
from collections.abc import Callable, Sequence
from typing import Any, TypeAlias

import numpy as np

from tausheet.addin import cells
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind

Rows: TypeAlias = tuple[tuple[Any, ...], ...]

COLUMN_ROWS = 1_048_576
"""Rows of a whole column."""


@functools.cache
def answer_of(name: str) -> Callable[..., Rows]:
    """The cell function `name` as LibreOffice calls it."""
    entry = CATALOGUE.get(name)
    if entry is None:
        return lambda *_: ((ErrorKind.NAME.nan,),)
    variadic = entry.variadic

    def answer(*arguments: Any) -> Rows:
        if variadic:
            arguments = (*arguments[:-1], *(arguments[-1] or ()))
        return rows(cells.call(name, trimmed(arguments)))

    return answer


def trimmed(arguments: Sequence[Any]) -> Sequence[Any]:
    """Without the arguments left out at the end, and with whole columns cut to their used rows.

    Whole columns keep one length: to the last row that is used in any of them.
    """
    while arguments and arguments[-1] is None:
        arguments = arguments[:-1]
    whole = [a for a in arguments if isinstance(a, tuple) and len(a) == COLUMN_ROWS]
    if not whole:
        return arguments
    used = max(map(_used_rows, whole))
    return [a[:used] if isinstance(a, tuple) and len(a) == COLUMN_ROWS else a for a in arguments]


def _used_rows(column: Rows) -> int:
    for row in range(COLUMN_ROWS, 1, -1):
        if any(cell != "" and cell is not None for cell in column[row - 1]):
            return row
    return 1


def rows(result: cells.Raw) -> Rows:
    """A result as rows."""
    if not isinstance(result, np.ndarray):
        return ((result,),)
    if result.ndim == 2 and result.shape[1] == 1:
        return tuple(zip(result.ravel().tolist(), strict=True))
    return tuple(map(tuple, result.tolist()))
