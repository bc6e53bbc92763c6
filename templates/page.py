"""The page being written: a cursor that goes down the grid and breaks pages where they end."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any

from openpyxl.cell.cell import Cell
from openpyxl.styles import Border, Font, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.pagebreak import Break
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.templates import style


class Page:
    """The main worksheet, written from top to bottom."""

    def __init__(self, worksheet: Worksheet, title_points: float) -> None:
        self.worksheet = worksheet
        self.row = style.TITLE_ROWS
        self._body = style.PAGE_POINTS - title_points
        self._left = self._body

    def down(self, points: float) -> int:
        """Start a row of that height; its number."""
        self.row += 1
        points = round(points / style.PIXEL_POINTS) * style.PIXEL_POINTS
        self.worksheet.row_dimensions[self.row].height = points
        self._left -= points
        return self.row

    def keep(self, points: float, again: Callable[[], None] | None = None) -> None:
        """Make sure that so much fits on this page, else go to the next (there, `again`)."""
        if points > self._left:
            self.new_page()
            if again is not None:
                again()

    def new_page(self) -> None:
        """Break the page below the current row."""
        self.worksheet.row_breaks.append(Break(id=self.row))
        self._left = self._body

    def part(self, number: int, title: str, following: float = 60) -> None:
        """The heading of one of the parts, kept together with what follows."""
        self.keep(34 + following)
        self.down(12)
        row = self.down(18)
        self.text(row, "A:H", f"{number}   {title}", style.font(11, bold=True, colour=style.DEEP))
        self.frame(row, "A:H", style.STRONG)
        self.down(4)

    def text(
        self,
        row: int,
        span: str,
        value: Any,
        font: Font | None = None,
        horizontal: str = "left",
        vertical: str = "center",
        wrap: bool = False,
        indent: int = 0,
    ) -> Cell:
        """Put a value into a cell, or into a span of cells such as "B:E" made one."""
        cell = self.merged(row, span)
        cell.value = value
        cell.font = font or style.font()
        cell.alignment = style.align(horizontal, vertical, wrap, indent)
        return cell

    def paragraph(self, span: str, value: str, size: float = 9, font: Font | None = None) -> int:
        """A wrapped text in a row of its own, as high as the text needs."""
        lines = style.lines_needed(value, self.width(span), size)
        height = lines * style.line_height(size) + 3
        self.keep(height)
        row = self.down(height)
        self.text(row, span, value, font or style.font(size), vertical="top", wrap=True)
        return row

    def quiet(self, value: str) -> None:
        """A remark across the page."""
        self.paragraph("A:H", value, 8, font=style.font(8, colour=style.QUIET))

    def merged(self, row: int, span: str) -> Cell:
        """The cell that stands for a span of columns."""
        first, _, last = span.partition(":")
        if last and last != first:
            self.worksheet.merge_cells(f"{first}{row}:{last}{row}")
        cell: Cell = self.worksheet[f"{first}{row}"]
        return cell

    def head(self, labels: Iterable[tuple[str, str, str]]) -> None:
        """The heading row of a table: span, label, horizontal position."""
        row = self.down(14)
        for span, label, horizontal in labels:
            self.text(row, span, label, style.font(7.5, colour=style.QUIET), horizontal, "bottom")
        self.frame(row, "A:H", style.RULE)

    def frame(self, row: int, span: str, border: Border) -> None:
        """Draw a border at each cell of a span."""
        for letter in self._letters(span):
            self.worksheet[f"{letter}{row}"].border = border

    def box(self, row: int, span: str, side: Side) -> None:
        """Draw a line around a span."""
        letters = self._letters(span)
        for letter in letters:
            self.worksheet[f"{letter}{row}"].border = Border(
                top=side,
                bottom=side,
                left=side if letter == letters[0] else None,
                right=side if letter == letters[-1] else None,
            )

    def width(self, span: str) -> int:
        """Pixels that a span is wide."""
        return sum(style.COLUMNS[letter] for letter in self._letters(span))

    @staticmethod
    def _letters(span: str) -> list[str]:
        first, _, last = span.partition(":")
        return [get_column_letter(i) for i in range(ord(first) - 64, ord(last or first) - 64 + 1)]
