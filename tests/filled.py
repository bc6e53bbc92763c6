"""A calc sheet in an engine, for tests: cells set and read by their defined names."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

from openpyxl import Workbook, load_workbook

from tausheet.addin import embedded
from tausheet.functions.errors import ErrorKind
from tausheet.functions.units import si
from tausheet.templates import writer
from tausheet.templates.book import CORNERS, CURVE
from tausheet.templates.formulas import LONG
from tausheet.templates.model import (
    COUNT,
    Choice,
    Entry,
    EntryTable,
    Sheet,
    TextColumn,
    Tolerance,
    WordColumn,
)

TYPED = re.compile(r"(values?|unit|lowest|highest|source)_of_")


class Filled:
    """A sheet in an engine, as its file has it but for the cells that `put` changes.

    filled.put(value_of_C_unit=3300, unit_of_C_unit="µF")["t_safe"] is a result in base SI.
    """

    def __init__(self, sheet: Sheet, made: Path | Workbook, book: Any = None) -> None:
        workbook = load_workbook(made) if isinstance(made, Path) else made
        self.sheet = sheet
        self.places: dict[str, tuple[str, str]] = {}
        for name, defined in workbook.defined_names.items():
            title, cells = next(iter(defined.destinations))
            self.places[name] = (title, cells.replace("$", "").split(":")[0])
        self.book = book if book is not None else embedded.Book(workbook)
        self.changed: dict[str, Any] = {}
        self.typed = {
            name: workbook[place[0]][place[1]].value
            for name, place in self.places.items()
            if TYPED.match(name)
        }
        self.values: dict[str, dict[str, Any]] = {}

    @classmethod
    def demo(cls, sheet: Sheet, folder: Path) -> Filled:
        """The demo in the embedded engine, with few draws and points: for hundreds of sets."""
        path = folder / f"{sheet.name}.xlsx"
        writer.build(short(sheet), demo=True).save(path)
        return cls(sheet, path)

    def put(self, **cells: Any) -> Filled:
        """Compute with these cells changed and every other as the file has it."""
        changed = {name: self.typed[name] for name in self.changed.keys() - cells.keys()} | cells
        if isinstance(self.book, embedded.Book):
            for name, value in changed.items():
                self.book.set(*self.places[name], value)
        else:
            by_title: dict[str, dict[str, Any]] = {}
            for name, value in changed.items():
                title, cell = self.places[name]
                by_title.setdefault(title, {})[cell] = value
            self.book.set(by_title)
        self.changed = dict(cells)
        self.values = self.book.values()
        return self

    def __getitem__(self, name: str) -> Any:
        title, cell = self.places[name]
        return self.values[title][cell]

    def keys(self) -> tuple[str, ...]:
        """The keys of the checks, that of the two ways among them."""
        return (*(check.key for check in self.sheet.checks), "agreement")

    def checks(self) -> dict[str, Any]:
        """What each check says."""
        return {key: self[f"check_{key}"] for key in self.keys()}

    def warnings(self) -> set[str]:
        """The names of the warnings that apply: "hot_surface"."""
        return {
            name.removeprefix("warning_")
            for name in self.places
            if name.startswith("warning_") and self[name] == "WARNING"
        } - {"results"}

    def state(self, symbol: str) -> Any:
        """The word beside an input: ok, not used, AT FAULT."""
        title, cell = self.places[f"value_of_{symbol}"]
        return self.values[title][f"H{cell[1:]}"]

    def at_fault(self, entry: Entry | EntryTable) -> bool:
        """Whether an input or a table is at fault."""
        if isinstance(entry, EntryTable):
            return "rows filled in" not in self[f"remark_on_{entry.symbol}"]
        return bool(self.state(entry.symbol) == "AT FAULT")

    def inputs_are_valid(self) -> bool:
        """Whether every input can be used."""
        asked = len(list(self.sheet.entries())) + len(self.sheet.filled_in)
        return bool(self["inputs_valid"] == asked)


def short(sheet: Sheet) -> Sheet:
    """The sheet with fewer draws, points and rows, to be computed some hundred times."""
    tables = [
        replace(table, rows=max(len(table.demo), LONG) + 20) if table.rows > LONG else table
        for table in sheet.filled_in
    ]
    return replace(
        sheet,
        filled_in=tuple(tables),
        worst_cases=tuple(replace(worst, draws=8) for worst in sheet.worst_cases),
        curve=replace(sheet.curve, points=24),
    )


def bad_values(entry: Entry) -> Iterator[tuple[str, dict[str, Any]]]:
    """Everything that can be wrong with the cells of one input."""
    value = f"value_of_{entry.symbol}"
    yield "blank", {value: None}
    yield "text", {value: "abc"}
    yield "empty text", {value: " "}
    yield "not a number", {value: "NaN"}
    yield "error", {value: ErrorKind.NA}
    yield "other error", {value: ErrorKind.DIV0}
    if isinstance(entry, Choice):
        yield "number", {value: 1.0}
        yield "other case", {value: entry.options[0].swapcase()}
        return
    yield "digits as text", {value: "4.7"}
    yield "truth", {value: True}
    if entry.low > 0:
        yield "zero", {value: 0.0}
    if (si(-1e3, entry.units[0]) if entry.units else -1e3) < entry.low:
        yield "negative", {value: -1e3}
    yield "huge", {value: 1e300}
    yield "negative huge", {value: -1e300}
    if entry.quantity == COUNT:
        yield "half", {value: 1.5}
    if entry.units:
        unit = f"unit_of_{entry.symbol}"
        yield "blank unit", {unit: None}
        yield "number as unit", {unit: 7.0}  # 1 is a unit of a ratio
        yield "error as unit", {unit: ErrorKind.VALUE}
        yield "unknown unit", {unit: "furlong"}
        yield "wrong unit", {unit: "A" if entry.quantity == "capacitance" else "µF"}
        yield "wrong case", {unit: entry.units[0].swapcase() + "x"}
    if entry.tolerance is not Tolerance.NONE:
        for end, outward in (("lowest", 1.0), ("highest", -1.0)):
            cell = f"{end}_of_{entry.symbol}"
            yield f"{end} blank", {cell: None}
            yield f"{end} text", {cell: "5 %"}
            yield f"{end} error", {cell: ErrorKind.NUM}
            yield f"{end} on the wrong side", {cell: outward * 1e12}
            yield f"{end} huge", {cell: outward * 1e300}


def bad_cells(table: EntryTable) -> Iterator[tuple[str, dict[str, Any]]]:
    """Everything that can be wrong in the first row of a table, and with its units."""
    for column in table.columns:
        name = f"{table.symbol}_{column.name}"
        value = f"values_of_{name}" if table.rows > LONG else f"value_of_{name}_1"
        yield f"{name} error", {value: ErrorKind.NA}
        if column.needed and (table.least or any(table.demo[:1])):
            yield f"{name} blank", {value: None}
        if isinstance(column, TextColumn):
            yield f"{name} long", {value: "x" * 60}
            continue
        yield f"{name} text", {value: "abc"}
        if isinstance(column, WordColumn):
            yield f"{name} number", {value: 1.0}
            continue
        if column.low > 0:
            yield f"{name} zero", {value: 0.0}
        yield f"{name} huge", {value: 1e300}
        yield f"{name} negative huge", {value: -1e300}
        if column.units:
            unit = f"unit_of_{name}"
            yield f"{name} blank unit", {unit: None}
            yield f"{name} error as unit", {unit: ErrorKind.VALUE}
            yield f"{name} wrong unit", {unit: "A" if column.quantity == "capacitance" else "µF"}


def assert_refused(filled: Filled, entry: Entry | EntryTable, alone: bool = True) -> None:
    """The sheet fails, says so beside this input or table, and computes with no value of it.

    alone: nothing else is at fault, so that the verdict names it.
    """
    symbol = entry.symbol
    assert filled["verdict"] == "FAIL"
    named = filled["decided_by"].removeprefix("An input is missing or at fault: ")
    assert named == symbol or (not alone and named in filled.places)
    assert filled.at_fault(entry)
    remark = filled[f"remark_on_{symbol}"]
    assert len(remark) > len(symbol) + 15
    if isinstance(entry, EntryTable):
        return
    assert remark.startswith(f"{symbol}")
    used = filled.places.get(f"{symbol}_lo"), filled.places[symbol]
    for place in (place for place in used if place):
        assert isinstance(filled.values[place[0]][place[1]], ErrorKind), place


def differences(here: Filled, there: Filled) -> list[tuple[str, str, Any, Any]]:
    """Cells in which two engines differ; numbers may by 1e-12 of their size, errors in kind.

    A point of a curve may by 1e-12 of the curve's largest: near zero a last bit of its time shows.
    A swing of a worst case may by 1e-12 of the results whose difference it is. How far two ways lie
    apart is rounding alone: it only has to stay below 1e-12 on both.
    """
    assert here.values.keys() == there.values.keys()
    rounding = {place for name, place in here.places.items() if name.endswith("_diff")}
    page, cell = here.places["check_agreement"]
    shown = {(page, f"{letter}{cell[1:]}") for letter in "CG"}  # the largest of them, its margin
    agree = here["check_agreement"] == there["check_agreement"] == "PASS"
    found = []
    for title, values in here.values.items():
        largest = _largest(values) if title == CURVE else {}
        for cell, value in values.items():
            other = there.values[title][cell]
            if (title, cell) in rounding and _tiny(value) and _tiny(other):
                continue
            if (title, cell) in shown and agree:
                continue
            if isinstance(value, float) and isinstance(other, float):
                near = 1e-12 * largest.get(cell.rstrip("0123456789"), 0.0)
                if title.startswith(CORNERS) and re.fullmatch("[GHI]([4-9]|1[01])", cell):
                    result = values.get(f"D{cell[1:]}")
                    near = 1e-12 * abs(result) if isinstance(result, float) else 0.0
                # a tail of exp(-100) and less has lost digits to one rounding of its time
                same = math.isclose(value, other, rel_tol=1e-12, abs_tol=max(near, 1e-40))
            else:
                same = value == other or {type(value), type(other)} == {ErrorKind}
            if not same:
                found.append((title, cell, value, other))
    return found


def _tiny(value: Any) -> bool:
    return isinstance(value, float) and value < 1e-12


def _largest(values: dict[str, Any]) -> dict[str, float]:
    """The largest magnitude in each column."""
    found: dict[str, float] = {}
    for cell, value in values.items():
        if isinstance(value, float):
            letters = cell.rstrip("0123456789")
            found[letters] = max(found.get(letters, 0.0), abs(value))
    return found
