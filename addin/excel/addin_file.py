"""The add-in file tausheet.xlam, made without Excel from the template that xlwings ships (BSD).

Which Python it starts is a constant of its VBA module; what it was made from (the stamp) stands on
its one sheet, for `tausheet status` alone.
"""

from __future__ import annotations

import hashlib
import importlib.util
import re
import zipfile
from collections.abc import Mapping
from importlib.metadata import version as distribution_version
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

from defusedxml import ElementTree

from tausheet.addin.excel import bridge, vba_project, wrappers
from tausheet.functions.errors import TausheetError

FILE_NAME = "tausheet.xlam"
PROJECT = "tausheet"

_PROJECT = "xl/vbaProject.bin"
_SHEET = "xl/worksheets/sheet1.xml"
_CORE = (
    b'<?xml version="1.0" encoding="UTF-8" standalone="yes"?><cp:coreProperties xmlns:cp="'
    b'http://schemas.openxmlformats.org/package/2006/metadata/core-properties"/>'
)
_NAMESPACE = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"


def template() -> Path:
    """The add-in template inside xlwings, found without importing it."""
    found = importlib.util.find_spec("xlwings")
    if found is None or found.origin is None:
        raise TausheetError('xlwings is missing; install it with: pip install "tausheet[excel]"')
    return Path(found.origin).parent / "quickstart_addin.xlam"


def make(out: Path, interpreter: str, udfs: Any) -> list[str]:
    """Write the add-in file; returns the functions in it. `udfs` is xlwings.udfs."""
    source, functions, stamp = contents(interpreter, udfs)
    module = {bridge.MODULE: source.replace("\n", "\r\n")}
    with zipfile.ZipFile(template()) as given, zipfile.ZipFile(out, "w") as made:
        for entry in given.infolist():
            data = given.read(entry)
            if entry.filename == _PROJECT:
                data = vba_project.rebuilt(data, module, PROJECT)
            elif entry.filename == "xl/workbook.xml":
                data = _workbook(data)
            elif entry.filename == "docProps/core.xml":
                data = _CORE
            elif entry.filename == _SHEET:
                start, end = data.index(b"<sheetData>"), data.index(b"</sheetData>")
                data = data[:start] + b"<sheetData>" + _sheet_rows(stamp).encode() + data[end:]
            fixed = zipfile.ZipInfo(entry.filename, (2020, 1, 1, 0, 0, 0))
            fixed.compress_type = zipfile.ZIP_DEFLATED
            made.writestr(fixed, data)
    return functions


def contents(interpreter: str, udfs: Any) -> tuple[str, list[str], dict[str, str]]:
    """Source of the module, the functions in it, and the stamp that `status` reads back."""
    path = bridge.without_console(interpreter)
    with zipfile.ZipFile(template()) as given:
        xlwings_source = vba_project.source_of(given.read(_PROJECT), "xlwings")
    xlwings_source = xlwings_source.replace("\r\n", "\n")
    source, functions = wrappers.module_text(udfs, FILE_NAME, path, xlwings_source)
    stamp = {
        "tausheet": distribution_version("tausheet"),
        "xlwings": distribution_version("xlwings"),
        "interpreter": str(path),
        "contents": hashlib.sha256(source.encode()).hexdigest()[:16],
    }
    return source, functions, stamp


def _workbook(data: bytes) -> bytes:
    """Our sheet name, and nothing of the machine on which the template was saved."""
    data = data.replace(b'name="_myaddin.conf"', b'name="made from"')
    return re.sub(rb"<mc:AlternateContent.*?</mc:AlternateContent>", b"", data, flags=re.DOTALL)


def _sheet_rows(stamp: Mapping[str, str]) -> str:
    def cell(reference: str, value: str) -> str:
        return f'<c r="{reference}" t="inlineStr"><is><t>{escape(value)}</t></is></c>'

    return "".join(
        f'<row r="{row}">{cell(f"A{row}", key)}{cell(f"B{row}", value)}</row>'
        for row, (key, value) in enumerate(stamp.items(), start=1)
    )


def read_stamp(path: Path) -> dict[str, str]:
    """What an add-in file was made from; no Excel needed."""
    try:
        with zipfile.ZipFile(path) as package:
            if package.getinfo(_SHEET).file_size > 1_000_000:
                raise TausheetError(f"{path} is not an add-in file of tausheet: its sheet is huge")
            root = ElementTree.fromstring(package.read(_SHEET))
    except (OSError, KeyError, zipfile.BadZipFile, ElementTree.ParseError) as error:
        raise TausheetError(f"{path} is not an add-in file of tausheet: {error}") from None
    found = {}
    for row in root.iter(f"{_NAMESPACE}row"):
        texts = ["".join(cell.itertext()) for cell in row.iter(f"{_NAMESPACE}c")]
        if len(texts) == 2:
            found[texts[0]] = texts[1]
    return found
