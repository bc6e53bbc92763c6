"""The values that a workbook shows beside those that a fresh engine computes."""

from __future__ import annotations

from collections.abc import Iterator

from tausheet.addin.cells import CellValue
from tausheet.addin.review.finding import Finding
from tausheet.addin.review.workbook_file import WorkbookFile, formula_of, shown
from tausheet.functions.errors import ErrorKind
from tausheet.templates.book import CURVE

CLOSE = 1e-9
"""Relative difference from which a stored number is another one: spreadsheets differ in the last
bits, and a chain of formulas keeps far within this."""
ROUNDING = 1e-12
"""Share of a curve, or of the two ways, within which two values are what rounding left."""


def findings(file: WorkbookFile) -> Iterator[Finding]:
    """Values that are stale, or that were put over the result of a formula."""
    ways = {
        place
        for name in file.workbook.defined_names
        if name.endswith("_diff")
        for place in file.cells_named(name)
    }
    for title, cells in file.computed.items():
        largest = _largest(cells) if title == CURVE else {}
        for address, value in cells.items():
            stored = file.stored_value(title, address)
            column = address.rstrip("0123456789")
            near = ROUNDING * (1.0 if (title, address) in ways else largest.get(column, 0.0))
            if same_value(stored, value, near):
                continue
            where = f"{title}!{address}"
            if stored is None and value not in ("", 0.0):
                yield Finding("no value stored", where, "(nothing)", shown(value))
            elif stored is not None:
                yield Finding("stale or overwritten value", where, shown(stored), shown(value))


def same_value(stored: CellValue, value: CellValue, near: float = 0.0) -> bool:
    """Whether a stored value is the computed one, to what two spreadsheet programs differ by."""
    if isinstance(stored, ErrorKind) or isinstance(value, ErrorKind):
        # a program may store another error than the one that it shows
        return isinstance(stored, ErrorKind) and isinstance(value, ErrorKind)
    if isinstance(stored, bool):
        stored = float(stored)
    if isinstance(value, bool):
        value = float(value)
    if isinstance(stored, float) and isinstance(value, float):
        difference = abs(stored - value)
        return difference <= max(CLOSE * max(abs(stored), abs(value)), near, 1e-300)
    return stored == value


def _largest(cells: dict[str, CellValue]) -> dict[str, float]:
    """The largest magnitude in each column."""
    found: dict[str, float] = {}
    for address, value in cells.items():
        if isinstance(value, float):
            column = address.rstrip("0123456789")
            found[column] = max(found.get(column, 0.0), abs(value))
    return found


def formulas(file: WorkbookFile) -> int:
    """How many formulas the workbook holds."""
    return sum(
        bool(formula_of(cell))
        for sheet in file.workbook.worksheets
        for cell in sheet._cells.values()
    )
