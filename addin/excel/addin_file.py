"""The add-in file tausheet.xlam, made without Excel from the template that xlwings ships (BSD).

Which Python it starts and which module it calls stand on a sheet inside the file, written when
it is made; xlwings' habit of looking in the active workbook and its folder first is taken out of
the VBA source, so that no workbook can choose what runs.
"""

from __future__ import annotations

import hashlib
import importlib.util
import json
import re
import zipfile
from collections.abc import Mapping
from importlib.metadata import version as distribution_version
from pathlib import Path, PureWindowsPath
from typing import Any
from xml.sax.saxutils import escape

from defusedxml import ElementTree

from tausheet.addin.excel import vba_project, wrappers
from tausheet.functions.errors import TausheetError

FILE_NAME = "tausheet.xlam"
PROJECT = "tausheet"
STAMP = "TAUSHEET STAMP"

_SHEET = "xl/worksheets/sheet1.xml"
_NAMESPACE = "{http://schemas.openxmlformats.org/spreadsheetml/2006/main}"

# what stands in xlwings' VBA module, what takes its place, how often it stands there
_EDITS = (
    ('PROJECT_NAME As String = "myaddin"', f'PROJECT_NAME As String = "{PROJECT}"', 1),
    ('If SheetExists(ActiveWorkbook, PROJECT_NAME & ".conf") = True Then', "If False Then", 1),
    (
        'If GetFullName(ActiveWorkbook) <> "" Then '
        "' Empty if local dir can't be figured out (e.g. SharePoint)",
        "If False Then",
        1,
    ),
    ("If FileExists(GetConfigFilePath()) = True Then", "If False Then", 1),
    (
        'PYTHONPATH = AddExcelDir & ";" & ActiveWorkbook.FullName & ";" & ThisWorkbook.FullName & '
        '";" & GetConfig("ONEDRIVE_CONSUMER_WIN") & ";" & GetConfig("ONEDRIVE_COMMERCIAL_WIN") & '
        '";" & GetConfig("SHAREPOINT_WIN") & ";" & GetConfig("PYTHONPATH")',
        'PYTHONPATH = "false;;;;;"',
        1,
    ),
    # isolated: nothing is imported from the folder that Excel happens to be in
    ('tail = " -B -c ""import sys', 'tail = " -I -B -c ""import sys', 1),
)


class UnusableInterpreter(TausheetError):
    """A path that the add-in could not start Python from."""


def template() -> Path:
    """The add-in template inside xlwings, found without importing it."""
    found = importlib.util.find_spec("xlwings")
    if found is None or found.origin is None:
        raise TausheetError('xlwings is missing; install it with: pip install "tausheet[excel]"')
    return Path(found.origin).parent / "quickstart_addin.xlam"


def edited(source: str) -> str:
    """xlwings' VBA module with everything taken out that lets a workbook choose what runs."""
    text = source.replace("\r\n", "\n")
    for old, new, times in _EDITS:
        if text.count(old) != times:
            raise wrappers.ChangedShape(
                f"xlwings' VBA module holds {text.count(old)} times, not {times}: {old[:60]} ...; "
                "install the version of xlwings that pyproject.toml names"
            )
        text = text.replace(old, new)
    return text.replace("\n", "\r\n")


def configuration(interpreter: str, source: str) -> dict[str, str | bool]:
    """The sheet inside the add-in: xlwings' keys, and the stamp that `status` reads back."""
    path = PureWindowsPath(interpreter)
    if not path.is_absolute() or re.search(r"[\"'%;&|<>^\r\n]", interpreter):
        raise UnusableInterpreter(
            f"the interpreter is {interpreter}, but must be a full Windows path without quotes, %, "
            "; or & in it; install Python in another folder, or give --interpreter"
        )
    if path.name.casefold() == "python.exe":
        path = path.with_name("pythonw.exe")
    return {
        "INTERPRETER_WIN": str(path),
        "INTERPRETER": str(path),
        "UDF MODULES": wrappers.PYTHON_MODULE,
        "ADD_WORKBOOK_TO_PYTHONPATH": "false",
        "CONDA PATH": "",
        "CONDA ENV": "",
        "LICENSE_KEY": "",
        "DEBUG UDFS": False,
        "USE UDF SERVER": False,
        "SHOW CONSOLE": False,
        STAMP: stamp(source),
    }


def stamp(source: str) -> str:
    """What an add-in file was made from."""
    return json.dumps(
        {
            "tausheet": distribution_version("tausheet"),
            "xlwings": distribution_version("xlwings"),
            "functions": hashlib.sha256(source.encode()).hexdigest()[:16],
        },
        sort_keys=True,
    )


def make(out: Path, interpreter: str, udfs: Any) -> list[str]:
    """Write the add-in file; returns the functions in it. `udfs` is xlwings.udfs."""
    source, functions = wrappers.wrapper_text(udfs, FILE_NAME)
    rows = configuration(interpreter, source)
    source = source.replace("\r\n", "\n").replace("\n", "\r\n")
    with zipfile.ZipFile(template()) as given, zipfile.ZipFile(out, "w") as made:
        for entry in given.infolist():
            data = given.read(entry)
            if entry.filename == "xl/vbaProject.bin":
                data = vba_project.rebuilt(
                    data, {"xlwings": edited}, {wrappers.MODULE: source}, PROJECT
                )
            elif entry.filename == "xl/workbook.xml":
                data = _workbook(data)
            elif entry.filename == _SHEET:
                start, end = data.index(b"<sheetData>"), data.index(b"</sheetData>")
                data = data[:start] + b"<sheetData>" + _sheet_rows(rows).encode() + data[end:]
            fixed = zipfile.ZipInfo(entry.filename, (2020, 1, 1, 0, 0, 0))
            fixed.compress_type = zipfile.ZIP_DEFLATED
            made.writestr(fixed, data)
    return functions


def _workbook(data: bytes) -> bytes:
    """Our sheet name, and nothing of the machine on which the template was saved."""
    data = data.replace(b'name="_myaddin.conf"', f'name="{PROJECT}.conf"'.encode())
    return re.sub(rb"<mc:AlternateContent.*?</mc:AlternateContent>", b"", data, flags=re.DOTALL)


def _sheet_rows(rows: Mapping[str, str | bool]) -> str:
    def cell(reference: str, value: str | bool) -> str:
        if isinstance(value, bool):
            return f'<c r="{reference}" t="b"><v>{int(value)}</v></c>'
        text = f"<is><t>{escape(value)}</t></is>"
        return f'<c r="{reference}" t="inlineStr">{text}</c>' if value else ""

    return "".join(
        f'<row r="{row}">{cell(f"A{row}", key)}{cell(f"B{row}", value)}</row>'
        for row, (key, value) in enumerate(rows.items(), start=1)
    )


def read_configuration(path: Path) -> dict[str, str]:
    """What stands on the sheet inside an add-in file; no Excel needed."""
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
