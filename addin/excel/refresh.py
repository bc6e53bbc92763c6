"""Enter formulas again that Excel took in as unknown names, in the workbooks that are open."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterable
from typing import Any

from tausheet.addin.excel.addin_file import FILE_NAME
from tausheet.addin.excel.installation import NOT_WINDOWS, NotInstalled

_MANUAL = -4135
_FILE = re.escape(FILE_NAME)
# what Excel has put in front of our functions when the add-in was elsewhere or absent
_PREFIX = re.compile(
    rf"(?i)@?(?:'[^'\"]*\[?{_FILE}\]?'!|\[?{_FILE}\]?!|\[\d+\]!|_xludf\.)?@?(?=FO_[A-Z0-9_]+\()"
)
_TEXT = re.compile(r'("(?:[^"]|"")*")')


def relinked(formula: str) -> str:
    """The formula with our functions by their plain names; texts in quotes stay as they are."""
    parts = _TEXT.split(formula)
    return "".join(part if part.startswith('"') else _PREFIX.sub("", part) for part in parts)


def refresh() -> str:
    """Re-enter every FO_ formula of every open workbook, then compute everything."""
    if sys.platform != "win32":
        raise NotInstalled(NOT_WINDOWS)
    import xlwings

    entered = sum(refresh_app(app) for app in xlwings.apps)
    return f"Excel: {entered} formulas entered again and everything computed."


def refresh_app(app: Any) -> int:
    """The same in one running Excel; returns how many formulas were entered."""
    before = app.api.Calculation
    app.api.Calculation = _MANUAL
    try:
        entered = sum(
            _entered(cell)
            for book in app.books
            for sheet in book.sheets
            for cell in _heads(sheet.used_range)
        )
    finally:
        app.api.Calculation = before
    app.api.CalculateFullRebuild()
    return entered


def _heads(cells: Iterable[Any]) -> Iterable[Any]:
    """Cells with our formulas; of an array formula only the first."""
    seen = set()
    for cell in cells:
        api = cell.api
        if not api.HasFormula or "FO_" not in api.Formula.upper():
            continue
        if api.HasArray:
            if api.CurrentArray.Address in seen:
                continue
            seen.add(api.CurrentArray.Address)
        yield api


def _entered(api: Any) -> int:
    if api.HasArray:
        api.CurrentArray.FormulaArray = relinked(api.Formula)
    else:
        api.Formula2 = relinked(api.Formula2)
    return 1
