"""A workbook file as a package of parts: read with suspicion, changed only where values go.

A computed value is put beside its formula inside the sheet's XML, byte by byte; every other part
is copied as it is, compressed bytes included.
"""

from __future__ import annotations

import io
import lzma
import posixpath
import re
import struct
import zipfile
import zlib
from bisect import bisect_right
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any
from xml.etree.ElementTree import ParseError
from xml.parsers import expat
from xml.sax.saxutils import escape

from defusedxml import DefusedXmlException, ElementTree
from openpyxl.utils import range_boundaries

from tausheet.addin.cells import CellValue
from tausheet.functions.errors import ErrorKind, TausheetError

_Row = Mapping[str, CellValue]
Values = Mapping[str, _Row]

MOST_BYTES = 100_000_000
"""Unpacked size beyond which a workbook is not read: a calc sheet has about 1 MB."""
_MOST_PARTS = 5_000
MOST_ELEMENTS = 500_000
"""XML elements of all worksheets: the largest calc sheet has 150,000."""
_MOST_SPANNED = 200_000
"""Cells under merged blocks and links: readers visit each, and a block can name billions."""
_TARGET = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"
_OLD_FORMAT = b"\xd0\xcf\x11\xe0"


class Unreadable(TausheetError):
    """A file that is no workbook, or one that is not safe to read."""


_BROKEN = (
    *(zipfile.BadZipFile, zlib.error, lzma.LZMAError, struct.error, EOFError, OSError),
    *(NotImplementedError, RuntimeError, ValueError),
)
"""What zipfile raises for a package that is not whole."""


def read(path: Path) -> bytes:
    """The bytes of a workbook file, after a look at what they would unpack to."""
    try:
        if path.exists() and not path.is_file():
            raise Unreadable(f"{path} is not a file")
        size = path.stat().st_size
        if size > MOST_BYTES:
            raise Unreadable(f"{path} has {size} bytes, more than a workbook should")
        data = path.read_bytes()
    except OSError as error:
        raise Unreadable(f"{path} cannot be read: {error.strerror}") from None
    if data.startswith(_OLD_FORMAT):
        raise Unreadable(f"{path} is encrypted, or of the old .xls kind; save it as plain .xlsx")
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as package:
            _inspect(path, package)
            _check_sheets(path, package)
    except _BROKEN as error:
        raise Unreadable(f"{path} is not a whole .xlsx workbook ({error})") from None
    return data


def _inspect(path: Path, package: zipfile.ZipFile) -> None:
    parts = package.infolist()
    names = [part.filename for part in parts]
    if len(parts) > _MOST_PARTS or sum(part.file_size for part in parts) > MOST_BYTES:
        raise Unreadable(f"{path} would unpack to more than a workbook should")
    if len(set(names)) != len(names) or any(map(_leads_outside, names)):
        raise Unreadable(f"{path} has parts with doubtful names")
    if any(part.flag_bits & 1 for part in parts):
        raise Unreadable(f"{path} is encrypted")
    if not {"[Content_Types].xml", "xl/workbook.xml"} <= set(names):
        raise Unreadable(f"{path} is not an .xlsx workbook")
    left = MOST_BYTES
    for part in parts:
        with package.open(part) as stream:
            content = stream.read(left + 1)
        left -= len(content)
        if left < 0:
            raise Unreadable(f"{path} would unpack to more than a workbook should")
        if _declares(content):
            raise Unreadable(f"{path}: {part.filename} holds declarations that no workbook needs")


def _leads_outside(name: str) -> bool:
    steps = name.replace("\\", "/").split("/")
    return ".." in steps or steps[0] == "" or ":" in name


def _declares(content: bytes) -> bool:
    """Whether a part is XML with declarations, or in an encoding that could hide them.

    Whatever its name: which part holds what is said inside the package.
    """
    head = content.removeprefix(b"\xef\xbb\xbf").lstrip()[:4]
    wide = content[:2] in (b"\xff\xfe", b"\xfe\xff") or (b"<" in head and b"\0" in head)
    return wide or (head[:1] == b"<" and re.search(rb"<!(DOCTYPE|ENTITY)", content) is not None)


def _check_sheets(path: Path, package: zipfile.ZipFile) -> None:
    elements = spanned = 0

    def begin(name: str, attributes: dict[str, str]) -> None:
        nonlocal elements, spanned
        elements += 1
        if elements > MOST_ELEMENTS:
            raise Unreadable(f"{path} has more cells than a workbook of calculations should")
        if name.rpartition(":")[2] in ("mergeCell", "hyperlink"):
            spanned += _spanned(attributes.get("ref", "A1"))
            if spanned > _MOST_SPANNED:
                raise Unreadable(f"{path} merges or links more cells than a sheet can show")

    try:
        for part in sheet_parts(package).values():
            parser = expat.ParserCreate()
            parser.StartElementHandler = begin
            parser.Parse(package.read(part), True)
    except (KeyError, ParseError, DefusedXmlException, expat.ExpatError) as error:
        raise Unreadable(f"{path} is damaged: its worksheets cannot be found ({error})") from None


def _spanned(reference: str) -> int:
    """How many cells a block covers; an edge left out (a whole column) counts as the far one."""
    left, top, right, bottom = range_boundaries(reference)
    wide = (right or 16_384) - (left or 1) + 1
    return max(wide, 1) * max((bottom or 1_048_576) - (top or 1) + 1, 1)


def sheet_parts(package: zipfile.ZipFile) -> dict[str, str]:
    """The part in which each worksheet lies, by its title."""
    relations = ElementTree.fromstring(package.read("xl/_rels/workbook.xml.rels"))
    targets = {relation.get("Id"): relation.get("Target", "") for relation in relations}
    parts = {}
    for element in ElementTree.fromstring(package.read("xl/workbook.xml")).iter():
        if element.tag.endswith("}sheet"):
            target = targets[element.get(_TARGET)]
            inside = target[1:] if target.startswith("/") else posixpath.join("xl", target)
            parts[element.get("name", "")] = posixpath.normpath(inside)
    return parts


def with_values(data: bytes, values: Values, typed: Values | None = None) -> bytes:
    """The workbook with a value stored in every formula cell that `values` names.

    typed: what to put into cells that hold no formula, by sheet and address; None empties one.
    """
    return Stencil(data).filled(values, typed or {})


class Stencil:
    """A workbook whose worksheets are looked through once, to be filled again and again."""

    def __init__(self, data: bytes) -> None:
        self._data = data
        self._sheets: dict[str, tuple[str, bytes, _Cells]] = {}
        with zipfile.ZipFile(io.BytesIO(data)) as package:
            self._parts = sheet_parts(package)

    def filled(
        self, values: Values, typed: Values, parts: Mapping[str, bytes] | None = None
    ) -> bytes:
        """The workbook with values stored, cells typed into, and some other parts replaced."""
        changed = dict(parts or {})
        for title in dict.fromkeys((*values, *typed)):
            computed, entered = values.get(title, {}), typed.get(title, {})
            if computed or entered:
                part, xml, found = self._sheet(title)
                changed[part] = _spliced(title, xml, found, computed, entered)
        return replaced(self._data, changed)

    def _sheet(self, title: str) -> tuple[str, bytes, _Cells]:
        if title not in self._sheets:
            part = self._parts[title]
            with zipfile.ZipFile(io.BytesIO(self._data)) as package:
                xml = package.read(part)
            self._sheets[title] = (part, xml, _Cells(xml))
        return self._sheets[title]


def replaced(data: bytes, changed: Mapping[str, bytes]) -> bytes:
    """The package with some parts replaced, all others byte for byte as they were."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as given, zipfile.ZipFile(out, "w") as made:
        made.comment = given.comment
        entries = sorted(given.infolist(), key=lambda entry: entry.header_offset)
        ends = [entry.header_offset for entry in entries[1:]] + [given.start_dir]
        for entry, end in zip(entries, ends, strict=True):
            if entry.filename in changed:
                fresh = zipfile.ZipInfo(entry.filename, entry.date_time)
                fresh.compress_type = zipfile.ZIP_DEFLATED
                fresh.external_attr, fresh.create_system = entry.external_attr, entry.create_system
                made.writestr(fresh, changed[entry.filename])
            else:
                _copy(made, entry, data[entry.header_offset : end])
    return out.getvalue()


def _copy(made: Any, entry: zipfile.ZipInfo, raw: bytes) -> None:
    """Append a local record as it is, and list it; zipfile has no call for this."""
    entry.header_offset = made.fp.tell()
    made.fp.write(raw)
    made.start_dir = made.fp.tell()
    made.filelist.append(entry)
    made.NameToInfo[entry.filename] = entry
    made._didModify = True


def _spliced(title: str, xml: bytes, found: _Cells, values: _Row, typed: _Row) -> bytes:
    """A sheet's XML with the values put in; cells that are not named stay."""
    edits: list[tuple[int, int, bytes]] = []
    open_to = 0
    for cell in found.cells:
        if cell.has_formula or cell.in_block:
            if cell.address in values:
                edits.append((cell.start, cell.end, _rewritten(xml, cell, values[cell.address])))
        elif cell.address in typed:
            open_to += 1
            edits.append((cell.start, cell.end, _typed(xml, cell, typed[cell.address])))
    if open_to != len(typed):
        raise Unreadable(f"{title} has no open cell at one of {', '.join(typed)[:80]}")
    edits += found.added(values)
    out, at = [], 0
    for start, end, new in sorted(edits, key=lambda edit: edit[:2]):
        out += [xml[at:start], new]
        at = end
    return b"".join(out) + xml[at:]


class _Cell:
    """Where a cell element lies in the XML."""

    def __init__(self, address: str, start: int) -> None:
        self.address, self.start, self.end = address, start, start
        self.has_formula = self.in_block = False
        self.value: tuple[int, int] | None = None


class _Cells:
    """The cells of a sheet, found by one pass that builds no tree."""

    def __init__(self, xml: bytes) -> None:
        self.cells: list[_Cell] = []
        self._rows: dict[int, int] = {}
        self._seen_rows: set[int] = set()
        self._row = 0
        self._end = 0
        self._xml = xml
        self._cell: _Cell | None = None
        self._value_start = 0
        self._blocks: list[tuple[int, int, int, int]] = []
        parser = expat.ParserCreate()
        parser.StartElementHandler = self._begin
        parser.EndElementHandler = self._finish
        self._parser = parser
        parser.Parse(xml, True)

    def _begin(self, name: str, attributes: dict[str, str]) -> None:
        kind = name.rpartition(":")[2]
        if kind == "row":
            self._row = int(attributes.get("r", self._row + 1))
            self._seen_rows.add(self._row)
        if kind == "c":
            self._cell = _Cell(attributes.get("r", ""), self._parser.CurrentByteIndex)
            column, row = _place(self._cell.address)
            self._cell.in_block = self._inside(column, row)
        elif kind == "f" and self._cell is not None:
            self._cell.has_formula = True
            if attributes.get("t") == "array" and ":" in attributes.get("ref", ""):
                first, _, last = attributes["ref"].partition(":")
                self._blocks.append((*_place(first), *_place(last)))
        elif kind == "v" and self._cell is not None:
            self._value_start = self._parser.CurrentByteIndex

    def _finish(self, name: str) -> None:
        kind, at, cell = name.rpartition(":")[2], self._parser.CurrentByteIndex, self._cell
        if kind == "row" and self._xml[at : at + 2] == b"</":
            self._rows[self._row] = at
        if kind == "sheetData":
            self._end = at
        if cell is None:
            return
        if kind == "v":
            cell.value = (self._value_start, self._element_end(self._value_start, at))
        elif kind == "c":
            cell.end = self._element_end(cell.start, at)
            self.cells.append(cell)
            self._cell = None

    def added(self, values: Mapping[str, CellValue]) -> Iterator[tuple[int, int, bytes]]:
        """Cells of array blocks that the file does not hold yet, and where they go."""
        known = {cell.address for cell in self.cells}
        by_row: dict[int, list[tuple[int, int]]] = {}
        for old in self.cells:
            column, row = _place(old.address)
            by_row.setdefault(row, []).append((column, old.start))
        new_rows: dict[int, list[bytes]] = {}
        for address, value in values.items():
            column, row = _place(address)
            if address in known or not self._inside(column, row):
                continue
            kind, text = _stored(value)
            kind = f' t="{kind}"' if kind else ""
            cell = f'<c r="{address}"{kind}><v>{text}</v></c>'.encode()
            if row not in self._seen_rows:
                new_rows.setdefault(row, []).append(cell)
                continue
            if row not in self._rows:  # an empty row element: left as it is
                continue
            behind = [start for other, start in by_row.get(row, ()) if other > column]
            at = min(behind, default=self._rows[row])
            yield at, at, cell
        rows = sorted(by_row)
        for row, cells in new_rows.items():
            later = bisect_right(rows, row)
            before = self._end
            if later < len(rows):
                first = min(start for _, start in by_row[rows[later]])
                before = self._xml.rfind(b"<row", 0, first)
            yield before, before, b'<row r="%d">%s</row>' % (row, b"".join(cells))

    def _inside(self, column: int, row: int) -> bool:
        return any(
            left <= column <= right and top <= row <= bottom
            for left, top, right, bottom in self._blocks
        )

    def _element_end(self, start: int, end_tag: int) -> int:
        """End of an element; for an empty one expat gives no place that can be relied on."""
        head_end = self._xml.index(b">", start) + 1
        empty = self._xml[head_end - 2 : head_end] == b"/>"
        return head_end if empty else self._xml.index(b">", end_tag) + 1


def _place(address: str) -> tuple[int, int]:
    column = 0
    letters = address.rstrip("0123456789")
    for letter in letters:
        column = 26 * column + ord(letter) - 64
    return column, int(address[len(letters) :] or 0)


def _rewritten(xml: bytes, cell: _Cell, value: CellValue) -> bytes:
    kind, text = _stored(value)
    head_end = xml.index(b">", cell.start) + 1
    head = re.sub(rb'\s+t="[^"]*"', b"", xml[cell.start : head_end])
    closing = b""
    inside_end = cell.end
    if head.endswith(b"/>"):  # a cell of an array block with nothing in it yet
        head, closing, inside_end = head[:-2].rstrip() + b">", b"</c>", head_end
    if kind:
        head = head[:-1] + f' t="{kind}">'.encode()
    new = f"<v>{text}</v>".encode()
    inside = xml[head_end:inside_end]
    if cell.value is not None:
        start, end = (place - head_end for place in cell.value)
        return head + inside[:start] + new + inside[end:]
    if closing:
        return head + new + closing
    at = inside.rindex(b"</")
    return head + inside[:at] + new + inside[at:]


def _typed(xml: bytes, cell: _Cell, value: CellValue) -> bytes:
    """A cell with a value that nothing computes; a text lies in it and is never a formula."""
    head = re.sub(rb'\s+t="[^"]*"', b"", xml[cell.start : xml.index(b">", cell.start)])
    head = head.rstrip(b"/").rstrip()
    if value is None:
        return head + b"/>"
    kind, text = _stored(value)
    if kind == "str":
        inside = f' t="inlineStr"><is><t xml:space="preserve">{text}</t></is></c>'
    else:
        inside = (f' t="{kind}"' if kind else "") + f"><v>{text}</v></c>"
    return head + inside.encode()


def _stored(value: CellValue) -> tuple[str, str]:
    """The cell type and the text of a value in a file."""
    if isinstance(value, ErrorKind):
        return "e", value.text
    if isinstance(value, bool):
        return "b", str(int(value))
    if isinstance(value, str):
        return "str", _escaped(value)
    return "", repr(0.0 if value is None else float(value)).removesuffix(".0")


_CONTROL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff]")


def _escaped(text: str) -> str:
    """A text as XML holds it; characters that XML cannot hold in the workbook's own spelling."""
    text = re.sub(r"_(?=x[0-9A-Fa-f]{4}_)", "_x005F_", text)
    return escape(_CONTROL.sub(lambda found: f"_x{ord(found[0]):04X}_", text))


_LONG_NAME = re.compile(rb"ORG\.TAUSHEET\.FUNCTIONS\.(?=FO_[A-Z0-9_]+ *\()", re.IGNORECASE)
_FORMULA = re.compile(rb'(<c\b[^>]*\br="([A-Z]+[0-9]+)"[^>]*>\s*<f\b[^>]*>)([^<]*)(</f>)')
_NAME = re.compile(rb'(<definedName\b[^>]*\bname="([^"]+)"[^>]*>)([^<]*)(</definedName>)')


def formulas_spelled_plainly(data: bytes) -> tuple[bytes, list[str]]:
    """Our functions by their plain names where LibreOffice has stored them by its long ones.

    Also where that was: each cell as Sheet!A1, and each defined name.
    """
    changed, found = {}, []
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        titles = {part: f"{title}!" for title, part in sheet_parts(package).items()}
        for part in (*titles, "xl/workbook.xml"):
            xml = package.read(part)
            where = titles.get(part, "")

            def plain(match: re.Match[bytes], where: str = where) -> bytes:
                formula, count = _LONG_NAME.subn(b"", match[3])
                if count:
                    found.append(f"{where}{match[2].decode(errors='replace')}")
                return match[1] + formula + match[4]

            spelled = (_FORMULA if where else _NAME).sub(plain, xml)
            if spelled != xml:
                changed[part] = spelled
    return (replaced(data, changed) if changed else data), found
