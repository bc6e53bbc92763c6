"""The tables that the engineer fills in: on the page, or on a worksheet of their own."""

from __future__ import annotations

from copy import copy
from dataclasses import dataclass
from typing import Any

from openpyxl.cell.cell import Cell
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.templates import style
from tausheet.templates.book import Book, address
from tausheet.templates.formulas import LONG, PAGE_COLUMNS
from tausheet.templates.model import EntryColumn, EntryTable, NumberColumn, TextColumn, WordColumn
from tausheet.templates.page import Page
from tausheet.templates.values import shown_unit
from tausheet.templates.writer_entries import allowed_range
from tausheet.templates.writer_rows import OVER, UNDER, Rows, Typed, has_unit, write_entry

ROW = 14.25
SIZE = 8.5
MOST = 250
"""Characters that a spreadsheet shows of a refusal."""
OWN_TOP = 5
"""First row of a table on a worksheet of its own."""
OWN_WIDTH = 18


def write(page: Page, book: Book, table: EntryTable, at: int, place: int) -> int:
    """Write a table: `at` is its line among the entries; the place of the next on "Rows"."""
    writing = _Own(page, book, table) if table.worksheet else _OnPage(page, book, table)
    rows = Rows(book, table, writing.typed(), place)
    rows.write()
    write_entry(book, table, rows, at)
    writing.fill(rows)
    return rows.end


@dataclass
class _Writing:
    """What both kinds have in common: the cells themselves."""

    page: Page
    book: Book
    table: EntryTable

    def __post_init__(self) -> None:
        self.values = self.book.typed_tables[self.table.symbol]

    def typed(self) -> Typed:
        raise NotImplementedError

    def _name_cells(self, typed: Typed) -> None:
        """Each typed cell of a short table, each column, each unit."""
        book, symbol, first = self.book, self.table.symbol, typed.first
        for name, letter in typed.letters.items():
            cells = [f"{letter}{first + i}" for i in range(self.table.rows)]
            book.define(f"values_of_{symbol}_{name}", typed.worksheet, cells[0], cells[-1])
            for i, cell in enumerate(cells if len(cells) <= LONG else (), start=1):
                book.define(f"value_of_{symbol}_{name}_{i}", typed.worksheet, cell)
        for name, cell in typed.units.items():
            book.define(f"unit_of_{symbol}_{name}", typed.worksheet, cell)

    def _validate(self, typed: Typed, rows: Rows) -> None:
        """Refuse at the keyboard what is not meant."""
        for column in self.table.columns:
            letter = typed.letters[column.name]
            cells = f"{letter}{typed.first}:{letter}{typed.first + self.table.rows - 1}"
            if isinstance(column, WordColumn):
                listed = ",".join(column.options)
                self._refuse(typed, cells, column, "pick one of the list", "list", f'"{listed}"')
            elif isinstance(column, NumberColumn):
                echo = rows.echo[column.name]
                over, under = (address(rows.sheet, f"{echo}{row}") for row in (OVER, UNDER))
                scale = f"*{under}/{over}" if has_unit(column) else ""
                bounds = [f"{bound!r}{scale}" for bound in (column.low, column.high)]
                sentence = f"outside {allowed_range(column)}: {column.why}"
                self._refuse(typed, cells, column, sentence, "decimal", *bounds)
            if isinstance(column, NumberColumn) and column.name in typed.units:
                listed = ",".join(map(shown_unit, column.units))
                unit = typed.units[column.name]
                self._refuse(typed, unit, column, "pick a unit of the list", "list", f'"{listed}"')

    def _refuse(
        self, typed: Typed, cells: str, column: EntryColumn, what: str, kind: str, *bounds: str
    ) -> None:
        validation = DataValidation(
            type=kind,  # type: ignore[arg-type]
            operator="between" if len(bounds) > 1 else None,
            formula1=bounds[0],
            formula2=bounds[1] if len(bounds) > 1 else None,
            allow_blank=True,
            showErrorMessage=True,
            errorTitle=self.table.symbol,
            error=f"{column.heading}: {what}"[:MOST],
        )
        validation.add(cells)
        typed.worksheet.add_data_validation(validation)

    def _unit(self, column: EntryColumn, cell: Cell) -> None:
        offered = column.units if isinstance(column, NumberColumn) else ()
        self.book.input_cell(cell, shown_unit(self.values.units.get(column.name) or offered[0]))

    def _remark(self, rows: Rows, row: int) -> None:
        """The state in the row of the title, which row is at fault, where the table comes from."""
        page, symbol = self.page, self.table.symbol
        state = f'=IF({rows.code()}=0,"ok","AT FAULT")'
        page.text(row, "H", state, style.font(8, bold=True, colour=style.QUIET), "center", "bottom")
        lines = max(
            style.lines_needed(text, page.width("A:H") - 10, 7.5, bold=True)
            for text in (rows.allowed() + " " * 60, *rows.longest_remark())
        )
        below = page.down(3 + style.line_height(7.5) * lines)
        remark = page.text(
            below,
            "A:H",
            f"={rows.remark()}",
            style.font(7.5, colour=style.QUIET),
            vertical="top",
            wrap=True,
        )
        self.book.define(f"remark_on_{symbol}", page.worksheet, remark.coordinate)
        page.worksheet.conditional_formatting.add(
            f"A{row}:H{row} A{below}:H{below}",
            style.when(f'$H${row}="AT FAULT"', letters=style.BAD),
        )
        below = page.down(16)
        page.text(below, "A", "source", style.font(7.5, colour=style.QUIET))
        source = page.text(below, "B:H", None, style.font(7.5))
        self.book.input_cell(source, self.values.source or None)
        page.frame(below, "B:H", style.SOURCE)
        self.book.define(f"source_of_{symbol}", page.worksheet, f"B{below}")

    def _title(self) -> int:
        page = self.page
        row = page.down(16)
        symbol, title = self.table.symbol, self.table.title
        names = f"{symbol}, {symbol}_{self.table.columns[0].name} ..."
        page.text(row, "A:D", title, style.font(9, bold=True), vertical="bottom")
        quiet = style.font(7.5, colour=style.QUIET)
        page.text(row, "E:G", f"in formulas: {names}", quiet, "right", "bottom")
        return row


class _OnPage(_Writing):
    """A short table, kept together on one page."""

    def typed(self) -> Typed:
        page, table = self.page, self.table
        lines = max(
            style.lines_needed(column.heading, page.width(span), 7.5)
            for column, span in zip(table.columns, self._spans(), strict=True)
        )
        head = 4 + style.line_height(7.5) * lines
        page.keep(16 + head + ROW * (1 + table.rows) + 2 * style.line_height(7.5) + 22)
        self.title = self._title()
        row = units = page.down(head)
        if any(map(has_unit, table.columns)):
            units = page.down(ROW)
        first = units + 1
        letters = {}
        quiet = style.font(7.5, colour=style.QUIET)
        for column, span in zip(table.columns, self._spans(), strict=True):
            letters[column.name] = span[0]
            page.text(row, span, column.heading, quiet, "center", "bottom", wrap=True)
            if has_unit(column):
                cell = page.text(units, span, None, style.font(8), "center")
                self._unit(column, cell)
                page.frame(units, span, style.BOX)
        page.text(row, "H", "state", quiet, "center", "bottom")
        for _ in range(table.rows):
            page.down(ROW)
        return Typed(
            page.worksheet,
            first,
            letters,
            {c.name: f"{letters[c.name]}{units}" for c in table.columns if has_unit(c)},
        )

    def _spans(self) -> list[str]:
        """The letters that each column takes; a narrow table leaves room for a label of rows."""
        at = self._labels()
        spans = []
        for column in self.table.columns:
            first, last = (chr(65 + i) for i in (at, at + column.span - 1))
            spans.append(first if first == last else f"{first}:{last}")
            at += column.span
        return spans

    def _labels(self) -> int:
        """Columns of the page left for the label of a row."""
        return 2 if sum(c.span for c in self.table.columns) <= PAGE_COLUMNS - 2 else 0

    def fill(self, rows: Rows) -> None:
        page, table, typed = self.page, self.table, rows.typed
        quiet = style.font(7.5, colour=style.QUIET)
        for i in range(table.rows):
            row = typed.first + i
            for column, span in zip(table.columns, self._spans(), strict=True):
                text = not isinstance(column, NumberColumn)
                cell = page.text(
                    row, span, None, style.font(SIZE, bold=not text), "left" if text else "center"
                )
                self.book.input_cell(cell, self.values.cells.get((i + 1, column.name)))
                if isinstance(column, TextColumn):
                    cell.number_format = "@"  # a node named 1 is a name
                page.frame(row, span, style.BOX)
            label = ""
            if self._labels():
                page.text(row, "A:B", f"{table.row} {i + 1}", quiet, "right", indent=1)
            else:
                label = f'"{i + 1}   "&'
            page.text(row, "H", f"={label}{rows.word(i)}", quiet, "center")
        last = typed.first + table.rows - 1
        page.worksheet.conditional_formatting.add(
            f"H{typed.first}:H{last}",
            style.when(f'RIGHT($H{typed.first},5)="FAULT"', letters=style.BAD),
        )
        self._name_cells(typed)
        self._validate(typed, rows)
        self._remark(rows, self.title)


class _Own(_Writing):
    """A table on a worksheet of its own; the page says how full it is, and what is at fault."""

    def typed(self) -> Typed:
        table = self.table
        sheet: Worksheet = self.book.workbook.create_sheet(table.worksheet, 1)
        letters = {column.name: chr(65 + i) for i, column in enumerate(table.columns)}
        sheet.freeze_panes = f"A{OWN_TOP}"
        for column in table.columns:
            letter = letters[column.name]
            sheet.column_dimensions[letter].width = max(OWN_WIDTH, len(column.heading) + 4)
            head = sheet[f"{letter}{OWN_TOP - 2}"]
            head.value = column.heading
            head.font = style.font(10, bold=True)
            head.alignment = style.align("right")
            unit = sheet[f"{letter}{OWN_TOP - 1}"]
            unit.font = style.font(10)
            unit.alignment = style.align("right")
            if has_unit(column):
                self._unit(column, unit)
        sheet["A1"] = table.title
        sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
        units = {c.name: f"{letters[c.name]}{OWN_TOP - 1}" for c in table.columns if has_unit(c)}
        return Typed(sheet, OWN_TOP, letters, units)

    def fill(self, rows: Rows) -> None:
        page, table, typed = self.page, self.table, rows.typed
        sheet = typed.worksheet
        for column in table.columns:
            letter = typed.letters[column.name]
            model = sheet[f"{letter}{OWN_TOP}"]
            self.book.input_cell(model, None)
            model.font = style.font(10)
            model.alignment = style.align("right" if isinstance(column, NumberColumn) else "left")
            number = ord(letter) - 64
            for i in range(table.rows):
                cell: Any = sheet.cell(OWN_TOP + i, number)
                cell._style = copy(model._style)  # setting each part anew takes long
                value = self.values.cells.get((i + 1, column.name))
                if isinstance(column, NumberColumn):
                    cell.value = value
                elif value is not None:
                    self.book.input_cell(cell, value)
        page.keep(16 + 16 + 40)
        row = self._title()
        line = page.down(16)
        text = f"Type or paste into the worksheet {table.worksheet}, from row {OWN_TOP} on."
        page.text(line, "A:H", text, style.font(SIZE))
        self._name_cells(typed)
        self._validate(typed, rows)
        self._remark(rows, row)
        beside = sheet[f"{chr(66 + len(table.columns))}{OWN_TOP - 2}"]
        beside.value = f"=remark_on_{table.symbol}"
        beside.font = style.font(10, colour=style.QUIET)
