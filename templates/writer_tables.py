"""The worksheet "Tables": units, how results are shown, constants to look up, formed tables."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from openpyxl.utils import get_column_letter

from tausheet.functions.units import readable_unit, units_of
from tausheet.templates import style
from tausheet.templates.book import Book, measured, table_name
from tausheet.templates.formulas import cells_of, renamed
from tausheet.templates.model import Formed
from tausheet.templates.values import shown_unit

TOP = 4
"""First row of every table."""


def write(book: Book) -> None:
    """Write every table, one beside the other, and name its columns."""
    sheet = book.tables
    sheet["A1"] = "Tables that the formulas look things up in"
    sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
    place = 1
    for quantity in measured(book.sheet):
        place = _units(book, quantity, place)
        place = _shown(book, quantity, place)
    for table in book.sheet.tables:
        columns = [
            (f"{table.name}_{c.name}", f"{table.name}: {c.heading}", c.values)
            for c in table.columns
        ]
        place = _columns(book, columns, place)
    for formed in book.sheet.formed:
        place = _formed(book, formed, place)


def spellings(unit: str) -> list[str]:
    """The ways in which a unit may be typed; capitals count."""
    shown = shown_unit(unit)
    return list(
        dict.fromkeys(
            (
                shown,
                unit,
                shown.replace("\u00b5", "\u03bc"),
                shown.replace("Ω", "\u2126"),
                shown.replace("\u00b5", "\u03bc").replace("Ω", "\u2126"),
                shown.replace("\u00b5", "u"),
            )
        )
    )


def ratio(size: float) -> tuple[float, float]:
    """A unit's size as two whole numbers, so that a conversion rounds but once."""
    return (float(round(size)), 1.0) if size >= 1 else (1.0, float(round(1 / size)))


def _units(book: Book, quantity: str, place: int) -> int:
    """The units of a quantity in every spelling, each with its size in base SI as a ratio."""
    rows = [
        (spelling, *ratio(size))
        for unit, size in units_of(quantity).items()
        for spelling in spellings(unit)
    ]
    names, over, under = zip(*rows, strict=True)
    return _columns(
        book,
        [
            (table_name("unit", quantity), f"{quantity}: unit", names),
            (table_name("over", quantity), "x", over),
            (table_name("under", quantity), "/", under),
        ],
        place,
    )


def _shown(book: Book, quantity: str, place: int) -> int:
    """From which size on a result is shown in which unit."""
    rows = []
    for unit, size in units_of(quantity).items():
        for start in (size, 10 * size):
            if readable_unit(start, quantity) == unit:
                rows.append((start, shown_unit(unit), *ratio(size)))
                break
    rows.sort()
    starts, names, over, under = zip(*rows, strict=True)
    return _columns(
        book,
        [
            (table_name("from", quantity), f"{quantity}: shown from", (0.0, *starts[1:])),
            (table_name("show", quantity), "in", names),
            (table_name("shown_over", quantity), "x", over),
            (table_name("shown_under", quantity), "/", under),
        ],
        place,
    )


def _formed(book: Book, formed: Formed, place: int) -> int:
    """A table that formulas fill; numbers and texts alone are written as such."""
    letters = {column: get_column_letter(place + i) for i, column in enumerate(formed.columns)}
    blank = tuple(None for _ in formed.rows)
    end = _columns(
        book, [(f"{formed.name}_{at}", f"{formed.name}: {at}", blank) for at in letters], place
    )
    for row, column, text in cells_of(formed):
        beside = {f"here_{at}": f"{letter}{TOP + row}" for at, letter in letters.items()}
        above = {f"above_{at}": f"{letter}{TOP + row - 1}" for at, letter in letters.items()}
        book.tables[f"{letters[column]}{TOP + row}"] = _written(text, {**beside, **above})
    first, last = letters[formed.columns[0]], letters[formed.columns[-1]]
    book.define(formed.name, book.tables, f"{first}{TOP}", f"{last}{TOP + len(formed.rows) - 1}")
    return end


def _written(formula: str, cells: Mapping[str, str]) -> float | str:
    """What stands in a cell: a number or a text alone as it is, anything else as a formula."""
    if word := re.fullmatch(r'"([^"=]+)"', formula):
        return word[1]
    try:
        return float(formula)
    except ValueError:
        return "=" + renamed(formula, cells)


def _columns(
    book: Book, columns: Sequence[tuple[str, str, Sequence[float | str | None]]], place: int
) -> int:
    """Write columns side by side from a place on; the place of the next table."""
    sheet = book.tables
    for name, heading, values in columns:
        letter = get_column_letter(place)
        longest = max(len(str(text)) for text in (heading, *values))
        sheet.column_dimensions[letter].width = 4 + longest
        cell = sheet[f"{letter}{TOP - 1}"]
        cell.value = heading
        cell.font = style.font(10, bold=True)
        cell.border = style.RULE
        for row, value in enumerate(values, start=TOP):
            if value is not None:
                sheet[f"{letter}{row}"] = value
        book.define(name, sheet, f"{letter}{TOP}", f"{letter}{TOP + len(values) - 1}")
        place += 1
    return place + 1
