"""One calc sheet filled in again and again: built and compiled once, then only computed.

What it gives is what `tausheet new` would write for the same values; a set of values that would
change the layout, a long source for instance, is built anew.
"""

from __future__ import annotations

import io
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

from tausheet import templates
from tausheet.addin import package
from tausheet.addin.cells import CellValue
from tausheet.addin.embedded import Book
from tausheet.addin.make import Said, said
from tausheet.templates import style, values
from tausheet.templates.model import Choice, Input, Tolerance

Given = Mapping[str, str]

FREE = ("doc_number",)
"""Fields of the heading that stand in one cell alone, and so may differ from row to row."""
_LIKE_A_FORMULA = tuple("=+-@'")


@dataclass(frozen=True)
class Done:
    """A workbook, and what it says."""

    data: bytes
    said: Said


def fill(name: str, given: Given) -> Done:
    """The calc sheet with these values, computed and stored."""
    sheet = templates.find(name)
    entries, texts = values.read(sheet, given, demo=False)
    written = [typed.source for typed in entries.values()] + [*texts.values()]
    wide = style.COLUMNS["B"]
    plain = not sheet.filled_in and all(
        not text.startswith(_LIKE_A_FORMULA) and style.lines_needed(text, wide, 7.5) <= 2
        for text in written
    )
    if not plain:
        return _Blank(name, given).with_cells({})
    fixed = tuple((key, text) for key, text in texts.items() if key not in FREE and text)
    blank = _blank(name, fixed)
    cells: dict[str, CellValue] = {key: texts.get(key) or None for key in FREE}
    for entry in sheet.entries():
        typed, symbol = entries[entry.symbol], entry.symbol
        cells |= {f"value_of_{symbol}": typed.value, f"source_of_{symbol}": typed.source or None}
        if isinstance(entry, Choice):
            continue
        assert isinstance(entry, Input)
        if entry.units:
            cells[f"unit_of_{symbol}"] = values.shown_unit(typed.unit)
        if entry.tolerance is not Tolerance.NONE:
            cells |= {f"lowest_of_{symbol}": typed.lowest, f"highest_of_{symbol}": typed.highest}
    return blank.with_cells(cells)


class _Blank:
    """A sheet as it is built, with the cells to type into found by their names."""

    def __init__(self, name: str, given: Given) -> None:
        self.workbook: Any = templates.build(name, given)
        packed = io.BytesIO()
        self.workbook.save(packed)
        self.stencil = package.Stencil(packed.getvalue())
        self.book = Book(self.workbook)

    def with_cells(self, cells: Mapping[str, CellValue]) -> Done:
        """Put these into the cells of these names, and compute."""
        typed: dict[str, dict[str, CellValue]] = {}
        for name, value in cells.items():
            ((title, reference),) = self.workbook.defined_names[name].destinations
            address = reference.replace("$", "").split(":")[0]
            number = float(value) if isinstance(value, int) else value
            self.book.set(title, address, number)
            typed.setdefault(title, {})[address] = number
        computed = self.book.values()
        return Done(self.stencil.filled(computed, typed), said(self.workbook, computed))


@lru_cache(maxsize=4)
def _blank(name: str, texts: tuple[tuple[str, str], ...]) -> _Blank:
    return _Blank(name, dict(texts))
