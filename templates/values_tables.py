"""What is to stand in the tables that the engineer fills in, read cell by cell.

A cell is named `TABLE.COLUMN.ROW`, rows counted from 1: `bounce.t_closed.1` = "2 ms". The unit of a
column is that of its first cell given with one. `TABLE.source` says where the table comes from.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tausheet.templates import values
from tausheet.templates.model import EntryColumn, EntryTable, NumberColumn, Sheet, WordColumn
from tausheet.templates.values import ValueRefused

Raw = tuple[float | str, str]
"""A value and the unit it was given in, "" for base SI or none."""


@dataclass
class TypedTable:
    """What stands in the cells of one table, in the units of its columns."""

    cells: dict[tuple[int, str], float | str] = field(default_factory=dict)
    """By row from 1 and column."""
    units: dict[str, str] = field(default_factory=dict)
    source: str = ""


def is_cell(key: str) -> bool:
    """Whether a key names a cell of a table rather than an input."""
    return "." in key


def read(
    sheet: Sheet, given: Mapping[str, str | float | None] | None, demo: bool
) -> dict[str, TypedTable]:
    """The typed cells of every table by its symbol; `given` may hold keys of inputs too."""
    tables = {table.symbol: table for table in sheet.filled_in}
    raw: dict[str, dict[tuple[int, str], Raw | None]] = {symbol: {} for symbol in tables}
    sources = {symbol: table.demo_source if demo else "" for symbol, table in tables.items()}
    for key, value in (given or {}).items():
        if not is_cell(key):
            continue
        symbol, _, rest = key.partition(".")
        if symbol not in tables:
            known = ", ".join(tables) or "none"
            raise ValueRefused(
                f'{sheet.name} has no table "{symbol[:40]}"; its tables are: {known}'
            )
        if rest == "source":
            sources[symbol] = values.checked_text(key, "" if value is None else value)
            continue
        column, row = _place(tables[symbol], key, rest)
        blank = value is None or value == ""
        raw[symbol][row, column.name] = None if blank else _cell(column, key, value or 0.0)
    typed = {}
    for symbol, table in tables.items():
        # what is given comes first, so that it decides the unit of a column
        cells = {**raw[symbol], **(_demo(table) if demo else {}), **raw[symbol]}
        kept = {place: cell for place, cell in cells.items() if cell is not None}
        typed[symbol] = _in_units(table, kept, sources[symbol])
    return typed


def _demo(table: EntryTable) -> dict[tuple[int, str], Raw]:
    return {
        (number, column.name): _cell(column, f"{table.symbol}.{column.name}.{number}", text)
        for number, row in enumerate(table.demo, start=1)
        for column, text in zip(table.columns, row, strict=True)
        if text
    }


def _place(table: EntryTable, key: str, rest: str) -> tuple[EntryColumn, int]:
    name, _, row = rest.partition(".")
    columns = {column.name: column for column in table.columns}
    if name not in columns:
        raise ValueRefused(
            f'{table.symbol} has no column "{name[:40]}"; its columns are: {", ".join(columns)}'
        )
    number = int(row) if row.isascii() and row.isdigit() and len(row) < 8 else 0
    if not 1 <= number <= table.rows:
        raise ValueRefused(
            f'"{key[:60]}" names no row of {table.symbol}; write {table.symbol}.{name}.1 for the '
            f"first row, up to {table.rows}"
        )
    return columns[name], number


def _cell(column: EntryColumn, key: str, value: str | float) -> Raw:
    if isinstance(column, NumberColumn):
        return values.number_of(key, column, value)
    text = values.checked_text(key, value)
    if isinstance(column, WordColumn) and values.shown_unit(text) in column.options:
        text = values.shown_unit(text)  # kohm for kΩ, as in numbers
    elif isinstance(column, WordColumn) and text not in column.options:
        raise ValueRefused(f'{key} is "{text}"; use one of: {"; ".join(column.options)}')
    return text, ""


def _in_units(table: EntryTable, raw: Mapping[tuple[int, str], Raw], source: str) -> TypedTable:
    """Every column in one unit: the first that was given, else the one that reads well."""
    typed = TypedTable(source=source)
    for column in table.columns:
        mine = {place: cell for place, cell in raw.items() if place[1] == column.name}
        if not isinstance(column, NumberColumn) or not column.units:
            typed.cells |= {place: value for place, (value, _) in mine.items()}
            continue
        given = next((unit for _, unit in mine.values() if unit), "")
        largest = max((abs(float(value)) for value, _ in mine.values()), default=0.0)
        unit = given or values.readable(column, largest)
        typed.units[column.name] = unit
        for own in dict.fromkeys(own for _, own in mine.values()):
            numbers = {place: float(value) for place, (value, at) in mine.items() if at == own}
            shown = values.all_converted(list(numbers.values()), own, unit)
            typed.cells |= dict(zip(numbers, shown, strict=True))
    return typed
