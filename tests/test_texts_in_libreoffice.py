"""Texts that our functions return must compare in LibreOffice as any other text does.

LibreOffice 7.4 takes two texts inside add-in arrays for equal, whatever they say (found by trial);
a single text is therefore returned on its own, and an array of texts is an error.
"""

from __future__ import annotations

from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin.calc import compute
from tausheet.functions.errors import ErrorKind

CASES = [
    ('=FO_TEXT(1,"s")="1.00 s"', True),
    ('=FO_TEXT(1,"s")=FO_TEXT(2,"s")', False),
    ('=EXACT(FO_TEXT(1,"s"),FO_TEXT(1,"s"))', True),
    ('=IFERROR(FO_TEXT(1,"s"),"")=IFERROR(FO_TEXT(2,"s"),"")', False),
    ("=C1=C2", False),
    ('=C1="1.00 s"', True),
    ('=IF(FO_REASON("FO_TAU_RC",1,2)="",1,2)', 1.0),
    ('=IF(FO_REASON("FO_TAU_RC",1,-2)="",1,2)', 2.0),
    ('=FO_RKM_TEXT(4700,"ohm")="4K7"', True),
    ('=FO_VERSION()=FO_VERSION()&""', True),
    ('=FO_TEXT(1,"no unit")', ErrorKind.VALUE),
    ('=FO_TEXT(1,"s",16)', ErrorKind.NUM),
    ('=FO_TEXT(NA(),"s")', ErrorKind.NA),
]


@pytest.fixture(scope="module")
def computed(tmp_path_factory: pytest.TempPathFactory) -> dict[str, object]:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "S"
    for row, (formula, _) in enumerate(CASES, start=1):
        sheet.cell(row, 1, formula)
    sheet["C1"], sheet["C2"] = '=FO_TEXT(1,"s")', '=FO_TEXT(2,"s")'
    sheet["B1"], sheet["B2"] = 1, 2
    sheet["D1"] = ArrayFormula("D1:D2", '=FO_TEXT(B1:B2,"s")')
    path: Path = tmp_path_factory.mktemp("texts") / "texts.xlsx"
    book.save(path)
    return dict(compute(path)["S"])


@pytest.mark.parametrize("row", range(1, len(CASES) + 1))
def test_a_text_compares_as_a_text(computed: dict[str, object], row: int) -> None:
    formula, expected = CASES[row - 1]
    assert computed[f"A{row}"] == expected, formula


def test_an_array_of_texts_is_an_error(computed: dict[str, object]) -> None:
    assert computed["D1"] is ErrorKind.VALUE
    assert computed["D2"] is ErrorKind.VALUE
