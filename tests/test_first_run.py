"""The logic of tests/on_windows/first_run.py, with a stand-in for Excel that computes embedded.

It shows that the report says what is wrong. It says nothing about Excel.
"""

from __future__ import annotations

import atexit
import copy
import functools
import importlib.util
import shutil
import sys
import tempfile
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
import windows_stand_in as windows
from openpyxl import load_workbook
from parity_cases import cases

from tausheet.addin import embedded
from tausheet.addin.make import make_index, make_sheet
from tausheet.addin.recalc import recalc
from tausheet.functions.errors import ErrorKind


def _load() -> ModuleType:
    path = Path(__file__).parent / "on_windows" / "first_run.py"
    spec = importlib.util.spec_from_file_location("first_run", path)
    assert spec is not None
    assert spec.loader is not None
    module = sys.modules["first_run"] = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


first_run = _load()
CALLS = cases()[::60]


@functools.cache
def made() -> dict[str, Path]:
    """The workbooks, made once."""
    folder = Path(tempfile.mkdtemp())
    atexit.register(shutil.rmtree, folder)
    make_sheet("bleed", folder / "bleed.xlsx", {}, demo=True)
    make_index(folder / "index.xlsx")
    return {path.name: path for path in folder.iterdir()}


known: dict[bytes, Any] = {}


def stored(path: Path) -> Any:
    """The stored values, read once for each content."""
    content = path.read_bytes()
    if content not in known:
        known[content] = original(path)
    return copy.deepcopy(known[content])


original = first_run.stored_values


class StandIn:
    """Shows what is stored, computes what is not (embedded), and behaves as Excel should."""

    def __init__(self) -> None:
        self.addin: Path | None = None
        self.running, self.dead = [100], 0

    def version(self) -> str:
        return "stand-in"

    def open_addin(self, path: Path) -> None:
        assert path.exists()
        self.addin = path

    def close_addin(self) -> None:
        assert self.addin is not None
        self.addin = None

    def values(self, path: Path, compute: bool) -> Any:
        if compute and not self.running:
            self.running = [101 + self.dead]
            self.dead += 1
            return self.after_death(stored(path))
        return embedded.compute(path) if path.name == "calls.xlsx" else stored(path)

    def after_death(self, values: Any) -> Any:
        return {title: dict.fromkeys(cells, ErrorKind.VALUE) for title, cells in values.items()}

    def refreshed(self, path: Path) -> tuple[Any, list[str]]:
        return stored(path), []

    def save_as(self, path: Path, out: Path) -> None:
        shutil.copyfile(path, out)

    def bridges(self) -> list[int]:
        return list(self.running)

    def end_process(self, number: int) -> None:
        self.running.remove(number)

    def listening(self, number: int) -> list[str]:
        return []

    def quit(self) -> None:
        self.running = []


class OneWrong(StandIn):
    """One number in its ninth digit, one error as a text."""

    def values(self, path: Path, compute: bool) -> Any:
        values = super().values(path, compute)
        if compute and path.name == "bleed.xlsx":
            sheet, cell = next((s, c) for s in values for c, v in values[s].items() if v == "PASS")
            values[sheet][cell] = "#VALUE!"
        if path.name == "index.xlsx":
            cells = values["Index"]
            number = next(c for c, v in cells.items() if isinstance(v, float) and v > 1)
            cells[number] *= 1 + 1e-8
        return values


class NotAnError(StandIn):
    """A call that Python did not answer shows 0."""

    def after_death(self, values: Any) -> Any:
        return {title: dict.fromkeys(cells, 0.0) for title, cells in values.items()}


class Listens(StandIn):
    def listening(self, number: int) -> list[str]:
        return ["TCP 0.0.0.0:4000 LISTENING"]


class KeepsNothing(StandIn):
    """Wipes stored values without the add-in, saves foreign names, refuses protected sheets."""

    def values(self, path: Path, compute: bool) -> Any:
        if not compute:
            there = stored(path)
            return {title: dict.fromkeys(cells, ErrorKind.NAME) for title, cells in there.items()}
        return super().values(path, compute)

    def save_as(self, path: Path, out: Path) -> None:
        book = load_workbook(path)
        for sheet in book.worksheets:
            for row in sheet.iter_rows():
                for cell in row:
                    if isinstance(cell.value, str) and cell.value.startswith("=FO_"):
                        cell.value = f"=_xludf.{cell.value[1:]}"
        book.save(out)

    def refreshed(self, path: Path) -> tuple[Any, list[str]]:
        return {}, ["bleed.xlsx, sheet Bleed: not all formulas could be entered"]


class DoesNotStart(StandIn):
    def __init__(self) -> None:
        raise windows.ComError(-2147221005, "Invalid class string")


@pytest.fixture(autouse=True)
def _read_once(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(first_run, "stored_values", stored)


def report_of(
    excel: type[StandIn], tmp_path: Path, calls: Any = CALLS[:3], again: Any = lambda path: None
) -> Any:
    report = first_run.Report("First run")
    addin = tmp_path / "tausheet.xlam"
    host = first_run.Host(
        install=lambda: str(addin.write_bytes(b"PK")),
        uninstall=lambda: str(addin.unlink()),
        status=lambda: ["Excel: in order" if addin.exists() else "Excel: not installed"],
        place=lambda: addin,
        make_sheet=lambda name, out: shutil.copyfile(made()[f"{name}.xlsx"], out),
        make_index=lambda out: shutil.copyfile(made()["index.xlsx"], out),
        recalc=again,
    )
    first_run.run(excel, report, tmp_path, host, ["bleed"], calls)
    return report


def failed(report: Any) -> list[str]:
    return [line.partition(": ")[2] for line in report.lines if line.startswith("- NOT OK")]


def test_all_is_well_where_all_is_well(tmp_path: Path) -> None:
    report = report_of(StandIn, tmp_path, CALLS, recalc)
    assert failed(report) == [], report.text()
    assert "12 of 12 checks hold." in report.text()
    assert report.text().startswith("# First run, Excel stand-in\n")


def test_a_wrong_number_and_a_text_instead_of_a_verdict_are_reported(tmp_path: Path) -> None:
    report = report_of(OneWrong, tmp_path)
    names = failed(report)
    assert names[0].startswith("calc sheet bleed")
    assert names[1].startswith("index of the functions")
    assert "shows '#VALUE!' instead of 'PASS'" in report.text()


@pytest.mark.parametrize(
    ("excel", "checks", "sentence"),
    [
        (NotAnError, ["a Python that dies"], "shows 0.0 instead of"),
        (Listens, ["one Python serves Excel"], "0.0.0.0:4000"),
        (
            KeepsNothing,
            ["saved by Excel", "without the add-in", "refresh enters"],
            "was saved as =_xludf.FO_",
        ),
        (DoesNotStart, ["Excel starts"], "could not be finished: ComError"),
    ],
)
def test_what_is_wrong_is_reported_and_the_rest_goes_on(
    excel: type[StandIn], checks: list[str], sentence: str, tmp_path: Path
) -> None:
    report = report_of(excel, tmp_path)
    for name, check in zip(failed(report), checks, strict=True):
        assert name.startswith(check)
    assert sentence in report.text()
    assert report.failed == len(checks)
    assert not (tmp_path / "tausheet.xlam").exists(), "removed again whatever happened"


def test_a_difference_in_the_parity_suite_is_reported(tmp_path: Path) -> None:
    class Off(StandIn):
        def values(self, path: Path, compute: bool) -> Any:
            values = super().values(path, compute)
            if path.name == "calls.xlsx":
                name = CALLS[0].function
                values[name] = dict.fromkeys(values[name], 12345.0)
            return values

    report = report_of(Off, tmp_path)
    assert [name[:28] for name in failed(report)] == ["every call of the parity sui"]


@pytest.mark.parametrize(
    ("found", "wanted", "same"),
    [
        (1.0, 1.0 + 1e-10, True),
        (1.0, 1.0 + 1e-8, False),
        (0.0, 1e-14, True),
        (0.0, 1e-12, False),
        (True, 1.0, False),
        ("1", 1.0, False),
        (None, "", True),
        (None, 0.0, False),
        (ErrorKind.NA, ErrorKind.NUM, False),
        (ErrorKind.NA, ErrorKind.NA, True),
    ],
)
def test_what_counts_as_the_same(found: Any, wanted: Any, same: bool) -> None:
    assert (first_run.compared({"S": {"A1": found}}, {"S": {"A1": wanted}}) == []) is same


def test_comparing_nothing_is_no_success() -> None:
    assert first_run.compared({}, {"S": {}}) == ["there was nothing to compare"]


def test_values_of_excel_are_read_as_what_they_are() -> None:
    given = [windows.ERROR_BASE + 2042, 1.5, True, "x", None, "#N/A"]
    assert [first_run.plain(v) for v in given] == [ErrorKind.NA, 1.5, True, "x", None, ErrorKind.NA]


def test_elsewhere_it_does_nothing(capsys: pytest.CaptureFixture[str]) -> None:
    assert first_run.main() == 2
    assert "nothing was done" in capsys.readouterr().err
