"""The same call gives the same result in Python, embedded and in LibreOffice.

One workbook holds every call of parity_cases.py. Kinds of error must agree exactly, texts and
shapes too, numbers to 4 units in the last place of the largest of the result and the arguments
(cell-functions.md, determinism). What LibreOffice is known to do otherwise is never a number.
"""

from __future__ import annotations

import itertools
import math
from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet
from parity_cases import Case, Omitted, cases

from tausheet.addin import cells, embedded
from tausheet.addin.calc import Calc
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind

Grid = list[list[cells.CellValue]]


@dataclass
class Placed:
    """A case, what Python gives for it, and the cells in which the hosts give theirs."""

    case: Case
    expected: Grid
    addresses: list[list[str]]

    @property
    def exempt(self) -> bool:
        """Whether LibreOffice is known to give an error instead (cell-functions.md)."""
        texts = CATALOGUE[self.case.function].texts
        return self.case.error_in_range or (texts and self.expected != [self.expected[0][:1]])


def python_result(case: Case) -> Grid:
    arguments = [None if isinstance(a, Omitted) else a for a in case.arguments]
    result = cells.plain_grid(cells.call(case.function, arguments))
    return result if isinstance(result, list) else [[result]]


def place(sheet: Worksheet, row: int, case: Case) -> Placed:
    """Write a case into the rows from `row` on."""
    column = 1
    written = []
    for argument in case.arguments:
        if isinstance(argument, Omitted):
            written.append("")
        elif case.inline and not isinstance(argument, list):
            written.append(literal(argument))
        else:
            rows = argument if isinstance(argument, list) else [[argument]]
            reference = fill(sheet, row, column, rows)
            one_by_address = not isinstance(argument, list)
            written.append(reference.partition(":")[0] if one_by_address else reference)
            column += max(map(len, rows))
    formula = f"={case.function}({','.join(written)})"
    expected = python_result(case)
    addresses = [
        [f"{get_column_letter(column + 1 + j)}{row + i}" for j in range(len(line))]
        for i, line in enumerate(expected)
    ]
    first, last = addresses[0][0], addresses[-1][-1]
    sheet[first] = formula if first == last else ArrayFormula(f"{first}:{last}", formula)
    return Placed(case, expected, addresses)


def fill(sheet: Worksheet, row: int, column: int, rows: list[list[Any]]) -> str:
    for i, line in enumerate(rows):
        for j, value in enumerate(line):
            held: Any = f"={value.text}" if isinstance(value, ErrorKind) else value
            sheet.cell(row + i, column + j, '=""' if held == "" else held)
    last = f"{get_column_letter(column + max(map(len, rows)) - 1)}{row + len(rows) - 1}"
    return f"{get_column_letter(column)}{row}:{last}"


def literal(value: Any) -> str:
    if isinstance(value, bool):
        return str(value).upper()
    return f'"{value}"' if isinstance(value, str) else repr(value)


def write_calls(path: Path, chosen: list[Case]) -> list[Placed]:
    """A workbook that holds the calls, a sheet a function."""
    book = Workbook()
    book.remove(book.worksheets[0])
    placed = []
    rows = Counter[str]()
    for case in chosen:
        name = case.function
        sheet = book[name] if name in book.sheetnames else book.create_sheet(name)
        placed.append(place(sheet, rows[name] + 1, case))
        heights = [len(a) for a in case.arguments if isinstance(a, list)]
        rows[name] += max(1, len(placed[-1].expected), *heights) + 1
    book.save(path)
    return placed


@pytest.fixture(scope="module")
def workbook(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[Placed]]:
    path = tmp_path_factory.mktemp("parity") / "calls.xlsx"
    return path, write_calls(path, cases())


def agree(found: cells.CellValue, expected: cells.CellValue, case: Case) -> bool:
    if isinstance(expected, float) and isinstance(found, float):
        largest = max([abs(expected), *(abs(a) for a in case.arguments if isinstance(a, float))])
        return abs(found - expected) <= 4 * math.ulp(largest)
    return type(found) is type(expected) and found == expected


def differences(values: dict[str, dict[str, cells.CellValue]], placed: list[Placed]) -> list[str]:
    wrong = []
    for one in placed:
        sheet = values[one.case.function]
        found = [[sheet[address] for address in line] for line in one.addresses]
        same = [
            agree(a, b, one.case)
            for line, expected in zip(found, one.expected, strict=True)
            for a, b in zip(line, expected, strict=True)
        ]
        if not all(same):
            wrong.append(f"{one.case}: {found} instead of {one.expected}")
    return wrong


def test_every_cell_function_is_called_well_and_badly(
    workbook: tuple[Path, list[Placed]],
) -> None:
    values, errors = Counter[str](), Counter[str]()
    for one in workbook[1]:
        for value in itertools.chain.from_iterable(one.expected):
            (errors if isinstance(value, ErrorKind) else values)[one.case.function] += 1
    needed = [name for name, entry in CATALOGUE.items() if entry.parameters]
    assert [n for n in needed if values[n] < 6] == [], "say in GLOSSARY what makes sense there"
    assert [n for n in needed if errors[n] < 10] == []


def test_embedded_agrees_with_python(workbook: tuple[Path, list[Placed]]) -> None:
    path, placed = workbook
    assert differences(embedded.compute(path), placed) == []


def test_libreoffice_agrees_with_python(workbook: tuple[Path, list[Placed]]) -> None:
    path, placed = workbook
    with Calc() as calc:
        values = calc.compute(path)
    assert differences(values, [one for one in placed if not one.exempt]) == []
    for one in placed:
        if one.exempt:
            sheet = values[one.case.function]
            found = [sheet[address] for line in one.addresses for address in line]
            assert all(isinstance(value, ErrorKind) for value in found), one.case


def test_what_libreoffice_cannot_tell(tmp_path: Path) -> None:
    """A single empty cell by its address counts as 0; of several error values it picks one."""
    book = Workbook()
    sheet = book.worksheets[0]
    sheet["A1"], sheet["A2"] = "=NA()", "=1/0"
    formulas = ["FO_STEP(1,Z9,0,5)", "FO_STEP(1,Z9:Z9,0,5)", "FO_STEP(A1,A2,0,5)"]
    for row, formula in enumerate(formulas, start=1):
        sheet.cell(row, 2, f"={formula}")
    book.save(tmp_path / "blank.xlsx")
    with Calc() as calc:
        found = calc.compute(tmp_path / "blank.xlsx")["Sheet"]
    assert found["B1"] is ErrorKind.NUM
    assert found["B2"] is ErrorKind.VALUE
    assert found["B3"] in (ErrorKind.NA, ErrorKind.DIV0)
