"""What a calc sheet is made of. A sheet module fills these in; it knows no cell and no layout.

Formulas are texts without the leading "=", written in symbols: "R_unit*C_unit". Besides the
symbols of the inputs and quantities they may use, for every input with a tolerance, `SYMBOL_lo`
and `SYMBOL_hi` (its extremes); for every worst case `SYMBOL_min` and `SYMBOL_max`; for every
second way `SYMBOL_hand`; for every table `TABLE_COLUMN`, and `TABLE` itself where formulas or the
engineer fill it. Everything is in base SI units.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from enum import Enum
from typing import TypeAlias

COUNT = "count"
"""The quantity of a number without a unit that counts things."""

NUMBER = "number"
"""The quantity of any other number without a unit."""

UNITLESS = (COUNT, NUMBER)


class Tolerance(Enum):
    """How the extremes of an input are given."""

    NONE = "none"
    PERCENT = "percent"
    ABSOLUTE = "absolute"


class Sense(Enum):
    """On which side of its limit a value has to stay."""

    AT_MOST = "at most"
    AT_LEAST = "at least"


@dataclass(frozen=True)
class Demo:
    """What the demo job enters: texts such as "4.7 mF", "-20 %"."""

    value: str
    source: str
    lowest: str = ""
    highest: str = ""


@dataclass(frozen=True)
class Rule:
    """A condition between inputs. In `holds` the input's own symbol means the number typed.

    `sentence` says what is wrong and what to do; the symbol stands before it on the sheet.
    """

    holds: str
    sentence: str


@dataclass(frozen=True)
class Input:
    """A number that the engineer enters.

    `low` and `high` bound what is physically meant (base SI), and `why` completes the sentence
    "... is outside LOW to HIGH: ". `units` are those offered, the first one being preset.
    `needed` is a formula; where it is false the input may stay blank.
    """

    symbol: str
    description: str
    quantity: str
    units: tuple[str, ...]
    low: float
    high: float
    why: str
    demo: Demo
    tolerance: Tolerance = Tolerance.NONE
    rules: tuple[Rule, ...] = ()
    needed: str = ""


@dataclass(frozen=True)
class Choice:
    """A word that the engineer picks from a list."""

    symbol: str
    description: str
    options: tuple[str, ...]
    demo: Demo
    needed: str = ""


Entry: TypeAlias = Input | Choice


@dataclass(frozen=True)
class Group:
    """Inputs under one heading."""

    title: str
    entries: tuple[Entry, ...]


@dataclass(frozen=True)
class Quantity:
    """A row of the calculation.

    `words` is the equation as a person writes it. `second` is the second way: a formula that uses
    built-in functions alone, and no cell that depends on a function of ours; a quantity that has
    one is a principal result.
    """

    symbol: str
    description: str
    formula: str
    quantity: str
    words: str
    second: str = ""


@dataclass(frozen=True)
class Block:
    """Quantities under one heading."""

    title: str
    quantities: tuple[Quantity, ...]


@dataclass(frozen=True)
class Varies:
    """A part that varies. `inside` is a formula for the place of an extreme between its limits."""

    symbol: str
    inside: str = ""


@dataclass(frozen=True)
class WorstCase:
    """A principal result over the tolerances.

    `of` is the quantity's symbol, `formula` the same result written in inputs, so that each part
    can be put to its extremes.
    """

    of: str
    formula: str
    parts: tuple[Varies, ...]
    draws: int = 200
    seed: int = 1


@dataclass(frozen=True)
class Check:
    """A value against its limit; the value is a worst case. `basis` is the clause or the reason."""

    key: str
    criterion: str
    value: str
    limit: str
    quantity: str
    basis: str
    sense: Sense = Sense.AT_MOST


@dataclass(frozen=True)
class Hazard:
    """A named warning, shown while the formula `when` is true or cannot be computed.

    In `sentence` a symbol in braces is replaced by its value with a unit: "takes {t_open}".
    """

    name: str
    when: str
    sentence: str


@dataclass(frozen=True)
class Trace:
    """A curve over time: a formula in symbols and in `t`, the time of the point."""

    label: str
    formula: str


@dataclass(frozen=True)
class Level:
    """A horizontal limit line at a value, a formula."""

    label: str
    value: str


@dataclass(frozen=True)
class Moment:
    """A vertical line at a time, a formula."""

    label: str
    time: str


@dataclass(frozen=True)
class Mark:
    """A marked point, two formulas."""

    label: str
    time: str
    value: str


@dataclass(frozen=True)
class Curve:
    """The chart of the waveform, from before switching until past `end` (a formula, seconds).

    `traces` first the one that decides. Units are those of the axes. `from_zero` starts the
    vertical axis at 0.
    """

    end: str
    time_unit: str
    quantity: str
    unit: str
    y_title: str
    caption: str
    traces: tuple[Trace, ...]
    levels: tuple[Level, ...] = ()
    moments: tuple[Moment, ...] = ()
    marks: tuple[Mark, ...] = ()
    points: int = 120
    from_zero: bool = True


@dataclass(frozen=True)
class Caution:
    """A hazard of the thing calculated, in plain words."""

    name: str
    text: str


@dataclass(frozen=True)
class Basis:
    """How it was calculated, what was assumed, after which sources, and what is not covered."""

    method: tuple[str, ...]
    assumptions: tuple[str, ...]
    sources: tuple[str, ...]
    not_covered: tuple[str, ...]


@dataclass(frozen=True)
class Column:
    """One column of a table of constants; formulas know it as `TABLE_COLUMN`.

    `span` is how many columns of the page it takes where the table is printed, 0 to leave it out.
    """

    name: str
    heading: str
    values: tuple[float | str, ...]
    span: int = 0


@dataclass(frozen=True)
class Table:
    """Constants to look up; printed with the basis where columns have a span."""

    name: str
    title: str
    columns: tuple[Column, ...]


@dataclass(frozen=True)
class Formed:
    """A table that formulas fill: sources or stages for a function, or the rows of a calculation.

    `rows` holds a formula a cell, "" for a blank. Formulas know the whole as `name` and a column
    as `name_COLUMN`. Inside the table `here_COLUMN` is the cell of the same row and `above_COLUMN`
    that of the row above.
    """

    name: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True)
class ListColumn:
    """A column of a table of results: a formula for one row, in which `here_row` is its number.

    `quantity` is what it measures, "" for a text. `unit`, a formula, replaces the base unit of the
    quantity where that depends on an input. `span` is how many columns of the page it takes.
    """

    name: str
    heading: str
    formula: str
    quantity: str = ""
    span: int = 1
    unit: str = ""


@dataclass(frozen=True)
class Listing:
    """A table of results on the page, after the calculation, to be read: a row for each thing.

    Values are shown as texts with units. `rows` is the most there can be; a row is shown while
    `shown`, a formula that may use `here_row`, is true. `lines` is how many lines of text fit.
    """

    name: str
    title: str
    columns: tuple[ListColumn, ...]
    rows: int
    shown: str
    lines: int = 1


@dataclass(frozen=True)
class NumberColumn:
    """A column of quantities to be filled in; its unit is chosen once for the whole column.

    `low`, `high` and `why` are those of an Input. Where `needed` is false, cells may stay blank.
    `span` is how many columns of the page it takes.
    """

    name: str
    heading: str
    quantity: str
    units: tuple[str, ...]
    low: float
    high: float
    why: str
    needed: bool = True
    span: int = 1


@dataclass(frozen=True)
class WordColumn:
    """A column of words, each picked from a list."""

    name: str
    heading: str
    options: tuple[str, ...]
    needed: bool = True
    span: int = 1


@dataclass(frozen=True)
class TextColumn:
    """A column of free texts such as names; a number typed there is taken as a text."""

    name: str
    heading: str
    needed: bool = True
    span: int = 1


EntryColumn: TypeAlias = NumberColumn | WordColumn | TextColumn


@dataclass(frozen=True)
class EntryTable:
    """A table that the engineer fills in from the top; rows left blank at its end do not count.

    Formulas know it as `symbol`, a column as `symbol_COLUMN` and the number of rows filled in as
    `symbol_count`. Blank cells reach them as empty texts, which our functions take for blanks; a
    row at fault reaches them as #N/A. `least` is how many rows must be filled in.

    In `rules`, conditions on each row, `here_COLUMN` is the cell of that row, `above_COLUMN` that
    of the row above (such a rule leaves the first row out), `here_row` the row's number from 1.

    A table with a `worksheet` stands on a worksheet of that title instead of on the page.
    `row` names a row where one is spoken of; `demo` holds texts such as "2 ms", "" for a blank.
    """

    symbol: str
    title: str
    columns: tuple[EntryColumn, ...]
    rows: int
    demo: tuple[tuple[str, ...], ...]
    demo_source: str
    rules: tuple[Rule, ...] = ()
    least: int = 1
    worksheet: str = ""
    row: str = "row"


@dataclass(frozen=True)
class Picture:
    """The circuit: a picture beside the module, and the line on what is switched when."""

    file: str
    switched: str


@dataclass(frozen=True)
class Heading:
    """The heading of the demo page."""

    number: str
    title: str
    project: str
    revision: str
    status: str


@dataclass(frozen=True)
class Sheet:
    """A calc sheet."""

    name: str
    title: str
    question: str
    purpose: str
    picture: Picture
    groups: tuple[Group, ...]
    blocks: tuple[Block, ...]
    worst_cases: tuple[WorstCase, ...]
    checks: tuple[Check, ...]
    hazards: tuple[Hazard, ...]
    curve: Curve
    cautions: tuple[Caution, ...]
    basis: Basis
    demo: Heading
    tables: tuple[Table, ...] = field(default=())
    formed: tuple[Formed, ...] = field(default=())
    filled_in: tuple[EntryTable, ...] = field(default=())
    listings: tuple[Listing, ...] = field(default=())

    def entries(self) -> Iterator[Entry]:
        """Every input, in the order of the page."""
        for group in self.groups:
            yield from group.entries

    def quantities(self) -> Iterator[Quantity]:
        """Every row of the calculation, in order."""
        for block in self.blocks:
            yield from block.quantities
