"""The engine with no spreadsheet program: our evaluator of workbook formulas."""

from __future__ import annotations

from pathlib import Path

from tausheet.addin.embedded.book import Book, Values
from tausheet.addin.embedded.refused import Refused

__all__ = ["Book", "Refused", "Values", "compute"]


def compute(path: Path) -> Values:
    """The value of every formula cell of a workbook."""
    return Book.load(path).values()
