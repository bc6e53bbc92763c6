"""LibreOffice Calc: the extension, its installation, and a headless one as an engine."""

from __future__ import annotations

import atexit
import functools
from collections.abc import Sequence
from pathlib import Path

from tausheet.addin.calc.driver import TIME_LIMIT, Book, Calc, Values
from tausheet.addin.calc.helper_process import CalcError

__all__ = ["TIME_LIMIT", "Book", "Calc", "CalcError", "Values", "compute", "pdf"]


def compute(path: Path) -> Values:
    """The value of every formula cell; one LibreOffice serves all calls until Python ends."""
    return _shared().compute(path)


def pdf(paths: Sequence[Path], folder: Path | None = None, limit: float = TIME_LIMIT) -> list[Path]:
    """Print each workbook to a .pdf beside it, or in `folder`; the files written."""
    return _shared().pdf(paths, folder, limit)


@functools.cache
def _shared() -> Calc:
    calc = Calc()
    atexit.register(calc.close)
    return calc
