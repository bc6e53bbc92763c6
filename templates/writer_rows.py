"""The worksheet "Rows": the tables that the engineer fills in, in base SI, each row judged.

State 0 means that a row can be used or is blank at the end; every other state is the number of a
sentence, which stands here and is shown beside the table. A row that cannot be used leaves this
worksheet as #N/A, a blank cell as an empty text. A short table has a formula a cell, a long one a
formula a column.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.templates import style
from tausheet.templates.book import Book, address, area, quoted, table_name, text_literal
from tausheet.templates.formulas import LONG, names_in, renamed
from tausheet.templates.model import (
    COUNT,
    NUMBER,
    UNITLESS,
    EntryColumn,
    EntryTable,
    NumberColumn,
    TextColumn,
    WordColumn,
)
from tausheet.templates.values import shown_unit
from tausheet.templates.writer_entries import WAITS, a, allowed_range

TOP = 7
"""First row of every table."""
LONGEST = 40
"""Characters of a free text that fit into its cell."""
OVER, UNDER = 3, 4
"""Rows of the two numbers that turn a column into base SI."""


@dataclass(frozen=True)
class Typed:
    """Where the cells of a table are typed: worksheet, first row, letter and unit of a column."""

    worksheet: Worksheet
    first: int
    letters: dict[str, str]
    units: dict[str, str]


@dataclass(frozen=True)
class _Place:
    """Where a formula is written: for one row of a short table, or for all rows of a long one."""

    row: int
    """From 0; of a long table 0."""
    typed: dict[str, str]
    above: dict[str, str]
    index: str
    used: str
    state: str


class Rows:
    """One table: its columns here start at the `place`-th column of the worksheet."""

    def __init__(self, book: Book, table: EntryTable, typed: Typed, place: int) -> None:
        self.book, self.table, self.typed = book, table, typed
        self.sheet = book.rows
        self.long = table.rows > LONG
        self.bottom = TOP + table.rows - 1
        letters = [get_column_letter(place + i) for i in range(4 + len(table.columns))]
        self.index, self.used, self.state, *rest = letters
        self.sentences_at = rest.pop()
        self.echo = {c.name: at for c, at in zip(table.columns, rest, strict=True)}
        self.sentences: list[str] = []
        self.end = place + len(letters)

    def write(self) -> None:
        """Write scalars, states, echoes and sentences, and name them."""
        symbol, sheet, book = self.table.symbol, self.sheet, self.book
        self._heads()
        units = self._unit_faults()
        few = self._say(
            f"{self.table.title}: fill in {self.table.least} "
            f"row{'s' if self.table.least > 1 else ''} or more"
        )
        self.of_the_whole = few
        self._states()
        self._echoes()
        index, state, used = (
            f"${letter}${TOP}:${letter}${self.bottom}"
            for letter in (self.index, self.state, self.used)
        )
        last, first = f"${self.used}${OVER}", f"${self.state}${OVER}"
        sheet[f"{self.used}{OVER}"] = f"=SUMPRODUCT(MAX({used}*{index}))"
        if self.long:
            self._whole_at_once(index)
        # the number of the first row at fault, 0 for none
        beyond = self.table.rows + 1
        sheet[f"{self.state}{OVER}"] = (
            f"=MOD({beyond}-SUMPRODUCT(MAX(({state}>0)*({beyond}-{index}))),{beyond})"
        )
        whole = f"IF({last}<{self.table.least},{few},IF({first}=0,0,INDEX({state},{first})))"
        for condition, code in reversed(units):
            whole = f"IF({condition},{code},{whole})"
        sheet[f"{self.state}{UNDER}"] = f"=IFERROR({whole},{self.cannot})"
        for row, sentence in enumerate(self.sentences, start=TOP):
            sheet[f"{self.sentences_at}{row}"] = sentence
        book.define(f"{symbol}_count", sheet, f"{self.used}{OVER}")
        for name, letter in self.echo.items():
            book.define(f"{symbol}_{name}", sheet, f"{letter}{TOP}", f"{letter}{self.bottom}")
        ends = list(self.echo.values())
        book.define(symbol, sheet, f"{ends[0]}{TOP}", f"{ends[-1]}{self.bottom}")

    def _whole_at_once(self, index: str) -> None:
        """For a long table: its last row, and whether all is well, by a few sums of columns.

        Only where something is wrong is every cell looked at, which takes much longer.
        """
        place = next(self._places())
        filled = [f"SUMPRODUCT(MAX((1-ISBLANK({cell}))*{index}))" for cell in place.typed.values()]
        last = f"${self.used}${OVER}"
        self.sheet[f"{self.used}{OVER}"] = f"=MAX({','.join(filled)})"
        wrong = []
        for column in self.table.columns:
            cell = place.typed[column.name]
            assert isinstance(column, NumberColumn)
            letter = self.echo[column.name]
            scale = f"*${letter}${OVER}/${letter}${UNDER}"
            wrong += [
                f"COUNTA({cell})<>{last}",
                f"COUNT({cell})<>{last}",
                f"MIN({cell}){scale}<{column.low!r}",
                f"MAX({cell}){scale}>{column.high!r}",
            ]
        for rule in self.table.rules:
            broken = self._rule(rule.holds, place)
            wrong.append(f"SUMPRODUCT(({place.index}<={last})*{broken})>0")
        # as an array formula, since Excel looks at one row alone where IF stands in SUMPRODUCT
        cell = f"{self.used}{UNDER}"
        self.sheet[cell] = ArrayFormula(cell, f"=IFERROR(IF(OR({','.join(wrong)}),0,1),0)")

    def _unless_well(self, well: str, looked_at: str) -> str:
        """What a column shows while the whole long table is well, and else."""
        return f"IF(${self.used}${UNDER}=1,{well},{looked_at})" if self.long else looked_at

    def code(self) -> str:
        """The cell that holds the number of the table's sentence, 0 when all is well."""
        return address(self.sheet, f"{self.state}{UNDER}")

    def remark(self) -> str:
        """A formula: what is allowed, or which row and column is at fault, why, what to do."""
        code, first = self.code(), address(self.sheet, f"{self.state}{OVER}")
        sentences = area(
            self.sheet,
            f"{self.sentences_at}{TOP}",
            f"{self.sentences_at}{TOP + len(self.sentences) - 1}",
        )
        row = f'IF({code}>{self.of_the_whole},"{self.table.row} "&{first}&": ","")'
        return (
            f'IF({code}=0,{self.table.symbol}_count&" of {self.table.rows} rows filled in"'
            f"&{text_literal(self.allowed())},{row}&INDEX({sentences},{code}))"
        )

    def word(self, row: int) -> str:
        """A formula for the state of a row (from 0) in one word."""
        state, used = (
            address(self.sheet, f"{letter}{TOP + row}") for letter in (self.state, self.used)
        )
        return f'IF({state}>0,"AT FAULT",IF({used}=1,"ok","-"))'

    def allowed(self) -> str:
        """What is allowed, in words."""
        ranges = [
            f"{c.heading} {allowed_range(c)}"
            for c in self.table.columns
            if isinstance(c, NumberColumn) and c.quantity != NUMBER
        ]
        return "; allowed: " + "; ".join(ranges) if ranges else ""

    def longest_remark(self) -> list[str]:
        """The sentences that the page must have room for."""
        return [f"{self.table.row} {self.table.rows}: {s}" for s in self.sentences]

    def _say(self, sentence: str) -> int:
        self.sentences.append(sentence)
        return len(self.sentences)

    def _heads(self) -> None:
        symbol = self.table.symbol
        labels = {
            self.index: "row",
            self.used: "filled in",
            self.state: "state",
            **{letter: f"{symbol}_{name}" for name, letter in self.echo.items()},
            self.sentences_at: f"{symbol}: what a state means",
        }
        for letter, label in labels.items():
            cell = self.sheet[f"{letter}{TOP - 1}"]
            cell.value = label
            cell.font = style.font(10, bold=True)
            cell.border = style.RULE
            self.sheet.column_dimensions[letter].width = max(12, len(label) + 2)
        self.sheet[f"{self.index}{OVER}"] = "last; first at fault; x"
        self.sheet[f"{self.index}{UNDER}"] = "state of the table; /"
        for row in range(self.table.rows):
            self.sheet[f"{self.index}{TOP + row}"] = row + 1

    def _unit_faults(self) -> list[tuple[str, int]]:
        """The unit of each column as two numbers; where it does not fit, a condition and a code."""
        faults = []
        for column in self.table.columns:
            if not isinstance(column, NumberColumn):
                continue
            over, under = (f"{self.echo[column.name]}{row}" for row in (OVER, UNDER))
            self.sheet[over] = self.sheet[under] = 1
            if column.name not in self.typed.units:
                continue
            unit = address(self.typed.worksheet, self.typed.units[column.name])
            names = table_name("unit", column.quantity)
            for cell, kind in ((over, "over"), (under, "under")):
                sizes = table_name(kind, column.quantity)
                self.sheet[cell] = f"=SUMPRODUCT(EXACT({unit},{names})*{sizes})"
            offered = ", ".join(shown_unit(each) for each in column.units)
            code = self._say(
                f"{column.heading}: its unit does not measure {a(column.quantity)}: pick {offered}"
            )
            faults.append((f"IFERROR({under}=0,TRUE)", code))
        return faults

    def _places(self) -> Iterator[_Place]:
        """Every place at which the formulas of this table are written."""
        first = self.typed.first
        spans = [(0, self.table.rows)] if self.long else [(i, 1) for i in range(self.table.rows)]
        for start, height in spans:

            def cells(letter: str, top: int, start: int = start, height: int = height) -> str:
                ends = [f"${letter}${row}" for row in (top + start, top + start + height - 1)]
                return ends[0] if height == 1 else ":".join(ends)

            title = quoted(self.typed.worksheet)
            yield _Place(
                start,
                {n: f"{title}!{cells(at, first)}" for n, at in self.typed.letters.items()},
                {n: f"{title}!{cells(at, first - 1)}" for n, at in self.typed.letters.items()},
                cells(self.index, TOP),
                cells(self.used, TOP),
                cells(self.state, TOP),
            )

    def _put(self, letter: str, place: _Place, formula: str) -> None:
        if self.long:
            block = f"{letter}{TOP}:{letter}{self.bottom}"
            self.sheet[f"{letter}{TOP}"] = ArrayFormula(block, f"={formula}")
        else:
            self.sheet[f"{letter}{TOP + place.row}"] = f"={formula}"

    def _states(self) -> None:
        gap = self._say("it is blank, but rows below it are filled in: close the gap")
        self.cannot = self._say("cannot be judged; look at the units and at the rows above")
        codes = [
            [self._say(sentence) for _, sentence in self._faults_of(column, "", "")]
            for column in self.table.columns
        ]
        rule_codes = [self._say(rule.sentence) for rule in self.table.rules]
        last = f"${self.used}${OVER}"
        for place in self._places():
            blank = "1"
            for cell in place.typed.values():
                blank = f"IF(ISBLANK({cell}),{blank},0)"
            filled = self._unless_well(f"IF({place.index}<={last},1,0)", f"1-{blank}")
            self._put(self.used, place, filled)
            faults = []
            for column, numbers in zip(self.table.columns, codes, strict=True):
                conditions = self._faults_of(
                    column, place.typed[column.name], self._converted(column, place.typed)
                )
                faults += [(c, number) for (c, _), number in zip(conditions, numbers, strict=True)]
            faults += [
                (condition, number)
                for rule, number in zip(self.table.rules, rule_codes, strict=True)
                if (condition := self._rule(rule.holds, place))
            ]
            state = "0"
            for condition, number in reversed(faults):
                state = f"IF({condition},{number},{state})"
            judged = (
                f"IF({place.used}=0,IF({place.index}<{last},{gap},0),"
                f"IFERROR({state},{self.cannot}))"
            )
            self._put(self.state, place, self._unless_well("0", judged))

    def _converted(self, column: EntryColumn, cells: dict[str, str]) -> str:
        cell = cells[column.name]
        if not isinstance(column, NumberColumn):
            return f'{cell}&""' if isinstance(column, TextColumn) else cell
        letter = self.echo[column.name]
        return f"{cell}*${letter}${OVER}/${letter}${UNDER}"

    def _faults_of(self, column: EntryColumn, cell: str, value: str) -> list[tuple[str, str]]:
        """What can be wrong with a cell: a condition, and the sentence for it."""
        name = column.heading
        faults = [(f"ISERROR({cell})", f"{name} holds an error value: type what is meant itself")]
        if isinstance(column, WordColumn):
            matches = "+".join(f"EXACT({cell},{text_literal(word)})" for word in column.options)
            blank = "" if column.needed else f"+ISBLANK({cell})"
            missing = [(f"ISBLANK({cell})", f"{name} is missing: pick from the list")]
            wrong = (f"{matches}{blank}<>1", f"{name} is not one of the list: pick from it")
            return [*faults, *(missing if column.needed else []), wrong]
        if column.needed:
            empty = f"LEN({cell})=0" if isinstance(column, TextColumn) else f"ISBLANK({cell})"
            faults.append((empty, f"{name} is missing: enter it, or clear the whole row"))
        if isinstance(column, TextColumn):
            long = f"{name} has more than {LONGEST} characters: shorten it"
            return [*faults, (f"LEN({cell})>{LONGEST}", long)]
        # blank cells of columns that need none pass: ISNUMBER is false for them
        plain = f"ISNUMBER({cell})+ISBLANK({cell})=0"
        if not self.long:  # TRUE is a number to Calc; in arrays it cannot be told
            plain = f"OR({plain},ISLOGICAL({cell}))"
        faults.append((plain, f"{name} is not a number: type digits alone"))
        outside = f"ISNUMBER({cell})*(({value}<{column.low!r})+({value}>{column.high!r}))>0"
        faults.append((outside, f"{name} is outside {allowed_range(column)}: {column.why}"))
        if column.quantity == COUNT:
            faults.append(
                (f"{value}<>INT({value})", f"{name} is not a whole number: it counts things")
            )
        return faults

    def _rule(self, holds: str, place: _Place) -> str:
        """A condition that is true where a rule is broken; "" where it does not apply."""
        cells = {"here_row": place.index}
        for column in self.table.columns:
            for kind, typed in (("here", place.typed), ("above", place.above)):
                blank = f'IF(ISBLANK({typed[column.name]}),"",{self._converted(column, typed)})'
                cells[f"{kind}_{column.name}"] = blank
        condition = renamed(holds, cells)
        if any(name.startswith("above_") for name in names_in(holds)):
            if self.long:
                condition = f"IF({place.index}>1,{condition},TRUE)"
            elif place.row == 0:
                return ""
        return f"IF({condition},FALSE,TRUE)"

    def _echoes(self) -> None:
        for column in self.table.columns:
            for place in self._places():
                cell = place.typed[column.name]
                value = self._converted(column, place.typed)
                judged = f'IF({place.state}>0,NA(),IF(ISBLANK({cell}),"",{value}))'
                well = f'IF({place.index}<=${self.used}${OVER},{value},"")'
                self._put(self.echo[column.name], place, self._unless_well(well, judged))


def has_unit(column: EntryColumn) -> bool:
    """Whether a unit is picked for a column."""
    return isinstance(column, NumberColumn) and column.quantity not in UNITLESS


def write_entry(book: Book, table: EntryTable, rows: Rows, at: int) -> None:
    """The table's line among the inputs: whether it can be used."""
    code = rows.code()
    for letter, content in {
        "A": table.symbol,
        "B": table.title,
        "H": f"=IFERROR(IF({code}=0,0,1),{WAITS})",
        "I": f"=IF(H{at}=0,0,1)",
        "M": 1,
    }.items():
        book.entries[f"{letter}{at}"] = content
