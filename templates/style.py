"""The look of every calc sheet: the grid, the fonts, the inks, the number formats.

Drawn for paper first. Everything that matters is told by words, weight and line, so that a
black-and-white print loses nothing; colour only repeats it.
"""

from __future__ import annotations

import math
from functools import cache

from openpyxl.formatting.rule import Rule
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.styles.differential import DifferentialStyle

FONT = "Arial"
"""Present, or replaced by one of the same widths, on every system with a spreadsheet program."""

INK = "1F2D3A"
QUIET = "6B7780"
LINE = "B9C2C8"
DEEP = "2B4A5E"
WASH = "EEF2F4"
ENTRY = "FBF3DD"
GOOD = "14532F"
CALM = "D9ECDF"
BAD = "A3201D"
HEED = "8A5A00"

COLUMNS = {"A": 78, "B": 186, "C": 78, "D": 50, "E": 66, "F": 66, "G": 78, "H": 78}
"""The grid of the page: columns and their widths in pixels of 1/96 inch; 180 mm together."""

TITLE_ROWS = 5
"""Rows of the heading strip, repeated on every printed page."""

PAGE_POINTS = 708.0
"""Height used of a page: what Letter leaves between its margins, with a little in reserve."""

PIXEL_POINTS = 0.75
"""Rows are whole pixels high, since a spreadsheet rounds them to that."""

MARGINS = {"left": 0.45, "right": 0.45, "top": 0.5, "bottom": 0.5, "header": 0.25, "footer": 0.25}

RELATIVE = '[<-99.995]"< -9999 %";[<0]-0.0%;0.0%'
"""A share. Calc drops the sign of a number that falls into a section after a condition."""
TINY = "0.0E+00;-0.0E+00;0"
DIGITS = 4
"""Significant digits of a result in the unit in which it reads well."""


@cache
def font(size: float = 9, bold: bool = False, colour: str = INK) -> Font:
    """A font of the page."""
    return Font(name=FONT, size=size, bold=bold, color=colour)


@cache
def fill(colour: str) -> PatternFill:
    """A plain ground."""
    return PatternFill("solid", fgColor=colour, bgColor=colour)


def when(formula: str, ground: str = "", letters: str = INK, bold: bool = True) -> Rule:
    """A look that a cell takes while a formula is true."""
    return Rule(
        type="expression",
        formula=[formula],
        dxf=DifferentialStyle(
            font=Font(color=letters, bold=bold), fill=fill(ground) if ground else None
        ),
    )


@cache
def align(
    horizontal: str = "left",
    vertical: str = "center",
    wrap: bool = False,
    indent: int = 0,
    shrink: bool = False,
) -> Alignment:
    """How a text stands in its cell."""
    return Alignment(
        horizontal=horizontal,
        vertical=vertical,
        wrap_text=wrap,
        indent=indent,
        shrink_to_fit=shrink,
    )


HAIR = Side(style="hair", color=LINE)
THIN = Side(style="thin", color=LINE)
FIRM = Side(style="thin", color=DEEP)
HEAVY = Side(style="medium", color=DEEP)

SOURCE = Border(left=THIN, bottom=HAIR)
BOX = Border(left=THIN, right=THIN, top=THIN, bottom=THIN)
UNDER = Border(bottom=HAIR)
RULE = Border(bottom=FIRM)
STRONG = Border(bottom=HEAVY)


# widths of Arial in thousandths of its size, from "space" on (those of Helvetica)
_WIDTHS = (
    278, 278, 355, 556, 556, 889, 667, 191, 333, 333, 389, 584, 278, 333, 278, 278,
    556, 556, 556, 556, 556, 556, 556, 556, 556, 556, 278, 278, 584, 584, 584, 556,
    1015, 667, 667, 722, 722, 667, 611, 778, 722, 278, 500, 667, 556, 833, 722, 778,
    667, 778, 722, 667, 611, 722, 667, 944, 667, 667, 611, 278, 278, 278, 469, 556,
    333, 556, 556, 500, 556, 556, 278, 556, 556, 222, 222, 500, 222, 833, 556, 556,
    556, 556, 333, 500, 278, 556, 500, 722, 500, 500, 500, 334, 260, 334, 584,
)  # fmt: skip


def text_width(text: str, size: float, bold: bool = False) -> float:
    """Width of a text in pixels."""
    units = sum(_WIDTHS[ord(c) - 32] if 32 <= ord(c) < 32 + len(_WIDTHS) else 700 for c in text)
    return units / 1000 * size * 96 / 72 * (1.1 if bold else 1.03)


def lines_needed(text: str, pixels: float, size: float, bold: bool = False) -> int:
    """Lines that a text takes when it is wrapped at words in a cell of that width."""
    room = pixels - 8
    lines = 0
    for paragraph in text.split("\n"):
        lines += 1
        used = 0.0
        for word in paragraph.split():
            width = text_width(word, size, bold)
            gap = text_width(" ", size, bold) if used else 0.0
            if used and used + gap + width > room:
                lines += 1
                used = width
            else:
                used += gap + width
            lines += max(0, math.ceil(used / room) - 1)
    return lines


def line_height(size: float) -> float:
    """Points that one line of a size takes."""
    return round(size * 1.22, 1)
