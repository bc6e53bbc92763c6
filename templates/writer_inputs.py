"""Part 4, inputs: the cells to type into, with what is allowed and what is wrong beside them."""

from __future__ import annotations

from collections.abc import Callable

from openpyxl.worksheet.datavalidation import DataValidation

from tausheet.templates import style, writer_entries, writer_entry_tables
from tausheet.templates.book import Book, address, area
from tausheet.templates.model import COUNT, Choice, Entry, Input, Tolerance
from tausheet.templates.page import Page
from tausheet.templates.values import shown_unit
from tausheet.templates.writer_entries import (
    PERCENT_HIGHEST,
    PERCENT_LOWEST,
    PERCENT_SENTENCE,
    Judgement,
    allowed_range,
)

PART = 4

HEAD = (
    ("A", "symbol", "left"),
    ("B", "description; source", "left"),
    ("C", "value", "right"),
    ("D", " unit", "left"),
    ("E", "lowest", "center"),
    ("F", "highest", "center"),
    ("G", "in base SI", "right"),
    ("H", "state", "center"),
)
PERCENT = '+General" %";-General" %";0" %"'
MOST = 250
"""Characters that a spreadsheet shows of a refusal."""


def write(page: Page, book: Book) -> None:
    """Write the inputs, and the worksheet that converts and judges them."""
    writer_entries.head(book)
    page.part(PART, "Inputs")
    page.quiet(
        "Type into the framed cells; nothing else is open. A unit picked later does not convert "
        "the number typed. Lowest and highest are in % of the value, or in its unit where no % "
        "is shown."
    )
    number = 0
    for group in book.sheet.groups:
        page.keep(16 + 14 + 40)
        row = page.down(16)
        page.text(row, "A:H", group.title, style.font(9, bold=True), vertical="bottom")
        page.head(HEAD)
        for entry in group.entries:
            _Row(page, book, entry, writer_entries.TOP + number, lambda: page.head(HEAD))
            number += 1
    place = 1
    for table in book.sheet.filled_in:
        place = writer_entry_tables.write(page, book, table, writer_entries.TOP + number, place)
        number += 1
    writer_entries.name_states(book, number)


def source_lines(source: str) -> int:
    """Lines kept for where a value comes from; two, since one typed later must fit too."""
    return max(2, style.lines_needed(source, style.COLUMNS["B"], 7.5))


class _Row:
    """One input: two rows of the page."""

    def __init__(
        self, page: Page, book: Book, entry: Entry, at: int, again: Callable[[], None]
    ) -> None:
        self.page, self.book, self.entry, self.at = page, book, entry, at
        self.typed = book.typed[entry.symbol]
        upper, lower = self._heights()
        page.keep(upper + lower, again)
        self.row, self.below = page.down(upper), page.down(lower)
        self.judgement = Judgement(book, entry, at, self.row)
        self.judgement.write()
        self._labels()
        if isinstance(entry, Choice):
            self._choice(entry)
        else:
            self._number(entry)
        self._remark()

    def _heights(self) -> tuple[float, float]:
        wide = self.page.width("B")
        description = style.lines_needed(self.entry.description, wide, 8.5)
        sentences = [sentence for _, sentence in Judgement(self.book, self.entry, 1, 1).faults]
        lines = max(
            source_lines(self.typed.source),
            *(
                style.lines_needed(s, self.page.width("C:H") - 10, 7.5, bold=True)
                for s in sentences
            ),
        )
        return max(15.0, 3 + style.line_height(8.5) * description), 3 + style.line_height(
            7.5
        ) * lines

    def _labels(self) -> None:
        page, entry, row = self.page, self.entry, self.row
        page.text(row, "A", entry.symbol, style.font(9, bold=True))
        page.text(row, "B", entry.description, style.font(8.5), wrap=True)
        page.text(
            row, "H", f"={self.judgement.word()}", style.font(8, colour=style.QUIET), "center"
        )
        self._redden(f"A{row}:H{row}")
        below = self.below
        page.text(below, "A", "source", style.font(7.5, colour=style.QUIET), vertical="top")
        page.frame(below, "A:H", style.UNDER)
        source = page.text(below, "B", None, style.font(7.5), vertical="top", wrap=True)
        self.book.input_cell(source, self.typed.source or None)
        source.border = style.SOURCE
        self.book.define(f"source_of_{entry.symbol}", page.worksheet, f"B{below}")

    def _redden(self, cells: str) -> None:
        self.page.worksheet.conditional_formatting.add(
            cells, style.when(f'$H${self.row}="AT FAULT"', letters=style.BAD)
        )

    def _choice(self, entry: Choice) -> None:
        page, book, row = self.page, self.book, self.row
        cell = page.text(row, "C:F", None, style.font(9, bold=True), indent=1)
        book.input_cell(cell, self.typed.value)
        page.frame(row, "C:F", style.BOX)
        book.define(f"value_of_{entry.symbol}", page.worksheet, f"C{row}")
        book.define(entry.symbol, book.entries, f"L{self.at}")
        ends = writer_entries.choices(book, self.at, entry.options)
        self._list("C", area(book.entries, *ends), "pick one of the list.")

    def _number(self, entry: Input) -> None:
        page, book, row, typed = self.page, self.book, self.row, self.typed
        cell = page.text(row, "C", None, style.font(9.5, bold=True), "right", indent=1)
        book.input_cell(cell, typed.value)
        book.define(f"value_of_{entry.symbol}", page.worksheet, f"C{row}")
        quiet = style.font(9, colour=style.QUIET)
        if entry.units:
            cell = page.text(row, "D", None, style.font(9), indent=1)
            cell.alignment = style.align(indent=1, shrink=True)
            book.input_cell(cell, shown_unit(typed.unit))
            book.define(f"unit_of_{entry.symbol}", page.worksheet, f"D{row}")
            units = ",".join(shown_unit(unit) for unit in entry.units)
            self._list("D", f'"{units}"', "pick a unit of the list.")
        else:
            page.text(row, "D", "-", quiet, indent=1)
        for letter, part in (("E", "lowest"), ("F", "highest")):
            cell = page.text(row, letter, "-", quiet, "center")
            if entry.tolerance is Tolerance.NONE:
                continue
            cell.font = style.font(9)
            book.input_cell(cell, getattr(typed, part))
            if entry.tolerance is Tolerance.PERCENT:
                cell.number_format = PERCENT
            book.define(f"{part}_of_{entry.symbol}", page.worksheet, f"{letter}{row}")
        used = f"={self.judgement.used()}"
        if entry.needed:  # what is not asked for shows no error to the reader
            asked, kept = (address(book.entries, f"{c}{self.at}") for c in "ML")
            book.entries[f"L{self.at}"] = used
            used = f'=IF({asked}=1,{kept},"-")'
            book.define(entry.symbol, book.entries, f"L{self.at}")
        else:
            book.define(entry.symbol, page.worksheet, f"G{row}")
        page.text(row, "G", used, style.font(8, colour=style.QUIET), "right")
        if entry.tolerance is not Tolerance.NONE:
            book.define(f"{entry.symbol}_lo", book.entries, f"J{self.at}")
            book.define(f"{entry.symbol}_hi", book.entries, f"K{self.at}")
        self._ranges(entry)

    def _ranges(self, entry: Input) -> None:
        """Refuse at the keyboard what is physically not meant."""
        scale = ""
        if entry.units:
            over, under = (address(self.book.entries, f"{c}{self.at}") for c in "CD")
            scale = f"*{under}/{over}"
        cells = ["C", "E", "F"] if entry.tolerance is Tolerance.ABSOLUTE else ["C"]
        sentence = f"{entry.symbol} is outside {allowed_range(entry)}: {entry.why}"
        self._between(cells, f"{entry.low!r}{scale}", f"{entry.high!r}{scale}", sentence)
        if entry.tolerance is Tolerance.PERCENT:
            for letter, (low, high) in (("E", PERCENT_LOWEST), ("F", PERCENT_HIGHEST)):
                self._between([letter], low, high, f"{entry.symbol}: {PERCENT_SENTENCE}")

    def _between(self, letters: list[str], low: object, high: object, sentence: str) -> None:
        count = isinstance(self.entry, Input) and self.entry.quantity == COUNT
        self._validate(
            letters,
            sentence,
            type="whole" if count else "decimal",
            operator="between",
            formula1=str(low),
            formula2=str(high),
        )

    def _list(self, letter: str, source: str, what: str) -> None:
        self._validate([letter], f"{self.entry.symbol}: {what}", type="list", formula1=source)

    def _validate(self, letters: list[str], sentence: str, **rule: str) -> None:
        validation = DataValidation(
            allow_blank=True,
            showErrorMessage=True,
            errorTitle=self.entry.symbol,
            error=sentence[:MOST],
            **rule,  # type: ignore[arg-type]
        )
        for letter in letters:
            validation.add(f"{letter}{self.row}")
        self.page.worksheet.add_data_validation(validation)

    def _remark(self) -> None:
        """What is allowed; or, where the input is at fault, which it is and why."""
        cell = self.page.text(
            self.below,
            "C:H",
            f"={self.judgement.sentence()}",
            style.font(7.5, colour=style.QUIET),
            vertical="top",
            wrap=True,
            indent=1,
        )
        self._redden(cell.coordinate)
        name = f"remark_on_{self.entry.symbol}"
        self.book.define(name, self.page.worksheet, cell.coordinate)
