"""How a workbook of ours prints, and how it is protected: the same for sheets and index."""

from __future__ import annotations

from openpyxl import Workbook
from openpyxl.utils.indexed_list import IndexedList
from openpyxl.workbook.properties import CalcProperties
from openpyxl.worksheet.header_footer import _HeaderFooterPart
from openpyxl.worksheet.page import PageMargins
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.functions import version
from tausheet.templates import style


def set_up(workbook: Workbook, sheet: Worksheet) -> None:
    """The page: grid, margins, heading strip on every page, page n of m at top and bottom."""
    # the font of every cell that sets none, and the unit of column widths: 7 pixels a digit
    plain = style.font(10)
    workbook._fonts = IndexedList([plain])  # type: ignore[attr-defined]
    workbook._named_styles["Normal"].font = plain  # type: ignore[attr-defined]
    for letter, pixels in style.COLUMNS.items():
        sheet.column_dimensions[letter].width = (pixels - 5) / 7
    sheet.sheet_view.showGridLines = False
    sheet.sheet_view.zoomScale = 115
    sheet.freeze_panes = f"A{style.TITLE_ROWS + 1}"
    sheet.print_title_rows = f"1:{style.TITLE_ROWS}"
    _print_set_up(sheet)


def _print_set_up(sheet: Worksheet) -> None:
    sheet.page_setup.paperSize = 9  # A4
    sheet.page_setup.orientation = "portrait"
    sheet.page_setup.scale = 100
    sheet.page_margins = PageMargins(**style.MARGINS)
    sheet.print_options.horizontalCentered = True
    for item in (sheet.oddHeader, sheet.oddFooter):
        assert item is not None
        _in_margin(item.right, "page &P of &N")
        if item is sheet.oddFooter:
            _in_margin(item.left, f"&F   tausheet {version()}")


def _in_margin(part: _HeaderFooterPart, text: str) -> None:
    part.text, part.size, part.font = text, 8, style.FONT


def finish(workbook: Workbook, title: str) -> None:
    """Protect the worksheets, print the first alone, keep stored values when the file is opened."""
    for sheet in workbook.worksheets:
        sheet.protection.sheet = True
        sheet.protection.formatColumns = False
        sheet.protection.formatRows = False
        if sheet is not workbook.worksheets[0]:
            sheet.sheet_view.showGridLines = False
            sheet.freeze_panes = sheet.freeze_panes or "A4"
            sheet.print_area = "A2"  # an empty cell: these are to be looked up, not printed
    # recomputing at load would replace stored values by #NAME? where the add-in is absent
    workbook.calculation = CalcProperties(calcId=191029, fullCalcOnLoad=False)
    workbook.properties.title = title
    workbook.properties.creator = f"tausheet {version()}"
