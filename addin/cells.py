"""Cell values to arguments and results to cell values: what every host shares.

A cell value is a float, a text, TRUE or FALSE, None for blank, or an ErrorKind. A range is a
sequence of rows. A host's adapter turns its own values into these and the results back.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import CellError, ErrorKind, error_kind

CellValue: TypeAlias = float | str | bool | ErrorKind | None
Raw: TypeAlias = float | str | NDArray[Any]
"""A result with its errors as NaNs: one value, or a grid of rows (float64, or objects)."""


def call(name: str, arguments: Sequence[object]) -> Raw:
    """Call a cell function; every failure is an error value, never a text or a number."""
    try:
        return _in_cells(CATALOGUE[name].function(*arguments))
    except CellError as error:
        return error.kind.nan
    except Exception:  # a defect of ours must show as an error in the cell, never as a number
        return ErrorKind.VALUE.nan


def _in_cells(result: Any) -> Raw:
    if isinstance(result, (float, str)):
        return result
    if isinstance(result, tuple):
        return _one_row_each(result)
    array = np.asarray(result)
    return array.reshape(1, -1) if array.ndim == 1 else array


def _one_row_each(results: tuple[Any, ...]) -> Raw:
    fields = [np.asarray(field) for field in results]
    if any(field.ndim == 2 and field.shape[1] > 1 for field in fields):
        return ErrorKind.VALUE.nan
    size = max(field.size for field in fields)
    return np.column_stack([np.broadcast_to(field.ravel(), (size,)) for field in fields])


def plain(value: Any) -> CellValue:
    """One value of a result, with a NaN turned into the error it stands for."""
    if isinstance(value, float):
        return error_kind(value) or float(value)
    return value  # type: ignore[no-any-return]


def plain_grid(result: Raw) -> CellValue | list[list[CellValue]]:
    """A whole result with its errors as ErrorKind: one value, or rows."""
    if isinstance(result, np.ndarray):
        return [[plain(value) for value in row] for row in result.tolist()]
    return plain(result)
