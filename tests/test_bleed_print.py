"""The printed calc sheet: pages, headings, and no text cut, on A4 and on Letter."""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook
from printed import PAPERS, assert_no_text_is_cut, plain, printed, shown

from tausheet import templates
from tausheet.addin import calc, embedded

PAGES = 8

FILLINGS: dict[str, tuple[dict[str, Any], bool]] = {
    "demo": ({}, True),
    "blank": ({}, False),
    "at fault": ({"C_unit": 1e300, "V_start": "59 V", "n_s": 1.5, "T_zero": "50 degC"}, True),
    "extremes": (
        {"R_unit": 1e9, "C_unit": 10, "V_start": "49 kV", "V_start_hi": "50 kV", "n_rp": 1000,
         "n_rs": 1000, "n_open": 0, "P_rated": 1e5, "limit": "75 V in 10 min (IEC 60871-1)"},
        True,
    ),
    "tiny": (
        {"R_unit": 0.1, "C_unit": "1 nF", "I_leak": 1e-9, "I_leak_lo": 1e-10, "I_leak_hi": 2e-9},
        True,
    ),
    "every warning": ({"n_open": 0, "n_rp": 1, "tapped": "no", "C_unit_source": None}, True),
}  # fmt: skip


@pytest.fixture(scope="module")
def office() -> Iterator[calc.Calc]:
    with calc.Calc() as running:
        yield running


@cache
def filled(name: str) -> Workbook:
    given, demo = FILLINGS[name]
    return templates.build("bleed", given, demo=demo)


@pytest.mark.parametrize(("paper", "size"), PAPERS.values(), ids=PAPERS)
def test_pages(office: calc.Calc, tmp_path: Path, paper: int, size: tuple[int, int]) -> None:
    workbook = templates.build("bleed", demo=True)
    sheet = workbook["Calc sheet"]
    assert sheet.page_setup.paperSize == 9
    sheet.page_setup.paperSize = paper
    sizes, texts = printed(office, workbook, tmp_path)
    assert sizes == [size] * PAGES
    assert len(sheet.row_breaks.brk) == PAGES - 1  # no page but those that were laid out
    for number, text in enumerate(texts, start=1):
        assert text.count(f"page{number}of{PAGES}") == 2  # at the top and at the bottom
        for heading in ("Q4CAL001", "Hoistdrive,d.c.link:discharge", "forchecking", "PASS"):
            assert heading in text, number
    for words in ("1Verdict", "3Signoff", "287.5s,atmost300.0sallowed", "Rebound"):
        assert words in texts[0]
    for part in ("4Inputs", "5Calculation", "6Worstcase", "7Checks", "8Curve", "11Record"):
        assert sum(part in text for text in texts) == 1
    assert "timeafterswitchingins" in "".join(texts)


@pytest.mark.parametrize("name", FILLINGS)
def test_every_text_is_on_the_page(office: calc.Calc, tmp_path: Path, name: str) -> None:
    sizes, texts = printed(office, filled(name), tmp_path)
    assert len(sizes) <= PAGES + 1
    everything = "".join(texts)
    assert "###" not in everything
    for cell, text in on_page(name):
        assert plain(text) in everything, (cell, text)


@cache
def on_page(name: str) -> list[tuple[str, str]]:
    workbook = filled(name)
    return shown(workbook, embedded.Book(workbook).values())


@pytest.mark.parametrize("name", FILLINGS)
def test_no_text_is_cut(name: str) -> None:
    assert_no_text_is_cut(filled(name), on_page(name))
