"""Reads what a workbook's formulas gave, in one go, for the headless engine."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

_FORMULA, _ERROR = 16, 4


def read(document: Any, titles: Sequence[str]) -> str:
    """The value of each formula cell, by sheet and address, as JSON; of all sheets or of some."""
    sheets = [sheet for sheet in document.Sheets if not titles or sheet.Name in titles]
    return json.dumps({sheet.Name: formula_values(sheet) for sheet in sheets})


def formula_values(sheet: Any) -> dict[str, Any]:
    """The value of each formula cell; {"error": number} for LibreOffice's error of that number."""
    values: dict[str, Any] = {}
    for part in sheet.queryContentCells(_FORMULA):
        place = part.RangeAddress
        for row, line in enumerate(part.getDataArray(), start=place.StartRow):
            for column, value in enumerate(line, start=place.StartColumn):
                if value == 0.0 or value == 1.0:
                    value = truth(sheet.getCellByPosition(column, row), value)
                values[address(column, row)] = value
    for part in sheet.queryFormulaCells(_ERROR):
        place = part.RangeAddress
        for row in range(place.StartRow, place.EndRow + 1):
            for column in range(place.StartColumn, place.EndColumn + 1):
                number = sheet.getCellByPosition(column, row).getError()
                values[address(column, row)] = {"error": number}
    return values


def truth(cell: Any, value: float) -> Any:
    """TRUE or FALSE where the cell shows one, which LibreOffice keeps as a number."""
    return {"TRUE": True, "FALSE": False}.get(cell.String, value)


def address(column: int, row: int) -> str:
    """A cell's address, from 0-based numbers."""
    letters = ""
    column += 1
    while column:
        column, letter = divmod(column - 1, 26)
        letters = chr(65 + letter) + letters
    return f"{letters}{row + 1}"
