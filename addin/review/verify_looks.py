"""What a workbook hides or shows otherwise than the sheet's own: colours, rows, rules, locks."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

from openpyxl.cell.cell import MergedCell
from openpyxl.formula.translate import Translator
from openpyxl.utils import get_column_letter, range_boundaries

from tausheet.addin.review.finding import Finding
from tausheet.addin.review.same_formula import pieces
from tausheet.addin.review.verify_own import Comparison
from tausheet.addin.review.workbook_file import WorkbookFile, formula_of, shown

_RULED = 500
"""Rows of a column in which rules for typing are compared: LibreOffice stores them no further than
somewhat below the last row that is used."""
_SMALLEST = 4.0
"""Points below which letters are as good as hidden."""
_SHRUNK = 1 / 3
"""Share of its own height or width below which a row or column counts as hidden."""


def of_cells(comparison: Comparison) -> Iterator[Finding]:
    """Colours, sizes, number formats, locks, hidden rows and columns, rules."""
    for own in comparison.own.worksheets:
        title = own.title
        if title not in comparison.file.workbook.sheetnames or title in comparison.moved:
            continue
        here = comparison.file.workbook[title]
        if here.sheet_state != own.sheet_state:
            yield Finding("hidden worksheet", title, here.sheet_state, own.sheet_state)
        if not here.protection.sheet:
            yield Finding("protection", title, "not protected", "protected")
        yield from _hidden(own, here)
        blank = own.cell(own.max_row + 1, 1)
        for row, column in comparison.places(own):
            mine = own._cells.get((row, column), blank)
            theirs = here._cells.get((row, column))
            if theirs is not None and not isinstance(theirs, MergedCell):
                yield from _looks(f"{title}!{theirs.coordinate}", comparison, mine, theirs)
        yield from _rules("changed conditional format", title, _formats(own), _formats(here))
        yield from _rules("changed validation", title, _validations(own), _validations(here))


def _looks(where: str, comparison: Comparison, mine: Any, theirs: Any) -> Iterator[Finding]:
    if mine.protection.locked != theirs.protection.locked:
        yield Finding("protection", where, _lock(theirs), _lock(mine))
    if theirs.value is None:
        return
    ground, letters = _ground(theirs), _letters(theirs)
    if letters == ground and _letters(mine) != _ground(mine):
        yield Finding("hidden text", where, f"letters {letters} on {ground}", _letters(mine))
    elif (letters, ground) != (_letters(mine), _ground(mine)):
        expected = f"{_letters(mine)} on {_ground(mine)}"
        yield Finding("recoloured", where, f"letters {letters} on {ground}", expected)
    if theirs.font.sz is not None and theirs.font.sz < _SMALLEST:
        yield Finding("hidden text", where, f"{theirs.font.sz} points", f"{mine.font.sz} points")
    place = (theirs.parent.title, theirs.coordinate)
    free = not mine.protection.locked and place not in comparison.inputs
    number = formula_of(theirs) or not isinstance(theirs.value, str)
    if number and not free and _format(mine) != _format(theirs):
        yield Finding("changed number format", where, theirs.number_format, mine.number_format)


def _lock(cell: Any) -> str:
    return "locked" if cell.protection.locked else "open"


def _letters(cell: Any) -> str:
    return _colour(cell.font.color, "000000")


def _ground(cell: Any) -> str:
    fill = cell.fill
    return _colour(fill.fgColor, "FFFFFF") if fill.fill_type == "solid" else "FFFFFF"


def _colour(colour: Any, automatic: str) -> str:
    """A colour as six digits; the automatic one where none is set."""
    if colour is None:
        return automatic
    if colour.type == "rgb" and isinstance(colour.rgb, str):
        return colour.rgb[-6:].upper()
    if colour.type == "theme":
        return {0: "FFFFFF", 1: "000000"}.get(colour.theme, f"theme {colour.theme}")
    if colour.type == "indexed":
        indexed = {64: automatic, 65: "FFFFFF", 0: "000000", 1: "FFFFFF", 8: "000000", 9: "FFFFFF"}
        return indexed.get(colour.indexed, f"number {colour.indexed}")
    return automatic


def _format(cell: Any) -> str:
    return str(cell.number_format).replace("\\", "").replace("[$-409]", "").casefold()


def _hidden(own: Any, here: Any) -> Iterator[Finding]:
    for row in range(1, own.max_row + 1):
        mine, theirs = own.row_dimensions.get(row), here.row_dimensions.get(row)
        height = mine.height if mine is not None and mine.height else 15.0
        if theirs is None:
            continue
        low = theirs.height is not None and theirs.height < height * _SHRUNK
        if theirs.hidden or low:
            found = "hidden" if theirs.hidden else f"{theirs.height} points high"
            yield Finding("hidden row", f"{own.title}!A{row}", found, f"{height:g} points high")
    widths = {
        column: dimension
        for dimension in here.column_dimensions.values()
        for column in range(dimension.min or 1, (dimension.max or dimension.min or 1) + 1)
        if column <= own.max_column
    }
    for column, dimension in widths.items():
        letter = get_column_letter(column)
        width = own.column_dimensions[letter].width if letter in own.column_dimensions else 13.0
        if dimension.hidden or dimension.width < width * _SHRUNK:
            found = "hidden" if dimension.hidden else f"{dimension.width:g} wide"
            yield Finding("hidden column", f"{own.title}!{letter}1", found, f"{width:g} wide")


Rule = tuple[Any, ...]


def _rules(
    kind: str, title: str, own: dict[str, set[Rule]], here: dict[str, set[Rule]]
) -> Iterator[Finding]:
    for cell in sorted({*own, *here}):
        mine, theirs = own.get(cell, set()), here.get(cell, set())
        if mine != theirs:
            found, expected = (_said(one - two) for one, two in ((theirs, mine), (mine, theirs)))
            yield Finding(kind, f"{title}!{cell}", found, expected)


def _said(rules: set[Rule]) -> str:
    words = [" ".join(_word(part) for part in rule if part) for rule in rules]
    return shown("; ".join(words) or "(no other rule)")


def _word(part: Any) -> str:
    return "".join(value for _, value in part) if isinstance(part, tuple) else str(part)


def _formats(sheet: Any) -> dict[str, set[Rule]]:
    """The conditional formats of each cell."""
    found: dict[str, set[Rule]] = {}
    for entry in sheet.conditional_formatting:
        areas = [area.bounds for area in entry.sqref.ranges]
        left, top = min(area[0] for area in areas), min(area[1] for area in areas)
        origin = f"{get_column_letter(left)}{top}"
        for rule in entry.rules:
            style = rule.dxf
            letters = _colour(style.font.color, "") if style and style.font else ""
            solid = style.fill if style else None
            ground = _colour(solid.bgColor, "") if solid else ""
            looks = (rule.type, rule.operator, letters, ground)
            for area in areas:
                for cell in _addresses(area):
                    formulas = tuple(_moved(text, origin, cell) for text in rule.formula)
                    found.setdefault(cell, set()).add((*formulas, *looks))
    return found


def _moved(formula: str, origin: str, cell: str) -> Any:
    if cell == origin:
        return pieces(formula)
    return pieces(Translator("=" + formula, origin).translate_formula(cell))


def _validations(sheet: Any) -> dict[str, set[Rule]]:
    """What may be typed into each cell."""
    found: dict[str, set[Rule]] = {}
    for rule in sheet.data_validations.dataValidation:
        listed = rule.type == "list"
        says: Rule = (
            rule.type,
            None if listed else rule.operator or "between",
            pieces(str(rule.formula1 or "")),
            None if listed else pieces(str(rule.formula2 or "")),
            "refuses" if rule.showErrorMessage and rule.errorStyle in (None, "stop") else "warns",
        )
        for area in rule.sqref.ranges:
            for cell in _addresses(area.bounds, _RULED):
                found.setdefault(cell, set()).add(says)
    return found


def _addresses(area: tuple[int, int, int, int], most: int = 100_000) -> Iterator[str]:
    left, top, right, bottom = area
    for row in range(top, min(bottom, top + most - 1) + 1):
        for column in range(left, right + 1):
            yield f"{get_column_letter(column)}{row}"


def of_workbook(file: WorkbookFile) -> Iterator[Finding]:
    """How the workbook is computed, and what it reaches for: for any workbook."""
    calculation = file.workbook.calculation
    if calculation is not None:
        if calculation.calcMode == "manual":
            yield Finding("manual calculation", "", "manual", "automatic")
        if calculation.fullPrecision is False:
            yield Finding("calculation settings", "", "precision as displayed", "full precision")
        if calculation.iterate:
            yield Finding("calculation settings", "", "circles are iterated", "no iteration")
    for part in file.parts():
        if part.startswith("xl/externalLinks/") and part.endswith(".xml"):
            yield Finding("link or macro", part, "a link to another workbook", "(none)")
        elif part.endswith("vbaProject.bin"):
            yield Finding("link or macro", part, "macros", "(none)")


def drawings(file: WorkbookFile, own: Any) -> Iterator[Finding]:
    """Pictures, charts and shapes that are not the sheet's: they can cover what is below."""
    for sheet in own.worksheets:
        if sheet.title not in file.workbook.sheetnames:
            continue
        here = file.workbook[sheet.title]
        for what, kept, found in (
            ("pictures", len(sheet._images), len(here._images)),
            ("charts", len(sheet._charts), len(here._charts)),
        ):
            if kept != found:
                yield Finding("added drawing", sheet.title, f"{found} {what}", f"{kept} {what}")
    for part in file.parts():
        if re.fullmatch(r"xl/drawings/drawing\d+\.xml", part):
            shapes = len(re.findall(rb"<(?:\w+:)?(?:sp|cxnSp|grpSp)[ >]", file.part(part)))
            if shapes:
                yield Finding("added drawing", part, f"{shapes} shapes", "no shapes")


def merged(file: WorkbookFile, own: Any) -> Iterator[Finding]:
    """Cells made one, or apart: a merged cell covers what lies under it."""
    for sheet in own.worksheets:
        if sheet.title not in file.workbook.sheetnames:
            continue
        mine = {str(area) for area in sheet.merged_cells.ranges}
        theirs = {str(area) for area in file.workbook[sheet.title].merged_cells.ranges}
        for area in sorted(theirs - mine, key=range_boundaries):
            where = f"{sheet.title}!{area.partition(':')[0]}"
            yield Finding("added content", where, f"{area} made one cell", "separate cells")
