"""Part 6, worst case: each part alone, root-sum-square, every corner, and a seeded draw."""

from __future__ import annotations

from math import prod

from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.functions.tolerance import draw
from tausheet.templates import style
from tausheet.templates.book import (
    CORNERS,
    Book,
    address,
    area,
    in_words,
    quantity_for,
    text_literal,
)
from tausheet.templates.formulas import renamed
from tausheet.templates.model import Varies, WorstCase
from tausheet.templates.page import Page

PART = 6

ALONE = (
    ("A", "part", "left"),
    ("B", "what it is", "left"),
    ("C", "lowest", "right"),
    ("D:E", "highest", "right"),
    ("F", "swing", "right"),
    ("G", "at lowest", "right"),
    ("H", "at highest", "right"),
)
METHODS = (
    ("A:B", "method, and what it is worth", "left"),
    ("C:D", "lowest", "right"),
    ("E:F", "nominal", "right"),
    ("G:H", "highest", "right"),
)


def write(page: Page, book: Book) -> None:
    """Write every worst case of the sheet."""
    first = book.sheet.worst_cases[:1]
    page.part(PART, "Worst case", _tall(page, book, first[0]) if first else 60)
    if not first:
        page.paragraph("A:H", "Each check below is against extremes that its formula names.")
    for number, worst in enumerate(book.sheet.worst_cases):
        worksheet = book.corners
        if number:
            worksheet = book.workbook.create_sheet(f"{CORNERS} {number + 1}")
        table = _Corners(book, worst, worksheet)
        table.write()
        _on_page(page, book, worst, table)


class _Corners:
    """The worksheet behind one worst case; every number in base SI."""

    TOP = 4

    def __init__(self, book: Book, worst: WorstCase, worksheet: Worksheet) -> None:
        self.book, self.worst, self.sheet = book, worst, worksheet
        self.parts = worst.parts
        self.levels = [3 if part.inside else 2 for part in self.parts]
        self.count = prod(self.levels)
        self.sums = self.TOP + len(self.parts) + 3
        self.first = self.sums + 14
        self.last = self.first + self.count - 1
        k = len(self.parts)
        self.level_columns = [get_column_letter(2 + j) for j in range(k)]
        self.value_columns = [get_column_letter(2 + k + j) for j in range(k)]
        self.result_column = get_column_letter(2 + 2 * k)
        self.draw_columns = [get_column_letter(4 + 2 * k + j) for j in range(k)]
        self.drawn_result = get_column_letter(4 + 3 * k)

    def write(self) -> None:
        """Write parts, sums, corners and draws."""
        self._title("A1", f"Worst case of {self.worst.of}, in base SI units")
        for letter in [get_column_letter(i) for i in range(1, 5 + 3 * len(self.parts))]:
            self.sheet.column_dimensions[letter].width = 15
        self._alone()
        self._corner_rows()
        self._draws()
        self._sums()

    def _put(self, cell: str, value: object, bold: bool = False) -> None:
        self.sheet[cell] = value  # type: ignore[assignment]
        if bold:
            self.sheet[cell].font = style.font(10, bold=True)

    def _title(self, cell: str, value: str) -> None:
        self.sheet[cell] = value
        self.sheet[cell].font = style.font(11, bold=True, colour=style.DEEP)

    def _heads(self, row: int, heads: dict[str, str]) -> None:
        for letter, label in heads.items():
            self._put(f"{letter}{row}", label, bold=True)
            self.sheet[f"{letter}{row}"].border = style.RULE

    def _inside(self, part: Varies) -> str:
        return f"MIN({part.symbol}_hi,MAX({part.symbol}_lo,{part.inside}))"

    def _alone(self) -> None:
        """Each part at its extremes, the others nominal."""
        labels = ("part", "lowest", "highest", "result at lowest", "result at highest",
                  "result inside", "farthest above nominal", "farthest below", "swing")  # fmt: skip
        self._heads(self.TOP - 1, dict(zip("ABCDEFGHI", labels, strict=True)))
        for row, part in enumerate(self.parts, start=self.TOP):
            s, of = part.symbol, self.worst.of
            inside = f"={renamed(self.worst.formula, {s: self._inside(part)})}"
            cells = {
                "A": s,
                "B": f"={s}_lo",
                "C": f"={s}_hi",
                "D": f"={renamed(self.worst.formula, {s: f'{s}_lo'})}",
                "E": f"={renamed(self.worst.formula, {s: f'{s}_hi'})}",
                "F": inside if part.inside else None,
                "G": f"=MAX(D{row}:F{row},{of})-{of}",
                "H": f"={of}-MIN(D{row}:F{row},{of})",
                "I": f"=G{row}+H{row}",
            }
            for letter, value in cells.items():
                self._put(f"{letter}{row}", value)

    def _corner_rows(self) -> None:
        """Every combination: the level of part j in row i is a digit of i."""
        heads = {"A": "row", self.result_column: "result"}
        for j, part in enumerate(self.parts):
            heads[self.level_columns[j]] = f"{part.symbol} at"
            heads[self.value_columns[j]] = part.symbol
        self._heads(self.first - 1, heads)
        self._put(f"A{self.first - 2}", "0 lowest, 1 highest, 2 extreme inside", bold=True)
        for i in range(self.count):
            row = self.first + i
            self._put(f"A{row}", i)
            cells, stride = {}, 1
            for j, part in enumerate(self.parts):
                level, value = self.level_columns[j], self.value_columns[j]
                self._put(f"{level}{row}", f"=MOD(INT($A{row}/{stride}),{self.levels[j]})")
                stride *= self.levels[j]
                lowest = f"{part.symbol}_lo"
                if part.inside:
                    lowest = f"IF({level}{row}=2,{self._inside(part)},{lowest})"
                self._put(f"{value}{row}", f"=IF({level}{row}=1,{part.symbol}_hi,{lowest})")
                cells[part.symbol] = f"{value}{row}"
            self._put(f"{self.result_column}{row}", f"={renamed(self.worst.formula, cells)}")

    def _draws(self) -> None:
        """Seeded unit draws, stored as numbers, and the result for each."""
        k = len(self.parts)
        units = draw([0.0] * k, [1.0] * k, self.worst.draws, "uniform", self.worst.seed)
        heads = {self.drawn_result: "result"}
        for j, part in enumerate(self.parts):
            heads[self.draw_columns[j]] = f"{part.symbol}, 0 to 1"
        self._heads(self.first - 1, heads)
        self._put(
            f"{self.draw_columns[0]}{self.first - 2}",
            f"{self.worst.draws} draws, seed {self.worst.seed}: an estimate, never the bound",
            bold=True,
        )
        for i in range(self.worst.draws):
            row, cells = self.first + i, {}
            for j, part in enumerate(self.parts):
                unit = f"{self.draw_columns[j]}{row}"
                self._put(unit, round(float(units[i, j]), 12))  # every program keeps so many
                low, high = f"{part.symbol}_lo", f"{part.symbol}_hi"
                cells[part.symbol] = f"({low}+({high}-{low})*{unit})"
            self._put(f"{self.drawn_result}{row}", f"={renamed(self.worst.formula, cells)}")

    def _sums(self) -> None:
        """The figures that the page shows."""
        of, top, end = self.worst.of, self.TOP, self.TOP + len(self.parts) - 1
        results = f"{self.result_column}{self.first}:{self.result_column}{self.last}"
        last_draw = self.first + self.worst.draws - 1
        drawn = f"{self.drawn_result}{self.first}:{self.drawn_result}{last_draw}"
        rows = (
            ("min", "all corners, lowest", f"=MIN({results})"),
            ("max", "all corners, highest", f"=MAX({results})"),
            ("min_row", "row of the lowest", f"=MATCH({of}_min,{results},0)"),
            ("max_row", "row of the highest", f"=MATCH({of}_max,{results},0)"),
            ("rss_lo", "root-sum-square, lowest", f"={of}-SQRT(SUMSQ(H{top}:H{end}))"),
            ("rss_hi", "root-sum-square, highest", f"={of}+SQRT(SUMSQ(G{top}:G{end}))"),
            ("draw_lo", "draw, lowest", f"=MIN({drawn})"),
            ("draw_hi", "draw, highest", f"=MAX({drawn})"),
            (
                "draw_part",
                "draw, not exceeded by 19 of 20",
                f"=LARGE({drawn},{self.worst.draws // 20 + 1})",
            ),
            ("most_row", "part that matters most", f"=MATCH(MAX(I{top}:I{end}),I{top}:I{end},0)"),
        )
        for row, (name, label, formula) in enumerate(rows, start=self.sums):
            self._put(f"A{row}", label)
            self._put(f"C{row}", formula)
            self.book.define(f"{of}_{name}", self.sheet, f"C{row}")

    def in_corner(self, which: str) -> str:
        """A formula for the words of a corner: "R_unit highest, C_unit lowest"."""
        words = []
        for part, letter in zip(self.parts, self.level_columns, strict=True):
            column = area(self.sheet, f"{letter}{self.first}", f"{letter}{self.last}")
            words.append(
                f'"{part.symbol} "&CHOOSE(INDEX({column},{self.worst.of}_{which}_row)+1,'
                '"lowest","highest","at its inner extreme")'
            )
        return '&", "&'.join(words)


def _tall(page: Page, book: Book, worst: WorstCase) -> float:
    """How high a worst case stands on the page, in one piece."""
    parts = {part.symbol for part in worst.parts}
    rows = (e.description for e in book.sheet.entries() if e.symbol in parts)
    return 32 + 14 + sum(_height(page, description) for description in rows) + 110


def _on_page(page: Page, book: Book, worst: WorstCase, table: _Corners) -> None:
    of = worst.of
    quantity = book.quantity_of[of]
    description = next(q.description for q in book.sheet.quantities() if q.symbol == of)
    description = description.removesuffix(", nominal")
    descriptions = {entry.symbol: entry.description for entry in book.sheet.entries()}
    heights = [_height(page, descriptions[part.symbol]) for part in worst.parts]
    page.keep(_tall(page, book, worst))
    row = page.down(16)
    page.text(row, "A:H", f"{of}: {description}", style.font(9, bold=True), vertical="bottom")
    page.head(ALONE)
    for number, (part, height) in enumerate(zip(worst.parts, heights, strict=True)):
        row = page.down(height)
        at = table.TOP + number
        cell = {letter: address(table.sheet, f"{letter}{at}") for letter in "BCDEI"}
        measured = quantity_for(book, part.symbol)
        page.text(row, "A", part.symbol, style.font(9, bold=True))
        page.text(row, "B", descriptions[part.symbol], style.font(8), wrap=True)
        for span, formula in (
            ("C", in_words(cell["B"], measured)),
            ("D:E", in_words(cell["C"], measured)),
            ("G", in_words(cell["D"], quantity)),
            ("H", in_words(cell["E"], quantity)),
        ):
            page.text(row, span, f"={formula}", style.font(8.5), "right")
        swing = page.text(row, "F", f"=IFERROR({cell['I']}/ABS({of}),NA())", horizontal="right")
        swing.number_format = style.RELATIVE
        page.frame(row, "A:H", style.UNDER)
    _methods(page, book, worst, table, quantity)


def _height(page: Page, description: str) -> float:
    """Points that the row of a part takes."""
    return max(15, 3 + style.line_height(8.5) * style.lines_needed(description, page.width("B"), 8))


def _methods(page: Page, book: Book, worst: WorstCase, table: _Corners, quantity: str) -> None:
    of = worst.of
    page.down(6)
    page.head(METHODS)
    rows = (
        (f"all {table.count} corners: the bound, used in part 7", f"{of}_min", f"{of}_max"),
        ("root-sum-square: likely, if independent", f"{of}_rss_lo", f"{of}_rss_hi"),
        (
            f"draw of {worst.draws}, seed {worst.seed}: an estimate, no bound",
            f"{of}_draw_lo",
            f"{of}_draw_hi",
        ),
    )
    for number, (method, low, high) in enumerate(rows):
        row = page.down(15)
        decides = number == 0
        page.text(row, "A:B", method, style.font(8.5, bold=decides))
        for span, name in (("C:D", low), ("E:F", of), ("G:H", high)):
            formula = f"={in_words(name, quantity)}"
            page.text(row, span, formula, style.font(9, bold=decides), "right")
        page.frame(row, "A:H", style.UNDER)
    end = table.TOP + len(table.parts) - 1
    symbols = area(table.sheet, f"A{table.TOP}", f"A{end}")
    swings = area(table.sheet, f"I{table.TOP}", f"I{end}")
    lines = (
        ("highest_corner", "Highest where", table.in_corner("max")),
        ("lowest_corner", "Lowest where", table.in_corner("min")),
        (
            "matters_most",
            "Matters most",
            f'INDEX({symbols},{of}_most_row)&", which alone moves the result by "'
            f'&ROUND(100*MAX({swings})/ABS({of}),1)&" %"',
        ),
        (
            "draw_says",
            "19 of 20 draws",
            f'"stay at or below "&{in_words(f"{of}_draw_part", quantity)}',
        ),
    )
    page.down(3)
    for name, label, formula in lines:
        row = page.down(13)
        page.text(row, "A", label, style.font(8, colour=style.QUIET))
        page.text(row, "B:H", f"=IFERROR({formula},{text_literal('not known')})")
        book.define(f"{of}_{name}", page.worksheet, f"B{row}")
