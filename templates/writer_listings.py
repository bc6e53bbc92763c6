"""Tables of results on the page, after the calculation: a row for each stage, element or store."""

from __future__ import annotations

from tausheet.templates import style
from tausheet.templates.book import Book, base_unit, in_words, text_literal
from tausheet.templates.formulas import renamed
from tausheet.templates.model import UNITLESS, ListColumn, Listing
from tausheet.templates.page import Page

SIZE = 7.5


def write(page: Page, book: Book) -> None:
    """Write every table, each kept together on one page."""
    for listing in book.sheet.listings:
        _listing(page, book, listing)


def _listing(page: Page, book: Book, listing: Listing) -> None:
    height = 4 + style.line_height(SIZE) * listing.lines
    spans = _spans(listing)
    head = 4 + style.line_height(SIZE) * max(
        style.lines_needed(column.heading, page.width(span), SIZE)
        for column, span in zip(listing.columns, spans, strict=True)
    )
    page.keep(18 + head + height * listing.rows + 6)
    row = page.down(18)
    page.text(row, "A:H", listing.title, style.font(9, bold=True), vertical="bottom")
    row = page.down(head)
    quiet = style.font(SIZE, colour=style.QUIET)
    for column, span in zip(listing.columns, spans, strict=True):
        side, indent = _side(column), _indent(column, span)
        page.text(row, span, column.heading, quiet, side, "bottom", wrap=True, indent=indent)
    page.frame(row, "A:H", style.RULE)
    first = row + 1
    for number in range(1, listing.rows + 1):
        row = page.down(height)
        shown = f"IFERROR({renamed(listing.shown, {'here_row': str(number)})},FALSE)"
        for column, span in zip(listing.columns, spans, strict=True):
            page.text(
                row,
                span,
                f'=IF({shown},{_read(column, number)},"")',
                style.font(SIZE),
                _side(column),
                vertical="top",
                wrap=True,
                indent=_indent(column, span),
            )
        page.frame(row, "A:H", style.UNDER)
    for column, span in zip(listing.columns, spans, strict=True):
        name = f"list_{listing.name}_{column.name}"
        book.define(name, page.worksheet, f"{span[0]}{first}", f"{span[0]}{row}")
    page.down(4)


def _side(column: ListColumn) -> str:
    return "right" if column.quantity else "left"


def _indent(column: ListColumn, span: str) -> int:
    """Texts keep off the numbers on their left."""
    return 0 if column.quantity or span[0] == "A" else 1


def _spans(listing: Listing) -> list[str]:
    at, spans = 0, []
    for column in listing.columns:
        first, last = (chr(65 + i) for i in (at, at + column.span - 1))
        spans.append(first if first == last else f"{first}:{last}")
        at += column.span
    return spans


def _read(column: ListColumn, number: int) -> str:
    """A formula for the value as a text with its unit."""
    value = renamed(column.formula, {"here_row": str(number)})
    if not column.quantity:
        return f'IFERROR({value},"no result")'
    unit = renamed(column.unit, {"here_row": str(number)}) or text_literal(
        base_unit(column.quantity)
    )
    if column.quantity in UNITLESS or column.quantity == "ratio":
        words = in_words(value, column.quantity)
    else:
        words = f'IFERROR(FO_TEXT({value},{unit},4),"no result")'
    return f'IF(IFERROR({value},1)="","-",{words})'
