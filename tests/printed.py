"""What a workbook of ours is on paper, for tests: its pages, its texts, the room they have."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path
from typing import Any

import pypdfium2
from openpyxl import Workbook
from PIL import ImageFont

from tausheet.addin import calc
from tausheet.templates import style

A4 = (595, 842)
LETTER = (612, 792)
PAPERS = {"A4": (9, A4), "Letter": (1, LETTER)}
"""The number that a workbook has for a paper, and its size in points."""


def printed(
    office: calc.Calc, workbook: Workbook, folder: Path
) -> tuple[list[tuple[int, int]], list[str]]:
    """Sizes and texts of the pages that LibreOffice prints."""
    path = folder / "sheet.xlsx"
    workbook.save(path)
    return pages_of(office, path, folder)


def pages_of(
    office: calc.Calc, path: Path, folder: Path
) -> tuple[list[tuple[int, int]], list[str]]:
    """Sizes and texts of the pages that LibreOffice prints of a file."""
    (out,) = office.pdf([path], folder)
    pages = list(pypdfium2.PdfDocument(out))
    sizes = [(round(page.get_width()), round(page.get_height())) for page in pages]
    return sizes, [plain(page.get_textpage().get_text_range()) for page in pages]


def plain(text: str) -> str:
    """A text without the spaces and breaks that a page puts elsewhere, and without hyphens."""
    return re.sub(r"[\s\ufffe\u00ad-]+", "", text)


def shown(workbook: Workbook, values: dict[str, dict[str, Any]]) -> list[tuple[str, str]]:
    """Every text of the page, computed ones included, by cell."""
    sheet = workbook.worksheets[0]
    computed = values[sheet.title]
    return [
        (cell.coordinate, text)
        for row in sheet.iter_rows()
        for cell in row
        if isinstance(text := computed.get(cell.coordinate, cell.value), str) and text.strip()
    ]


@cache
def letters(size: float, bold: bool) -> ImageFont.FreeTypeFont:
    """The font that stands in for Arial, with the same widths."""
    return ImageFont.truetype(f"LiberationSans-{'Bold' if bold else 'Regular'}.ttf", size * 20)


@cache
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


def assert_no_text_is_cut(workbook: Workbook, texts: list[tuple[str, str]]) -> None:
    """Every text fits into its cell, measured with the font that prints it."""
    sheet = workbook.worksheets[0]
    spans = {str(area).split(":")[0]: area for area in sheet.merged_cells.ranges}
    for coordinate, text in texts:
        cell = sheet[coordinate]
        first, last, rows = cell.column, cell.column, 1
        if coordinate in spans:
            last, rows = spans[coordinate].max_col, spans[coordinate].size["rows"]
        widths = list(style.COLUMNS.values())[first - 1 : last]
        room = sum(widths) - 4 - 9 * (cell.alignment.indent or 0)
        lines = lines_of(text, room, cell.font.sz, bool(cell.font.b))
        if cell.alignment.shrink_to_fit:
            wide = lines_of(text, room * 1.6, cell.font.sz, bool(cell.font.b))
            assert wide == 1, (coordinate, text)  # smaller than five eighths cannot be read
            continue
        if not cell.alignment.wrap_text:
            assert lines == 1, (coordinate, text)
        height = sum(sheet.row_dimensions[cell.row + i].height for i in range(rows))
        assert lines * cell.font.sz * 1.17 <= height + 0.5, (coordinate, text)
