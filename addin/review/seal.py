"""Seals a calc sheet: the fingerprint goes into its record and its footer, nothing else changes."""

from __future__ import annotations

import io
import re
import zipfile
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape, unescape

from tausheet.addin import files, package
from tausheet.addin.cells import CellValue
from tausheet.addin.embedded.book import Book, workbook_of
from tausheet.addin.review import fingerprint
from tausheet.addin.review.verify import verify
from tausheet.functions import version
from tausheet.functions.errors import TausheetError

MEANING = "It shows a change that nobody recorded; it is no signature."
_FOOTER = re.compile(rb"(<oddFooter[^>]*>)([^<]*)(</oddFooter>)")
_MARK = re.compile(r"&C(?:&\"[^\"]*\")?(?:&8)? ?fingerprint [0-9a-f ]*")

Cells = dict[str, dict[str, CellValue]]


class NotSealed(TausheetError):
    """A workbook that was not sealed; it is as it was."""


@dataclass(frozen=True)
class Sealed:
    """A calc sheet that was sealed."""

    path: Path
    fingerprint: str
    rounded: list[str]
    """Cells whose number had more than 15 digits, of which 15 were kept."""

    def __str__(self) -> str:
        """What the one who sealed it should know."""
        lines = [f"{self.path}: sealed", f"fingerprint {self.fingerprint}"]
        if self.rounded:
            lines.append(
                f"{len(self.rounded)} numbers had more than the 15 digits that every spreadsheet "
                "program keeps, and were rounded to them"
            )
        return "\n".join([*lines, MEANING])


def seal(path: Path) -> Sealed:
    """Write the fingerprint of a calc sheet that verifies."""
    data = package.read(path)
    workbook = workbook_of(path, data)
    if not fingerprint.written(workbook) or not fingerprint.places_of(workbook, "sealed_results"):
        raise NotSealed(
            f"{path} is no calc sheet with a place for a fingerprint; make one with `tausheet new`"
        )
    refuse_what_does_not_verify(path)
    rounded = _long_numbers(workbook)
    data = package.with_values(data, {}, rounded)
    workbook = workbook_of(path, data)
    values = Book(workbook).values()
    today = f"{date.today().isoformat()}, with tausheet {version()}"
    cells: Cells = {}
    for (title, address), value in fingerprint.block(workbook, values).items():
        cells.setdefault(title, {})[address] = value
    _put(workbook, cells, "last_verified", today)
    data = package.with_values(data, values, cells)
    counted = fingerprint.fingerprint(workbook_of(path, data))
    record: Cells = {}
    _put(workbook, record, "fingerprint", counted)
    data = _with_footer(package.with_values(data, {}, record), workbook.sheetnames[0], counted)
    with files.replacing(path, force=True) as temporary:
        temporary.write_bytes(data)
    changed = [f"{title}!{address}" for title, found in rounded.items() for address in found]
    return Sealed(path, counted, changed)


def refuse_what_does_not_verify(path: Path) -> None:
    """Refuse with the first thing that `tausheet verify` finds, an older seal aside."""
    counted = [f for f in verify(path).findings if f.counts and f.kind != "broken fingerprint"]
    if counted:
        first = counted[0]
        more = f", and {len(counted) - 1} more" if len(counted) > 1 else ""
        raise NotSealed(
            f"{path} was not sealed, since it does not verify: {first.kind} at {first.cell}, "
            f"{first.found} (expected: {first.expected}){more}; see `tausheet verify`"
        )


def _long_numbers(workbook: Any) -> Cells:
    """Numbers that LibreOffice would save with another last digit, as they would come back."""
    found: Cells = {}
    for sheet in workbook.worksheets:
        computed = fingerprint.filled_by_blocks(sheet)
        for place, cell in sheet._cells.items():
            value = cell.value
            if place in computed or not isinstance(value, float):
                continue
            if fingerprint.to_15_digits(value) != value:
                found.setdefault(sheet.title, {})[cell.coordinate] = fingerprint.to_15_digits(value)
    return found


def _put(workbook: Any, cells: Cells, name: str, value: CellValue) -> None:
    title, address = fingerprint.places_of(workbook, name)[0]
    cells.setdefault(title, {})[address] = value


def _with_footer(data: bytes, title: str, counted: str) -> bytes:
    """The fingerprint in the middle of the printed footer, in place of an older one."""
    with zipfile.ZipFile(io.BytesIO(data)) as parts:
        part = package.sheet_parts(parts)[title]
        xml = parts.read(part)
    found = _FOOTER.search(xml)
    if found is None:
        raise NotSealed(f"the worksheet {title} has lost its printed footer; make the sheet anew")
    text = _MARK.sub("", unescape(found[2].decode(), {"&quot;": '"'}))
    at = text.find("&R")
    at = len(text) if at < 0 else at
    text = f'{text[:at]}&C&"Arial,Regular"&8 fingerprint {counted}{text[at:]}'
    footer = found[1] + escape(text, {'"': "&quot;"}).encode() + found[3]
    return package.replaced(data, {part: xml[: found.start()] + footer + xml[found.end() :]})
