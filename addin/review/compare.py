"""What changed between two revisions of a calc sheet: both computed anew, then held together."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from openpyxl import Workbook
from rich.console import Console
from rich.markup import escape
from rich.table import Table

from tausheet.addin import files
from tausheet.addin.cells import CellValue
from tausheet.addin.review import canonical, fingerprint
from tausheet.addin.review.workbook_file import WorkbookFile
from tausheet.functions.errors import ErrorKind, TausheetError
from tausheet.templates import style

GROUPS = ("verdict", "check", "margin", "input", "result", "formula", "other cell", "name")
"""What is compared, in the order of the report."""
MOST_ROWS = 80
"""Rows of the table on the terminal; --json and the workbook have all."""
_INPUT = re.compile(r"(values?|unit|lowest|highest|source)_of_")
_HEADING = ("doc_number", "doc_title", "project", "revision", "status")


class NotCompared(TausheetError):
    """Two workbooks that cannot be held together."""


@dataclass(frozen=True)
class Change:
    """One thing that differs; `difference` is a number where both are."""

    group: str
    what: str
    old: CellValue
    new: CellValue
    difference: float | None = None
    relative: float | None = None


@dataclass(frozen=True)
class Compared:
    """Two revisions and what changed from the old to the new."""

    old: Path
    new: Path
    changes: list[Change]

    def as_dict(self) -> dict[str, Any]:
        """For machines."""
        changes = [{k: _plain(v) for k, v in asdict(change).items()} for change in self.changes]
        return {"old": str(self.old), "new": str(self.new), "changes": changes}


def compare(old: Path, new: Path) -> Compared:
    """Everything that differs; both files stay as they are."""
    sides = _Side(old), _Side(new)
    if not (sides[0].named.keys() & sides[1].named.keys()):
        raise NotCompared(f"{old} and {new} have no name in common: they are not one calc sheet")
    found = [*_named(*sides), *_cells(*sides), *_names(*sides)]
    return Compared(old, new, sorted(found, key=lambda change: GROUPS.index(change.group)))


class _Side:
    """One of the two workbooks."""

    def __init__(self, path: Path) -> None:
        self.file = WorkbookFile(path)
        self.values = self.file.computed
        if self.file.failed:
            raise NotCompared(f"{path} cannot be computed: {self.file.refusal}")
        self.workbook = self.file.workbook
        self.named = {
            name: places
            for name in self.workbook.defined_names
            if (places := fingerprint.places_of(self.workbook, name))
        }
        self.formulas: dict[str, str] = {}
        self.constants: dict[str, CellValue] = {}
        called = {places[0]: n for n, places in self.named.items() if len(places) == 1}
        for sheet in self.workbook.worksheets:
            filled = fingerprint.filled_by_blocks(sheet)
            for place, cell in sheet._cells.items():
                if cell.value is None or place in filled:
                    continue
                where = (sheet.title, cell.coordinate)
                said = canonical.content(cell)
                if said.startswith(("formula ", "block ")):
                    self.formulas[called.get(where, "!".join(where))] = said.partition(" ")[2]
                elif where not in called:
                    self.constants["!".join(where)] = cell.value
        for name, places in self.named.items():  # what has a name is compared under it
            if _INPUT.match(name) or name.startswith("sealed_"):
                for title, address in places:
                    self.constants.pop(f"{title}!{address}", None)

    def value(self, place: tuple[str, str]) -> CellValue:
        """What a cell gives: computed where it holds a formula."""
        title, address = place
        computed = self.values.get(title, {})
        return computed[address] if address in computed else self.workbook[title][address].value

    def checks(self) -> dict[str, tuple[CellValue, CellValue, CellValue, CellValue]]:
        """Value, limit, margin and result of every check, by its name."""
        columns = [
            [self.value(place) for place in self.named.get(f"check_{part}", [])]
            for part in ("names", "values", "limits", "margins", "results")
        ]
        rows = zip(*columns, strict=False)
        return {str(name): tuple(rest) for name, *rest in rows if name}


def _named(old: _Side, new: _Side) -> Iterator[Change]:
    yield from _change("verdict", "verdict", _single(old, "verdict"), _single(new, "verdict"))
    yield from _change(
        "verdict", "decided by", _single(old, "decided_by"), _single(new, "decided_by")
    )
    before, after = old.checks(), new.checks()
    for name in dict.fromkeys((*before, *after)):
        a, b = before.get(name, (None,) * 4), after.get(name, (None,) * 4)
        for part, i in (("value used", 0), ("limit", 1), ("result", 3)):
            yield from _change("check", f"{name}: {part}", a[i], b[i])
        yield from _change("margin", name, a[2], b[2])
    skipped = ("check_", "sealed_", "remark_on_", "verdict", "decided_by")
    for name in dict.fromkeys((*old.named, *new.named)):
        if name.startswith(skipped) or name.endswith("_diff"):
            continue
        one, other = old.named.get(name, []), new.named.get(name, [])
        if _INPUT.match(name) or name in _HEADING:
            rows = range(max(len(one), len(other)))
            for i in rows:
                what = name if len(rows) == 1 else f"{name} {i + 1}"
                values = [
                    side.value(places[i]) if i < len(places) else None
                    for side, places in ((old, one), (new, other))
                ]
                yield from _change("input", what, *values)
        elif (name in old.formulas or name in new.formulas) and len(one) <= 1 >= len(other):
            yield from _change("result", name, _single(old, name), _single(new, name))


def _cells(old: _Side, new: _Side) -> Iterator[Change]:
    for where in dict.fromkeys((*old.formulas, *new.formulas)):
        yield from _change("formula", where, old.formulas.get(where), new.formulas.get(where))
    for where in dict.fromkeys((*old.constants, *new.constants)):
        yield from _change("other cell", where, old.constants.get(where), new.constants.get(where))


def _names(old: _Side, new: _Side) -> Iterator[Change]:
    both = [
        {n: canonical.reference(d.attr_text or "") for n, d in side.workbook.defined_names.items()}
        for side in (old, new)
    ]
    for name in dict.fromkeys((*both[0], *both[1])):
        yield from _change("name", name, both[0].get(name), both[1].get(name))


def _single(side: _Side, name: str) -> CellValue:
    places = side.named.get(name, [])
    return side.value(places[0]) if places else None


def _change(group: str, what: str, old: CellValue, new: CellValue) -> Iterator[Change]:
    if canonical.constant(old if old is not None else "") == canonical.constant(
        new if new is not None else ""
    ):
        return
    numbers = [v for v in (old, new) if isinstance(v, (int, float)) and not isinstance(v, bool)]
    if len(numbers) < 2:
        yield Change(group, what, old, new)
        return
    a, b = map(float, numbers)
    if group in ("result", "margin") and math.isclose(a, b, rel_tol=1e-12, abs_tol=1e-300):
        return
    yield Change(group, what, a, b, b - a, (b - a) / abs(a) if a else None)


def report(console: Console, compared: Compared) -> None:
    """A table of what changed."""
    console.print(f"from {escape(str(compared.old))} to {escape(str(compared.new))}", style="bold")
    if not compared.changes:
        console.print("nothing differs in inputs, results, verdicts, margins, formulas or labels")
        return
    table = Table(box=None, pad_edge=False)
    for heading in ("", "what", "old", "new", "difference"):
        table.add_column(heading, overflow="fold")
    for change in compared.changes[:MOST_ROWS]:
        row = (change.group, change.what, shown(change.old), shown(change.new), apart(change))
        table.add_row(*map(escape, row))
    console.print(table)
    left = len(compared.changes) - MOST_ROWS
    if left > 0:
        console.print(f"... and {left} more; --json and -o list all")


def write(compared: Compared, out: Path, *, force: bool = False) -> None:
    """The same table as a workbook for the revision file."""
    if out.suffix.lower() != ".xlsx":
        raise NotCompared(f"{out} does not end in .xlsx; what is written is a plain workbook")
    workbook = Workbook()
    sheet: Any = workbook.active
    sheet.title = "Changes"
    sheet["A1"] = "What changed between two revisions"
    sheet["A1"].font = style.font(11, bold=True, colour=style.DEEP)
    for row, (label, path) in enumerate((("old", compared.old), ("new", compared.new)), start=2):
        _text(sheet.cell(row, 1), label)
        _text(sheet.cell(row, 2), str(path))
    headings = ("group", "what", "old", "new", "difference", "relative")
    for column, heading in enumerate(headings, start=1):
        cell = sheet.cell(5, column, heading)
        cell.font, cell.border = style.font(10, bold=True), style.RULE
        sheet.column_dimensions["ABCDEF"[column - 1]].width = (12, 36, 34, 34, 16, 12)[column - 1]
    for row, change in enumerate(compared.changes, start=6):
        for column, name in enumerate(("group", "what", "old", "new"), start=1):
            _text(sheet.cell(row, column), getattr(change, name))
        sheet.cell(row, 5, change.difference)
        sheet.cell(row, 6, change.relative).number_format = "0.00%"
    sheet.freeze_panes = "A6"
    sheet.print_title_rows = "5:5"
    sheet.page_setup.orientation, sheet.page_setup.paperSize = "landscape", 9
    sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    with files.replacing(out, force=force) as temporary:
        workbook.save(temporary)


def _text(cell: Any, value: CellValue) -> None:
    """Put a value into a cell; a text is never taken for a formula."""
    plain = _plain(value)
    cell.value = plain[:32_000] if isinstance(plain, str) else plain
    if isinstance(plain, str):
        cell.data_type, cell.quotePrefix = "s", plain[:1] in tuple("=+-@'")
    cell.alignment = style.align(wrap=True, vertical="top")


def shown(value: CellValue, most: int = 60) -> str:
    """A value as the table shows it."""
    if value is None:
        return "(blank)"
    if isinstance(value, float):
        return f"{value:.6g}"
    text = str(_plain(value))
    return text if len(text) <= most else text[: most - 3] + "..."


def apart(change: Change) -> str:
    """A difference as the table shows it, relative beside absolute."""
    if change.difference is None:
        return ""
    share = "" if change.relative is None else f" ({100 * change.relative:+.3g} %)"
    return f"{change.difference:+.4g}{share}"


def _plain(value: Any) -> Any:
    return value.text if isinstance(value, ErrorKind) else value
