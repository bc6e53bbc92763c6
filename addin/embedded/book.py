"""A workbook that this engine computes: read once, recomputed as often as inputs change."""

from __future__ import annotations

import datetime
import io
import math
import warnings
from collections.abc import Callable, Iterable, Iterator
from functools import cached_property
from pathlib import Path
from typing import Any

from openpyxl.reader.excel import ExcelReader
from openpyxl.utils import get_column_letter, range_boundaries
from openpyxl.utils.datetime import CALENDAR_WINDOWS_1900, to_excel
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin import package
from tausheet.addin.cells import CellValue
from tausheet.addin.embedded.parser import (
    MANY,
    MOST_CELLS,
    MOST_STEPS_IN_ALL,
    Area,
    Formula,
    Node,
    Unknown,
    size,
)
from tausheet.addin.embedded.refused import Refused
from tausheet.addin.embedded.values import Grid, NotHere, PassedOn, Value, top_left
from tausheet.functions.errors import ErrorKind

Key = tuple[str, int, int]
"""Sheet, row, column."""

Keys = set[Key]
Users = dict[Key, Keys]

Values = dict[str, dict[str, CellValue]]


class Reader(ExcelReader):
    """Reads a number as the number that the file holds, whatever format shows it as a date."""

    def read(self) -> None:
        """Read it; warnings of what openpyxl would not write again are none here: it writes not."""
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            try:
                super().read()
            except Exception as error:  # of which the first line says what is wrong
                raise ValueError(str(error).partition("\n")[0] or repr(error)) from None

    def read_worksheets(self) -> None:
        """Read them with no format known as one of dates."""
        workbook: Any = self.wb
        workbook._date_formats = workbook._timedelta_formats = set()
        super().read_worksheets()


def workbook_of(path: Path, data: bytes, data_only: bool = False) -> Any:
    """The workbook in bytes that `package.read` has passed, its numbers left as they are."""
    reader = Reader(io.BytesIO(data), data_only=data_only)
    try:
        reader.read()
    except Exception as error:  # openpyxl has no error of its own for a damaged part
        raise package.Unreadable(f"{path} is damaged ({error})") from None
    return reader.wb


class Book:
    """The cells, formulas and names of a workbook."""

    def __init__(self, workbook: Any) -> None:
        self._sheets: set[str] = set(workbook.sheetnames)
        self._names = {name.casefold(): d.attr_text for name, d in workbook.defined_names.items()}
        self._local_names = {
            (sheet.title, name.casefold()): d.attr_text
            for sheet in workbook.worksheets
            for name, d in sheet.defined_names.items()
        }
        self.known: dict[tuple[str, str, bool], tuple[Node, list[Area], int]] = {}
        self.watch: Callable[[Key, str, list[Any], Value], None] | None = None
        """Is told of every call of a cell function: where, which, its arguments, its result."""
        self._at: Key = ("", 0, 0)
        self._cells: dict[Key, CellValue] = {}
        self._texts: dict[Key, tuple[str, Area | None]] = {}
        self._filled_by: dict[Key, Key] = {}
        self._filling: dict[Area, list[Key]] = {}
        for sheet in workbook.worksheets:
            self._read(sheet, workbook.epoch)
        self._formulas = {key: self._compiled(key) for key in self._texts}
        areas = [area for formula in self._formulas.values() for area in formula.areas]
        small = sum(size(area) for area in areas if size(area) <= MANY)
        if small + sum(size(area) for area in {*areas} if size(area) > MANY) > MOST_CELLS:
            raise Refused("the workbook", "its formulas refer to more cells than this engine reads")
        if sum(formula.steps for formula in self._formulas.values()) > MOST_STEPS_IN_ALL:
            raise Refused("the workbook", "its names stand for more than this engine computes")
        self._order = list(self._in_order())
        self._stale: set[Key] = set(self._formulas)
        self._read_before: dict[Area, Grid] = {}

    @classmethod
    def load(cls, path: Path) -> Book:
        """Read an .xlsx; Refused names the cells that this engine does not compute."""
        return cls(workbook_of(path, package.read(path)))

    def set(self, sheet: str, address: str, value: CellValue) -> None:
        """Enter a value into a cell that holds no formula; None empties it."""
        column, row, _, _ = range_boundaries(address)
        key = (sheet, int(row or 0), int(column or 0))
        if sheet not in self._sheets or key in self._formulas or key in self._filled_by:
            raise Refused(f"{sheet}!{address}", "it is not a cell for a value")
        self._cells[key] = _constant(value, None)
        if value is None:
            del self._cells[key]
        todo = [key]
        while todo:
            users = self._users_of(todo.pop()) - self._stale
            self._stale |= users
            todo += users

    def values(self) -> Values:
        """Compute what the cells entered change; the value of every formula cell."""
        self._read_before.clear()
        for key in self._order:
            if key in self._stale:
                self._compute(key)
        self._stale.clear()
        computed: Values = {sheet: {} for sheet in self._sheets}
        for sheet, row, column in (*self._formulas, *self._filled_by):
            address = f"{get_column_letter(column)}{row}"
            value = self._cells[sheet, row, column]
            computed[sheet][address] = 0.0 if isinstance(value, PassedOn) else value
        return computed

    def value(self, sheet: str, row: int, column: int) -> CellValue:
        """Value of a cell, computed before."""
        return self._cells.get((sheet, row, column))

    def read_once(self, area: Area) -> Grid:
        """The values of a range; nothing in it changes once a formula has read it."""
        found = self._read_before.get(area)
        if found is None:
            sheet, left, top, right, bottom = area
            columns, value = range(left, right + 1), self._cells.get
            found = [[value((sheet, r, c)) for c in columns] for r in range(top, bottom + 1)]
            self._read_before[area] = found
        return found

    def named(self, sheet: str, name: str) -> str | None:
        """What a defined name stands for on a sheet."""
        folded = name.casefold()
        return self._local_names.get((sheet, folded), self._names.get(folded))

    def called(self, name: str, arguments: list[Any], result: Value) -> None:
        """A formula has called a cell function."""
        if self.watch is not None:
            self.watch(self._at, name, arguments, result)

    def has_sheet(self, sheet: str) -> bool:
        """Whether there is a worksheet of this name."""
        return sheet in self._sheets

    def _read(self, sheet: Any, epoch: datetime.datetime) -> None:
        # not iter_rows, which makes every cell up to the last one, a billion for a far corner
        for cell in list(sheet._cells.values()):
            if cell.value is None:
                continue
            key = (sheet.title, cell.row, cell.column)
            if isinstance(cell.value, ArrayFormula):
                edges: Any = range_boundaries(cell.value.ref)
                left, top, right, bottom = edges
                area = (sheet.title, left, top, right, bottom)
                if None in area or size(area) > MOST_CELLS:
                    raise Refused(_address(key), "its block is larger than this engine fills")
                self._texts[key] = (cell.value.text, area)  # type: ignore[assignment]
            elif cell.data_type == "f":
                if not isinstance(cell.value, str):
                    raise Refused(_address(key), "it belongs to a table of variants")
                self._texts[key] = (cell.value, None)
            elif cell.data_type == "e":
                self._cells[key] = _error(cell.value)
            else:
                self._cells[key] = _constant(cell.value, epoch)
        for key, (_, block) in self._texts.items():
            if block is not None and key[0] == sheet.title:
                for other in _keys(block):
                    if other != key:
                        self._filled_by[other] = key
                        self._cells.pop(other, None)

    def _users_of(self, key: Key) -> Keys:
        """The formula cells that refer to a cell, or to the block that its formula fills."""
        users, of_large = self._users
        found = set(users.get(key, ()))
        sheet, row, column = key
        block = self._texts[key][1] if key in self._texts else None
        _, left, top, right, bottom = block or (sheet, column, row, column, row)
        for area, others in of_large.items():
            if (
                area[0] == sheet
                and area[1] <= right
                and left <= area[3]
                and area[2] <= bottom
                and top <= area[4]
            ):
                found |= others
        return found

    @cached_property
    def _users(self) -> tuple[Users, dict[Area, Keys]]:
        """The formula cells that refer to a cell, or to a large area; made at the first change."""
        users: Users = {}
        of_large: dict[Area, Keys] = {}
        for key, formula in self._formulas.items():
            for area in formula.areas:
                if size(area) > MANY:
                    of_large.setdefault(area, set()).add(key)
                    continue
                for other in _keys(area):
                    users.setdefault(self._filled_by.get(other, other), set()).add(key)
        return users, of_large

    def _compiled(self, key: Key) -> Formula:
        text, area = self._texts[key]
        try:
            return Formula(self, key[0], key[1], text, array=area is not None)
        except Unknown as unknown:
            raise Refused(_address(key), str(unknown)) from None

    def _in_order(self) -> Iterator[Key]:
        """The formula cells, each after those that it refers to; a cycle is refused."""
        done: set[Key] = set()
        for start in self._formulas:
            if start in done:
                continue
            path: dict[Key, Iterator[Key]] = {start: self._needed(start)}
            while path:
                key, waiting = next(reversed(path.items()))
                following = next((other for other in waiting if other not in done), None)
                if following is None:
                    done.add(key)
                    del path[key]
                    yield key
                elif following in path:
                    members = list(path)[list(path).index(following) :]
                    cells = ", ".join(map(_address, members[:8]))
                    raise Refused(cells, "these cells refer to each other in a circle")
                else:
                    path[following] = self._needed(following)

    def _needed(self, key: Key) -> Iterator[Key]:
        for area in self._formulas[key].areas:
            yield from self._origins(area)

    def _origins(self, area: Area) -> Iterable[Key]:
        """The formula cells that fill an area, each once."""
        if area not in self._filling:
            origins = dict.fromkeys(self._filled_by.get(other, other) for other in _keys(area))
            self._filling[area] = [key for key in origins if key in self._formulas]
        return self._filling[area]

    def _compute(self, key: Key) -> None:
        block = self._texts[key][1]
        self._at = key
        try:
            value: Value = self._formulas[key].run()
        except NotHere as unknown:
            raise Refused(_address(key), f"it uses {unknown}") from None
        except Exception as defect:
            raise Refused(_address(key), f"it could not be computed ({defect!r})") from defect
        if block is None:
            self._cells[key] = _shown(top_left(value))
            return
        grid = value if type(value) is list else [[value]]
        sheet, left, top, right, bottom = block
        for row in range(top, bottom + 1):
            for column in range(left, right + 1):
                down = 0 if len(grid) == 1 else row - top
                across = 0 if len(grid[0]) == 1 else column - left
                inside = down < len(grid) and across < len(grid[0])
                filled = grid[down][across] if inside else ErrorKind.NA
                self._cells[sheet, row, column] = _shown(filled)


def _shown(value: CellValue) -> CellValue:
    """What a formula leaves in its cell: a reference to an empty cell is 0."""
    return PassedOn() if value is None else value


def _keys(area: Area) -> Iterable[Key]:
    sheet, left, top, right, bottom = area
    for row in range(top, bottom + 1):
        for column in range(left, right + 1):
            yield (sheet, row, column)


def _address(key: Key) -> str:
    sheet, row, column = key
    return f"{sheet}!{get_column_letter(column)}{row}"


def _error(text: str) -> ErrorKind:
    try:
        return ErrorKind.from_text(text)
    except ValueError:
        return ErrorKind.VALUE


def _constant(value: Any, epoch: datetime.datetime | None) -> CellValue:
    if isinstance(value, (bool, ErrorKind)) or value is None:
        return value
    if isinstance(value, (int, float)):
        try:
            number = float(value)
        except OverflowError:
            return ErrorKind.NUM
        return number if math.isfinite(number) else ErrorKind.NUM
    if isinstance(value, (datetime.date, datetime.time, datetime.timedelta)):
        serial: float = to_excel(value, epoch or CALENDAR_WINDOWS_1900)  # type: ignore[no-untyped-call]
        return float(serial)
    return str(value)
