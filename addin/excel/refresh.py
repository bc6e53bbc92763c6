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

    found = [refresh_app(app) for app in xlwings.apps]
    if not found:
        return "Excel: not open; open the workbooks first."
    return "\n".join(
        [
            f"Excel: {sum(count for count, _ in found)} formulas entered again and everything "
            "computed.",
            *(f"Excel: {sentence}" for _, left in found for sentence in left),
        ]
    )


def refresh_app(app: Any) -> tuple[int, list[str]]:
    """The same in one running Excel: how many formulas were entered, and sheets that were not."""
    if not len(app.books):  # Excel then knows no way of calculating
        return 0, []
    before = app.api.Calculation
    app.api.Calculation = _MANUAL
    entered, left = 0, []
    try:
        for book in app.books:
            for sheet in book.sheets:
                # a sheet that refuses (a password, a shared workbook) must not stop the others
                try:
                    entered += _refresh_sheet(sheet)
                except Exception as error:
                    left.append(
                        f"{book.name}, sheet {sheet.name}: not all formulas could be entered "
                        f"({error}); unprotect the sheet and run `tausheet refresh` again"
                    )
    finally:
        app.api.Calculation = before
    app.api.CalculateFullRebuild()
    return entered, left


def _refresh_sheet(sheet: Any) -> int:
    heads = list(_heads(sheet.used_range))
    if heads and sheet.api.ProtectContents:
        _let_us_in(sheet.api)
    for api in heads:
        _enter(api)
    return len(heads)


_ALLOWED = (
    *("AllowFormattingCells", "AllowFormattingColumns", "AllowFormattingRows"),
    *("AllowInsertingColumns", "AllowInsertingRows", "AllowInsertingHyperlinks"),
    *("AllowDeletingColumns", "AllowDeletingRows"),
    *("AllowSorting", "AllowFiltering", "AllowUsingPivotTables"),
)


def _let_us_in(sheet: Any) -> None:
    """Keep the sheet protected for its user as it is, but let this program enter formulas.

    Lasts until the workbook is closed and is not stored in it. A password makes Excel refuse.
    """
    sheet.Protect(
        DrawingObjects=sheet.ProtectDrawingObjects,
        Contents=True,
        Scenarios=sheet.ProtectScenarios,
        UserInterfaceOnly=True,
        **{name: getattr(sheet.Protection, name) for name in _ALLOWED},
    )


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


def _enter(api: Any) -> None:
    if api.HasArray:
        api.CurrentArray.FormulaArray = relinked(api.Formula)
    elif hasattr(api, "Formula2"):  # with plain Formula, newer versions put @ before our functions
        api.Formula2 = relinked(api.Formula2)
    else:
        api.Formula = relinked(api.Formula)
