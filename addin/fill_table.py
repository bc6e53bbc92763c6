"""The table of `tausheet fill`, read with suspicion, a row at a time."""

from __future__ import annotations

import csv
import hashlib
import json
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from tausheet import templates
from tausheet.functions import version
from tausheet.functions.errors import TausheetError
from tausheet.templates import values

LONGEST_FIELD = 10_000
"""Characters of one field of a table; more is no value of a calc sheet."""
MOST_COLUMNS = 2_000


class NotFilled(TausheetError):
    """A table or a folder that cannot be used."""


@dataclass(frozen=True)
class Row:
    """One row of the table: its line in the file, and what it gives or why it gives nothing."""

    line: int
    given: dict[str, str]
    fault: str = ""

    def digest(self, name: str) -> str:
        """What tells this row, made by this version, from any other."""
        content = json.dumps([version(), name, self.given], sort_keys=True, ensure_ascii=False)
        return hashlib.sha256(content.encode("utf-8", "surrogatepass")).hexdigest()


def read_rows(name: str, table: Path) -> Iterator[Row]:
    """The rows of a table one by one; NotFilled where the table as a whole cannot be used."""
    csv.field_size_limit(LONGEST_FIELD)
    try:
        with table.open(encoding="utf-8-sig", newline="") as file:
            first = file.readline(LONGEST_FIELD * 10)
            file.seek(0)
            comma = ";" if first.count(";") > first.count(",") else ","
            reader = csv.reader(file, delimiter=comma, strict=True)
            heading = [cell.strip() for cell in next(reader, [])]
            _check_heading(name, table, heading)
            while True:
                line = reader.line_num + 1
                try:
                    cells = next(reader)
                except StopIteration:
                    return
                except csv.Error as error:
                    yield Row(line, {}, f"it cannot be read ({error})")
                    continue
                if any(cell.strip() for cell in cells):
                    yield _row(line, heading, cells)
    except UnicodeDecodeError:
        raise NotFilled(f"{table} is not UTF-8 text; save it as CSV in UTF-8") from None
    except (OSError, csv.Error) as error:
        raise NotFilled(f"{table} cannot be read as a table: {error}") from None


def _check_heading(name: str, table: Path, heading: list[str]) -> None:
    if not any(heading):
        raise NotFilled(f"{table} has no heading row; it needs one with symbols of {name}")
    if len(heading) > MOST_COLUMNS:
        raise NotFilled(f"{table} has {len(heading)} columns; at most {MOST_COLUMNS} are read")
    twice = next((cell for cell in heading if heading.count(cell) > 1), None)
    if twice is not None:
        raise NotFilled(f'{table} has the column "{twice[:40]}" twice; keep one of them')
    try:
        # a blank value is allowed everywhere, so this tells unknown columns alone
        templates.check_keys(name, heading)
    except values.ValueRefused as error:
        raise NotFilled(f"{table}: {error}") from None


def _row(line: int, heading: list[str], cells: list[str]) -> Row:
    if len(cells) != len(heading):
        return Row(line, {}, f"it has {len(cells)} fields where the heading has {len(heading)}")
    if any("\0" in cell for cell in cells):
        return Row(line, {}, "it holds a NUL character")
    texts = (cell.strip() for cell in cells)
    return Row(line, {key: text for key, text in zip(heading, texts, strict=True) if text})
