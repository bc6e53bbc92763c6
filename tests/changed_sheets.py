"""Changes that people make to a calc sheet, by accident or on purpose, for tests.

Each takes a workbook and random numbers, changes one thing, and returns the class and the cell
that a review must name. Cells are drawn among all that the change can be made to.
"""

from __future__ import annotations

import functools
import random
import re
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from openpyxl.cell.cell import MergedCell
from openpyxl.styles import Font
from openpyxl.styles.differential import DifferentialStyle
from openpyxl.workbook.defined_name import DefinedName

from tausheet import templates
from tausheet.addin import package
from tausheet.addin.embedded import Book
from tausheet.functions.errors import ErrorKind

Change = Callable[[Any, random.Random, dict[str, dict[str, Any]]], tuple[str, str]]
MAIN = "Calc sheet"
CHANGES: dict[str, Change] = {}


def change(function: Change) -> Change:
    """List a class of change."""
    CHANGES[function.__name__] = function
    return function


@functools.cache
def values_of(name: str) -> dict[str, dict[str, Any]]:
    """What the demo of a sheet computes to."""
    return Book(templates.build(name, demo=True)).values()


def write(workbook: Any, values: dict[str, dict[str, Any]], path: Path) -> Path:
    """Save a workbook with these values stored."""
    workbook.save(path)
    kept = {title: cells for title, cells in values.items() if title in workbook.sheetnames}
    path.write_bytes(package.with_values(path.read_bytes(), kept))
    return path


def changed(sheet: str, names: Sequence[str], seed: int, path: Path) -> list[tuple[str, str]]:
    """Write the demo of a sheet with these changes; the class and the cell of each."""
    workbook = templates.build(sheet, demo=True)
    values = {title: dict(cells) for title, cells in values_of(sheet).items()}
    draw = random.Random(f"{sheet} {names} {seed}")
    found = [CHANGES[name](workbook, draw, values) for name in names]
    write(workbook, values, path)
    return found


def cells(workbook: Any, wanted: Callable[[Any], bool]) -> list[Any]:
    return [
        cell
        for sheet in workbook.worksheets
        for cell in sheet._cells.values()
        if not isinstance(cell, MergedCell) and cell.value is not None and wanted(cell)
    ]


def place(cell: Any) -> str:
    return f"{cell.parent.title}!{cell.coordinate}"


def is_formula(cell: Any) -> bool:
    return cell.data_type == "f" and isinstance(cell.value, str)


def is_label(cell: Any) -> bool:
    return cell.data_type == "s" and cell.protection.locked and len(str(cell.value)) > 3


def reformulated(workbook: Any, draw: random.Random, pattern: str, new: str) -> str:
    """One formula, drawn, with the first match outside texts replaced; its cell."""

    def parts(cell: Any) -> list[str]:
        return re.split(r'("[^"]*")', cell.value)

    def matches(cell: Any) -> bool:
        return is_formula(cell) and any(re.search(pattern, part) for part in parts(cell)[::2])

    cell = draw.choice(cells(workbook, matches))
    pieces = parts(cell)
    for at in range(0, len(pieces), 2):
        if re.search(pattern, pieces[at]):
            pieces[at] = re.sub(pattern, new, pieces[at], count=1)
            break
    cell.value = "".join(pieces)
    return place(cell)


@change
def formula_replaced_by_its_value(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    cell = draw.choice(cells(workbook, is_formula))
    where = place(cell)
    value = values[cell.parent.title].pop(cell.coordinate)
    cell.value = value.text if isinstance(value, ErrorKind) else value
    # an empty text cannot be pasted as a value: the cell is then empty
    return "formula emptied" if value in ("", None) else "formula replaced by a value", where


@change
def limit_loosened(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """A number in a formula of the checks or of what they use."""
    pattern = r"(?<![A-Za-z_$0-9.!'])([1-9][0-9]*)(?![A-Za-z_$0-9.!'(:])"
    return "changed number", reformulated(workbook, draw, pattern, r"\g<1>9")


@change
def limit_in_a_table_loosened(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    cell = draw.choice(
        cells(workbook, lambda c: isinstance(c.value, (int, float)) and c.protection.locked)
    )
    cell.value = cell.value * 1.25 if cell.value else 1.0
    return "changed number", place(cell)


@change
def sign_changed(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    where = reformulated(workbook, draw, r"(?<=[A-Za-z0-9_)])-(?=[A-Za-z(])", "+")
    return "changed sign", where


@change
def comparison_reversed(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """In a check's result."""
    title, area = next(iter(workbook.defined_names["check_results"].destinations))
    cell = draw.choice([c for (c,) in workbook[title][area] if is_formula(c)])
    old, new = ("<=", ">=") if "<=1" in cell.value else (">=", "<=")
    cell.value = cell.value.replace(f"12){old}1", f"12){new}1", 1)
    return "reversed comparison", place(cell)


@change
def unit_cell_edited(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """To a unit that the input does not offer."""
    names = [name for name in workbook.defined_names if name.startswith("unit_of_")]
    name = draw.choice(
        [n for n in names if f"value_of_{n.removeprefix('unit_of_')}" in workbook.defined_names]
    )
    title, area = next(iter(workbook.defined_names[name].destinations))
    workbook[title][area][0][0].value = "furlong"
    value = workbook.defined_names[f"value_of_{name.removeprefix('unit_of_')}"]
    title, area = next(iter(value.destinations))
    return "missing input", f"{title}!{area.replace('$', '').split(':')[0]}"


@change
def unit_label_edited(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    units = {"s", "A", "V", "W", "J", "ohm", "Ω", "Hz", "F", "H", "K", "°C"}
    cell = draw.choice(cells(workbook, lambda c: c.value in units and c.protection.locked))
    cell.value = "k" + cell.value
    return "changed unit", place(cell)


@change
def label_edited(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    cell = draw.choice(cells(workbook, lambda c: is_label(c) and " " in c.value))
    cell.value = cell.value.replace(" ", " not ", 1)
    return "changed label", place(cell)


@change
def row_deleted(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    sheet = workbook["Entries"]
    last = max(row for row, _ in sheet._cells)
    row = draw.randrange(4, last - 2)
    sheet.delete_rows(row)
    return "row deleted", f"Entries!A{row}"


@change
def row_hidden(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    row = draw.randrange(6, workbook[MAIN].max_row)
    workbook[MAIN].row_dimensions[row].hidden = True
    return "hidden row", f"{MAIN}!A{row}"


@change
def worksheet_hidden(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    sheet = draw.choice(workbook.worksheets[1:])
    sheet.sheet_state = draw.choice(["hidden", "veryHidden"])
    return "hidden worksheet", sheet.title


@change
def white_text(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    cell = draw.choice(cells(workbook, lambda c: c.fill.fill_type is None))
    cell.font = Font(name=cell.font.name, sz=cell.font.sz, color="FFFFFF")
    return "hidden text", place(cell)


@change
def name_changed(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    name = draw.choice(sorted(workbook.defined_names))
    workbook.defined_names[name].attr_text = "'Calc sheet'!$A$1:$A$1"
    return "changed name", name


@change
def value_pasted_over(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """The value that the file shows, without the formula being touched."""
    numbers = [
        (title, address)
        for title, kept in values.items()
        for address, value in kept.items()
        if isinstance(value, float) and value
    ]
    title, address = draw.choice(numbers)
    names = workbook.defined_names.items()
    differences = {n.attr_text.replace("$", "") for name, n in names if name.endswith("_diff")}
    while any(f"{address}:" in text for text in differences):
        title, address = draw.choice(numbers)
    values[title][address] += 2 * max(abs(v) for v in values[title].values() if _number(v))
    return "stale or overwritten value", f"{title}!{address}"


def _number(value: Any) -> bool:
    return isinstance(value, float)


@change
def number_turned_to_text(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    def typed(cell: Any) -> bool:
        return not cell.protection.locked and isinstance(cell.value, (int, float))

    cell = draw.choice(cells(workbook, typed))
    cell.value = str(cell.value)
    cell.data_type = "s"
    return "number turned to text", place(cell)


@change
def manual_calculation(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """With values that are stale."""
    workbook.calculation.calcMode = "manual"
    return "manual calculation", ""


@change
def worksheet_that_shadows_a_name(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    added = workbook.create_sheet("Notes")
    added["A1"] = 1.0
    name = draw.choice(sorted(workbook.defined_names))
    where = draw.choice(workbook.worksheets[:-1])
    where.defined_names[name] = DefinedName(name, attr_text="Notes!$A$1:$A$1")
    return "added name", f"{where.title}!{name}"


@change
def worksheet_added(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    workbook.create_sheet("Notes")["A1"] = "a note"
    return "added worksheet", "Notes"


@change
def conditional_format_recoloured(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    """A format that shows FAIL as it shows PASS."""
    formats = [
        (entry, rule)
        for entry in workbook[MAIN].conditional_formatting
        for rule in entry.rules
        if '"FAIL"' in "".join(rule.formula)
    ]
    entry, rule = draw.choice(formats)
    passed = next(r for r in entry.rules if '"PASS"' in "".join(r.formula))
    rule.dxf = DifferentialStyle(font=passed.dxf.font, fill=passed.dxf.fill)
    first = str(entry.sqref).split(":")[0]
    return "changed conditional format", f"{MAIN}!{first}"


@change
def formula_behind_a_label(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    cell = draw.choice(cells(workbook, is_label))
    text = str(cell.value).replace('"', '""')[:200]
    cell.value = f'="{text}"&IF(1>2,"x","")'
    return "formula in place of a label", place(cell)


@change
def formula_in_an_input_cell(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    def typed(cell: Any) -> bool:
        return not cell.protection.locked and isinstance(cell.value, (int, float))

    cell = draw.choice(cells(workbook, typed))
    cell.value = f"={cell.value}+0"
    cell.data_type = "f"
    return "formula in an input cell", place(cell)


@change
def protection_removed(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    sheet = draw.choice(workbook.worksheets)
    sheet.protection.sheet = False
    return "protection", sheet.title


@change
def validation_removed(workbook: Any, draw: Any, values: Any) -> tuple[str, str]:
    rules = workbook[MAIN].data_validations.dataValidation
    rule = draw.choice(rules)
    rules.remove(rule)
    return "changed validation", f"{MAIN}!{str(rule.sqref).split(':')[0].split(' ')[0]}"
