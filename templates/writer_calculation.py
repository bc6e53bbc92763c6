"""Part 5, calculation: each quantity, the equation, the result, and the second way beside it."""

from __future__ import annotations

from openpyxl.styles import Font

from tausheet.templates import style
from tausheet.templates.book import Book, base_unit, table_name, text_literal
from tausheet.templates.formulas import outer_call, tables_of
from tausheet.templates.model import COUNT, UNITLESS, Quantity
from tausheet.templates.page import Page
from tausheet.templates.values import shown_unit

PART = 5

HEAD = (
    ("A", "symbol", "left"),
    ("B", "description; equation", "left"),
    ("C", "result", "right"),
    ("D", " unit", "left"),
    ("E:F", "in base SI", "right"),
    ("G", "second way", "right"),
    ("H", "difference", "center"),
)
INTRODUCTION = 28
BLOCK = 16 + 14
"""Points of the sentence below the heading of the part, and of the heading of a block."""

NO_REASON = "no result: an input that it needs is missing or at fault"


def write(page: Page, book: Book) -> None:
    """Write the calculation."""
    first = book.sheet.blocks[0].quantities[0]
    page.part(PART, "Calculation", INTRODUCTION + BLOCK + sum(_heights(page, first)))
    page.quiet(
        "Formulas use the names of the symbols and base SI units. The second way uses the "
        "spreadsheet's own functions alone, so that it can be followed without the add-in; the "
        "difference is relative.",
    )
    for block in book.sheet.blocks:
        page.keep(BLOCK + sum(_heights(page, block.quantities[0])))
        row = page.down(16)
        page.text(row, "A:H", block.title, style.font(9, bold=True), vertical="bottom")
        page.head(HEAD)
        for quantity in block.quantities:
            _quantity(page, book, quantity)


def _heights(page: Page, quantity: Quantity) -> tuple[float, float]:
    """Points that the two rows of a quantity take."""
    principal = bool(quantity.second)
    upper = 3 + style.line_height(8.5) * style.lines_needed(
        quantity.description, page.width("B"), 8.5, bold=principal
    )
    words = style.lines_needed(quantity.words, page.width("B:H"), 7.5)
    lower = 4 + style.line_height(7.5) * (max(words, 2) if principal else words)
    return upper, lower


def _quantity(page: Page, book: Book, quantity: Quantity) -> None:
    principal = bool(quantity.second)
    upper, lower = _heights(page, quantity)
    page.keep(upper + lower, lambda: page.head(HEAD))
    row = page.down(max(upper, 15))
    below = page.down(lower)
    symbol = quantity.symbol
    page.text(row, "A", symbol, style.font(9, bold=True))
    page.text(row, "B", quantity.description, style.font(8.5, bold=principal), wrap=True)
    page.text(row, "E:F", f"={quantity.formula}", style.font(8), "right", indent=1)
    book.define(symbol, page.worksheet, f"E{row}")
    _shown(page, row, "C", "D", symbol, quantity.quantity, style.font(9.5, bold=principal))
    if principal:
        _second(page, book, quantity, row)
    page.text(
        below,
        "B:H",
        _words(book, quantity) if principal else quantity.words,
        style.font(7.5, colour=style.QUIET),
        vertical="top",
        wrap=True,
    )
    page.frame(below, "A:H", style.UNDER)


def _shown(
    page: Page, row: int, number: str, unit: str, name: str, quantity: str, font: Font
) -> None:
    """A result in the unit in which it reads well."""
    cell = page.text(row, number, None, font, "right")
    if quantity in UNITLESS:
        value = name if quantity == COUNT else f"IF({name}=0,0,{_rounded(name)})"
        cell.value = f'=IF(ISNUMBER({name}),{value},"no result")'
        page.text(row, unit, "-", style.font(9, colour=style.QUIET), indent=1)
        return
    place = place_of(name, quantity)
    under, over = (
        f"INDEX({table_name(column, quantity)},{place})" for column in ("shown_under", "shown_over")
    )
    value = f"{name}*{under}/{over}"
    cell.value = f'=IF(ISNUMBER({name}),IF({name}=0,0,{_rounded(value)}),"no result")'
    page.text(
        row,
        unit,
        f"=IF(ISNUMBER({name}),INDEX({table_name('show', quantity)},{place}),"
        f"{text_literal(shown_unit(base_unit(quantity)))})",
        style.font(9),
        indent=1,
    )


def _rounded(value: str) -> str:
    return f"ROUND({value},{style.DIGITS - 1}-INT(LOG10(ABS({value}))))"


def place_of(name: str, quantity: str) -> str:
    """A formula for the row of the unit in which a value reads well."""
    return f"MATCH(IF({name}=0,1,ABS({name})),{table_name('from', quantity)},1)"


def _second(page: Page, book: Book, quantity: Quantity, row: int) -> None:
    """The second way, in full, and how far it is from the first."""
    symbol = quantity.symbol
    page.text(row, "G", f"={quantity.second}", style.font(8), "right")
    book.define(f"{symbol}_hand", page.worksheet, f"G{row}")
    difference = page.text(
        row,
        "H",
        f"=IF(AND(ISNUMBER({symbol}),ISNUMBER({symbol}_hand)),ABS({symbol}-{symbol}_hand)"
        f"/MAX(ABS({symbol}),ABS({symbol}_hand),1E-300),NA())",
        style.font(8, colour=style.QUIET),
        "center",
    )
    difference.number_format = style.TINY
    book.define(f"{symbol}_diff", page.worksheet, f"H{row}")


def _words(book: Book, quantity: Quantity) -> str:
    """The equation; or, where there is no result, the reason."""
    call = outer_call(quantity.formula)
    reason = text_literal(NO_REASON)
    if call:
        function, arguments = call
        asked = f'IFERROR(FO_REASON("{function}",{",".join(arguments)}),{reason})'
        tables = [name for name in arguments if name in tables_of(book.sheet)]
        # LibreOffice calls no function with an error in a range, so there is nothing to ask
        wrong = "+".join(f"SUMPRODUCT(ISERROR({name})*1)" for name in tables)
        reason = f"IF({wrong}>0,{reason},{asked})" if wrong else asked
    return f"=IF(ISERROR({quantity.symbol}),{reason},{text_literal(quantity.words)})"
