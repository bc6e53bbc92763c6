"""A plain =FO_STEP(...) in an .xlsx computes when LibreOffice loads the file, and leaves no trace.

The documents are looked at from LibreOffice's own Python, before anything is recalculated.
"""

from __future__ import annotations

import json
import shutil
import subprocess
import tempfile
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.workbook.protection import WorkbookProtection
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin.calc import driver, extension, libreoffice
from tausheet.functions import step

LOOK = """
import json, sys, time, uno
sys.path.insert(0, sys.argv[1])
import helper

def look(office, document):
    return {
        "values": office.read(document),
        "modified": document.isModified(),
        "undo": list(document.getUndoManager().getAllUndoActionTitles()),
        "names": list(document.NamedRanges.ElementNames),
        "visible": document.CurrentController.Frame.ContainerWindow.isVisible(),
    }
"""
HIDDEN = """
soffice, folder, options, *paths = sys.argv[2:]
office = helper.Office(soffice, folder, [options])
seen = {}
for path in paths:
    how = helper.properties(Hidden=True, ReadOnly=path.endswith("readonly.xlsx"))
    url = uno.systemPathToFileUrl(path)
    document = office.desktop.loadComponentFromURL(url, "_blank", 0, how)
    seen[path] = look(office, document)
    document.close(True)
office.end()
print(json.dumps(seen))
"""
IN_WINDOWS = """
soffice, folder, options, *paths = sys.argv[2:]

class WindowedOffice(helper.Office):
    OPTIONS = ["--norestore", "--nologo", "--nofirststartwizard", *paths]

office = WindowedOffice(soffice, folder, [options])
seen = {}
while len(seen) < len(paths):
    time.sleep(1)
    for document in office.desktop.Components:
        path = uno.fileUrlToSystemPath(document.getURL())
        time.sleep(2)
        seen[path] = look(office, document)
office.end()
print(json.dumps(seen))
"""


def workbook(path: Path, *, protected: bool = False) -> Path:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "Quay 4"
    sheet["A1"], sheet["A2"], sheet["A3"] = 1, 2, 3
    sheet["B1"] = "=FO_STEP(A1,1,0,5)"
    sheet["B2"] = '=IF(FO_STEP(A2,1,0,5)>4,"fo_step(","no")'
    sheet["B3"] = "=tau_of_link*2"
    sheet["B4"] = "=2*FO_STEP(A1,-1,0,5)"
    sheet["B5"] = "=unknown_function(1)"
    sheet["C1"] = ArrayFormula("C1:C3", "=FO_STEP(A1:A3,1,0,5)")
    other = book.create_sheet("Other")
    other["A1"] = "=SUM(FO_STEP('Quay 4'!A1:A3,1,0,5))"
    book.defined_names["tau_of_link"] = DefinedName("tau_of_link", attr_text="FO_STEP(1,1,0,5)")
    taken = DefinedName("tausheet_temporary_name", attr_text="'Quay 4'!$A$1")
    book.defined_names["tausheet_temporary_name"] = taken
    if protected:
        sheet.protection.sheet = other.protection.sheet = True
        sheet.protection.password = other.protection.password = "crane"
        book.security = WorkbookProtection(workbookPassword="crane", lockStructure=True)
    book.save(path)
    return path


def probe(program: str, paths: dict[str, Path], **environment: str) -> dict[str, Any]:
    office = libreoffice.find()
    with tempfile.TemporaryDirectory() as folder:
        bundled = Path(folder, "bundled")
        extension.write(extension.files(), bundled / "tausheet")
        command = [
            *(office.python, "-c", LOOK + program, Path(driver.__file__).parent, office.soffice),
            *(folder, f"-env:BUNDLED_EXTENSIONS={bundled.as_uri()}", *paths.values()),
        ]
        done = subprocess.run(
            command,
            capture_output=True,
            text=True,
            timeout=120,
            env={**libreoffice.clean_environment(), **environment},
        )
    assert done.returncode == 0, done.stderr
    found = json.loads(done.stdout.splitlines()[-1])
    return {name: found[str(path)] for name, path in paths.items()}


@pytest.fixture(scope="module")
def seen(tmp_path_factory: pytest.TempPathFactory) -> Any:
    folder = tmp_path_factory.mktemp("load")
    paths = {
        "plain": workbook(folder / "plain.xlsx"),
        "protected": workbook(folder / "protected.xlsx", protected=True),
        "readonly": workbook(folder / "readonly.xlsx"),
    }
    return probe(HIDDEN, paths)


def check_values(values: dict[str, Any]) -> None:
    at = [step(t, 1, 0, 5) for t in (1, 2, 3)]
    assert values["Quay 4"] == {
        "B1": at[0],
        "B2": "fo_step(",
        "B3": 2 * at[0],
        "B4": {"error": 503},
        "B5": {"error": 525},
        "C1": at[0],
        "C2": at[1],
        "C3": at[2],
    }
    assert values["Other"] == {"A1": pytest.approx(sum(at), rel=1e-15)}


def check_no_trace(state: dict[str, Any]) -> None:
    assert state["modified"] is False
    assert state["undo"] == []
    assert sorted(state["names"]) == ["tau_of_link", "tausheet_temporary_name"]


@pytest.mark.parametrize("kind", ["plain", "protected", "readonly"])
def test_plain_calls_are_computed_on_load(seen: Any, kind: str) -> None:
    check_values(seen[kind]["values"])


@pytest.mark.parametrize("kind", ["plain", "protected", "readonly"])
def test_loading_leaves_no_trace(seen: Any, kind: str) -> None:
    check_no_trace(seen[kind])


@pytest.mark.campaign  # needs a LibreOffice with windows, and Xvfb to show them on
def test_plain_calls_are_computed_on_load_in_a_window(tmp_path: Path) -> None:
    paths = {
        "plain": workbook(tmp_path / "plain.xlsx"),
        "protected": workbook(tmp_path / "protected.xlsx", protected=True),
    }
    needed = "needs apt-get install --no-install-recommends libreoffice-calc xvfb"
    assert shutil.which("Xvfb"), needed
    program = libreoffice.find().soffice.parent
    assert list(program.glob("libvclplug_*")), needed
    command = ["Xvfb", "-noreset", "-displayfd", "1"]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as screen:
        try:
            assert screen.stdout is not None
            display = f":{screen.stdout.readline().strip()}"
            seen = probe(IN_WINDOWS, paths, DISPLAY=display)
        finally:
            screen.terminate()
    for state in seen.values():
        assert state["visible"]
        check_values(state["values"])
        check_no_trace(state)
