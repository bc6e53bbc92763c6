"""What stands in the cells to type into, by the name of the cell, as the writers put it there.

A sheet with other values is the same workbook with other contents of these cells, as long as
`layout` is the same: then it need not be built again.
"""

from __future__ import annotations

from collections.abc import Hashable, Mapping

from tausheet.templates import values, values_tables
from tausheet.templates.model import Choice, NumberColumn, Sheet, Tolerance
from tausheet.templates.values import FIELDS, shown_unit
from tausheet.templates.writer_inputs import source_lines
from tausheet.templates.writer_rows import has_unit

Given = Mapping[str, str | float | None]
Content = float | str | None
Cell = tuple[str, int]
"""A defined name, and which of its cells from 0."""


def entered(sheet: Sheet, given: Given | None) -> dict[Cell, Content]:
    """The content of every cell to type into; refuses what `build` refuses."""
    typed, texts = values.read(sheet, given, False)
    found: dict[Cell, Content] = {(name, 0): texts.get(name) or None for name in FIELDS}
    found["revision_1_number", 0] = texts.get("revision") or None
    for entry in sheet.entries():
        symbol, own = entry.symbol, typed[entry.symbol]
        found[f"source_of_{symbol}", 0] = own.source or None
        found[f"value_of_{symbol}", 0] = own.value
        if isinstance(entry, Choice):
            continue
        if entry.units:
            found[f"unit_of_{symbol}", 0] = shown_unit(own.unit)
        if entry.tolerance is not Tolerance.NONE:
            found[f"lowest_of_{symbol}", 0] = own.lowest
            found[f"highest_of_{symbol}", 0] = own.highest
    tables = values_tables.read(sheet, given, False)
    for table in sheet.filled_in:
        filled = tables[table.symbol]
        found[f"source_of_{table.symbol}", 0] = filled.source or None
        for column in table.columns:
            if isinstance(column, NumberColumn) and has_unit(column):
                unit = filled.units.get(column.name) or column.units[0]
                found[f"unit_of_{table.symbol}_{column.name}", 0] = shown_unit(unit)
        for (row, name), value in filled.cells.items():
            found[f"values_of_{table.symbol}_{name}", row - 1] = value
    return found


def layout(sheet: Sheet, content: Mapping[Cell, Content]) -> Hashable:
    """What of the contents decides the rest of the workbook.

    Long sources make rows higher and move what lies below; a text that begins like a formula has
    a cell that says it is none.
    """
    long = tuple(
        (entry.symbol, lines)
        for entry in sheet.entries()
        if (lines := source_lines(str(content[f"source_of_{entry.symbol}", 0] or ""))) > 2
    )
    marked = frozenset(
        cell
        for cell, value in content.items()
        if isinstance(value, str) and value[:1] in tuple("=+-@'")
    )
    return long, marked


def unknown_keys(sheet: Sheet, keys: list[str]) -> list[str]:
    """A sentence for each key that names nothing of a sheet."""
    said = []
    for key in keys:
        try:
            values.read(sheet, {key: None}, False)
            values_tables.read(sheet, {key: None}, False)
        except values.ValueRefused as refused:
            said.append(str(refused))
    return said
