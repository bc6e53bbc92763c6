"""Parts 2 and 7: the checks, the named warnings, and the one verdict."""

from __future__ import annotations

import re

from tausheet.templates import style
from tausheet.templates.book import (
    VERDICT_INKS,
    Book,
    in_words,
    text_literal,
    with_values,
)
from tausheet.templates.model import COUNT, NUMBER, Check, Hazard, Sense
from tausheet.templates.page import Page

VERDICT_PART = 1
PART = 7

AGREEMENT = 1e-9
"""How far the two ways of a principal result may lie apart, relatively."""

HEAD = (
    ("A:B", "criterion, and the basis of its limit", "left"),
    ("C:D", "value, worst case", "right"),
    ("E:F", "limit", "right"),
    ("G", "margin", "center"),
    ("H", "result", "center"),
)


def verdict(page: Page, book: Book) -> None:
    """Write the verdict and the number that decides it, for the first page."""
    page.part(VERDICT_PART, "Verdict", 70)
    page.down(4)
    row = page.down(30)
    below = page.down(15)
    sheet = page.worksheet
    page.merged(row, "A:A")
    cell = page.text(row, "A:B", f"={verdict_formula(book)}", style.font(22, bold=True), "center")
    book.define("verdict", sheet, cell.coordinate)
    book.colour_words(cell.coordinate, VERDICT_INKS)
    page.box(row, "A:B", style.HEAVY)
    decides = page.text(
        row,
        "C:H",
        f"={_decides(book)}",
        style.font(10.5, bold=True),
        wrap=True,
        indent=1,
    )
    book.define("decided_by", sheet, decides.coordinate)
    tally = page.text(
        below,
        "C:H",
        f'=checks_passed&" of {_number_of_checks(book)} checks pass, "&inputs_valid&" of '
        f'{_number_of_inputs(book)} inputs can be used"',
        style.font(8.5, colour=style.QUIET),
        indent=1,
    )
    book.define("tally", sheet, tally.coordinate)
    names = [hazard.name for hazard in hazards(book)]
    height = 3 + style.line_height(8.5) * style.lines_needed(
        "; ".join([*names, f"see part {PART}"]), page.width("C:H") - 10, 8.5, bold=True
    )
    row = page.down(height)
    page.text(row, "A:B", '="named warnings: "&warnings_shown', style.font(8.5), "right", "top")
    shown = "&".join(
        f'IF({warning_name(name)}="WARNING",{text_literal(name + "; ")},"")' for name in names
    )
    listed = page.text(
        row,
        "C:H",
        f'=IF(warnings_shown=0,"none",{shown}&"see part {PART}")',
        style.font(8.5, bold=True, colour=style.HEED),
        vertical="top",
        wrap=True,
        indent=1,
    )
    book.define("warnings_named", sheet, listed.coordinate)


def verdict_formula(book: Book) -> str:
    """PASS only when every check is exactly PASS and every input can be used."""
    return (
        f"IFERROR(IF(AND(checks_passed={_number_of_checks(book)},"
        f'inputs_valid={_number_of_inputs(book)}),"PASS","FAIL"),"FAIL")'
    )


def _number_of_checks(book: Book) -> int:
    return len(book.sheet.checks) + 1


def _number_of_inputs(book: Book) -> int:
    return sum(1 for _ in book.sheet.entries()) + len(book.sheet.filled_in)


def _decides(book: Book) -> str:
    """The input at fault; else the check that fails or passes by the least."""
    at_fault = (
        '"An input is missing or at fault: "&IFERROR(INDEX(input_symbols,MATCH(1,input_faults,0)),'
        '"see part 4")'
    )
    least = "MATCH(MIN(check_margins),check_margins,0)"
    without = at_fault
    for check in reversed([*book.sheet.checks, agreement(book)]):
        named = text_literal(f"{check.criterion}: no result")
        without = f"IF(ISERROR(({check.value})-({check.limit})),{named},{without})"
    closest = (
        f'INDEX(check_names,{least})&": "&INDEX(check_values,{least})&", "'
        f'&INDEX(check_limits,{least})&" allowed (margin "&ROUND(100*MIN(check_margins),1)&" %)"'
    )
    return f"IF(SUM(input_faults)>0,{at_fault},IFERROR({closest},{without}))"


def write(page: Page, book: Book) -> None:
    """Write the checks and the named warnings."""
    checks = [*book.sheet.checks, agreement(book)]
    # in one piece: a heading repeated inside the table would stand among the checks' names
    page.part(PART, "Checks", 14 + sum(16 + _lower(page, check) for check in checks) + 18)
    page.head(HEAD)
    for check in checks:
        _check(page, book, check)
    first, last = book.check_rows[0], book.check_rows[-1]
    for name, letter in (
        ("check_names", "A"),
        ("check_values", "C"),
        ("check_limits", "E"),
        ("check_margins", "G"),
        ("check_results", "H"),
    ):
        book.define(name, page.worksheet, f"{letter}{first}", f"{letter}{last}")
    book.colour_words(f"H{first}:H{last}", VERDICT_INKS)
    page.down(3)
    row = page.down(15)
    sheet = page.worksheet
    quiet = style.font(8, colour=style.QUIET)
    page.text(row, "A:B", "checks that pass, of those above", quiet, "right")
    page.text(row, "C", '=SUMPRODUCT(EXACT(check_results,"PASS")*1)', horizontal="right")
    book.define("checks_passed", sheet, f"C{row}")
    page.text(row, "D", f"of {len(checks)}")
    page.text(row, "E:F", "inputs that can be used", quiet, "right")
    page.text(row, "G", "=SUMPRODUCT((input_states=0)*(input_faults=0))", horizontal="right")
    book.define("inputs_valid", sheet, f"G{row}")
    page.text(row, "H", f"of {_number_of_inputs(book)}")
    _warnings(page, book)


def agreement(book: Book) -> Check:
    """The check that both ways of every principal result agree."""
    differences = [f"{q.symbol}_diff" for q in book.sheet.quantities() if q.second]
    return Check(
        "agreement",
        "Both ways of each principal result agree",
        f"MAX({','.join(differences)})",
        f"{AGREEMENT:.0E}",
        NUMBER,
        "largest relative difference in part 5; rounding alone stays far below",
    )


def passes(check: Check) -> str:
    """A formula that is TRUE only where the value keeps its limit.

    Spreadsheets differ in the last bit, so the ratio is rounded to 12 digits.
    """
    value, limit = f"({check.value})", f"({check.limit})"
    sign = "<=" if check.sense is Sense.AT_MOST else ">="
    turned = ">=" if check.sense is Sense.AT_MOST else "<="
    ratio = f"ROUND({value}/{limit},12)"
    return f"IF({limit}=0,{value}{sign}0,IF({limit}>0,{ratio}{sign}1,{ratio}{turned}1))"


def _lower(page: Page, check: Check) -> float:
    """How high the line with the basis of a check is."""
    longest = re.sub(r"{\w+}", "x" * 36, check.basis)
    return 4 + style.line_height(7.5) * style.lines_needed(longest, page.width("B:G"), 7.5)


def _check(page: Page, book: Book, check: Check) -> None:
    basis = check.basis
    lower = _lower(page, check)
    page.keep(16 + lower, lambda: page.head(HEAD))
    row = page.down(16)
    below = page.down(lower)
    book.check_rows.append(row)
    value, limit = f"({check.value})", f"({check.limit})"
    page.text(row, "A:B", check.criterion, style.font(9, bold=True))
    page.text(row, "C:D", f"={_read(check, value, limit)}", style.font(9, bold=True), "right")
    word = "at most" if check.sense is Sense.AT_MOST else "at least"
    page.text(
        row,
        "E:F",
        f'="{word} "&{_read(check, limit, value)}',
        style.font(9),
        "right",
    )
    room = f"{limit}-{value}" if check.sense is Sense.AT_MOST else f"{value}-{limit}"
    margin = page.text(
        row, "G", f"=IF({limit}=0,{room},({room})/ABS({limit}))", style.font(9), "center"
    )
    margin.number_format = style.RELATIVE
    result = (
        f"=IFERROR(IF(AND(ISNUMBER({value}),ISNUMBER({limit})),"
        f'IF({passes(check)},"PASS","FAIL"),"FAIL"),"FAIL")'
    )
    page.text(row, "H", result, style.font(9, bold=True), "center")
    book.define(f"check_{check.key}", page.worksheet, f"H{row}")
    page.text(
        below,
        "B:G",
        f"={with_values(book, basis)}" if "{" in basis else basis,
        style.font(7.5, colour=style.QUIET),
        vertical="top",
        wrap=True,
    )
    page.frame(below, "A:H", style.UNDER)


def _read(check: Check, value: str, other: str) -> str:
    """A value to be read, with all digits where fewer would make it look equal to the other."""
    if check.quantity == COUNT:
        return in_words(value, check.quantity)
    few, few_other = (in_words(x, check.quantity) for x in (value, other))
    digits = f"IF(AND({value}<>{other},EXACT({few},{few_other})),15,4)"  # "=" misleads in Calc
    return in_words(value, check.quantity, digits)


def _warnings(page: Page, book: Book) -> None:
    """The named warnings: hazards that the numbers show, whatever the verdict."""
    page.keep(50)
    row = page.down(20)
    page.text(row, "A:F", "Named warnings", style.font(9, bold=True), vertical="bottom")
    page.text(row, "G", "shown", style.font(7.5, colour=style.QUIET), "right", "bottom")
    page.text(row, "H", '=COUNTIF(warning_results,"WARNING")', style.font(9), "center", "bottom")
    book.define("warnings_shown", page.worksheet, f"H{row}")
    page.frame(row, "A:H", style.RULE)
    first = page.row + 1
    for hazard in hazards(book):
        _hazard(page, book, hazard)
    cells = f"H{first}:H{page.row}"
    book.define("warning_results", page.worksheet, *cells.split(":"))
    book.colour_words(cells, {"WARNING": (style.WASH, style.HEED)})


def _hazard(page: Page, book: Book, hazard: Hazard) -> None:
    longest = re.sub(r"{\w+}", "000.0 V", hazard.sentence)
    lines = style.lines_needed(longest, page.width("C:G"), 8)
    height = 4 + style.line_height(8) * max(lines, 1)
    page.keep(height)
    row = page.down(height)
    name = hazard.name
    page.text(row, "A:B", name, style.font(8.5, bold=True), vertical="top", wrap=True)
    condition = f"IFERROR(IF({hazard.when},1,0),1)=1"
    sentence = page.text(
        row,
        "C:G",
        f'=IF({condition},{with_values(book, hazard.sentence)},"does not apply")',
        style.font(8, colour=style.QUIET),
        vertical="top",
        wrap=True,
    )
    page.worksheet.conditional_formatting.add(
        sentence.coordinate,
        style.when(f'$H${row}="WARNING"', letters=style.INK, bold=False),
    )
    page.text(
        row, "H", f'=IF({condition},"WARNING","-")', style.font(8, bold=True), "center", "top"
    )
    page.frame(row, "A:H", style.UNDER)
    book.define(warning_name(name), page.worksheet, f"H{row}")


def hazards(book: Book) -> list[Hazard]:
    """The named warnings of the sheet, and the one that every sheet has."""
    return [*book.sheet.hazards, sources_missing(book)]


def warning_name(name: str) -> str:
    """The name of the cell that shows whether a warning applies."""
    return "warning_" + "_".join(re.findall(r"[a-z]+", name.lower()))


def sources_missing(book: Book) -> Hazard:
    """The warning that some inputs do not say where they come from."""
    asked = (*book.sheet.entries(), *book.sheet.filled_in)
    blanks = "+".join(
        f"IF({getattr(entry, 'needed', '') or 'TRUE'},ISBLANK(source_of_{entry.symbol})*1,0)"
        for entry in asked
    )
    return Hazard(
        "Source missing",
        f"{blanks}>0",
        "One input or more does not say where its value comes from, so nobody can check it.",
    )
