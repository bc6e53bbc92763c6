"""The workbook being written: its worksheets, its names, what may be typed into."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping

from openpyxl import Workbook
from openpyxl.cell.cell import Cell
from openpyxl.styles import Protection
from openpyxl.utils import absolute_coordinate
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.functions.units import units_of
from tausheet.templates import style
from tausheet.templates.formulas import SheetError
from tausheet.templates.model import (
    COUNT,
    NUMBER,
    UNITLESS,
    Entry,
    EntryColumn,
    Quantity,
    Sheet,
)
from tausheet.templates.values import Typed
from tausheet.templates.values_tables import TypedTable

MAIN = "Calc sheet"
ENTRIES = "Entries"
CORNERS = "Worst case"
CURVE = "Curve"
TABLES = "Tables"
ROWS = "Rows"
SEALED = "Sealed"


class Book:
    """One calc sheet on its way into a workbook."""

    def __init__(
        self,
        sheet: Sheet,
        typed: Mapping[str, Typed],
        texts: Mapping[str, str],
        tables: Mapping[str, TypedTable],
    ) -> None:
        self.sheet = sheet
        self.typed = typed
        self.typed_tables = tables
        self.texts = texts
        self.workbook = Workbook()
        first = self.workbook.active
        assert isinstance(first, Worksheet)
        first.title = MAIN
        self.main = first
        self.entries = self.workbook.create_sheet(ENTRIES)
        self.corners = self.workbook.create_sheet(CORNERS)
        self.curve = self.workbook.create_sheet(CURVE)
        self.tables = self.workbook.create_sheet(TABLES)
        if sheet.filled_in:
            self.rows = self.workbook.create_sheet(ROWS)
        self.sealed = self.workbook.create_sheet(SEALED)
        self.quantity_of = {q.symbol: q.quantity for q in sheet.quantities()}
        self.check_rows: list[int] = []
        self._names: set[str] = set()

    def define(self, name: str, worksheet: Worksheet, first: str, last: str = "") -> None:
        """Give a cell (as a range of one by one) or a range a name."""
        if name.lower() in self._names:
            raise SheetError(f"{self.sheet.name}: {name} is a name of the page itself")
        self._names.add(name.lower())
        target = f"{absolute_coordinate(first)}:{absolute_coordinate(last or first)}"
        self.workbook.defined_names[name] = DefinedName(
            name, attr_text=f"{quoted(worksheet)}!{target}"
        )

    def input_cell(self, cell: Cell, value: object) -> None:
        """A cell to type into: visibly so, unlocked, its text never taken for a formula."""
        cell.value = value  # type: ignore[assignment]
        if isinstance(value, str):
            cell.data_type = "s"
            cell.quotePrefix = value[:1] in tuple("=+-@'")
        cell.protection = Protection(locked=False)
        cell.fill = style.fill(style.ENTRY)
        cell.border = style.BOX

    def colour_words(self, cells: str, inks: Mapping[str, tuple[str, str]]) -> None:
        """Colour a cell by the word it shows: word -> ground, letters."""
        anchor = cells.split(":")[0]
        for word, (ground, letters) in inks.items():
            self.main.conditional_formatting.add(
                cells, style.when(f'EXACT({anchor},"{word}")', ground, letters)
            )


VERDICT_INKS = {"PASS": (style.CALM, style.GOOD), "FAIL": (style.BAD, "FFFFFF")}
"""PASS dark on light, FAIL light on dark: apart in grey, too."""


def quoted(worksheet: Worksheet) -> str:
    """A worksheet's title as a formula writes it."""
    title = worksheet.title
    return title if re.fullmatch(r"[A-Za-z_]\w*", title) else f"'{title}'"


def address(worksheet: Worksheet, cell: str) -> str:
    """A cell as a formula on another worksheet writes it."""
    return f"{quoted(worksheet)}!{absolute_coordinate(cell)}"


def area(worksheet: Worksheet, first: str, last: str) -> str:
    """A range as a formula on another worksheet writes it."""
    return f"{address(worksheet, first)}:{absolute_coordinate(last)}"


def text_literal(text: str) -> str:
    """A text as a formula writes it."""
    return '"' + text.replace('"', '""') + '"'


def base_unit(quantity: str) -> str:
    """The base SI unit of a quantity, "" for a count."""
    if quantity in UNITLESS:
        return ""
    return next(unit for unit, size in units_of(quantity).items() if size == 1)


def table_name(kind: str, quantity: str) -> str:
    """The name of a column of the unit tables."""
    return f"{kind}_{quantity.replace(' ', '_')}"


def in_words(value: str, quantity: str, digits: str = "4") -> str:
    """A formula for a value with its unit, to be read; "no result" where there is none."""
    unit = base_unit(quantity)
    if quantity == NUMBER:
        return f'IFERROR(FO_TEXT({value},"1",{digits}),"no result")'
    if not unit:
        return f'IFERROR({value}&"","no result")'
    number = f"100*({value})" if quantity == "ratio" else value
    name = "%" if quantity == "ratio" else unit
    return f'IFERROR(FO_TEXT({number},"{name}",{digits}),"no result")'


def quantity_for(book: Book, symbol: str) -> str:
    """The quantity that a symbol, or one of its extremes, measures."""
    known = {**book.quantity_of}
    known |= {e.symbol: getattr(e, "quantity", "") for e in book.sheet.entries()}
    for stem in (symbol, *(symbol.removesuffix(end) for end in ENDINGS)):
        if stem in known:
            return known[stem]
    raise KeyError(symbol)


ENDINGS = ("_lo", "_hi", "_min", "_max", "_hand")


def with_values(book: Book, sentence: str) -> str:
    """A formula for a sentence in which {symbol} is replaced by its value with a unit."""
    pieces = []
    for text, symbol in re.findall(r"([^{]*)(?:{(\w+)})?", sentence):
        if text:
            pieces.append(text_literal(text))
        if symbol:
            quantity = quantity_for(book, symbol)
            pieces.append(in_words(symbol, quantity) if quantity else symbol)
    return "&".join(pieces)


def measured(sheet: Sheet) -> list[str]:
    """The quantities with units that a sheet enters or shows, in order."""
    columns = [column for table in sheet.filled_in for column in table.columns]
    items: Iterable[Entry | Quantity | EntryColumn] = (
        *sheet.entries(),
        *sheet.quantities(),
        *columns,
    )
    found = dict.fromkeys(getattr(item, "quantity", COUNT) for item in items)
    return [quantity for quantity in found if quantity not in UNITLESS]
