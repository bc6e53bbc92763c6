"""The calc sheets: `build` makes the workbook of one, SHEETS lists them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import date
from typing import TYPE_CHECKING

from tausheet.functions.errors import TausheetError
from tausheet.templates.model import Input, NumberColumn, Sheet
from tausheet.templates.sheets import SHEETS
from tausheet.templates.values import shown_unit

if TYPE_CHECKING:
    from openpyxl import Workbook

__all__ = ["SHEETS", "UnknownSheet", "build", "check_keys", "describe_inputs", "find"]


class UnknownSheet(TausheetError):
    """A name that is no calc sheet."""


def find(name: str) -> Sheet:
    """The calc sheet of that name."""
    if name not in SHEETS:
        raise UnknownSheet(f'"{name[:40]}" is no calc sheet; use one of: {", ".join(SHEETS)}')
    return SHEETS[name]


def build(
    name: str,
    values: Mapping[str, str | float | None] | None = None,
    demo: bool = False,
    made: date | None = None,
) -> Workbook:
    """The workbook of a calc sheet, with formulas and without stored values.

    values: an input's symbol, SYMBOL_lo, SYMBOL_hi or SYMBOL_source, or a field of the heading,
    to a text with a unit ("4.7 mF"), a number in base SI, or None for blank; a cell of a table is
    TABLE.COLUMN.ROW ("bounce.t_closed.1").
    demo: start from the values of the demo job. made: the date on the sheet, today by default.
    """
    from tausheet.templates import writer

    return writer.build(find(name), values, demo, made)


def check_keys(name: str, keys: Iterable[str]) -> None:
    """Refuse a key that names no input, no cell of a table and no field of the heading."""
    from tausheet.templates import values, values_tables

    blank = dict.fromkeys(keys, None)
    values.read(find(name), blank, demo=False)
    values_tables.read(find(name), blank, demo=False)


def describe_inputs(name: str) -> list[tuple[str, str, str, str]]:
    """For each input and column its symbol, description, units or choices, and demo value."""
    rows = []
    for entry in find(name).entries():
        if isinstance(entry, Input):
            offered = ", ".join(shown_unit(unit) for unit in entry.units)
        else:
            offered = "; ".join(entry.options)
        rows.append((entry.symbol, entry.description, offered, entry.demo.value))
    for table in find(name).filled_in:
        for place, column in enumerate(table.columns):
            if isinstance(column, NumberColumn):
                offered = ", ".join(shown_unit(unit) for unit in column.units)
            else:
                offered = "; ".join(getattr(column, "options", ("a text",)))
            key = f"{table.symbol}.{column.name}.1 to {table.rows}"
            first = table.demo[0][place] if table.demo else ""
            rows.append((key, f"{table.title}: {column.heading}", offered, first))
    return rows
