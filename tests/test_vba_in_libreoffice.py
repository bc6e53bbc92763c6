"""The VBA of the built add-in file, compiled and executed by LibreOffice in its VBA mode.

Not Excel's VBA, but a second reader of the same language: it compiles the whole module and runs
the helpers and the wrappers, with a stand-in for Python behind them.
"""

from __future__ import annotations

import json
import subprocess
from pathlib import Path
from typing import Any

import pytest
import windows_stand_in as windows

from tausheet.addin.calc import libreoffice
from tausheet.addin.excel import addin_file, bridge, registration
from tausheet.functions.catalogue import CATALOGUE

XLWINGS = windows.install()
PYTHON = r"C:\Users\Zoë Łuk\venv\Scripts\python.exe"

# writes any value as text: errors by their number, arrays by row
SHOWN = """
Function Shown(ByVal v As Variant) As String
    Dim i As Long, j As Long, wide As Boolean, text As String
    If Not IsArray(v) Then
        If IsError(v) Then Shown = "<" & CStr(v) & ">" Else Shown = TypeName(v) & " " & v
        Exit Function
    End If
    On Error Resume Next
    j = UBound(v, 2)
    wide = (Err.Number = 0)
    On Error GoTo 0
    For i = LBound(v, 1) To UBound(v, 1)
        If wide Then
            For j = LBound(v, 2) To UBound(v, 2)
                text = text & Shown(v(i, j)) & ","
            Next j
            text = text & ";"
        Else
            text = text & Shown(v(i)) & ","
        End If
    Next i
    Shown = "[" & text & "]"
End Function
"""


# LibreOffice knows no Value2; in Excel it differs from Value for dates and currencies alone
VALUE2 = ("block.Value2", "block.Value")


def run(addin: Path, folder: Path, names: list[str], **request: Any) -> dict[str, str]:
    office = libreoffice.find()
    done = subprocess.run(
        [
            *(office.python, Path(__file__).with_name("vba_in_libreoffice.py")),
            *(office.soffice, folder, addin, json.dumps({**request, "run": names})),
        ],
        capture_output=True,
        text=True,
        timeout=180,
        env={**libreoffice.clean_environment(), "LC_ALL": "C.UTF-8"},
    )
    assert done.returncode == 0, done.stderr
    results: dict[str, str] = json.loads(done.stdout.splitlines()[-1])
    return results


@pytest.fixture(scope="module")
def addin(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("vba") / addin_file.FILE_NAME
    addin_file.make(path, PYTHON, XLWINGS.udfs)
    return path


HELPERS = """
Function OfNumbers() As String
    OfNumbers = Shown(InCell(1.5)) & Shown(InCell("x")) & Shown(InCell(True)) & Shown(InCell(Empty))
End Function
Function OfLongs() As String
    Dim below As Long, last As Long, small As Long
    below = -2146824192: last = -2146824193: small = 5
    OfLongs = Shown(InCell(below)) & Shown(InCell(last)) & Shown(InCell(small))
End Function
Function OfErrors() As String
    Dim codes As Variant, k As Long, code As Long
    codes = Array(2000, 2007, 2015, 2023, 2029, 2036, 2042)
    For k = 0 To 6
        code = -2146828288 + codes(k)
        OfErrors = OfErrors & Shown(InCell(code))
    Next k
End Function
Function OfADoubleThatLooksLikeAnError() As String
    OfADoubleThatLooksLikeAnError = Shown(InCell(CDbl(-2146826281)))
End Function
Function OfARow() As String
    Dim v(2) As Variant, code As Long
    code = -2146826252
    v(0) = 1.5: v(1) = code: v(2) = "x"
    OfARow = Shown(InCells(v))
End Function
Function OfATable() As String
    Dim v(1, 2) As Variant, code As Long
    code = -2146826246
    v(0, 0) = 1.5: v(0, 1) = code: v(0, 2) = "x": v(1, 0) = code: v(1, 1) = 0.25: v(1, 2) = ""
    OfATable = Shown(InCells(v))
End Function
Function OfASingleValue() As String
    Dim code As Long
    code = -2146826273
    OfASingleValue = Shown(InCells(code)) & Shown(InCells(2.5))
End Function
Function OfAFailure() As String
    OfAFailure = Shown(ErrorFrom("no answer")) & TausheetLastFailure()
End Function
Function OfNothing() As String
    OfNothing = UBound(Given(Array()))
End Function
Function OfRanges() As String
    ThisWorkbook.Sheets(1).Range("D1").Value = 1.5
    ThisWorkbook.Sheets(1).Range("E2").Value = "x"
    OfRanges = Shown(Given(Array(ThisWorkbook.Sheets(1).Range("D1:E2"), 2.5, _
        ThisWorkbook.Sheets(1).Range("D1"))))
End Function
Function OfSeveralAreas() As String
    OfSeveralAreas = Shown(Given(Array(ThisWorkbook.Sheets(1).Range("A1,B2"))))
End Function
Function OfTheCommand() As String
    OfTheCommand = PythonCommand()
End Function
"""


def test_the_helpers_compute_what_they_should(addin: Path, tmp_path: Path) -> None:
    wanted = {
        "OfNumbers": "Double 1.5String xBoolean TrueEmpty ",
        "OfLongs": "Long -2146824192<Error 4095>Long 5",
        "OfErrors": "".join(f"<Error {n}>" for n in (2000, 2007, 2015, 2023, 2029, 2036, 2042)),
        "OfADoubleThatLooksLikeAnError": "Double -2146826281",
        "OfARow": "[Double 1.5,<Error 2036>,String x,]",
        "OfATable": "[Double 1.5,<Error 2042>,String x,;<Error 2042>,Double 0.25,String ,;]",
        "OfASingleValue": "<Error 2015>Double 2.5",
        "OfAFailure": "<Error 2015>no answer",
        "OfNothing": "-1",
        "OfRanges": "[[Double 1.5,Empty ,;Empty ,String x,;],Double 2.5,Double 1.5,]",
        "OfSeveralAreas": "[<Error 2015>,]",
        "OfTheCommand": bridge.command(bridge.without_console(PYTHON)),
    }
    found = run(addin, tmp_path / "lo", list(wanted), append=SHOWN + HELPERS, replace=[VALUE2])
    assert found == wanted


# LibreOffice does not pass a left-out argument on, so all are given;
# it answers as Python does: numbers, an error alone and in arrays, or not at all
FAKE_PYTHON = """Option VBASupport 1
Option ClassModule
Public Function CallUDF(ByVal module As String, ByVal name As String, given As Variant) As Variant
    Dim code As Long, table(1, 1) As Variant, row(1) As Variant
    code = -2146826252
    Select Case given(0)
    Case 1
        CallUDF = name & UBound(given) & module
    Case 2
        CallUDF = code
    Case 3
        table(0, 0) = 0.5: table(0, 1) = code: table(1, 0) = code: table(1, 1) = "x"
        CallUDF = table
    Case 4
        row(0) = code: row(1) = 0.5
        CallUDF = row
    Case 5
        Err.Raise 1000, Description:="Python has died"
    End Select
End Function
"""
ANSWERED = """
Private Function Answering() As Object
    Set Answering = New FakePython
End Function
Function OfAText() As String
    OfAText = Shown(FO_STEP(1, 2, 3, 4, 5))
End Function
Function OfAnError() As String
    OfAnError = Shown(FO_STEP(2, 2, 3, 4, 5))
End Function
Function OfATable() As String
    OfATable = Shown(FO_STEP(3, 2, 3, 4, 5))
End Function
Function OfARow() As String
    OfARow = Shown(FO_STEP(4, 2, 3, 4, 5))
End Function
Function OfADeath() As String
    OfADeath = Shown(FO_STEP(5, 2, 3, 4, 5)) & TausheetLastFailure()
End Function
Function OfManyArguments() As String
    OfManyArguments = Shown(FO_REASON(1, 2, 3, 4, 5, 6)) & Shown(FO_REASON(1))
End Function
"""


def test_the_wrappers_hand_over_and_bring_back(addin: Path, tmp_path: Path) -> None:
    module = "tausheet.addin.excel.worksheet_functions"
    wanted = {
        "OfAText": f"String FO_STEP4{module}",
        "OfAnError": "<Error 2036>",
        "OfATable": "[Double 0.5,<Error 2036>,;<Error 2036>,String x,;]",
        "OfARow": "[<Error 2036>,Double 0.5,]",
        "OfADeath": "<Error 2015>Python has died",
        "OfManyArguments": f"String FO_REASON5{module}String FO_REASON0{module}",
    }
    found = run(
        addin,
        tmp_path / "lo",
        list(wanted),
        classes={"FakePython": FAKE_PYTHON},
        append=SHOWN + ANSWERED,
        replace=[("InCells(XLPy.CallUDF(", "InCells(Answering.CallUDF(")],
    )
    assert found == wanted


HELP = """
Private Collected As String
Private Sub Collect(ByVal macro As String, ByVal group As String, ByVal summary As String, \
ByVal helps As Variant)
    Collected = Collected & macro & "|" & group & "|" & summary & "|" & Join(helps, "|") & Chr(10)
End Sub
Function OfTheHelp() As String
    DescribeFunctions
    OfTheHelp = Collected
End Function
"""


def test_the_function_wizard_is_told_of_every_function(addin: Path, tmp_path: Path) -> None:
    found = run(
        addin,
        tmp_path / "lo",
        ["OfTheHelp"],
        append=HELP,
        replace=[('    Describe "', '    Collect "')],
    )
    lines = [line.split("|") for line in found["OfTheHelp"].splitlines()]
    assert sorted(lines) == sorted(
        [
            f"'{addin_file.FILE_NAME}'!{entry.name}",
            f"tausheet: {entry.group}",
            registration.description(entry),
            *(
                map(registration.argument_description, entry.parameters)
                if entry.parameters
                else [""]
            ),
        ]
        for entry in CATALOGUE.values()
    )


def test_a_module_that_does_not_compile_is_noticed(addin: Path, tmp_path: Path) -> None:
    broken = "\nFunction Broken()\n    If True\nEnd Function\n"
    found = run(addin, tmp_path / "lo", ["OfNumbers"], append=SHOWN + HELPERS + broken)
    assert found["OfNumbers"] != "Double 1.5String xBoolean TrueEmpty "
