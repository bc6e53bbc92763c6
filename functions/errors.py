"""Errors, and the one table that maps each to a cell error.

    TausheetError                 anything tausheet refuses to do
    `-- CellError                 a call that puts an error into its cell
        |-- DomainError           #NUM!    a number outside its domain
        |-- InputError            #VALUE!  blank, text, unknown word, malformed table, shapes
        |-- NotAvailable          #N/A     the moment asked for does not exist
        `-- PassedOn              as came  an error value in an argument

An error travels through float arrays as a NaN whose payload is the code of its kind,
the form in which LibreOffice takes it. A NaN without a known payload counts as #NUM!.
"""

from __future__ import annotations

import math
import struct
from enum import Enum
from typing import Any

import numpy as np
from numpy.typing import NDArray

_QUIET_NAN = 0x7FF8000000000000
_PAYLOAD = 0x0007FFFFFFFFFFFF


class ErrorKind(Enum):
    """The cell errors that spreadsheets share; the value is LibreOffice's number for it."""

    NULL = 521
    DIV0 = 532
    VALUE = 519
    REF = 524
    NAME = 525
    NUM = 503
    NA = 32767

    @property
    def text(self) -> str:
        """What the cell shows, for example "#NUM!"."""
        return _TEXTS[self]

    @property
    def nan(self) -> float:
        """The NaN that carries this kind through a float array."""
        number: float = struct.unpack("<d", struct.pack("<Q", _QUIET_NAN | self.value))[0]
        return number

    @classmethod
    def from_text(cls, text: str) -> ErrorKind:
        """The kind that a cell shows as `text`; ValueError for anything else."""
        for kind, shown in _TEXTS.items():
            if shown == text:
                return kind
        raise ValueError(f"not a cell error: {text!r}")


_TEXTS = {
    ErrorKind.NULL: "#NULL!",
    ErrorKind.DIV0: "#DIV/0!",
    ErrorKind.VALUE: "#VALUE!",
    ErrorKind.REF: "#REF!",
    ErrorKind.NAME: "#NAME?",
    ErrorKind.NUM: "#NUM!",
    ErrorKind.NA: "#N/A",
}
_KINDS = {kind.value: kind for kind in ErrorKind}
_CODES = np.array([kind.value for kind in ErrorKind], dtype=np.uint64)


def error_codes(values: NDArray[np.float64]) -> NDArray[np.uint16]:
    """Code of the cell error that each element carries, 0 where it is a finite number."""
    bits = np.ascontiguousarray(values).view(np.uint64)
    payload = bits & np.uint64(_PAYLOAD)
    known = np.isnan(values) & np.isin(payload, _CODES)
    codes = np.where(known, payload, np.uint64(ErrorKind.NUM.value))
    return np.where(np.isfinite(values), 0, codes).astype(np.uint16).reshape(values.shape)


def error_kind(value: float) -> ErrorKind | None:
    """Kind of the cell error that one number carries, None for a finite number."""
    return None if math.isfinite(value) else carried_kind(value) or ErrorKind.NUM


def carried_kind(value: object) -> ErrorKind | None:
    """The cell error that a value is, or carries as a NaN's payload; None for anything else."""
    if isinstance(value, ErrorKind):
        return value
    if isinstance(value, float) and value != value:
        code = struct.unpack("<Q", struct.pack("<d", value))[0] & _PAYLOAD
        return _KINDS.get(code)
    return None


def nan_of(codes: NDArray[Any]) -> NDArray[np.float64]:
    """NaNs that carry the given error codes."""
    bits: NDArray[np.uint64] = np.uint64(_QUIET_NAN) | codes.astype(np.uint64)
    return bits.view(np.float64)


class TausheetError(Exception):
    """Base of everything tausheet refuses to do; the text says what and why."""


class CellError(TausheetError):
    """A call that puts an error into its cell."""

    kind = ErrorKind.VALUE


class DomainError(CellError):
    """A number outside its domain: #NUM!."""

    kind = ErrorKind.NUM


class InputError(CellError):
    """Blank, text where a number belongs, unknown word, malformed table, shapes: #VALUE!."""

    kind = ErrorKind.VALUE


class NotAvailable(CellError):
    """The moment or value asked for does not exist: #N/A."""

    kind = ErrorKind.NA


class PassedOn(CellError):
    """An error value that stood in an argument: it comes out unchanged."""

    def __init__(self, message: str, kind: ErrorKind) -> None:
        super().__init__(message)
        self.kind = kind
