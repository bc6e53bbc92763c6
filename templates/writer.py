"""A calc sheet as a workbook: the parts in their order."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date

from openpyxl import Workbook

from tausheet.templates import (
    formulas,
    paper,
    values,
    values_tables,
    writer_calculation,
    writer_checks,
    writer_curve,
    writer_heading,
    writer_inputs,
    writer_listings,
    writer_sealed,
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
    paper.set_up(book.workbook, book.main)
    page = Page(book.main, sum(writer_heading.STRIP_POINTS))
    writer_heading.strip(page, book)
    writer_checks.verdict(page, book)
    writer_heading.purpose(page, book)
    writer_heading.sign_off(page, book)
    page.new_page()
    writer_tables.write(book)
    writer_inputs.write(page, book)
    writer_calculation.write(page, book)
    writer_listings.write(page, book)
    writer_worst_case.write(page, book)
    writer_checks.write(page, book)
    writer_curve.write(page, book)
    writer_texts.cautions(page, book)
    writer_texts.basis(page, book)
    writer_texts.record(page, book, (made or date.today()).isoformat())
    writer_sealed.write(book)
    book.main.print_area = f"A1:H{page.row}"
    paper.finish(book.workbook, book.texts.get("doc_title") or book.sheet.title)
    return book.workbook
