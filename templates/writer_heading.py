"""The heading strip of every page, and parts 2 and 3: purpose with circuit, sign-off."""

from __future__ import annotations

import struct
from importlib.resources import files

from openpyxl.drawing.image import Image
from openpyxl.drawing.spreadsheet_drawing import AnchorMarker, OneCellAnchor
from openpyxl.drawing.xdr import XDRPositiveSize2D
from openpyxl.worksheet.datavalidation import DataValidation

from tausheet.templates import style
from tausheet.templates.book import VERDICT_INKS, Book
from tausheet.templates.page import Page
from tausheet.templates.values import STATUSES

PURPOSE_PART = 2
SIGN_OFF_PART = 3

MOST_PIXELS = 270
"""Height that a circuit may take."""

CLEAR = 8
"""Pixels kept free at either side of a circuit, since print cuts at the edge of the page."""

SCALE = 0.42
"""Pixels of the page for one of a picture at most: letters are then of one size on all sheets."""

EMU = 9525
"""Units of a drawing in a pixel."""

STRIP_POINTS = (10, 18, 10, 18, 6)
"""Heights of the rows of the heading strip."""


def strip(page: Page, book: Book) -> None:
    """Document number, title, project, revision, status and verdict, repeated on every page."""
    sheet = page.worksheet
    for row, points in enumerate(STRIP_POINTS, start=1):
        sheet.row_dimensions[row].height = points
    labels = (
        (1, "A:B", "document number"), (1, "C:F", "title"),
        (1, "G", "revision"), (1, "H", "status"),
        (3, "A:C", "project"), (3, "D:G", "calc sheet"), (3, "H", "verdict"),
    )  # fmt: skip
    for row, span, label in labels:
        page.text(row, span, label, style.font(7, colour=style.QUIET), vertical="bottom")
    entries = (
        (2, "A:B", "doc_number", style.font(10.5, bold=True)),
        (2, "C:F", "doc_title", style.font(10.5, bold=True)),
        (2, "G", "revision", style.font(10, bold=True)),
        (2, "H", "status", style.font(8.5)),
        (4, "A:C", "project", style.font(9)),
    )
    for row, span, name, font in entries:
        cell = page.text(row, span, None, font)
        cell.alignment = style.align("left", "center", shrink=True)
        book.input_cell(cell, book.texts.get(name) or None)
        page.frame(row, span, style.BOX)
        book.define(name, sheet, cell.coordinate)
    page.text(4, "D:G", f"{book.sheet.title} ({book.sheet.name})", style.font(9))
    badge = page.text(4, "H", "=verdict", style.font(10, bold=True), "center")
    book.colour_words(badge.coordinate, VERDICT_INKS)
    page.frame(5, "A:H", style.STRONG)
    rule = DataValidation(
        type="list",
        formula1='"' + ",".join(STATUSES) + '"',
        allow_blank=True,
        showErrorMessage=True,
        errorTitle="status",
        error="status: pick one of the list.",
    )
    rule.add("H2")
    sheet.add_data_validation(rule)


def purpose(page: Page, book: Book) -> None:
    """Write the purpose, the circuit, and what is switched when."""
    page.part(PURPOSE_PART, "Purpose", 200)
    page.paragraph("A:H", book.sheet.purpose, 9.5)
    page.down(4)
    picture = _Picture(book.sheet.picture.file)
    width = page.width("A:H") - 2 * CLEAR
    scale = min(width / picture.width, MOST_PIXELS / picture.height, SCALE)
    picture.width, picture.height = int(picture.width * scale), int(picture.height * scale)
    height = picture.height * 72 / 96 + 6
    page.keep(height)
    picture.place(page, page.down(height), CLEAR + (width - picture.width) / 2)
    page.worksheet.add_image(picture)
    page.paragraph("A:H", book.sheet.picture.switched, 8.5)


class _Picture(Image):
    """A PNG that ships with the sheets; its size is read from its header."""

    def __init__(self, file: str) -> None:
        self._bytes = files("tausheet.templates.sheets").joinpath(file).read_bytes()
        self.width, self.height = struct.unpack(">II", self._bytes[16:24])
        self.format = "png"
        self.anchor = "A1"

    def place(self, page: Page, row: int, left: float) -> None:
        """Anchor the picture in a row, so many pixels from the left edge of the grid."""
        widths = list(style.COLUMNS.values())
        column = 0
        while left >= widths[column]:
            left -= widths[column]
            column += 1
        corner = AnchorMarker(col=column, colOff=round(left * EMU), row=row - 1)
        size = XDRPositiveSize2D(self.width * EMU, self.height * EMU)
        self.anchor = OneCellAnchor(_from=corner, ext=size)

    def _data(self) -> bytes:
        return self._bytes


def sign_off(page: Page, book: Book) -> None:
    """Write the sign-off and the list of revisions."""
    page.part(SIGN_OFF_PART, "Sign-off", 150)
    sheet = page.worksheet
    page.head(
        (
            ("A", "", "left"),
            ("B", "name", "left"),
            ("C:D", "date", "left"),
            ("E:H", "signature", "left"),
        )
    )
    for role in ("prepared", "checked", "approved"):
        row = page.down(22)
        page.text(row, "A", role, style.font(9, bold=True))
        for span, what in (("B", "by"), ("C:D", "on"), ("E:H", "signature")):
            name = f"{role}_{what}"
            cell = page.text(row, span, None)
            book.input_cell(cell, book.texts.get(name) or None)
            page.frame(row, span, style.BOX)
            book.define(name, sheet, cell.coordinate)
            if what == "on":
                cell.number_format = "yyyy-mm-dd"
    page.down(6)
    page.head(
        (
            ("A", "revision", "left"),
            ("B:E", "what changed", "left"),
            ("F:G", "by", "left"),
            ("H", "date", "left"),
        )
    )
    for number in range(4):
        row = page.down(15)
        for span, what in (("A", "number"), ("B:E", "change"), ("F:G", "by"), ("H", "date")):
            cell = page.text(row, span, None, style.font(8.5))
            first = number == 0 and what == "number"
            book.input_cell(cell, (book.texts.get("revision") or None) if first else None)
            page.frame(row, span, style.BOX)
            book.define(f"revision_{number + 1}_{what}", sheet, cell.coordinate)
            if what == "date":
                cell.number_format = "yyyy-mm-dd"
