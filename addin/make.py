"""Makes calc sheets: built, computed, values stored, put into place whole."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from openpyxl.utils import range_boundaries

from tausheet import templates
from tausheet.addin import files, package
from tausheet.addin.cells import CellValue
from tausheet.addin.recalc import Values, engine_named
from tausheet.functions.errors import ErrorKind, TausheetError


@dataclass(frozen=True)
class Said:
    """What a calc sheet says."""

    verdict: str
    decided_by: str
    checks: list[tuple[str, str, str, str]]
    """Criterion, value used, limit, PASS or FAIL."""


@dataclass(frozen=True)
class Made(Said):
    """A calc sheet that was made, and what it says."""

    path: Path
    title: str


class NotMade(TausheetError):
    """A calc sheet that was not made."""


def make_sheet(
    name: str,
    out: Path,
    given: Mapping[str, str | float | None],
    *,
    demo: bool = False,
    force: bool = False,
    engine: str = "embedded",
) -> Made:
    """Build a calc sheet, compute it, store the values and put the file into place."""
    _refuse(out, force)
    workbook = templates.build(name, given, demo=demo)
    values = _write(workbook, out, force, engine)
    return Made(**vars(said(workbook, values)), path=out, title=templates.SHEETS[name].title)


def make_index(out: Path, *, force: bool = False, engine: str = "embedded") -> tuple[int, int]:
    """The workbook of all cell functions; how many results agree, and of how many."""
    from tausheet.templates import index, writer_index

    _refuse(out, force)
    workbook = writer_index.build()
    said = named(workbook, _write(workbook, out, force, engine), "agreements")
    return said.count(writer_index.AGREES), len(index.EXAMPLES)


def _refuse(out: Path, force: bool) -> None:
    if out.suffix.lower() != ".xlsx":
        raise NotMade(f"{out} does not end in .xlsx; what is made is a plain workbook")
    files.refuse_existing(out, force=force)


def _write(workbook: Any, out: Path, force: bool, engine: str) -> Values:
    """Compute a workbook, store the values and put the file into place whole."""
    with files.replacing(out, force=force) as temporary:
        workbook.save(temporary)
        if engine == "embedded":
            from tausheet.addin.embedded import Book

            values = Book(workbook).values()
        else:
            values = engine_named(engine)(temporary)
        temporary.write_bytes(package.with_values(temporary.read_bytes(), values))
    return values


def said(workbook: Any, values: Values) -> Said:
    """What a computed calc sheet says, read from its workbook and its values."""

    def column(name: str) -> list[str]:
        return [_shown(value) for value in named(workbook, values, name)]

    checks = [
        (criterion, value, limit, result)
        for criterion, value, limit, result in zip(
            *map(column, ("check_names", "check_values", "check_limits", "check_results")),
            strict=True,
        )
        if criterion
    ]
    return Said(column("verdict")[0], column("decided_by")[0], checks)


def named(workbook: Any, values: Values, name: str) -> list[CellValue]:
    """The cell values that a defined name stands for."""
    ((sheet, reference),) = workbook.defined_names[name].destinations
    left, top, right, bottom = range_boundaries(reference)
    found = []
    for row in workbook[sheet].iter_rows(top, bottom, left, right):
        for cell in row:
            found.append(values[sheet].get(cell.coordinate, cell.value))
    return found


def _shown(value: CellValue) -> str:
    if isinstance(value, ErrorKind):
        return value.text
    return "" if value is None else str(value)


def make_demo(folder: Path, *, force: bool = False) -> Iterator[Made]:
    """The calc sheets of the demo job, one a file, each made as it is asked for.

    What would be overwritten is refused at once, before the first.
    """
    outs = {name: folder / f"quay-4-{name}.xlsx" for name in templates.SHEETS}
    for out in outs.values():
        files.refuse_existing(out, force=force)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise NotMade(f"the folder {folder} cannot be made: {error.strerror}") from None
    return (make_sheet(name, out, {}, demo=True, force=force) for name, out in outs.items())
