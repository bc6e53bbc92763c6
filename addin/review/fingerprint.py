"""The fingerprint: a hash of what a calc sheet says, which its record and footer carry.

It covers labels, formulas, limits, inputs at 15 digits, and the results when it was sealed. It
does not cover status, sign-off, revisions and the last verification, which change afterwards, nor
any look. It shows a change that nobody recorded; it is no signature, since anyone can seal again.
"""

from __future__ import annotations

import hashlib
import math
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

from openpyxl.utils import get_column_letter, range_boundaries
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin.cells import CellValue
from tausheet.addin.review import canonical
from tausheet.functions.errors import ErrorKind

Values = Mapping[str, Mapping[str, CellValue]]
Place = tuple[str, str]
"""Worksheet and address."""

NOT_SEALED = "not sealed"
CLOSENESS = 1e-12
"""Relative; within it a result is the one that was sealed."""
_OUTSIDE = re.compile(
    r"status|fingerprint|last_verified|(prepared|checked|approved)_(by|on|signature)"
    r"|revision_[0-9]+_(number|change|by|date)"
)
_DIGITS = 32


@dataclass(frozen=True)
class Departure:
    """Something that is not as it was sealed."""

    cell: str
    found: str
    sealed: str


def is_sealed(workbook: Any) -> bool:
    """Whether the record of a calc sheet carries a fingerprint."""
    return written(workbook) not in ("", NOT_SEALED)


def written(workbook: Any) -> str:
    """The fingerprint in the record, "not sealed", or "" where there is no record."""
    places = places_of(workbook, "fingerprint")
    return str(workbook[places[0][0]][places[0][1]].value or "") if places else ""


def departures(workbook: Any, computed: Values) -> list[Departure]:
    """What differs from the sealed calc sheet; `computed` are its formulas' values now."""
    record = "!".join(places_of(workbook, "fingerprint")[0])
    found = [
        Departure("!".join(place), _shown(kept(value)), _shown(sealed))
        for _, place, sealed, value in _results(workbook, computed)
        if not _alike(sealed, kept(value))
    ]
    counted = fingerprint(workbook)
    if counted != written(workbook):
        found.insert(0, Departure(record, counted, written(workbook)))
    return found


def fingerprint(workbook: Any) -> str:
    """The hash of a calc sheet, in groups of four."""
    digest = hashlib.sha256()
    for line in _lines(workbook):
        digest.update(line.encode() + b"\0")
    digits = digest.hexdigest()[:_DIGITS]
    return " ".join(digits[at : at + 4] for at in range(0, _DIGITS, 4))


def block(workbook: Any, computed: Values) -> dict[Place, CellValue]:
    """The results to be stored when the sheet is sealed, by the cell that takes each."""
    cells = places_of(workbook, "sealed_results")
    rows = _results(workbook, computed)
    return {cell: kept(value) for cell, (_, _, _, value) in zip(cells, rows, strict=True)}


def kept(value: CellValue) -> CellValue:
    """A result as the block stores it, which every spreadsheet program saves alike."""
    if isinstance(value, ErrorKind):
        return f"error {value.text}"
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, (int, float)):
        return to_15_digits(float(value))
    return value or "(empty)"


def to_15_digits(number: float) -> float:
    """The number that is left when a spreadsheet program has saved 15 digits."""
    return float(f"{number:.15g}") + 0.0


def filled_by_blocks(sheet: Any) -> set[tuple[int, int]]:
    """Row and column of the cells that an array formula in another cell fills."""
    filled: set[tuple[int, int]] = set()
    for place, cell in sheet._cells.items():
        if isinstance(cell.value, ArrayFormula):
            edges: Any = range_boundaries(cell.value.ref)
            left, top, right, bottom = edges
            filled |= {(r, c) for r in range(top, bottom + 1) for c in range(left, right + 1)}
            filled.discard(place)
    return filled


def places_of(workbook: Any, name: str) -> list[Place]:
    """The cells that a defined name stands for; [] where there is no such name."""
    defined = workbook.defined_names.get(name)
    try:
        ((title, reference),) = defined.destinations
        edges: Any = range_boundaries(reference)
        left, top, right, bottom = edges
    except (AttributeError, ValueError, TypeError):
        return []
    if title not in workbook.sheetnames or None in (left, top, right, bottom):
        return []
    return [
        (title, f"{get_column_letter(column)}{row}")
        for row in range(top, bottom + 1)
        for column in range(left, right + 1)
    ]


def _lines(workbook: Any) -> Iterator[str]:
    outside = {
        place
        for name in workbook.defined_names
        if _OUTSIDE.fullmatch(name)
        for place in places_of(workbook, name)[:1]  # a name stretched over more hides nothing
    }
    for name in sorted(workbook.defined_names, key=str.casefold):
        target = canonical.reference(workbook.defined_names[name].attr_text or "")
        yield f"name {name.casefold()} {target}"
    for sheet in workbook.worksheets:
        yield f"worksheet {sheet.title}"
        computed = filled_by_blocks(sheet)
        for place, cell in sorted(sheet._cells.items()):
            if cell.value is None or place in computed:
                continue
            if (sheet.title, cell.coordinate) not in outside:
                yield f"{cell.coordinate} {canonical.content(cell)}"


def _results(workbook: Any, computed: Values) -> Iterator[tuple[str, Place, CellValue, CellValue]]:
    """Name, cell, sealed value and value now of every result."""
    cells = places_of(workbook, "sealed_results")
    for (title, address), sealed in zip(places_of(workbook, "sealed_names"), cells, strict=True):
        name = str(workbook[title][address].value)
        place = next(iter(places_of(workbook, name)), ("", name))
        value = computed.get(place[0], {}).get(place[1])
        yield name, place, workbook[sealed[0]][sealed[1]].value, value


def _alike(one: CellValue, other: CellValue) -> bool:
    if isinstance(one, (int, float)) and isinstance(other, (int, float)):
        return math.isclose(one, other, rel_tol=CLOSENESS)
    return one == other


def _shown(value: CellValue) -> str:
    return f"{value:.15g}" if isinstance(value, float) else str(value)
