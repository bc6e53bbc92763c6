"""A workbook read as a file, for tests: cells by name, what formulas call and depend on."""

from __future__ import annotations

from typing import Any

from openpyxl import Workbook
from openpyxl.formula import Tokenizer
from openpyxl.utils import range_boundaries
from openpyxl.utils.cell import get_column_letter


def cell_named(book: Workbook, name: str) -> Any:
    """The cell, or the first cell, that a name stands for."""
    title, cells = next(iter(book.defined_names[name].destinations))
    return book[title][cells.replace("$", "").split(":")[0]]


def operands(formula: str) -> list[str]:
    """The names and ranges in a formula."""
    return [
        token.value
        for token in Tokenizer(formula).items
        if token.type == "OPERAND" and token.subtype == "RANGE"
    ]


def functions(formula: str) -> set[str]:
    """The functions that a formula calls."""
    return {t.value[:-1] for t in Tokenizer(formula).items if t.type == "FUNC" and t.value != ")"}


def cells_behind(book: Workbook, start: Any) -> list[Any]:
    """Every formula cell that a cell depends on, itself included, found in the file alone."""
    todo, seen = [start], {}
    while todo:
        cell = todo.pop()
        key = (cell.parent.title, cell.coordinate)
        if key in seen or not (isinstance(cell.value, str) and cell.value.startswith("=")):
            continue
        seen[key] = cell
        for operand in operands(cell.value):
            if operand in book.defined_names:
                operand = book.defined_names[operand].attr_text
            title, _, area = operand.rpartition("!")
            sheet = book[title.strip("'")] if title else cell.parent
            left, top, right, bottom = range_boundaries(area.replace("$", ""))
            for row in range(top, bottom + 1):
                for column in range(left, right + 1):
                    todo.append(sheet[f"{get_column_letter(column)}{row}"])
    return list(seen.values())
