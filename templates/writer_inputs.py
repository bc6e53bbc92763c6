"""Part 4, inputs: what is typed, its echo in base SI, and the sentence that says what is wrong."""

from __future__ import annotations

import math
from collections.abc import Callable

from openpyxl.worksheet.datavalidation import DataValidation

from tausheet.functions.units import text as unit_text
from tausheet.templates import style
from tausheet.templates.book import Book, address, area, base_unit, table_name, text_literal
from tausheet.templates.formulas import renamed
from tausheet.templates.model import COUNT, Choice, Entry, Input, Tolerance
from tausheet.templates.page import Page
from tausheet.templates.values import Typed, shown_unit

PART = 4
TOP = 4
"""First row of the worksheet "Entries"."""
WAITS = 99
"""State of an input that cannot be judged while another one is at fault."""

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
COLUMNS = {
    "A": ("symbol", 14), "B": ("description", 46), "C": ("unit x", 12), "D": ("unit /", 12),
    "E": ("value as typed", 16), "F": ("lowest as typed", 16), "G": ("highest as typed", 16),
    "H": ("state", 8), "I": ("at fault", 9), "J": ("lowest used", 16), "K": ("highest used", 16),
    "L": ("choice used", 30), "M": ("asked for", 10),
}  # fmt: skip


def write(page: Page, book: Book) -> None:
    """Write the inputs, and the worksheet that converts and judges them."""
    _head_of_entries(book)
    page.part(PART, "Inputs")
    page.quiet(
        "Type into the framed cells; nothing else is open. A unit picked later does not convert "
        "the number typed. Lowest and highest are in % of the value, or in its unit where no % "
        "is shown.",
    )
    number = 0
    for group in book.sheet.groups:
        page.keep(16 + 14 + 40)
        row = page.down(16)
        page.text(row, "A:H", group.title, style.font(9, bold=True), vertical="bottom")
        page.head(HEAD)
        for entry in group.entries:
            _Row(page, book, entry, TOP + number).write(lambda: page.head(HEAD))
            number += 1
    last = TOP + number - 1
    book.define("input_states", book.entries, f"H{TOP}", f"H{last}")
    book.define("input_faults", book.entries, f"I{TOP}", f"I{last}")
    book.define("input_symbols", book.entries, f"A{TOP}", f"A{last}")


def _head_of_entries(book: Book) -> None:
    sheet = book.entries
    sheet["A1"] = "The inputs in base SI, and whether each can be used (state 0)"
    sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
    for letter, (label, width) in COLUMNS.items():
        cell = sheet[f"{letter}{TOP - 1}"]
        cell.value = label
        cell.font = style.font(8, bold=True)
        cell.border = style.RULE
        sheet.column_dimensions[letter].width = width


class _Row:
    """One input: two rows of the page, one row of "Entries"."""

    def __init__(self, page: Page, book: Book, entry: Entry, at: int) -> None:
        self.page, self.book, self.entry, self.at = page, book, entry, at
        self.typed: Typed = book.typed[entry.symbol]
        self.faults = self._faults_of(0)

    def write(self, again: Callable[[], None]) -> None:
        """Write the input's rows."""
        entry = self.entry
        sentences = [sentence for _, sentence in self.faults]
        upper = 3 + style.line_height(8.5) * style.lines_needed(
            entry.description, self.page.width("B"), 8.5
        )
        lower = 4 + style.line_height(7.5) * max(
            2 if self.typed.source else 1,
            style.lines_needed(self.typed.source, self.page.width("B"), 7.5),
            *(style.lines_needed(s, self.page.width("C:H"), 7.5) for s in sentences),
        )
        self.page.keep(upper + lower, again)
        row = self.page.down(max(upper, 15))
        below = self.page.down(lower)
        self.faults = self._faults_of(row)
        self._labels(row, below)
        self._cells(row)
        self._entries(row)
        self._sentence(row, below)
        self.page.frame(below, "A:H", style.UNDER)
        source = self.page.text(below, "B", None, style.font(7.5), vertical="top", wrap=True)
        self.book.input_cell(source, self.typed.source or None)
        source.border = style.SOURCE
        self.book.define(f"source_of_{entry.symbol}", self.page.worksheet, f"B{below}")

    def _labels(self, row: int, below: int) -> None:
        page, entry = self.page, self.entry
        page.text(row, "A", entry.symbol, style.font(9, bold=True))
        page.text(row, "B", entry.description, style.font(8.5), wrap=True)
        page.text(below, "A", "source", style.font(7.5, colour=style.QUIET), vertical="top")
        state = address(self.book.entries, f"H{self.at}")
        asked = address(self.book.entries, f"M{self.at}")
        page.text(
            row,
            "H",
            f'=IF(ISNUMBER({state}),IF({state}=0,IF({asked}=1,"ok","not used"),"AT FAULT"),'
            '"AT FAULT")',
            style.font(8, colour=style.QUIET),
            "center",
        )
        page.worksheet.conditional_formatting.add(
            f"A{row}:H{row}",
            style.when(f'$H${row}="AT FAULT"', letters=style.BAD),
        )

    def _cells(self, row: int) -> None:
        page, book, entry, typed = self.page, self.book, self.entry, self.typed
        if isinstance(entry, Choice):
            cell = page.text(row, "C:F", None, style.font(9, bold=True), indent=1)
            book.input_cell(cell, typed.value)
            page.frame(row, "C:F", style.BOX)
            book.define(f"value_of_{entry.symbol}", page.worksheet, f"C{row}")
            book.define(entry.symbol, book.entries, f"L{self.at}")
            self._list(row, "C", entry.options, f"{entry.symbol}: pick one of the list.")
            return
        cell = page.text(row, "C", None, style.font(9.5, bold=True), "right", indent=1)
        book.input_cell(cell, typed.value)
        book.define(f"value_of_{entry.symbol}", page.worksheet, f"C{row}")
        if entry.units:
            cell = page.text(row, "D", None, style.font(9), indent=1)
            book.input_cell(cell, shown_unit(typed.unit))
            book.define(f"unit_of_{entry.symbol}", page.worksheet, f"D{row}")
            units = tuple(shown_unit(unit) for unit in entry.units)
            self._list(row, "D", units, f"{entry.symbol}: pick a unit of the list.")
        else:
            page.text(row, "D", "-", style.font(9, colour=style.QUIET), indent=1)
        for letter, part in (("E", "lowest"), ("F", "highest")):
            if entry.tolerance is Tolerance.NONE:
                page.text(row, letter, "-", style.font(9, colour=style.QUIET), "center")
                continue
            cell = page.text(row, letter, None, style.font(9), "center")
            book.input_cell(cell, getattr(typed, part))
            if entry.tolerance is Tolerance.PERCENT:
                cell.number_format = '+General" %";-General" %";0" %"'
            book.define(f"{part}_of_{entry.symbol}", page.worksheet, f"{letter}{row}")
        page.text(
            row,
            "G",
            f"=IF({address(book.entries, f'H{self.at}')}=0,"
            f"{address(book.entries, f'E{self.at}')},NA())",
            style.font(8, colour=style.QUIET),
            "right",
        )
        book.define(entry.symbol, page.worksheet, f"G{row}")
        if entry.tolerance is not Tolerance.NONE:
            book.define(f"{entry.symbol}_lo", book.entries, f"J{self.at}")
            book.define(f"{entry.symbol}_hi", book.entries, f"K{self.at}")
        self._validation(row)

    def _list(self, row: int, letter: str, options: tuple[str, ...], message: str) -> None:
        source = '"' + ",".join(options) + '"'
        if len(source) > 255 or any("," in option for option in options):
            cells = self._options_cells(options)
            source = cells
        rule = DataValidation(
            type="list",
            formula1=source,
            allow_blank=True,
            showErrorMessage=True,
            errorTitle=self.entry.symbol,
            error=message,
        )
        rule.add(f"{letter}{row}")
        self.page.worksheet.add_data_validation(rule)

    def _options_cells(self, options: tuple[str, ...]) -> str:
        """Where a long list of options stands: beside the input on "Entries"."""
        sheet = self.book.entries
        first = 14
        for place, option in enumerate(options):
            sheet.cell(self.at, first + place, option).font = style.font(8)
        last = sheet.cell(self.at, first + len(options) - 1).coordinate
        start = sheet.cell(self.at, first).coordinate
        return area(sheet, start, last)

    def _validation(self, row: int) -> None:
        entry = self.entry
        assert isinstance(entry, Input)
        scale = ""
        if entry.units:
            scale = (
                f"*{address(self.book.entries, f'D{self.at}')}"
                f"/{address(self.book.entries, f'C{self.at}')}"
            )
        cells = [f"C{row}"]
        if entry.tolerance is Tolerance.ABSOLUTE:
            cells += [f"E{row}", f"F{row}"]
        sentence = f"{entry.symbol} is outside {self._range()}: {entry.why}"
        self._between(cells, repr(entry.low) + scale, repr(entry.high) + scale, sentence)
        if entry.tolerance is Tolerance.PERCENT:
            low, high = PERCENT_LOWEST, PERCENT_HIGHEST
            self._between([f"E{row}"], low[0], low[1], f"{entry.symbol}: {PERCENT_SENTENCE}")
            self._between([f"F{row}"], high[0], high[1], f"{entry.symbol}: {PERCENT_SENTENCE}")

    def _between(self, cells: list[str], low: object, high: object, sentence: str) -> None:
        whole = isinstance(self.entry, Input) and self.entry.quantity == COUNT
        rule = DataValidation(
            type="whole" if whole else "decimal",
            operator="between",
            formula1=str(low),
            formula2=str(high),
            allow_blank=True,
            showErrorMessage=True,
            errorTitle=self.entry.symbol,
            error=sentence[:250],
        )
        for cell in cells:
            rule.add(cell)
        self.page.worksheet.add_data_validation(rule)

    def _range(self) -> str:
        entry = self.entry
        assert isinstance(entry, Input)
        return (
            f"{plain_text(entry.low, entry.quantity)} to {plain_text(entry.high, entry.quantity)}"
        )

    def _faults_of(self, row: int) -> list[tuple[str, str]]:
        """What can be wrong with the input: a condition, and the sentence for it."""
        entry = self.entry
        main = self.book.main
        value = address(main, f"C{row or 1}")
        if isinstance(entry, Choice):
            options = "+".join(f"EXACT({value},{text_literal(option)})" for option in entry.options)
            return [
                (f"ISERROR({value})", f"{entry.symbol} holds an error value: pick from the list"),
                (f"ISBLANK({value})", f"{entry.symbol} is missing: pick from the list"),
                (f"{options}<>1", f"{entry.symbol} is not one of the list: pick from it"),
            ]
        faults = [
            (f"ISERROR({value})", f"{entry.symbol} holds an error value: type the number itself"),
            (f"ISBLANK({value})", f"{entry.symbol} is missing: enter the {entry.description}"),
            (
                f"NOT(ISNUMBER({value}))",
                f"{entry.symbol} is not a number: type digits alone"
                + (", and pick the unit beside them" if entry.units else ""),
            ),
        ]
        if entry.units:
            unit = address(main, f"D{row or 1}")
            offered = ", ".join(shown_unit(u) for u in entry.units)
            faults += [
                (f"ISERROR({unit})", f"{entry.symbol} has an error value for a unit: pick one"),
                (f"ISBLANK({unit})", f"{entry.symbol} has no unit: pick {offered}"),
                (
                    f"C{self.at}=0",
                    f"{entry.symbol} has a unit that does not measure {a(entry.quantity)}: "
                    f"pick {offered}",
                ),
            ]
        outside = f"{entry.symbol} is outside {self._range()}: {entry.why}"
        faults.append((f"OR(E{self.at}<{entry.low!r},E{self.at}>{entry.high!r})", outside))
        if entry.quantity == COUNT:
            faults.append(
                (
                    f"E{self.at}<>INT(E{self.at})",
                    f"{entry.symbol} is not a whole number: it counts things",
                )
            )
        faults += self._tolerance_faults(row)
        own = {
            entry.symbol: f"$E${self.at}",
            f"{entry.symbol}_lo": f"$F${self.at}",
            f"{entry.symbol}_hi": f"$G${self.at}",
        }
        faults += [
            (f"NOT({renamed(rule.holds, own)})", f"{entry.symbol} {rule.sentence}")
            for rule in entry.rules
        ]
        return faults

    def _tolerance_faults(self, row: int) -> list[tuple[str, str]]:
        entry = self.entry
        assert isinstance(entry, Input)
        if entry.tolerance is Tolerance.NONE:
            return []
        lowest, highest = (address(self.book.main, f"{c}{row or 1}") for c in "EF")
        faults = [
            (
                f"NOT(AND(ISNUMBER({lowest}),ISNUMBER({highest})))",
                f"{entry.symbol} needs a lowest and a highest, both numbers; enter "
                + (
                    "0 where it does not vary"
                    if entry.tolerance is Tolerance.PERCENT
                    else "the value where it does not vary"
                ),
            )
        ]
        if entry.tolerance is Tolerance.PERCENT:
            low, high = PERCENT_LOWEST, PERCENT_HIGHEST
            outside = (
                f"OR({lowest}<{low[0]},{lowest}>{low[1]},{highest}<{high[0]},{highest}>{high[1]})"
            )
            return [*faults, (outside, f"{entry.symbol}: {PERCENT_SENTENCE}")]
        at = self.at
        order = f"NOT(AND(F{at}<=E{at},E{at}<=G{at}))"
        outside = f"OR(F{at}<{entry.low!r},G{at}>{entry.high!r})"
        return [
            *faults,
            (order, f"{entry.symbol}: lowest, value and highest must not fall in this order"),
            (outside, f"{entry.symbol}: lowest or highest is outside {self._range()}: {entry.why}"),
        ]

    def _entries(self, row: int) -> None:
        """The row of "Entries": conversion, state, and what may be used."""
        sheet, entry, at = self.book.entries, self.entry, self.at
        main = self.book.main
        value = address(main, f"C{row}")
        cells: dict[str, object] = {"A": entry.symbol, "B": entry.description}
        cells["M"] = f"=IFERROR(IF({entry.needed},1,0),1)" if entry.needed else 1
        state = f"{WAITS}"
        for number, (condition, _) in reversed(list(enumerate(self.faults, start=1))):
            state = f"IF({condition},{number},{state if number < len(self.faults) else 0})"
        if entry.needed:
            state = f"IF(AND(ISBLANK({value}),NOT({entry.needed})),0,{state})"
        cells["H"] = f"=IFERROR({state},{WAITS})"
        cells["I"] = f"=IF(AND(H{at}>0,H{at}<{WAITS}),1,0)"
        if isinstance(entry, Choice):
            cells["L"] = f"=IF(H{at}=0,{value},NA())"
        else:
            cells |= self._conversion(row, value)
        for letter, content in cells.items():
            sheet[f"{letter}{at}"] = content
            sheet[f"{letter}{at}"].font = style.font(8)

    def _conversion(self, row: int, value: str) -> dict[str, object]:
        entry, at = self.entry, self.at
        assert isinstance(entry, Input)
        main = self.book.main
        cells: dict[str, object] = {"C": 1, "D": 1}
        if entry.units:
            unit = address(main, f"D{row}")
            names = table_name("unit", entry.quantity)
            for letter, kind in (("C", "over"), ("D", "under")):
                sizes = table_name(kind, entry.quantity)
                cells[letter] = f"=SUMPRODUCT(EXACT({unit},{names})*{sizes})"
        cells["E"] = f"=IF(ISNUMBER({value}),{value}*C{at}/D{at},NA())"
        if entry.tolerance is not Tolerance.NONE:
            for letter, typed, used in (("F", "E", "J"), ("G", "F", "K")):
                extreme = address(main, f"{typed}{row}")
                scaled = (
                    f"E{at}*(1+{extreme}/100)"
                    if entry.tolerance is Tolerance.PERCENT
                    else f"{extreme}*C{at}/D{at}"
                )
                cells[letter] = f"=IF(ISNUMBER({extreme}),{scaled},NA())"
                cells[used] = f"=IF(H{at}=0,{letter}{at},NA())"
        return cells

    def _sentence(self, row: int, below: int) -> None:
        """What is allowed; or, where the input is at fault, which it is and why."""
        entry = self.entry
        state = address(self.book.entries, f"H{self.at}")
        allowed = f"allowed: {self._range()}" if isinstance(entry, Input) else ""
        sentences = [text_literal(sentence) for _, sentence in self.faults]
        waits = f"{entry.symbol} cannot be judged while an input it is compared with is at fault"
        cell = self.page.text(
            below,
            "C:H",
            f"=IF({state}=0,{text_literal(allowed)},IF({state}={WAITS},{text_literal(waits)},"
            f"CHOOSE({state},{','.join(sentences)})))",
            style.font(7.5, colour=style.QUIET),
            vertical="top",
            wrap=True,
            indent=1,
        )
        self.page.worksheet.conditional_formatting.add(
            cell.coordinate,
            style.when(f'$H${row}="AT FAULT"', letters=style.BAD),
        )
        self.book.define(f"remark_on_{entry.symbol}", self.page.worksheet, cell.coordinate)


PERCENT_LOWEST = (-90, 0)
PERCENT_HIGHEST = (0, 200)
PERCENT_SENTENCE = "lowest is from -90 to 0 %, highest from 0 to 200 % of the value"


def a(noun: str) -> str:
    """A noun with its article."""
    return f"{'an' if noun[0] in 'aeiou' else 'a'} {noun}"


def plain_text(value: float, quantity: str) -> str:
    """A bound as the page writes it: 1 nF, 10 kV, 85 °C."""
    if quantity == COUNT:
        return f"{value:.0f}"
    if quantity == "ratio":
        return f"{value * 100:.12g} %"
    unit = base_unit(quantity)
    digits = 1
    while digits < 6 and not math.isclose(float(f"{value:.{digits - 1}e}"), value):
        digits += 1
    return str(unit_text(value, unit, digits))
