"""The worksheet "Sealed": every result by its name, and what it was when the sheet was sealed."""

from __future__ import annotations

from typing import Any

from openpyxl.utils import range_boundaries

from tausheet.templates import style
from tausheet.templates.book import Book

TOP = 4
"""First row of results."""
_NOISE = "_diff"
"""The difference of both ways is rounding alone, and no result."""


def write(book: Book) -> None:
    """Name every result, beside an empty cell that sealing fills."""
    sheet = book.sealed
    sheet["A1"] = "The results when the sheet was sealed: filled by `tausheet seal`"
    sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
    for letter, label, width in (("A", "result", 30), ("B", "when sealed", 60)):
        cell = sheet[f"{letter}{TOP - 1}"]
        cell.value = label
        cell.font = style.font(10, bold=True)
        cell.border = style.RULE
        sheet.column_dimensions[letter].width = width
    names = results(book)
    for row, name in enumerate(names, start=TOP):
        sheet[f"A{row}"] = name
        sheet[f"B{row}"].font = style.font(10)
        sheet[f"B{row}"].alignment = style.align()
    last = TOP + len(names) - 1
    for name, letter in (("sealed_names", "A"), ("sealed_results", "B")):
        book.define(name, sheet, f"{letter}{TOP}", f"{letter}{last}")


def results(book: Book) -> list[str]:
    """The names of single cells that hold a formula."""
    found = []
    for name, defined in book.workbook.defined_names.items():
        ((title, reference),) = defined.destinations
        edges: Any = range_boundaries(reference)
        left, top, right, bottom = edges
        if (left, top) != (right, bottom) or name.endswith(_NOISE):
            continue
        if book.workbook[title].cell(top, left).data_type == "f":
            found.append(name)
    return found
