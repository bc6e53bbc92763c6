"""The workbook beside the one that tausheet writes for the same calc sheet, cell by cell."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula

from tausheet import templates
from tausheet.addin.review.finding import Finding
from tausheet.addin.review.same_formula import difference, pieces, same
from tausheet.addin.review.workbook_file import WorkbookFile, formula_of, shown
from tausheet.functions.units import canonical
from tausheet.templates.book import MAIN
from tausheet.templates.model import Sheet

_TYPED = re.compile(r"(values?|lowest|highest)_of_", re.IGNORECASE)
_NUMBER = re.compile(r"\s*[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?\s*%?\s*")
_ALIKE = 0.5
"""Share of the input names from which a workbook is taken for a calc sheet of ours."""


def identify(file: WorkbookFile) -> Sheet | None:
    """Which calc sheet a workbook is, by the names of its input cells; None when it is none."""

    def typed(names: Any) -> set[str]:
        return {name for name in names if name.startswith(("value_of_", "values_of_"))}

    present = typed(file.workbook.defined_names)
    best, share = None, 0.0
    for sheet in templates.SHEETS.values():
        own = {f"value_of_{entry.symbol}" for entry in sheet.entries()}
        tables = tuple(f"{kind}_of_{t.symbol}_" for t in sheet.filled_in for kind in _KINDS)
        entries = {name for name in present if not (tables and name.startswith(tables))}
        alike = len(own & entries) / max(1, len(own | entries))
        if alike > share:
            best, share = sheet, alike
    return best if share >= _ALIKE else None


_KINDS = ("value", "values")


def made_by_tausheet(file: WorkbookFile) -> bool:
    """Whether a workbook looks like a calc sheet of ours, whichever it is."""
    return "made_with" in file.workbook.defined_names or MAIN in file.workbook.sheetnames


def own_workbook(file: WorkbookFile, sheet: Sheet) -> Any:
    """The workbook that tausheet writes for this sheet, laid out as the file is.

    How long the sources were when the sheet was made decides where its pages break, and so the
    rows: of the layouts that can have been, the one whose names lie most as in the file.
    """
    sources = {f"{entry.symbol}_source": _source(file, entry.symbol) for entry in sheet.entries()}
    sources |= {f"{table.symbol}.source": _source(file, table.symbol) for table in sheet.filled_in}
    best, most = None, -1
    for given, demo in ((sources, False), ({}, True), ({}, False)):
        built = templates.build(sheet.name, given, demo=demo)
        names = file.workbook.defined_names
        alike = sum(
            name in names and _plain(names[name].attr_text) == _plain(own.attr_text)
            for name, own in built.defined_names.items()
        )
        if alike > most:
            best, most = built, alike
        if alike == len(built.defined_names):
            break
    return best


def _source(file: WorkbookFile, symbol: str) -> str:
    places = file.cells_named(f"source_of_{symbol}")
    value = file.workbook[places[0][0]][places[0][1]].value if places else None
    return "" if value is None else re.sub(r"[\x00-\x1f]", " ", str(value))[:200]


def _plain(reference: str) -> str:
    return reference.replace("'", "").replace("$", "").casefold()


class Comparison:
    """The file beside the sheet's own workbook."""

    def __init__(self, file: WorkbookFile, own: Any) -> None:
        self.file, self.own = file, own
        self.moved: set[str] = set()
        """Worksheets in which rows are missing or added: nothing more is compared there."""
        self.inputs = {
            (title, cell.coordinate)
            for name in own.defined_names
            if _TYPED.match(name) or name.startswith("unit_of_")
            for title, cell in _cells(own, name)
        }
        self.numbers = {
            (title, cell.coordinate)
            for name in own.defined_names
            if _TYPED.match(name)
            for title, cell in _cells(own, name)
            if cell.number_format != "@"
        }

        self.sealed = {
            (title, cell.coordinate)
            for name in ("fingerprint", "last_verified", "sealed_results")
            for title, cell in _cells(own, name)
        }
        """What sealing fills; the fingerprint itself covers it."""

    def findings(self) -> Iterator[Finding]:
        """Names, worksheets and the contents of cells that differ."""
        yield from self._names()
        yield from self._worksheets()
        for sheet in self.own.worksheets:
            if sheet.title in self.file.workbook.sheetnames:
                moved = self._rows(sheet)
                if moved is not None:
                    self.moved.add(sheet.title)
                    yield moved
                else:
                    yield from self._contents(sheet)

    def places(self, sheet: Any) -> list[tuple[int, int]]:
        """Row and column of every cell that one of the two workbooks has on a worksheet."""
        return sorted({*sheet._cells, *self.file.workbook[sheet.title]._cells})

    def _names(self) -> Iterator[Finding]:
        here, own = self.file.workbook.defined_names, self.own.defined_names
        for name, defined in own.items():
            if name not in here:
                yield Finding("missing name", name, "(not defined)", defined.attr_text)
            elif _plain(here[name].attr_text) != _plain(defined.attr_text):
                yield Finding("changed name", name, here[name].attr_text, defined.attr_text)
        known = {name.casefold() for name in own}
        for name, defined in here.items():
            if name not in own and not name.startswith("_xlnm."):
                again = " (shadows a name of the sheet)" if name.casefold() in known else ""
                yield Finding("added name", name, defined.attr_text + again, "(no such name)")
        for sheet in self.file.workbook.worksheets:
            for name, defined in sheet.defined_names.items():
                if not name.startswith("_xlnm."):
                    where = f"{sheet.title}!{name}"
                    yield Finding("added name", where, defined.attr_text, "(no name of its own)")

    def _worksheets(self) -> Iterator[Finding]:
        here, own = self.file.workbook.sheetnames, self.own.sheetnames
        for title in own:
            if title not in here:
                yield Finding("missing worksheet", title, "(not there)", title)
        for title in here:
            if title not in own:
                yield Finding("added worksheet", title, title, "(no such worksheet)")

    def _rows(self, own: Any) -> Finding | None:
        """Rows deleted or added, told by what stands above and below them."""
        here = self.file.workbook[own.title]
        mine, theirs = self._signatures(own), self._signatures(here)
        if len(mine) == len(theirs) or not mine:
            return None
        top = _alike(mine, theirs)
        bottom = min(_alike(mine[::-1], theirs[::-1]), len(mine) - top, len(theirs) - top)
        gone, new = len(mine) - top - bottom, len(theirs) - top - bottom
        if bottom < 2 and len(mine) > 4:
            return None  # nothing below agrees: no row has moved, cells differ
        cell = f"{own.title}!A{top + 1}"
        row = mine[top] if gone > new else theirs[top]
        text = next((value for _, value in row if value != "="), "a row of formulas")
        if gone > new:
            return Finding("row deleted", cell, f"{len(theirs)} rows", f"{len(mine)}: {text}")
        return Finding("row added", cell, f"{len(theirs)} rows: {text}", f"{len(mine)} rows")

    def _signatures(self, sheet: Any) -> list[tuple[tuple[int, str], ...]]:
        """For each row what stands in it, without what may be typed."""
        rows: dict[int, list[tuple[int, str]]] = {}
        own = self.own[sheet.title]
        for (row, column), cell in sorted(sheet._cells.items()):
            kept = own._cells.get((row, column))
            free = cell.value is None or not cell.protection.locked
            if free or (sheet is not own and kept is not None and not kept.protection.locked):
                continue
            rows.setdefault(row, []).append((column, "=" if formula_of(cell) else str(cell.value)))
        last = max(rows, default=0)
        return [tuple(rows.get(row, ())) for row in range(1, last + 1)]

    def _contents(self, own: Any) -> Iterator[Finding]:
        here = self.file.workbook[own.title]
        for row, column in self.places(own):
            mine, theirs = own._cells.get((row, column)), here._cells.get((row, column))
            if mine is not None and (own.title, mine.coordinate) in self.sealed:
                continue
            found = self._cell(f"{own.title}!{get_column_letter(column)}{row}", mine, theirs)
            if found is not None:
                yield found

    def _cell(self, where: str, mine: Any, theirs: Any) -> Finding | None:
        formula = formula_of(theirs) if theirs is not None else ""
        wanted = formula_of(mine) if mine is not None else ""
        value = theirs.value if theirs is not None else None
        if mine is not None and not mine.protection.locked:
            return self._typed(where, mine, value, formula)
        if wanted:
            if not formula:
                kind = "formula emptied" if value is None else "formula replaced by a value"
                return Finding(kind, where, shown(value), shown(wanted))
            if not same(formula, wanted):
                return Finding(difference(formula, wanted), where, *_apart(formula, wanted))
            if _block(theirs) != _block(mine):
                return Finding("changed formula", where, _block(theirs), _block(mine))
            return None
        expected = mine.value if mine is not None else None
        if formula:
            kind = "formula in place of a label" if expected is not None else "added formula"
            return Finding(kind, where, shown(formula), shown(expected))
        if _equal(value, expected):
            return None
        if expected is None:
            return Finding("added content", where, shown(value), "(blank)")
        if value is None:
            return Finding("emptied cell", where, "(blank)", shown(expected))
        return Finding(_constant_change(value, expected), where, shown(value), shown(expected))

    def _typed(self, where: str, mine: Any, value: Any, formula: str) -> Finding | None:
        place = (mine.parent.title, mine.coordinate)
        if formula and place in self.inputs:
            return Finding("formula in an input cell", where, shown(formula), "a value as typed")
        if place in self.numbers and isinstance(value, str) and _NUMBER.fullmatch(value):
            return Finding("number turned to text", where, f'the text "{value}"', "a number")
        return None


def _cells(workbook: Any, name: str) -> Iterator[tuple[str, Any]]:
    for title, reference in workbook.defined_names[name].destinations:
        area = workbook[title][reference.replace("$", "")]
        for row in area if isinstance(area, tuple) else ((area,),):
            for cell in row if isinstance(row, tuple) else (row,):
                yield title, cell


def _alike(one: list[Any], other: list[Any]) -> int:
    count = 0
    for a, b in zip(one, other, strict=False):
        if a != b:
            break
        count += 1
    return count


def _block(cell: Any) -> str:
    if not isinstance(cell.value, ArrayFormula):
        return ""
    first, _, last = cell.value.ref.partition(":")
    return f"entered over {first}:{last or first}"


def _equal(value: Any, expected: Any) -> bool:
    if value in (None, "") and expected in (None, ""):
        return True
    if isinstance(value, (int, float)) and isinstance(expected, (int, float)):
        return abs(value - expected) <= 1e-14 * abs(expected)
    if isinstance(value, str) and isinstance(expected, str):
        return value.replace("\r\n", "\n") == expected
    return bool(value == expected)


def _constant_change(value: Any, expected: Any) -> str:
    if isinstance(expected, (int, float)):
        if isinstance(value, str):
            return "number turned to text" if _NUMBER.fullmatch(value) else "changed label"
        return "changed number"
    return "changed unit" if canonical(str(expected)) else "changed label"


def _apart(found: str, expected: str) -> tuple[str, str]:
    """Two formulas shortened to where they begin to differ."""
    if max(len(found), len(expected)) <= 90:
        return found, expected
    start = _alike(list(pieces(found)), list(pieces(expected)))
    at = len("".join(value for _, value in pieces(expected)[: max(0, start - 4)]))
    return tuple(  # type: ignore[return-value]
        ("..." if at else "") + shown("".join(v for _, v in pieces(text))[at:])
        for text in (found, expected)
    )
