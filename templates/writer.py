"""A calc sheet as a workbook: the parts in their order, and how it prints."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date

from openpyxl import Workbook
from openpyxl.utils.indexed_list import IndexedList
from openpyxl.workbook.properties import CalcProperties
from openpyxl.worksheet.header_footer import _HeaderFooterPart
from openpyxl.worksheet.page import PageMargins
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.functions import version
from tausheet.templates import (
    formulas,
    style,
    values,
    values_tables,
    writer_calculation,
    writer_checks,
    writer_curve,
    writer_heading,
    writer_inputs,
    writer_tables,
    writer_texts,
    writer_worst_case,
)
from tausheet.templates.book import Book
from tausheet.templates.model import Sheet
from tausheet.templates.page import Page


def build(
    sheet: Sheet,
    given: Mapping[str, str | float | None] | None = None,
    demo: bool = False,
    made: date | None = None,
) -> Workbook:
    """The workbook of a calc sheet, with formulas and without stored values."""
    formulas.check(sheet)
    typed, texts = values.read(sheet, given, demo)
    book = Book(sheet, typed, texts, values_tables.read(sheet, given, demo))
    _set_up(book)
    page = Page(book.main, sum(writer_heading.STRIP_POINTS))
    writer_heading.strip(page, book)
    writer_checks.verdict(page, book)
    writer_heading.purpose(page, book)
    writer_heading.sign_off(page, book)
    page.new_page()
    writer_tables.write(book)
    writer_inputs.write(page, book)
    writer_calculation.write(page, book)
    writer_worst_case.write(page, book)
    writer_checks.write(page, book)
    writer_curve.write(page, book)
    writer_texts.cautions(page, book)
    writer_texts.basis(page, book)
    writer_texts.record(page, book, (made or date.today()).isoformat())
    book.main.print_area = f"A1:H{page.row}"
    _finish(book)
    return book.workbook


def _set_up(book: Book) -> None:
    """The page: grid, margins, heading strip on every page, page n of m at top and bottom."""
    # the font of every cell that sets none, and the unit of column widths: 7 pixels a digit
    plain = style.font(10)
    book.workbook._fonts = IndexedList([plain])  # type: ignore[attr-defined]
    book.workbook._named_styles["Normal"].font = plain  # type: ignore[attr-defined]
    sheet = book.main
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


def _finish(book: Book) -> None:
    for sheet in book.workbook.worksheets:
        sheet.protection.sheet = True
        sheet.protection.formatColumns = False
        sheet.protection.formatRows = False
        if sheet is not book.main:
            sheet.sheet_view.showGridLines = False
            sheet.freeze_panes = sheet.freeze_panes or "A4"
            sheet.print_area = "A2"  # an empty cell: these are to be looked up, not printed
    # recomputing at load would replace stored values by #NAME? where the add-in is absent
    book.workbook.calculation = CalcProperties(calcId=191029, fullCalcOnLoad=False)
    book.workbook.properties.title = book.texts.get("doc_title") or book.sheet.title
    book.workbook.properties.creator = f"tausheet {version()}"
