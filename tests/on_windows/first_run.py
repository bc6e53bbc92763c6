"""The first run on a real Excel: installs, computes, compares, breaks, repairs, writes a report.

    python tests/on_windows/first_run.py [REPORT.md]

On Windows, with Excel closed, in a Python that has tausheet[test]. **This has not been run in
Excel yet.** What is tested elsewhere is its logic, with a stand-in for Excel
(tests/test_first_run.py). What it would settle is listed in DEVELOPERS.md.

Every check stands alone: one that fails or cannot be made is reported, and the next is made.
The exit status is 0 only when all hold. The add-in is removed again at the end.
"""

from __future__ import annotations

import contextlib
import json
import math
import platform
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Protocol

from openpyxl import load_workbook
from openpyxl.utils import get_column_letter, range_boundaries
from openpyxl.worksheet.formula import ArrayFormula

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from parity_cases import Case, cases
from test_parity_of_hosts import differences, write_calls

from tausheet import templates
from tausheet.addin.cells import CellValue
from tausheet.addin.excel import addin_file, installation, refresh, registration
from tausheet.addin.make import make_index, make_sheet
from tausheet.addin.recalc import recalc
from tausheet.functions import version
from tausheet.functions.errors import ErrorKind

Values = dict[str, dict[str, CellValue]]

SHOWN = 10
"""Differences that the report lists of one check; the rest are counted."""


class Excel(Protocol):
    """What this run needs of Excel; RealExcel below, and a stand-in in the tests."""

    def version(self) -> str:
        """Its version, in words."""

    def open_addin(self, path: Path) -> None:
        """Open the add-in, as Excel does by itself when a person starts it."""

    def close_addin(self) -> None:
        """Close the add-in."""

    def values(self, path: Path, compute: bool) -> Values:
        """Every cell of a workbook, opened afresh; computed or as opening leaves it."""

    def refreshed(self, path: Path) -> tuple[Values, list[str]]:
        """The same after `tausheet refresh`, and what that could not enter."""

    def save_as(self, path: Path, out: Path) -> None:
        """Open a workbook, compute it and save it elsewhere."""

    def bridges(self) -> list[int]:
        """The process numbers of the Pythons that serve Excel."""

    def end_process(self, number: int) -> None:
        """End one of them from outside."""

    def listening(self, number: int) -> list[str]:
        """What that process listens on."""

    def quit(self) -> None:
        """End this Excel."""


@dataclass
class Report:
    """What was checked, and how it came out."""

    heading: str
    lines: list[str] = field(default_factory=list)
    failed: int = 0

    @contextlib.contextmanager
    def check(self, name: str) -> Iterator[list[str]]:
        """One check; what its block appends to the list is what is wrong."""
        wrong: list[str] = []
        began = time.monotonic()
        try:
            yield wrong
        except Exception as error:  # a check that cannot be made must not stop the next
            wrong.append(f"could not be finished: {type(error).__name__}: {error}")
        took = time.monotonic() - began
        self.failed += bool(wrong)
        self.lines.append(f"- {'NOT OK' if wrong else 'ok'}: {name} ({took:.1f} s)")
        self.lines += [f"    - {' '.join(line.split())}" for line in wrong[:SHOWN]]
        if len(wrong) > SHOWN:
            self.lines.append(f"    - and {len(wrong) - SHOWN} more")

    def text(self) -> str:
        """The report in Markdown."""
        checks = sum(line.startswith("- ") for line in self.lines)
        verdict = f"{checks - self.failed} of {checks} checks hold."
        return "\n".join([f"# {self.heading}", "", verdict, "", *self.lines, ""])


def stored_values(path: Path) -> Values:
    """The stored value of every formula cell of a workbook, read without Excel."""
    formulas, results = load_workbook(path), load_workbook(path, data_only=True)
    found: Values = {}
    for sheet in formulas.worksheets:
        cells = found.setdefault(sheet.title, {})
        for row in sheet.iter_rows():
            for cell in row:
                for address in _computed(cell):
                    cells[address] = plain(results[sheet.title][address].value)
    return found


def _computed(cell: Any) -> Iterator[str]:
    if isinstance(cell.value, ArrayFormula):
        left, top, right, bottom = range_boundaries(cell.value.ref)
        for row in range(top, bottom + 1):
            for column in range(left, right + 1):
                yield f"{get_column_letter(column)}{row}"
    elif cell.data_type == "f":
        yield cell.coordinate


_BY_TEXT = {kind.text: kind for kind in ErrorKind}
_BY_NUMBER = {
    registration.ERROR_BASE + number: kind for kind, number in registration.EXCEL_NUMBERS.items()
}


def plain(value: Any) -> CellValue:
    """A value as openpyxl or Excel gives it, as a cell value."""
    if isinstance(value, str):
        return _BY_TEXT.get(value, value)
    if isinstance(value, bool) or value is None:
        return value
    if isinstance(value, int) and value in _BY_NUMBER:
        return _BY_NUMBER[value]
    return float(value)


def compared(live: Mapping[str, Mapping[str, CellValue]], wanted: Values) -> list[str]:
    """Cells that do not show what they should; numbers to 9 digits, or 1E-13 near zero."""
    wrong = []
    for title, cells in wanted.items():
        shown = live.get(title, {})
        for address, value in cells.items():
            found = shown.get(address)
            if not _same(found, value):
                wrong.append(f"{title}!{address} shows {_text(found)} instead of {_text(value)}")
    if not any(wanted.values()):
        wrong.append("there was nothing to compare")
    return wrong


def _same(found: CellValue, wanted: CellValue) -> bool:
    if type(found) is float and type(wanted) is float:
        return math.isclose(found, wanted, rel_tol=1e-9, abs_tol=1e-13)
    if {found, wanted} <= {None, ""}:  # an empty text is stored as no value by some programs
        return True
    return type(found) is type(wanted) and found == wanted


def _text(value: CellValue) -> str:
    return value.text if isinstance(value, ErrorKind) else repr(value)


@dataclass
class Host:
    """What this machine does besides Excel; replaced in the tests."""

    install: Callable[[], str] = installation.install
    uninstall: Callable[[], str] = installation.uninstall
    status: Callable[[], list[str]] = installation.status
    make_sheet: Callable[[str, Path], Any] = lambda name, out: make_sheet(name, out, {}, demo=True)
    make_index: Callable[[Path], Any] = make_index
    recalc: Callable[[Path], Any] = recalc
    place: Callable[[], Path] = lambda: installation.start_up_folder() / addin_file.FILE_NAME


def run(
    start: Callable[[], Excel],
    report: Report,
    folder: Path,
    host: Host,
    names: list[str],
    calls: list[Case],
) -> None:
    """All checks, in order."""
    with report.check("install, and status finds nothing to repair") as wrong:
        host.install()
        wrong += [line for line in host.status() if "repair" in line or "not installed" in line]
    excel: Excel | None = None
    with report.check("Excel starts and opens the add-in"):
        excel = start()
        report.heading += f", Excel {excel.version()}"
        excel.open_addin(host.place())
    if excel is not None:
        try:
            _with_excel(excel, report, folder, host, names, calls)
        finally:
            with report.check("Excel ends"):
                excel.quit()
    with report.check("uninstall, and status says so") as wrong:
        host.uninstall()
        wrong += [line for line in host.status() if "not installed" not in line]


def _with_excel(
    excel: Excel, report: Report, folder: Path, host: Host, names: list[str], calls: list[Case]
) -> None:
    sheets = {name: folder / f"{name}.xlsx" for name in names}
    for name, path in sheets.items():
        with report.check(f"calc sheet {name}: every result as stored") as wrong:
            host.make_sheet(name, path)
            wrong += compared(excel.values(path, compute=True), stored_values(path))
    with report.check("index of the functions: every result as stored") as wrong:
        path = folder / "index.xlsx"
        host.make_index(path)
        wrong += compared(excel.values(path, compute=True), stored_values(path))
    with report.check(
        "every call of the parity suite: values, error kinds alone and in arrays, blanks, omitted "
        "arguments, array formulas"
    ) as wrong:
        path = folder / "calls.xlsx"
        placed = write_calls(path, calls)
        wrong += differences(excel.values(path, compute=True), placed)
    one = sheets[names[0]]
    _bridge(excel, report, one)
    with report.check("saved by Excel: plain names, the same values, and recalc reads it") as wrong:
        saved = folder / "saved.xlsx"
        excel.save_as(one, saved)
        wrong += _foreign_names(saved)
        wrong += compared(stored_values(saved), stored_values(one))
        host.recalc(saved)
        wrong += compared(stored_values(saved), stored_values(one))
    with report.check("without the add-in the stored values stay") as wrong:
        excel.close_addin()
        wrong += compared(excel.values(one, compute=False), stored_values(one))
    with report.check("refresh enters formulas again, in protected sheets too") as wrong:
        unbound = folder / "unbound.xlsx"
        excel.save_as(one, unbound)
        excel.open_addin(host.place())
        values, left = excel.refreshed(unbound)
        wrong += [*left, *compared(values, stored_values(one))]


def _bridge(excel: Excel, report: Report, one: Path) -> None:
    """The Python behind the cells: what it listens on, and what happens when it dies."""
    numbers: list[int] = []
    with report.check("one Python serves Excel, and listens on nothing") as wrong:
        numbers = excel.bridges()
        if len(numbers) != 1:
            wrong.append(f"{len(numbers)} processes were found: {numbers}")
        wrong += [line for number in numbers for line in excel.listening(number)]
    with report.check(
        "a Python that dies: no wrong value, and a new one at the next call"
    ) as wrong:
        for number in numbers:
            excel.end_process(number)
        wanted = stored_values(one)
        first = excel.values(one, compute=True)
        # an error may show once; another number or a text may not
        wrong += [line for line in compared(first, wanted) if " shows #" not in line]
        wrong += compared(excel.values(one, compute=True), wanted)
        if not set(excel.bridges()) - set(numbers):
            wrong.append("no new Python was started")


def _foreign_names(path: Path) -> list[str]:
    """Formulas in which our functions no longer stand by their plain names."""
    wrong = []
    for sheet in load_workbook(path).worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                text = cell.value.text if isinstance(cell.value, ArrayFormula) else cell.value
                if isinstance(text, str) and text[:1] == "=" and refresh.relinked(text) != text:
                    wrong.append(f"{sheet.title}!{cell.coordinate} was saved as {text}")
    return wrong


class RealExcel:
    """Excel itself, through xlwings."""

    def __init__(self) -> None:
        import xlwings

        self.app: Any = xlwings.App(visible=False, add_book=False)
        self.app.display_alerts = False

    def version(self) -> str:
        """Its version and build."""
        return f"{self.app.api.Version} build {self.app.api.Build}"

    def open_addin(self, path: Path) -> None:
        """Excel started by a program opens nothing from its start-up folder, so this does."""
        self.app.api.Workbooks.Open(str(path)).RunAutoMacros(1)

    def close_addin(self) -> None:
        """It answers to its name, although it is not among the workbooks."""
        self.app.api.Workbooks(addin_file.FILE_NAME).Close(False)

    @contextlib.contextmanager
    def _book(self, path: Path) -> Iterator[Any]:
        book = self.app.books.open(str(path), update_links=False)
        try:
            yield book
        finally:
            book.close()

    def values(self, path: Path, compute: bool) -> Values:
        """Value2 of every cell that is used."""
        with self._book(path) as book:
            if compute:
                self.app.api.CalculateFull()
            return _shown(book)

    def refreshed(self, path: Path) -> tuple[Values, list[str]]:
        """After `tausheet refresh`."""
        with self._book(path) as book:
            _, left = refresh.refresh_app(self.app)
            return _shown(book), left

    def save_as(self, path: Path, out: Path) -> None:
        """As .xlsx, number 51."""
        with self._book(path) as book:
            self.app.api.CalculateFull()
            book.api.SaveAs(str(out), 51)

    def bridges(self) -> list[int]:
        """Pythons whose command is the one that the add-in gives."""
        ask = (
            "Get-CimInstance Win32_Process | Where-Object { $_.CommandLine -like "
            "'*-c*import xlwings; xlwings.serve(*' } | Select-Object -ExpandProperty ProcessId | "
            "ConvertTo-Json -Compress"
        )
        found = json.loads(_said("powershell", "-NoProfile", "-Command", ask) or "[]")
        own = found if isinstance(found, list) else [found]
        return [int(number) for number in own if number != _powershell_itself(number)]

    def end_process(self, number: int) -> None:
        """By its number, and only that one."""
        _said("taskkill", "/F", "/PID", str(number))
        time.sleep(2)

    def listening(self, number: int) -> list[str]:
        """Lines of netstat for the process."""
        return [
            line.strip()
            for line in _said("netstat", "-ano").splitlines()
            if line.split()[-1:] == [str(number)] and ("LISTENING" in line or "UDP" in line)
        ]

    def quit(self) -> None:
        """Without saving anything."""
        self.app.quit()


def _powershell_itself(number: int) -> int | None:
    """The shell that asks has the words in its own command line too."""
    name = _said("powershell", "-NoProfile", "-Command", f"(Get-Process -Id {number}).ProcessName")
    return None if name.strip().casefold().startswith("python") else number


def _said(*command: str) -> str:
    return subprocess.run(command, capture_output=True, text=True, timeout=60).stdout


def _shown(book: Any) -> Values:
    found: Values = {}
    for sheet in book.sheets:
        used = sheet.used_range
        rows = used.api.Value2
        rows = rows if isinstance(rows, tuple) else ((rows,),)
        found[sheet.name] = {
            f"{get_column_letter(used.column + j)}{used.row + i}": plain(value)
            for i, row in enumerate(rows)
            for j, value in enumerate(row)
        }
    return found


def main() -> int:
    """Run everything on this machine and write the report."""
    if sys.platform != "win32":
        print("This is for a real Excel on Windows; nothing was done.", file=sys.stderr)
        return 2
    import xlwings

    if list(xlwings.apps):
        print("Excel is open; save your work, close it and start again.", file=sys.stderr)
        return 2
    out = Path(sys.argv[1] if len(sys.argv) > 1 else "first-run.md").resolve()
    report = Report(
        f"First run: tausheet {version()}, xlwings {xlwings.__version__}, "
        f"Python {platform.python_version()} ({platform.architecture()[0]}), {platform.platform()}"
    )
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as folder:
        run(RealExcel, report, Path(folder), Host(), list(templates.SHEETS), cases())
    out.write_text(report.text(), encoding="utf-8")
    print(report.text())
    return 1 if report.failed else 0


if __name__ == "__main__":
    raise SystemExit(main())
