"""The printed calc sheet: pages, headings, and no text cut, on A4 and on Letter."""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pypdfium2
import pytest
from openpyxl import Workbook
from PIL import ImageFont

from tausheet import templates
from tausheet.addin import calc, embedded
from tausheet.templates import style

A4 = (595, 842)
LETTER = (612, 792)
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


def printed(office: calc.Calc, workbook: Workbook, folder: Path) -> tuple[list[Any], list[str]]:
    """Sizes and texts of the pages that LibreOffice prints."""
    path = folder / "sheet.xlsx"
    workbook.save(path)
    (out,) = office.pdf([path], folder)
    pages = list(pypdfium2.PdfDocument(out))
    sizes = [(round(page.get_width()), round(page.get_height())) for page in pages]
    return sizes, [plain(page.get_textpage().get_text_range()) for page in pages]


def plain(text: str) -> str:
    """A text without the spaces and breaks that a page puts elsewhere."""
    return re.sub(r"[\s\ufffe\u00ad]+", "", text)


@pytest.mark.parametrize(("paper", "size"), [(9, A4), (1, LETTER)], ids=["A4", "Letter"])
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
        for heading in ("Q4-CAL-001", "Hoistdrive,d.c.link:discharge", "forchecking", "PASS"):
            assert heading in text, number
    for words in ("1Verdict", "3Sign-off", "287.5s,atmost300.0sallowed", "Rebound"):
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
    for cell, text in shown(name):
        assert plain(text) in everything, (cell, text)


@cache
def shown(name: str) -> list[tuple[str, str]]:
    """Every text of the page, computed ones included, by cell."""
    workbook = filled(name)
    values = embedded.Book(workbook).values()["Calc sheet"]
    return [
        (cell.coordinate, text)
        for row in workbook["Calc sheet"].iter_rows()
        for cell in row
        if isinstance(text := values.get(cell.coordinate, cell.value), str) and text.strip()
    ]


@cache
def letters(size: float, bold: bool) -> ImageFont.FreeTypeFont:
    """The font that stands in for Arial, with the same widths."""
    return ImageFont.truetype(f"LiberationSans-{'Bold' if bold else 'Regular'}.ttf", size * 20)


def lines_of(text: str, room: float, size: float, bold: bool) -> int:
    """Lines that a text takes at a width in pixels, measured with the real font."""
    font = letters(size, bold)
    lines, line = 1, ""
    for word in text.split():
        longer = f"{line} {word}".strip()
        if font.getlength(longer) / 20 * 96 / 72 > room and line:
            lines, line = lines + 1, word
        else:
            line = longer
        if font.getlength(word) / 20 * 96 / 72 > room:
            return 99
    return lines


@pytest.mark.parametrize("name", FILLINGS)
def test_no_text_is_cut(name: str) -> None:
    """Every text fits into its cell, measured with the font that prints it."""
    sheet = filled(name)["Calc sheet"]
    spans = {str(area).split(":")[0]: area for area in sheet.merged_cells.ranges}
    for coordinate, text in shown(name):
        cell = sheet[coordinate]
        first, last = cell.column, cell.column
        if coordinate in spans:
            last = spans[coordinate].max_col
        widths = list(style.COLUMNS.values())[first - 1 : last]
        room = sum(widths) - 4 - 9 * (cell.alignment.indent or 0)
        lines = lines_of(text, room, cell.font.sz, bool(cell.font.b))
        if not cell.alignment.wrap_text:
            assert lines == 1, (coordinate, text)
        height = sheet.row_dimensions[cell.row].height
        assert lines * cell.font.sz * 1.17 <= height + 0.5, (coordinate, text)
