"""Installing, repairing, refreshing and removing the add-in, with Excel and Windows replaced.

A Windows path is one file name on Linux, so the fake Python and its DLL lie in the current folder.
"""

from __future__ import annotations

import os
import subprocess
import zipfile
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest
import windows_stand_in as windows

from tausheet.addin.excel import addin_file, bridge, installation, refresh
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import TausheetError

XLWINGS = windows.install().xlwings
PYTHON = r"C:\venv\Scripts\pythonw.exe"
DLL = bridge.dll_name(64, XLWINGS.__version__)


class Excel:
    """A running Excel, as much of it as installing needs; it writes down what happens."""

    def __init__(self, has_it_open: bool, events: list[str]) -> None:
        self.has_it_open, self.events = has_it_open, events
        self.api = SimpleNamespace(Workbooks=self)

    def __call__(self, name: str) -> Any:
        if name != addin_file.FILE_NAME or not self.has_it_open:
            raise windows.ComError(-2147352565, "Invalid index")
        return SimpleNamespace(Close=self.close)

    def close(self, save: bool) -> None:
        assert save is False
        self.events.append("closed")
        self.has_it_open = False

    def Open(self, path: str) -> None:
        self.events.append(f"opened {Path(path).read_bytes()[:2]!r}")
        self.has_it_open = True


@pytest.fixture
def place(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Where the add-in goes, on a machine that seems to be Windows with a Python that works."""
    here = SimpleNamespace(platform="win32", executable=PYTHON)
    monkeypatch.setattr(installation, "sys", here)
    monkeypatch.setattr(refresh, "sys", here)
    monkeypatch.setenv("APPDATA", str(tmp_path / "Roaming"))
    monkeypatch.chdir(tmp_path)
    Path(PYTHON).touch()
    Path(DLL).touch()
    python_says(monkeypatch, 0)
    monkeypatch.setattr(XLWINGS, "apps", [])
    return tmp_path / "Roaming" / "Microsoft" / "Excel" / "XLSTART" / addin_file.FILE_NAME


def python_says(monkeypatch: pytest.MonkeyPatch, code: int, message: str = "") -> None:
    def run(command: list[str], **_: Any) -> Any:
        assert command[:3] == [PYTHON, "-I", "-B"]
        return subprocess.CompletedProcess(command, code, "", message)

    monkeypatch.setattr(installation, "subprocess", SimpleNamespace(**vars(subprocess), x=0))
    monkeypatch.setattr(installation.subprocess, "run", run)


def test_installed_then_in_order_then_removed(place: Path) -> None:
    assert installation.status() == [
        "Excel: the add-in is not installed; run `tausheet install excel`."
    ]
    said = installation.install()
    assert said == f"Excel: {len(CATALOGUE)} functions in {place}; restart Excel where it is open."
    assert os.listdir(place.parent) == [place.name], "Excel opens whatever lies there"
    assert os.listdir(place.parent.parent) == ["XLSTART"]
    (line,) = installation.status()
    assert "repair" not in line
    assert PYTHON in line
    assert installation.uninstall() == f"Excel: {place} removed."
    assert os.listdir(place.parent) == []
    assert installation.uninstall() == "Excel: the add-in is not installed."


def with_stamp(path: Path, key: str, value: str) -> None:
    """The add-in file with another value in its stamp."""
    stamp = addin_file.read_stamp(path)
    with zipfile.ZipFile(path) as given:
        parts = {name: given.read(name) for name in given.namelist()}
    sheet = parts["xl/worksheets/sheet1.xml"]
    assert sheet.count(stamp[key].encode()) == 1
    parts["xl/worksheets/sheet1.xml"] = sheet.replace(stamp[key].encode(), value.encode())
    with zipfile.ZipFile(path, "w") as made:
        for name, data in parts.items():
            made.writestr(name, data)


@pytest.mark.parametrize(
    ("key", "value", "sentence"),
    [
        ("tausheet", "0.0.1", "it was made with tausheet 0.0.1, and"),
        ("xlwings", "0.36.99", "it was made with xlwings 0.36.99, and"),
        ("contents", "0123456789abcdef", "its functions are not those of this version"),
        ("interpreter", r"C:\gone\pythonw.exe", r"C:\gone\pythonw.exe is gone"),
    ],
)
def test_status_says_what_needs_a_repair(key: str, value: str, sentence: str, place: Path) -> None:
    installation.install()
    with_stamp(place, key, value)
    repairs = [line for line in installation.status() if "needs a repair" in line]
    assert any(sentence in line for line in repairs)
    assert all("run `tausheet install excel`" in line for line in repairs)
    installation.install()
    assert len(installation.status()) == 1


def test_status_misses_the_dll_after_an_upgrade_of_xlwings(place: Path) -> None:
    installation.install()
    Path(DLL).rename("xlwings64-0.99.0.dll")
    assert f"{DLL} is missing beside" in installation.status()[1]


def test_status_of_a_file_that_is_no_add_in(place: Path) -> None:
    place.parent.mkdir(parents=True)
    place.write_bytes(b"something else")
    (line,) = installation.status()
    assert "is not an add-in file of tausheet" in line
    assert "run `tausheet install excel`" in line


def test_a_running_excel_lets_go_of_the_file_and_opens_the_new_one(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    events: list[str] = []
    monkeypatch.setattr(XLWINGS, "apps", [Excel(True, events), Excel(False, events)])
    place.parent.mkdir(parents=True)
    place.write_bytes(b"old")
    installation.install()
    assert events == ["closed", "opened b'PK'"], "closed and opened in the one that had it"
    installation.uninstall()
    assert events[2:] == ["closed"]


def test_an_excel_that_keeps_the_file_leaves_the_old_one(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    events: list[str] = []
    monkeypatch.setattr(XLWINGS, "apps", [Excel(True, events)])
    place.parent.mkdir(parents=True)
    place.write_bytes(b"old")

    def refused(*_: Any) -> None:
        raise PermissionError(13, "The process cannot access the file")

    monkeypatch.setattr(installation.os, "replace", refused)
    with pytest.raises(TausheetError, match=r"cannot access the file.*close Excel and try again"):
        installation.install()
    assert place.read_bytes() == b"old"
    assert os.listdir(place.parent.parent) == ["XLSTART"]
    monkeypatch.setattr(Path, "unlink", refused)
    with pytest.raises(TausheetError, match=r"could not be removed .*close Excel"):
        installation.uninstall()
    assert place.read_bytes() == b"old"
    assert events == ["closed", "opened b'ol'"] * 2, "what was open is open again"


def test_a_python_that_cannot_load_the_functions_is_refused(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    python_says(monkeypatch, 1, "Traceback\nModuleNotFoundError: No module named 'xlwings'\n")
    with pytest.raises(TausheetError, match=r"No module named 'xlwings'\); install \"tausheet"):
        installation.install()
    assert not place.exists()

    def hangs(command: list[str], **_: Any) -> Any:
        raise subprocess.TimeoutExpired(command, 120)

    monkeypatch.setattr(installation.subprocess, "run", hangs)
    with pytest.raises(TausheetError, match="cannot be started"):
        installation.install()
    assert not place.exists()


def test_without_a_home_of_excel_a_sentence_says_so(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("APPDATA")
    assert "APPDATA is not set" in installation.status()[0]
    with pytest.raises(TausheetError, match="use --to"):
        installation.install()


ALLOWED = dict.fromkeys(refresh._ALLOWED, False) | {"AllowFormattingColumns": True}


class Sheet:
    """A worksheet; protected or not, with a password or not."""

    def __init__(self, name: str, cells: list[Any], protected: bool, password: bool) -> None:
        self.name, self.used_range, self.password = name, cells, password
        self.api, self.given = self, None
        self.ProtectContents, self.ProtectDrawingObjects = protected, True
        self.ProtectScenarios, self.Protection = False, SimpleNamespace(**ALLOWED)
        for cell in cells:
            cell.sheet = self

    def Protect(self, **given: Any) -> None:
        if self.password:
            raise windows.ComError(-2146827284, "The password is not correct")
        self.given = given


class Cell:
    """A cell that is locked; what is entered into it ends up in `entered`."""

    def __init__(self, formula: str, array: Any = None) -> None:
        self.sheet: Any = None
        self.api, self.entered = self, ""
        self.HasFormula, self.Formula = formula.startswith("="), formula
        self.HasArray, self.CurrentArray = array is not None, array

    @property
    def Formula2(self) -> str:
        return self.Formula

    @Formula2.setter
    def Formula2(self, formula: str) -> None:
        if self.sheet.ProtectContents and not (self.sheet.given or {}).get("UserInterfaceOnly"):
            raise windows.ComError(-2146827284, "The cell is protected")
        self.entered = formula


def an_excel(*sheets: Sheet) -> Any:
    events: list[str] = []
    api = SimpleNamespace(Calculation=-4105, CalculateFullRebuild=lambda: events.append("rebuilt"))
    book = SimpleNamespace(name="Quay 4.xlsx", sheets=sheets)
    return SimpleNamespace(api=api, books=[book], events=events)


def test_refresh_enters_each_formula_once_and_computes_everything() -> None:
    array = SimpleNamespace(Address="$B$1:$B$2", FormulaArray=None)
    cells = [
        Cell("=[1]!FO_STEP(1,1,0,5)"),
        Cell("=SUM(A1:A2)"),
        Cell("5"),
        Cell("=_xludf.FO_STEP(A1:A2,1,0,5)", array),
        Cell("=_xludf.FO_STEP(A1:A2,1,0,5)", array),
    ]
    app = an_excel(Sheet("S", cells, protected=False, password=False))
    assert refresh.refresh_app(app) == (2, [])
    assert [cell.entered for cell in cells] == ["=FO_STEP(1,1,0,5)", "", "", "", ""]
    assert array.FormulaArray == "=FO_STEP(A1:A2,1,0,5)"
    assert (app.api.Calculation, app.events) == (-4105, ["rebuilt"])


def test_refresh_keeps_a_protected_sheet_protected_as_it_was() -> None:
    cell = Cell("=_xludf.FO_TAU_RC(1,2)")
    sheet = Sheet("Calculation", [cell], protected=True, password=False)
    untouched = Sheet("Notes", [Cell("=SUM(A1)")], protected=True, password=False)
    assert refresh.refresh_app(an_excel(sheet, untouched)) == (1, [])
    assert cell.entered == "=FO_TAU_RC(1,2)"
    assert sheet.given == {
        "DrawingObjects": True,
        "Contents": True,
        "Scenarios": False,
        "UserInterfaceOnly": True,
        **ALLOWED,
    }
    assert untouched.given is None


def test_refresh_names_a_sheet_with_a_password_and_goes_on(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    locked, other = Cell("=[1]!FO_TAU_RC(1,2)"), Cell("=[1]!FO_TAU_RC(3,4)")
    app = an_excel(
        Sheet("Locked", [locked], protected=True, password=True),
        Sheet("Open", [other], protected=False, password=False),
    )
    monkeypatch.setattr(XLWINGS, "apps", [app])
    first, second = refresh.refresh().splitlines()
    assert first == "Excel: 1 formulas entered again and everything computed."
    assert second.startswith("Excel: Quay 4.xlsx, sheet Locked: not all formulas could be entered")
    assert "unprotect the sheet" in second
    assert (locked.entered, other.entered) == ("", "=FO_TAU_RC(3,4)")
    assert (app.api.Calculation, app.events) == (-4105, ["rebuilt"])


def test_refresh_without_workbooks_or_without_excel(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert refresh.refresh() == "Excel: not open; open the workbooks first."
    empty = SimpleNamespace(books=[], api=None)  # Excel fails when asked how it calculates
    monkeypatch.setattr(XLWINGS, "apps", [empty])
    assert refresh.refresh() == "Excel: 0 formulas entered again and everything computed."
    monkeypatch.undo()
    with pytest.raises(TausheetError, match="Windows only"):
        refresh.refresh()


def test_refresh_in_an_excel_without_formula2() -> None:
    api = SimpleNamespace(HasArray=False, Formula="=[1]!FO_TAU_RC(1,2)")
    refresh._enter(api)
    assert api.Formula == "=FO_TAU_RC(1,2)"


def test_a_file_for_carrying_over_says_which_python_it_starts(tmp_path: Path) -> None:
    """Without a word about it: a folder that administrators alone can write to."""
    said = installation.install(to=tmp_path / "tausheet.xlam")
    assert installation.CARRIED_OVER in said
    assert (tmp_path / "tausheet.xlam").is_file()
    named = installation.install(to=tmp_path / "other.xlam", interpreter=r"D:\py\pythonw.exe")
    assert r"D:\py\pythonw.exe" in named
