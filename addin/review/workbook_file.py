"""A workbook file read for a review: its formulas, the values stored, the values computed anew."""

from __future__ import annotations

import io
import tempfile
import zipfile
from functools import cached_property
from pathlib import Path
from typing import Any

from openpyxl.utils import range_boundaries
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin import package
from tausheet.addin.cells import CellValue
from tausheet.addin.embedded.book import Book, Key, workbook_of
from tausheet.addin.embedded.refused import Refused
from tausheet.addin.embedded.values import Value
from tausheet.functions.errors import ErrorKind, TausheetError

Call = tuple[Key, str, list[Any], Value]
"""Where a cell function was called, its name, its arguments evaluated, and what it gave."""


class WorkbookFile:
    """One workbook: nothing of it is changed."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.data, self.respelled = package.formulas_spelled_plainly(package.read(path))
        self.workbook: Any = self._read(data_only=False)
        self.calls: list[Call] = []
        self.refusal = ""
        """Why the embedded engine did not compute the workbook, "" when it did."""
        self.failed = False
        """Whether LibreOffice did not compute it either."""

    def _read(self, data_only: bool) -> Any:
        workbook = workbook_of(self.path, self.data, data_only)
        _empty_blocks(workbook)
        return workbook

    @cached_property
    def stored(self) -> Any:
        """The workbook with the values stored in place of the formulas."""
        return self._read(data_only=True)

    @cached_property
    def computed(self) -> dict[str, dict[str, CellValue]]:
        """The value of every formula cell, computed in a fresh engine; fills `calls` on the way."""
        try:
            return self._watched(self.workbook)
        except Refused as refused:
            self.refusal = str(refused).split(". Nothing was")[0]
        self.calls.clear()
        try:
            values = self._by_libreoffice()
        except TausheetError as error:
            self.refusal += f"; LibreOffice: {error}"
            self.failed = True
            return {}
        try:
            self._watched(self._others_as_values(values))
        except Refused as refused:
            self.calls.clear()
            self.refusal += f"; and {str(refused).split('. Nothing was')[0]}"
        return values

    def _watched(self, workbook: Any) -> dict[str, dict[str, CellValue]]:
        book = Book(workbook)
        book.watch = lambda *call: self.calls.append(call)
        return book.values()

    def _by_libreoffice(self) -> dict[str, dict[str, CellValue]]:
        from tausheet.addin.calc import compute

        with tempfile.TemporaryDirectory() as folder:
            copy = Path(folder, "workbook.xlsx")
            copy.write_bytes(self.data)
            return compute(copy)

    def _others_as_values(self, values: dict[str, dict[str, CellValue]]) -> Any:
        """The workbook with LibreOffice's values in every formula cell without our functions."""
        workbook = self._read(data_only=False)
        for sheet in workbook.worksheets:
            for cell in list(sheet._cells.values()):
                text = formula_of(cell)
                if text and "FO_" not in text.upper():
                    value = values[sheet.title].get(cell.coordinate)
                    cell.value = value.text if isinstance(value, ErrorKind) else value
                    if isinstance(value, str):
                        cell.data_type = "s"
        return workbook

    def parts(self) -> list[str]:
        """The names of the parts of the package."""
        with zipfile.ZipFile(io.BytesIO(self.data)) as parts:
            return parts.namelist()

    def part(self, name: str) -> bytes:
        """One part of the package."""
        with zipfile.ZipFile(io.BytesIO(self.data)) as parts:
            return parts.read(name)

    def stored_value(self, title: str, address: str) -> CellValue:
        """The value that the file shows in a cell."""
        cell = self.stored[title][address]
        if cell.data_type == "e":
            try:
                return ErrorKind.from_text(cell.value)
            except ValueError:
                return ErrorKind.VALUE
        value = cell.value
        if isinstance(value, int) and not isinstance(value, bool):
            return float(value)
        return value  # type: ignore[no-any-return]

    def value(self, title: str, address: str) -> CellValue:
        """The value of a cell: computed anew where it holds a formula."""
        cells = self.computed.get(title, {})
        return cells[address] if address in cells else self.stored_value(title, address)

    def cells_named(self, name: str) -> list[tuple[str, str]]:
        """The worksheet and address of each cell that a defined name stands for; [] if none."""
        defined = self.workbook.defined_names.get(name)
        try:
            ((title, reference),) = defined.destinations
            left, top, right, bottom = range_boundaries(reference)
        except (AttributeError, ValueError, TypeError):
            return []
        if title not in self.workbook.sheetnames or None in (left, top, right, bottom):
            return []
        rows = self.workbook[title].iter_rows(top, bottom, left, right)
        return [(title, cell.coordinate) for row in rows for cell in row]

    def values_named(self, name: str) -> list[CellValue]:
        """The values of those cells."""
        return [self.value(*place) for place in self.cells_named(name)]


def _empty_blocks(workbook: Any) -> None:
    """Take away what stands in the cells of an array formula's block: results, and no content."""
    for sheet in workbook.worksheets:
        cells = list(sheet._cells.values())
        for first in [cell for cell in cells if isinstance(cell.value, ArrayFormula)]:
            left, top, right, bottom = range_boundaries(first.value.ref)
            for cell in cells:
                if (
                    cell is not first
                    and left <= cell.column <= right
                    and top <= cell.row <= bottom
                    and not isinstance(cell.value, ArrayFormula)
                ):
                    cell.value = None


def formula_of(cell: Any) -> str:
    """The formula of a cell, "" when it holds none."""
    if isinstance(cell.value, ArrayFormula):
        return str(cell.value.text)
    return cell.value if cell.data_type == "f" and isinstance(cell.value, str) else ""


def shown(value: object, most: int = 90) -> str:
    """A value as the report shows it."""
    if value is None:
        return "(blank)"
    if isinstance(value, ErrorKind):
        return value.text
    if isinstance(value, float):
        return f"{value:.15g}"
    text = str(value)
    return text if len(text) <= most else text[: most - 3] + "..."
