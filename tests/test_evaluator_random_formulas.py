"""Random formulas: the evaluator gives what LibreOffice gives, or refuses; nothing else."""

from __future__ import annotations

import math
import random
from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.workbook.defined_name import DefinedName

from tausheet.addin import calc, embedded
from tausheet.functions.errors import ErrorKind

CELLS: dict[str, object] = {
    "Z1": None, "Z2": "abc", "Z3": "12", "Z4": True, "Z5": "=NA()", "Z6": 1.5, "Z7": -2,
    "Z8": '=""',
    "Z9": 0, "Z10": "=Z1", "Z11": "=1/3", "Z12": "PASS", "Z13": "FAIL", "Z14": "=1/0", "Z15": 60,
    "Z16": "4.7 mF", "Z17": 1, "Z18": 2, "Z19": 3, "Z20": "=IF(TRUE,Z1,0)", "Z21": False,
    "Z22": 2.5,
    "Z23": "Pass", "Z24": "50%", "Z25": 1e-9, "Z26": 0.1, "Z27": 0.3, "Z28": "=0.1+0.2",
    "Z29": 47000,
    "Y1": 1, "Y2": 2, "Y3": 3, "Y4": "a", "Y5": "b", "Y6": "C", "Y7": None, "Y8": None,
}  # fmt: skip
AREAS = [
    "Z1:Z4", "Z5:Z7", "Z6:Z9", "Z1:Z1", "Z6:Z6", "Z2:Z3", "Z9:Z13", "Z12:Z13", "Z17:Z19", "Z15:Z18",
    "Y1:Y3", "Y1:Y6", "Y4:Y6", "Y1:Y8", "Y7:Y8", "Y1:Z3", "Z17:Z17", "{1,2,3}", "{1;2;3}",
    "{1,2;3,4}",
    '{"a","b"}', "some_cells", "one_cell",
]  # fmt: skip
PLAIN = ["Z17:Z19", "Y1:Y3", "some_cells", "{1;2;3}"]
NUMBERS = ["Z6", "Z15", "Z17", "Z22", "Z25", "2", "0.5"]
"""What our functions are called with: their errors are compared in the parity of hosts, and
LibreOffice passes over an error of an add-in inside MAX, MIN and COUNT."""
CONSTANTS = [
    "0", "1", "2", "3", "-1", "0.5", "1.5", "60", "1E6", "2.5E-3", "TRUE", "FALSE", '"PASS"',
    '"fail"', '""',
    '"abc"', '"12"', '"x"', "#N/A", "1E300", "0.1",
]  # fmt: skip
OPERATORS = ["+", "-", "*", "/", "^", "&", "=", "<>", "<", ">", "<=", ">="]
ONE = [
    "ABS", "ATAN", "COS", "EXP", "INT", "LN", "LOG10", "SIGN", "SIN", "SQRT", "LEN", "NOT",
    "ISBLANK",
    "ISERROR",
    "ISNUMBER", "ISTEXT", "ISLOGICAL", "ROUND",
]  # fmt: skip
CRITERIA = ["1", '"PASS"', '">0"', '"<>PASS"', '"=a"']
OVER = ["SUM", "MIN", "MAX", "SUMSQ", "COUNT", "COUNTA", "AND", "OR"]


class Writer:
    """Writes formulas, mostly sensible ones; some are not known to the evaluator."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)

    def formula(self) -> str:
        return "=" + self.single(3)

    def single(self, depth: int) -> str:
        draw, pick = self.random.random, self.random.choice
        if depth == 0 or draw() < 0.12:
            return pick([*CELLS, *CONSTANTS, "one_cell", "blank_cell", "number_name"])
        some = self.single
        kind = self.random.randrange(14)
        if kind < 3:
            return f"({some(depth - 1)}{pick(OPERATORS)}{some(depth - 1)})"
        if kind == 3:
            return pick([f"-{some(depth - 1)}", f"{some(depth - 1)}%", f"+{some(depth - 1)}"])
        if kind == 4:
            return f"{pick(ONE)}({some(depth - 1)})"
        if kind == 5:
            given = [self.area(depth - 1) if draw() < 0.6 else some(depth - 1) for _ in range(2)]
            return f"{pick(OVER)}({','.join(given[: self.random.randint(1, 2)])})"
        if kind == 6:
            return f"IF({some(depth - 1)},{some(depth - 1)},{some(depth - 1)})"
        if kind == 7:
            return f"IFERROR({some(depth - 1)},{some(depth - 1)})"
        if kind == 8:
            return f"CHOOSE({pick(['1', '2', some(0)])},{some(depth - 1)},{some(depth - 1)})"
        if kind == 9:
            return f"INDEX({self.area(0)},{pick(['1', '2', '3', some(0)])}{pick(['', ',1', ',2'])})"
        if kind == 10:
            return f"MATCH({some(depth - 1)},{self.area(0)},{pick(['0', '0', '1'])})"
        if kind == 11:
            return pick([
                f"COUNTIF({pick(AREAS[:16])},{pick([*CRITERIA, some(0)])})",
                f"{pick(['LARGE', 'SMALL'])}({self.area(0)},{pick(['1', '2', '9', some(0)])})",
                f"MOD({some(0)},{some(0)})", f"ROUND({some(0)},{pick(['0', '2', '-1', some(0)])})",
                f"EXACT({some(depth - 1)},{some(depth - 1)})", f"COUNTBLANK({pick(AREAS[:16])})",
                f"FO_TAU_RC({pick(NUMBERS)},{pick(NUMBERS)})", "PI()",
            ])  # fmt: skip
        if kind == 12:
            return f"SUMPRODUCT({self.area(depth - 1)})"
        return f"SUMPRODUCT({pick(['--', '1*', ''])}({self.area(0)}{pick(OPERATORS)}{some(0)}))"

    def area(self, depth: int) -> str:
        """Something with several elements; spread element by element inside SUMPRODUCT only."""
        pick = self.random.choice
        if depth <= 0 or self.random.random() < 0.6:
            return pick(AREAS)
        one, two = self.area(depth - 1), pick([self.area(depth - 1), self.single(0)])
        return pick([
            f"({one}{pick(OPERATORS)}{two})", f"{pick(ONE)}({one})",
            f"IF({one},{two},{self.single(0)})",
            f"IFERROR({one},{two})", f"EXACT({one},{two})", f"-{one}",
            f"FO_TAU_RC({pick(NUMBERS)},{pick(PLAIN)})",
        ])  # fmt: skip


def workbook(lines: list[str]) -> Workbook:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "S"
    for address, value in CELLS.items():
        sheet[address] = value
    for row, line in enumerate(lines, start=1):
        sheet.cell(row, 1, line)
    for name, content in (
        ("one_cell", "S!$Z$6:$Z$6"),
        ("blank_cell", "S!$Z$1:$Z$1"),
        ("some_cells", "S!$Z$17:$Z$19"),
        ("number_name", "0.25"),
    ):
        book.defined_names[name] = DefinedName(name, attr_text=content)
    return book


def differ(ours: object, theirs: object) -> bool:
    """Which error comes out where several meet in a formula is not compared here."""
    if isinstance(ours, ErrorKind) and isinstance(theirs, ErrorKind):
        return False
    if isinstance(ours, (float, bool)) and isinstance(theirs, (float, bool)):
        return not math.isclose(ours, theirs, rel_tol=1e-14, abs_tol=1e-300)
    return type(ours) is not type(theirs) or ours != theirs


def computed_or_refused(line: str) -> bool:
    """Whether the evaluator computes a formula; anything that it raises but Refused comes out."""
    try:
        embedded.Book(workbook([line])).values()
    except embedded.Refused as refused:
        if "could not be computed" in str(refused):
            raise
        return False
    return True


def beyond_libreoffice(line: str) -> bool:
    """LibreOffice has no result (Err:509) for IF with our function in it and a choice inside."""
    return "FO_" in line and any(choice in line for choice in ("IF(", "IFERROR(", "CHOOSE("))


def compare(seed: int, count: int, path: Path) -> None:
    writer = Writer(seed)
    asked = [writer.formula() for _ in range(count)]
    lines = [line for line in asked if computed_or_refused(line) and not beyond_libreoffice(line)]
    assert len(lines) > count / 3
    workbook(lines).save(path)
    ours, theirs = embedded.compute(path)["S"], calc.compute(path)["S"]
    wrong = [
        f"{line}: embedded {ours[f'A{row}']!r}, LibreOffice {theirs[f'A{row}']!r}"
        for row, line in enumerate(lines, start=1)
        if differ(ours[f"A{row}"], theirs[f"A{row}"])
    ]
    assert not wrong, f"{len(wrong)} of {len(lines)}:\n" + "\n".join(sorted(wrong, key=len)[:40])


def test_random_formulas_agree_with_libreoffice_or_are_refused(tmp_path: Path) -> None:
    compare(1, 1500, tmp_path / "random.xlsx")


@pytest.mark.campaign
@pytest.mark.parametrize("seed", range(2, 12))
def test_many_random_formulas_agree_with_libreoffice(seed: int, tmp_path: Path) -> None:
    compare(seed, 3000, tmp_path / "random.xlsx")


def test_any_text_as_a_formula_is_computed_or_refused() -> None:
    draw = random.Random(3)
    pieces = ["(", ")", ",", ";", "{", "}", '"', "'", "!", ":", "$", "%", "+", "-", "^", "&", "<",
    ">", "=",
              "A1", "Z6", "S", "1", "1E", "E+3", ".", " ", "SUM(", "IF(", "FO_STEP(", "#N/A", "#",
              "@", "[",
              "]", "TRUE", "x", "\n", "µ", "SUMPRODUCT("]  # fmt: skip
    computed = 0
    for _ in range(3000):
        line = "=" + "".join(draw.choice(pieces) for _ in range(draw.randint(1, 9)))
        computed += computed_or_refused(line)
    assert 0 < computed < 1000


@pytest.mark.parametrize("wrong", [None, "", "abc", "4.7 mF", "uF", ErrorKind.NUM, ErrorKind.NA])
def test_an_input_that_is_no_number_never_gives_one(wrong: float | str | ErrorKind | None) -> None:
    lines = [
        "=FO_STEP(t_in,2,0,5)",
        "=FO_TAU_RC(Z6,t_in)",
        '=IF(A1>=0,"PASS","FAIL")',
        "=ROUND(A2,3)",
    ]
    made = workbook(lines)
    made.defined_names["t_in"] = DefinedName("t_in", attr_text="S!$Y$1:$Y$1")
    book = embedded.Book(made)
    assert book.values()["S"]["A3"] == "PASS"
    book.set("S", "Y1", wrong)
    values = book.values()["S"]
    assert all(isinstance(values[f"A{row}"], ErrorKind) for row in range(1, 5)), values
