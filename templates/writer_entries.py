"""The worksheet "Entries": each input in base SI, judged, and what of it may be used.

State 0 means that an input can be used; every other state has a sentence, which the page shows
beside the input. Only a usable input leaves this worksheet as a number; any other leaves as #N/A,
so that nothing computed from it can pass a check.
"""

from __future__ import annotations

import math

from tausheet.functions.units import text as unit_text
from tausheet.templates import style
from tausheet.templates.book import Book, address, base_unit, table_name, text_literal
from tausheet.templates.formulas import renamed
from tausheet.templates.model import (
    COUNT,
    UNITLESS,
    Choice,
    Entry,
    Input,
    NumberColumn,
    Tolerance,
)
from tausheet.templates.values import shown_unit

TOP = 4
"""First row of inputs."""
WAITS = 99
"""State of an input that cannot be judged while another one is at fault."""

PERCENT_LOWEST = (-90, 0)
PERCENT_HIGHEST = (0, 200)
PERCENT_SENTENCE = "lowest is from -90 to 0 %, highest from 0 to 200 % of the value"

COLUMNS = {
    "A": ("symbol", 14), "B": ("description", 46), "C": ("unit x", 12), "D": ("unit /", 12),
    "E": ("value as typed", 16), "F": ("lowest as typed", 16), "G": ("highest as typed", 16),
    "H": ("state", 8), "I": ("at fault", 9), "J": ("lowest used", 16), "K": ("highest used", 16),
    "L": ("choice used", 30), "M": ("asked for", 10), "N": ("choices", 30),
}  # fmt: skip


def head(book: Book) -> None:
    """Write the heading rows."""
    sheet = book.entries
    sheet["A1"] = "The inputs in base SI, and whether each can be used (state 0)"
    sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
    for letter, (label, width) in COLUMNS.items():
        cell = sheet[f"{letter}{TOP - 1}"]
        cell.value = label
        cell.font = style.font(10, bold=True)
        cell.border = style.RULE
        sheet.column_dimensions[letter].width = width


def name_states(book: Book, number: int) -> None:
    """Name the columns that the verdict counts."""
    for name, letter in (("input_states", "H"), ("input_faults", "I"), ("input_symbols", "A")):
        book.define(name, book.entries, f"{letter}{TOP}", f"{letter}{TOP + number - 1}")


def choices(book: Book, at: int, options: tuple[str, ...]) -> tuple[str, str]:
    """Write the options of a choice into the row of its input; the first and the last cell."""
    first = ord("N") - 64
    cells = [book.entries.cell(at, first + place, option) for place, option in enumerate(options)]
    return cells[0].coordinate, cells[-1].coordinate


class Judgement:
    """One input: `at` is its row here, `row` the row of its cells on the page."""

    def __init__(self, book: Book, entry: Entry, at: int, row: int) -> None:
        self.book, self.entry, self.at = book, entry, at
        self.value, self.unit, self.lowest, self.highest = (
            address(book.main, f"{letter}{row}") for letter in "CDEF"
        )
        self.shown = address(book.main, f"G{row}")
        self.faults = self._faults()

    def write(self) -> None:
        """Write the row: conversion, state, and what may be used."""
        entry, at = self.entry, self.at
        cells: dict[str, str | int] = {"A": entry.symbol, "B": entry.description}
        cells["M"] = f"=IFERROR(IF({entry.needed},1,0),1)" if entry.needed else 1
        state = "0"
        for number, (condition, _) in reversed(list(enumerate(self.faults, start=1))):
            state = f"IF({condition},{number},{state})"
        if entry.needed:
            state = f"IF(AND(ISBLANK({self.value}),NOT({entry.needed})),0,{state})"
        cells["H"] = f"=IFERROR({state},{WAITS})"
        unusable = f"AND(H{at}>0,H{at}<{WAITS})"
        if isinstance(entry, Choice):
            cells["I"] = f"=IF({unusable},1,0)"
            cells["L"] = f"=IF(H{at}=0,{self.value},NA())"
        else:
            # a value put over the one in base SI on the page is a fault as well
            replaced = f"AND(H{at}=0,M{at}=1,NOT(IFERROR({self.shown}=E{at},FALSE)))"
            cells["I"] = f"=IF(OR({unusable},{replaced}),1,0)"
            cells |= self._conversion(entry)
        for letter, content in cells.items():
            self.book.entries[f"{letter}{at}"] = content

    def sentence(self) -> str:
        """A formula: what is allowed, or what is wrong with the input and what to do."""
        entry = self.entry
        state = address(self.book.entries, f"H{self.at}")
        allowed = f"allowed: {allowed_range(entry)}" if isinstance(entry, Input) else ""
        sentences = ",".join(text_literal(sentence) for _, sentence in self.faults)
        waits = f"{entry.symbol} cannot be judged while an input it is compared with is at fault"
        return (
            f"IF({state}=0,{text_literal(allowed)},IF({state}={WAITS},{text_literal(waits)},"
            f"CHOOSE({state},{sentences})))"
        )

    def word(self) -> str:
        """A formula for the state in one word."""
        state, asked = (address(self.book.entries, f"{c}{self.at}") for c in "HM")
        return (
            f'IF(ISNUMBER({state}),IF({state}=0,IF({asked}=1,"ok","not used"),"AT FAULT"),'
            '"AT FAULT")'
        )

    def used(self) -> str:
        """A formula for the value that may be used."""
        state, value = (address(self.book.entries, f"{c}{self.at}") for c in "HE")
        return f"IF({state}=0,{value},NA())"

    def _conversion(self, entry: Input) -> dict[str, str | int]:
        at, value = self.at, self.value
        cells: dict[str, str | int] = {"C": 1, "D": 1}
        if entry.units:
            names = table_name("unit", entry.quantity)
            for letter, kind in (("C", "over"), ("D", "under")):
                sizes = table_name(kind, entry.quantity)
                cells[letter] = f"=SUMPRODUCT(EXACT({self.unit},{names})*{sizes})"
        cells["E"] = f"=IF(ISNUMBER({value}),{value}*C{at}/D{at},NA())"
        if entry.tolerance is Tolerance.NONE:
            return cells
        for letter, extreme, kept in (("F", self.lowest, "J"), ("G", self.highest, "K")):
            scaled = f"{extreme}*C{at}/D{at}"
            if entry.tolerance is Tolerance.PERCENT:
                scaled = f"E{at}*(1+{extreme}/100)"
            cells[letter] = f"=IF(ISNUMBER({extreme}),{scaled},NA())"
            cells[kept] = f"=IF(H{at}=0,{letter}{at},NA())"
        return cells

    def _faults(self) -> list[tuple[str, str]]:
        """What can be wrong: a condition, and the sentence for it; the first that holds decides."""
        if isinstance(self.entry, Choice):
            return self._choice_faults(self.entry)
        return [
            *self._value_faults(self.entry),
            *self._unit_faults(self.entry),
            *self._range_faults(self.entry),
            *self._tolerance_faults(self.entry),
            *self._rule_faults(self.entry),
        ]

    def _choice_faults(self, choice: Choice) -> list[tuple[str, str]]:
        value, symbol = self.value, choice.symbol
        matches = "+".join(f"EXACT({value},{text_literal(each)})" for each in choice.options)
        return [
            (f"ISERROR({value})", f"{symbol} holds an error value: pick from the list"),
            (f"ISBLANK({value})", f"{symbol} is missing: pick from the list"),
            (f"{matches}<>1", f"{symbol} is not one of the list: pick from it"),
        ]

    def _value_faults(self, entry: Input) -> list[tuple[str, str]]:
        value, symbol = self.value, entry.symbol
        # a cell that holds TRUE is a number to Calc, but not to Excel
        no_number = f"OR(ISLOGICAL({value}),NOT(ISNUMBER({value})))"
        pick = ", and pick the unit beside them" if entry.units else ""
        return [
            (f"ISERROR({value})", f"{symbol} holds an error value: type the number itself"),
            (f"ISBLANK({value})", f"{symbol} is missing: enter the {entry.description}"),
            (no_number, f"{symbol} is not a number: type digits alone{pick}"),
        ]

    def _unit_faults(self, entry: Input) -> list[tuple[str, str]]:
        if not entry.units:
            return []
        unit, symbol = self.unit, entry.symbol
        offered = ", ".join(shown_unit(each) for each in entry.units)
        wrong = f"{symbol} has a unit that does not measure {a(entry.quantity)}: pick {offered}"
        return [
            (f"ISERROR({unit})", f"{symbol} has an error value for a unit: pick {offered}"),
            (f"ISBLANK({unit})", f"{symbol} has no unit: pick {offered}"),
            (f"C{self.at}=0", wrong),
        ]

    def _range_faults(self, entry: Input) -> list[tuple[str, str]]:
        at = self.at
        outside = f"{entry.symbol} is outside {allowed_range(entry)}: {entry.why}"
        faults = [(f"OR(E{at}<{entry.low!r},E{at}>{entry.high!r})", outside)]
        if entry.quantity == COUNT:
            whole = f"{entry.symbol} is not a whole number: it counts things"
            faults.append((f"E{at}<>INT(E{at})", whole))
        return faults

    def _tolerance_faults(self, entry: Input) -> list[tuple[str, str]]:
        if entry.tolerance is Tolerance.NONE:
            return []
        symbol, at, lowest, highest = entry.symbol, self.at, self.lowest, self.highest
        percent = entry.tolerance is Tolerance.PERCENT
        fixed = "0" if percent else "the value itself"
        missing = (
            f"NOT(AND(ISNUMBER({lowest}),ISNUMBER({highest})))",
            f"{symbol} needs lowest and highest as numbers; enter {fixed} where it does not vary",
        )
        if percent:
            (low, low_end), (high, high_end) = PERCENT_LOWEST, PERCENT_HIGHEST
            outside = (
                f"OR({lowest}<{low},{lowest}>{low_end},{highest}<{high},{highest}>{high_end})",
                f"{symbol}: {PERCENT_SENTENCE}",
            )
            return [missing, outside]
        return [
            missing,
            (
                f"NOT(AND(F{at}<=E{at},E{at}<=G{at}))",
                f"{symbol}: its value must lie from its lowest to its highest",
            ),
            (
                f"OR(F{at}<{entry.low!r},G{at}>{entry.high!r})",
                f"{symbol}: lowest or highest is outside {allowed_range(entry)}: {entry.why}",
            ),
        ]

    def _rule_faults(self, entry: Input) -> list[tuple[str, str]]:
        own = {
            entry.symbol: f"$E${self.at}",
            f"{entry.symbol}_lo": f"$F${self.at}",
            f"{entry.symbol}_hi": f"$G${self.at}",
        }
        return [
            (f"NOT({renamed(rule.holds, own)})", f"{entry.symbol} {rule.sentence}")
            for rule in entry.rules
        ]


def a(noun: str) -> str:
    """A noun with its article."""
    return f"{'an' if noun[0] in 'aeiou' else 'a'} {noun}"


def allowed_range(entry: Input | NumberColumn) -> str:
    """The physical range of an input, as the page writes it."""
    return f"{plain_text(entry.low, entry.quantity)} to {plain_text(entry.high, entry.quantity)}"


def plain_text(value: float, quantity: str) -> str:
    """A bound as the page writes it: 1 nF, 10 kV, 85 °C."""
    if quantity in UNITLESS:
        return f"{value:.12g}"
    if quantity == "ratio":
        return f"{value * 100:.12g} %"
    digits = 1
    while digits < 6 and not math.isclose(float(f"{value:.{digits - 1}e}"), value):
        digits += 1
    return str(unit_text(value, base_unit(quantity), digits))
