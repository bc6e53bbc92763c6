"""The index of all cell functions as a workbook: live examples, expected values, agreement."""

from __future__ import annotations

from importlib.metadata import version
from itertools import groupby

from openpyxl import Workbook
from openpyxl.utils import absolute_coordinate, get_column_letter
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.worksheet import Worksheet

from tausheet.functions.catalogue import CATALOGUE
from tausheet.templates import paper, style
from tausheet.templates.book import quoted, text_literal
from tausheet.templates.index import EXAMPLES, READS, Example, Reads
from tausheet.templates.page import Page

TITLE = "Cell functions: an index with live examples"
STRIP_POINTS = (10, 20, 6, 15, 6)
HEAD = (
    ("A:B", "function, and what it gives", "left"),
    ("C:D", "result", "right"),
    ("E:F", "expected", "right"),
    ("G", " unit", "left"),
    ("H", "agreement", "center"),
)
AGREES, DIFFERS = "agrees", "DIFFERS"


def build() -> Workbook:
    """The workbook, with formulas and without stored values."""
    workbook = Workbook()
    sheet = workbook.active
    assert isinstance(sheet, Worksheet)
    sheet.title = "Index"
    paper.set_up(workbook, sheet)
    page = Page(sheet, sum(STRIP_POINTS))
    _strip(page)
    _purpose(page)
    writer = _Rows(page, workbook)
    for number, (group, examples) in enumerate(
        groupby(EXAMPLES, key=lambda example: CATALOGUE[example.function].group), start=1
    ):
        page.part(number, group, 60)
        page.head(HEAD)
        for example in examples:
            writer.example(example)
    page.part(number + 1, "Tables that the examples read", 80)
    for table in READS:
        writer.table(table)
    last = page.row
    _define(workbook, "agreements", sheet, f"H{style.TITLE_ROWS + 1}", f"H{last}")
    sheet.print_area = f"A1:H{last}"
    paper.finish(workbook, TITLE)
    sheet.protection.sheet = False  # the examples are there to be changed
    return workbook


def _strip(page: Page) -> None:
    """The heading repeated on every page: title, version, and how many results agree."""
    sheet = page.worksheet
    for row, points in enumerate(STRIP_POINTS, start=1):
        sheet.row_dimensions[row].height = points
    page.text(2, "A:H", TITLE, style.font(14, bold=True))
    page.text(4, "A:C", '="computed with tausheet "&FO_VERSION()', style.font(9))
    count = f'SUMPRODUCT(EXACT(agreements,"{AGREES}")*1)'
    agreed = f'={count}&" of {len(EXAMPLES)} results agree with what is expected"'
    page.text(4, "D:H", agreed, style.font(9, bold=True), "right")
    page.frame(5, "A:H", style.STRONG)


def _purpose(page: Page) -> None:
    page.down(5)
    page.quiet(
        "Each example is live: change it and the result follows. Everything is in base SI units, "
        "angles in degrees, ratios as fractions. What is expected does not come from the function: "
        "it is a published value, or a closed form or a sum by hand that uses built-in functions "
        "alone. A result agrees when both are the same to 1 part in 10^12, unless its row says "
        "otherwise; an error never agrees."
    )


def _define(workbook: Workbook, name: str, sheet: Worksheet, first: str, last: str) -> None:
    target = f"{absolute_coordinate(first)}:{absolute_coordinate(last)}"
    workbook.defined_names[name] = DefinedName(name, attr_text=f"{quoted(sheet)}!{target}")


class _Rows:
    """Writes the examples and the tables that they read."""

    def __init__(self, page: Page, workbook: Workbook) -> None:
        self.page, self.workbook, self.sheet = page, workbook, page.worksheet

    def example(self, example: Example) -> None:
        """Three rows: numbers, the formula as text, where the expected value comes from."""
        page = self.page
        wide, narrow = page.width("C:H") - 10, page.width("A:B")
        summary = CATALOGUE[example.function].summary
        formula = 3 + style.line_height(8.5) * style.lines_needed(f"={example.formula}", wide, 8.5)
        origin = 4 + style.line_height(8) * style.lines_needed(example.origin, wide, 8)
        needed = 4 + style.line_height(8) * style.lines_needed(summary, narrow, 8)
        origin = max(origin, needed - formula)
        text = example.expected.startswith(('"', "{"))
        wordy = text and len(example.expected) > 20
        lines = style.lines_needed(example.expected, page.width("C:D"), 8.5) if wordy else 1
        first = max(16, 4 + style.line_height(8.5) * lines)
        page.keep(first + formula + origin, lambda: page.head(HEAD))
        row, middle, below = page.down(first), page.down(formula), page.down(origin)
        small = style.font(8.5 if wordy else 9, bold=True)
        page.text(row, "A:B", example.function, style.font(9.5, bold=True))
        page.text(row, "C:D", f"={example.formula}", small, "right", wrap=wordy)
        page.text(row, "E:F", self._expected(example), style.font(small.sz), "right", wrap=wordy)
        page.text(row, "G", example.unit or None, style.font(8.5), indent=1)
        self._agreement(example, row, text)
        self.sheet.merge_cells(f"A{middle}:B{below}")
        cell = self.sheet[f"A{middle}"]
        cell.value, cell.font = summary, style.font(8)
        cell.alignment = style.align(vertical="top", wrap=True)
        shown = page.text(middle, "C:H", None, style.font(8.5), wrap=True, indent=1)
        shown.value = f"={example.formula}"
        shown.data_type = "s"
        shown.quotePrefix = True
        page.text(
            below,
            "C:H",
            example.origin,
            style.font(8, colour=style.QUIET),
            vertical="top",
            wrap=True,
            indent=1,
        )
        page.frame(below, "A:H", style.UNDER)

    @staticmethod
    def _expected(example: Example) -> str:
        if example.expected == "{version}":
            return version("tausheet")
        return f"={example.expected}"

    def _agreement(self, example: Example, row: int, text: bool) -> None:
        result, expected = f"C{row}", f"E{row}"
        near = f"ABS({result}-{expected})<={example.within!r}*ABS({expected})"
        same = f"AND(ISNUMBER({result}),{near})"
        if text:
            same = f"EXACT({result},{expected})"
        cell = self.page.text(
            row,
            "H",
            f'=IFERROR(IF({same},{text_literal(AGREES)},"{DIFFERS}"),"{DIFFERS}")',
            style.font(8.5, bold=True),
            "center",
        )
        self.sheet.conditional_formatting.add(
            cell.coordinate,
            style.when(f'EXACT({cell.coordinate},"{DIFFERS}")', style.BAD, "FFFFFF"),
        )

    def table(self, table: Reads) -> None:
        """A table, kept on one page, with its names."""
        page, letters = self.page, [get_column_letter(i + 1) for i in range(len(table.headings))]
        page.keep(34 + 14 * len(table.rows))
        row = page.down(20)
        page.text(row, "A:H", table.title, style.font(9, bold=True), vertical="bottom")
        page.head([(at, head, "left") for at, head in zip(letters, table.headings, strict=True)])
        top = page.row + 1
        for values in table.rows:
            row = page.down(14)
            for letter, value in zip(letters, values, strict=True):
                formula = value.format(row=row) if isinstance(value, str) else value
                page.text(row, letter, formula, style.font(9))
            page.frame(row, "A:H", style.UNDER)
        if table.name:
            _define(self.workbook, table.name, self.sheet, f"A{top - 1}", f"{letters[-1]}{row}")
        for name, letter in zip(table.columns, letters, strict=False):
            _define(self.workbook, name, self.sheet, f"{letter}{top}", f"{letter}{row}")
