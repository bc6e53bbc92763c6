"""Parts 9, 10 and 11: the cautions, the basis, the record."""

from __future__ import annotations

from tausheet.functions import version
from tausheet.templates import style
from tausheet.templates.book import Book
from tausheet.templates.model import Table
from tausheet.templates.page import Page

CAUTIONS_PART = 9
BASIS_PART = 10
RECORD_PART = 11

LOCAL_FIRST = (
    "Local codes and licensed practice come first",
    "This sheet is an aid to a competent person. Where a code, an authority or the maker of the "
    "equipment asks for more, that holds; work on the equipment only as licensed to do so.",
)


def cautions(page: Page, book: Book) -> None:
    """Write the hazards in plain words."""
    page.part(CAUTIONS_PART, "Cautions", 60)
    items = [(caution.name, caution.text) for caution in book.sheet.cautions]
    for name, text in (*items, LOCAL_FIRST):
        lines = max(
            style.lines_needed(text, page.width("C:H"), 8.5),
            style.lines_needed(name, page.width("A:B"), 8.5, bold=True),
        )
        height = 5 + style.line_height(8.5) * lines
        page.keep(height)
        row = page.down(height)
        page.text(row, "A:B", name, style.font(8.5, bold=True), vertical="top", wrap=True)
        page.text(row, "C:H", text, style.font(8.5), vertical="top", wrap=True)
        page.frame(row, "A:H", style.UNDER)


def basis(page: Page, book: Book) -> None:
    """Write method, assumptions, sources and what is not covered; and the tables of limits."""
    page.part(BASIS_PART, "Basis", 60)
    basis = book.sheet.basis
    for title, texts in (
        ("method", basis.method),
        ("assumptions", basis.assumptions),
        ("sources", basis.sources),
        ("not covered", basis.not_covered),
    ):
        for number, text in enumerate(texts):
            lines = style.lines_needed(text, page.width("B:H"), 8.5)
            height = 3 + style.line_height(8.5) * lines
            page.keep(height)
            row = page.down(height)
            if number == 0:
                page.text(row, "A", title, style.font(8.5, bold=True), vertical="top")
            page.text(row, "B:H", text, style.font(8.5), vertical="top", wrap=True)
        page.frame(page.row, "A:H", style.UNDER)
    for table in book.sheet.tables:
        if any(column.span for column in table.columns):
            _table(page, table)


def _table(page: Page, table: Table) -> None:
    printed = [column for column in table.columns if column.span]
    spans, place = [], 0
    for column in printed:
        letters = "ABCDEFGH"[place : place + column.span]
        spans.append(f"{letters[0]}:{letters[-1]}")
        place += column.span
    page.keep(80)
    page.down(6)
    page.paragraph("A:H", table.title, 8.5, font=style.font(8.5, bold=True))
    heads = [(s, c.heading, "left") for s, c in zip(spans, printed, strict=True)]
    page.head(heads)
    for row_values in zip(*(column.values for column in printed), strict=True):
        texts = [str(value) for value in row_values]
        lines = max(
            style.lines_needed(text, page.width(span), 8)
            for text, span in zip(texts, spans, strict=True)
        )
        height = 4 + style.line_height(8) * lines
        page.keep(height, lambda: page.head(heads))
        row = page.down(height)
        for text, span in zip(texts, spans, strict=True):
            page.text(row, span, text, style.font(8), vertical="top", wrap=True)
        page.frame(row, "A:H", style.UNDER)


def record(page: Page, book: Book, made: str) -> None:
    """Write with what and when the sheet was made, and that it is not sealed yet."""
    page.part(RECORD_PART, "Record", 95)
    rows = (
        ("made with", "made_with", f"tausheet {version()}"),
        ("computed with", "computed_with", '="tausheet "&FO_VERSION()'),
        ("made on", "made_on", made),
        ("fingerprint", "fingerprint", "not sealed"),
        ("last verified", "last_verified", "never"),
    )
    for label, name, value in rows:
        row = page.down(14)
        page.text(row, "A:B", label, style.font(8.5, bold=True))
        page.text(row, "C:H", value, style.font(8.5))
        book.define(name, page.worksheet, f"C{row}")
        page.frame(row, "A:H", style.UNDER)
    page.down(3)
    page.quiet(
        "The worksheets are protected without a password: against a slip, not against intent. A "
        "fingerprint shows that something changed without a record; it is no signature.",
    )
