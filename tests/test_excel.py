"""Excel up to its door: xlwings' real registration, generator and call code, Windows replaced.

What only a real Excel can show is listed in DEVELOPERS.md and settled by tests/on_windows.
"""

from __future__ import annotations

import datetime
import io
import re
import subprocess
import sys
import time
import zipfile
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest
import windows_stand_in as windows
from oletools.olevba import VBA_Parser

from tausheet.addin import cells
from tausheet.addin.excel import addin_file, bridge, installation, names, registration, wrappers
from tausheet.addin.excel.refresh import relinked
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind, TausheetError

XLWINGS = windows.install()
PYTHON = r"C:\Users\engineer\venv\Scripts\python.exe"
NUMBER = {kind: registration.ERROR_BASE + n for kind, n in registration.EXCEL_NUMBERS.items()}
BLANK = windows.Range(None)


def excel(function: str, *arguments: Any) -> Any:
    return windows.call(wrappers.PYTHON_MODULE, function, *arguments)


@pytest.fixture(scope="module")
def built(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("addin") / addin_file.FILE_NAME
    addin_file.make(path, PYTHON, XLWINGS.udfs)
    return path


@pytest.fixture(scope="module")
def sources(built: Path) -> dict[str, str]:
    parser = VBA_Parser(str(built))
    return {name: code for _, _, name, code in parser.extract_macros()}


def test_every_function_of_the_catalogue_is_registered_with_its_help() -> None:
    excel("FO_VERSION")
    import tausheet.addin.excel.worksheet_functions as module

    for name, entry in CATALOGUE.items():
        info = getattr(module, name).__xlfunc__
        assert info["category"] == f"tausheet: {entry.group}"
        assert info["call_in_wizard"] is True
        assert info["ret"]["doc"] == entry.summary
        assert [a["name"] for a in info["args"]] == [p.name for p in entry.parameters]
        for argument, parameter in zip(info["args"], entry.parameters, strict=True):
            assert argument["doc"].startswith(parameter.help)
            assert argument["options"] == {"convert": "raw"}


def test_every_name_can_be_used_in_excel() -> None:
    for entry in CATALOGUE.values():
        registration.check_names(entry)
        assert len(entry.summary) <= names.LONGEST_DESCRIPTION
        for parameter in entry.parameters:
            whole = f"{parameter.help} (required)"
            assert len(whole) <= names.LONGEST_DESCRIPTION, f"{entry.name}: {parameter.name}"
    assert names.collisions(CATALOGUE, [*bridge.OWN_NAMES, bridge.MODULE, "Sheet2"]) == []


@pytest.mark.parametrize(
    ("function", "arguments", "sentence"),
    [
        ("FO_X", ["End"], "reserved word of VBA"),
        ("FO_X", ["step"], "reads differently"),
        ("FO_X", ["xlpy"], "used by the generated wrapper"),
        ("FO_X", ["a b"], "not a VBA identifier"),
        ("FO1", ["a"], "reads as a cell address"),
        ("R1C1", ["a"], "reads as a cell address"),
        ("FO_X", ["a", "A"], "differ only by case"),
        ("FO_X", ["fo_x"], "the function's name"),
        ("FO_X", [f"a{i}" for i in range(61)], "61 arguments"),
        ("FO_X", ["a" * 130, "b" * 130], "too long together"),
    ],
)
def test_a_name_that_excel_misreads_is_refused(
    function: str, arguments: list[str], sentence: str
) -> None:
    found = names.problems(function, arguments, variadic=False, optional=0)
    assert any(sentence in problem for problem in found)


def test_optional_and_variable_arguments_do_not_mix() -> None:
    assert names.problems("FO_X", ["a"], variadic=True, optional=1)
    assert names.collisions(["FO_A", "fo_a"], []) == ["fo_a collides with the function FO_A"]


@pytest.mark.parametrize(
    ("argument", "expected"),
    [
        (windows.Range(2.0), 2.0),
        (2.0, 2.0),
        (windows.Range(Decimal("2")), 2.0),
        (windows.Range(True), 1.0),
        (windows.Range(windows.PyTime(1900, 1, 1, tzinfo=datetime.timezone.utc)), 2.0),
        (windows.Range(windows.PyTime(1899, 12, 30, 12)), 0.5),
    ],
)
def test_numbers_arrive_as_their_values(argument: Any, expected: float) -> None:
    got = excel("FO_STEP", argument, 1.0, 0.0, 5.0, windows.MISSING)
    assert got == cells.call("FO_STEP", [expected, 1.0, 0.0, 5.0])


def test_blanks_left_out_arguments_and_texts_keep_their_meaning() -> None:
    assert excel("FO_STEP", BLANK, 1.0, 0.0, 5.0) == NUMBER[ErrorKind.VALUE]
    assert excel("FO_STEP", 1.0, 1.0, 0.0, 5.0, BLANK) == excel("FO_STEP", 1.0, 1.0, 0.0, 5.0)
    assert excel("FO_STEP", windows.Range(""), 1.0, 0.0, 5.0) == NUMBER[ErrorKind.VALUE]
    assert excel("FO_STEP", windows.Range("5"), 1.0, 0.0, 5.0) == NUMBER[ErrorKind.VALUE]


@pytest.mark.parametrize("kind", list(ErrorKind))
def test_an_error_cell_comes_out_unchanged_alone_and_in_a_range(kind: ErrorKind) -> None:
    assert excel("FO_STEP", 1.0, windows.Range(NUMBER[kind]), 0.0, 5.0) == NUMBER[kind]
    column = windows.Range(((1.0,), (NUMBER[kind],)))
    assert excel("FO_STEP", column, 1.0, 0.0, 5.0)[1] == [NUMBER[kind]]


def test_several_areas_in_one_argument_are_an_error_and_not_the_first_of_them() -> None:
    assert excel("FO_PARALLEL", windows.Range(((1.0,), (2.0,)), areas=2)) == NUMBER[ErrorKind.VALUE]


def test_numbers_of_visual_basic_are_numbers_too() -> None:
    day = windows.PyTime(1900, 1, 1, tzinfo=datetime.timezone.utc)
    assert excel("FO_TAU_RC", Decimal("2"), day) == 4.0


def test_whole_columns_are_read_as_far_as_they_are_used() -> None:
    blank = ((None,),) * (2**20 - 3)
    times = windows.Range(((0.0,), (1.0,), (2.0,), *blank))
    levels = windows.Range(((0.0,), (1.0,), (1.0,), *blank))
    points = [[[0.0], [1.0], [2.0]], [[0.0], [1.0], [1.0]]]
    expected = cells.call("FO_TABLE", [0.5, 1.0, 0.0, *points])
    assert excel("FO_TABLE", 0.5, 1.0, 0.0, times, levels) == expected


def test_an_error_of_a_newer_excel_is_an_error_too() -> None:
    spilled = registration.ERROR_BASE + 2045
    assert excel("FO_STEP", windows.Range(spilled), 1.0, 0.0, 5.0) == NUMBER[ErrorKind.VALUE]


def test_ranges_and_array_constants_broadcast() -> None:
    column = windows.Range(((0.0,), (1.0,)))
    table = excel("FO_STEP", column, (1.0, 2.0, 4.0), 0.0, 5.0)
    assert table[1] == [cells.call("FO_STEP", [1.0, tau, 0.0, 5.0]) for tau in (1.0, 2.0, 4.0)]
    assert excel("FO_STEP", column, ((1.0,), (2.0,), (3.0,)), 0.0, 5.0) == NUMBER[ErrorKind.VALUE]


def test_reason_takes_any_number_of_arguments() -> None:
    sentence = excel("FO_REASON", "FO_STEP", windows.Range(1.0), windows.Range(0.0), 0.0, 5.0)
    assert sentence.startswith("FO_STEP: tau is 0;")
    assert excel("FO_REASON", "FO_STEP", 1.0, 1.0, 0.0, 5.0) == ""


def test_a_call_that_hangs_gives_an_error_and_the_next_one_works(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    entry = CATALOGUE["FO_STEP"]
    hanging = entry.__class__(**{**vars(entry), "function": lambda *_: time.sleep(1.5)})
    monkeypatch.setattr(registration, "TIME_LIMIT", 0.2)
    monkeypatch.setitem(CATALOGUE, "FO_STEP", hanging)
    assert excel("FO_STEP", 1.0, 1.0, 0.0, 5.0) == NUMBER[ErrorKind.VALUE]
    monkeypatch.undo()
    assert excel("FO_STEP", 1.0, 1.0, 0.0, 5.0) == cells.call("FO_STEP", [1.0, 1.0, 0.0, 5.0])


def test_a_call_that_stops_every_thread_ends_this_python_and_a_long_wait_does_not() -> None:
    script = """
import re, sys, time
from tausheet.addin.excel import registration
registration.END_LIMIT = 1.0
registration.end_when_stuck()
time.sleep(2.5)
print("waited", flush=True)
re.match("(a+)+$", 60 * "a" + "b")  # never gives another thread its turn
print("came back", flush=True)
"""
    command = [sys.executable, "-c", script]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60)
    assert done.returncode != 0
    assert done.stdout == "waited\n"


def test_nothing_listens_on_a_network_address() -> None:
    script = """
import os, sys
sys.path.insert(0, "tests")
import windows_stand_in as windows
assert windows.call("tausheet.addin.excel.worksheet_functions", "FO_TAU_RC", 2.0, 3.0) == 6.0
links = [f"/proc/self/fd/{fd}" for fd in os.listdir("/proc/self/fd")]
own = {os.readlink(link) for link in links if os.path.lexists(link)}
for table in ("tcp", "tcp6", "udp", "udp6"):
    for line in open(f"/proc/self/net/{table}").readlines()[1:]:
        inode = line.split()[9]
        assert f"socket:[{inode}]" not in own, line
"""
    root = Path(__file__).resolve().parent.parent
    done = subprocess.run(
        [sys.executable, "-c", script], capture_output=True, text=True, timeout=60, cwd=root
    )
    assert done.returncode == 0, done.stderr


def test_the_wrappers_return_real_errors_and_hand_no_workbook_over(sources: dict[str, str]) -> None:
    text = sources[f"{bridge.MODULE}.bas"]
    for name in CATALOGUE:
        body = re.search(rf"(?ms)^Function {name}\(.*?^End Function", text)
        assert body is not None, name
        assert body[0].count(f'InCells(XLPy.CallUDF("{wrappers.PYTHON_MODULE}", "{name}", G') == 2
        assert body[0].count("ErrorFrom(Err.Description)") == 1
        assert body[0].count("On Error GoTo failed") == 1
    assert "ActiveWorkbook" not in text
    assert "Caller" not in text
    assert "= Err.Description" not in text


def test_a_formula_can_reach_the_cell_functions_and_nothing_else(sources: dict[str, str]) -> None:
    """Every public function of an open add-in can be called from any workbook's cells."""
    assert set(sources) == {"ThisWorkbook.cls", "Sheet2.cls", f"{bridge.MODULE}.bas"}
    begun = re.compile(
        r"(?im)^\s*(Public |Friend |Private )?(Static )?(Function|Sub|Property) (\w+)"
    )
    for text in sources.values():
        for scope, _, kind, name in begun.findall(text):
            if scope.strip() != "Private":
                assert name in CATALOGUE or (kind, name) in {
                    ("Function", "TausheetLastFailure"),
                    ("Sub", "Auto_Open"),
                }
    text = sources[f"{bridge.MODULE}.bas"]
    code = "\n".join(line for line in text.splitlines() if not line.startswith("'"))
    for word in ("Shell", "CreateObject", "GetObject", "Environ", "Kill ", "Open ", "cmd"):
        assert word not in code


def test_what_runs_is_a_constant(sources: dict[str, str]) -> None:
    text = sources[f"{bridge.MODULE}.bas"]
    command = re.search(r"(?ms)^Private Function PythonCommand.*?^End Function", text)
    assert command is not None
    assert command[0].splitlines()[1].strip() == (
        r'PythonCommand = """C:\Users\engineer\venv\Scripts\pythonw.exe"" -I -B -c '
        '""import xlwings; xlwings.serve(\'$(CLSID)\')"""'
    )


def test_names_of_the_module_are_refused_as_arguments() -> None:
    for name in bridge.OWN_NAMES:
        assert names.problems("FO_X", [name], variadic=False, optional=0)


@pytest.mark.parametrize(
    ("text", "written"),
    [
        ('say "x"', '"say ""x"""'),
        ("47 kΩ", '"47 k" & ChrW(937)'),
        ("µ", "ChrW(181)"),
        ("", '""'),
        ("a😀b", '"a" & ChrW(55357) & ChrW(56832) & "b"'),
    ],
)
def test_a_text_is_written_as_vba_reads_it_in_any_code_page(text: str, written: str) -> None:
    assert bridge.literal(text) == written


def test_the_lines_fit_into_vba(sources: dict[str, str]) -> None:
    lines = sources[f"{bridge.MODULE}.bas"].splitlines()
    assert max(map(len, lines)) <= 1023
    continued = 0
    for line in lines:
        continued = continued + 1 if line.endswith(" _") else 0
        assert continued <= 24


def test_an_xlwings_of_another_shape_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(bridge.ChangedShape, match="its DLL"):
        bridge.head("nothing of what is looked for")
    real = XLWINGS.udfs.generate_vba_wrapper

    def other(module_name: str, module: Any, file: Any, book: Any) -> None:
        buffer = io.StringIO()
        real(module_name, module, buffer, book)
        file.write(buffer.getvalue().replace("Err.Description", "Err.Number"))

    monkeypatch.setattr(XLWINGS.udfs, "generate_vba_wrapper", other)
    with pytest.raises(bridge.ChangedShape, match="a form that this version does not know"):
        addin_file.contents(PYTHON, XLWINGS.udfs)


def test_the_file_says_what_it_was_made_from(built: Path) -> None:
    found = addin_file.read_stamp(built)
    assert found["interpreter"] == r"C:\Users\engineer\venv\Scripts\pythonw.exe"
    assert set(found) == {"tausheet", "xlwings", "interpreter", "contents"}
    assert len(installation.status(built)) == 1
    with zipfile.ZipFile(built) as package:
        assert b"creator" not in package.read("docProps/core.xml")


def test_the_same_input_gives_the_same_file(built: Path, tmp_path: Path) -> None:
    again = tmp_path / "again.xlam"
    addin_file.make(again, PYTHON, XLWINGS.udfs)
    assert again.read_bytes() == built.read_bytes()


@pytest.mark.parametrize(
    "bad", ["python", r"C:\a$(b)\python.exe", r"%TEMP%\python.exe", r"C:\"\python.exe", ""]
)
def test_an_interpreter_that_is_no_plain_full_path_is_refused(bad: str, tmp_path: Path) -> None:
    with pytest.raises(TausheetError, match="full Windows path"):
        addin_file.make(tmp_path / "x.xlam", bad, XLWINGS.udfs)


def test_elsewhere_one_sentence_says_why_not() -> None:
    with pytest.raises(TausheetError, match="Windows only"):
        installation.install()
    with pytest.raises(TausheetError, match="Windows only"):
        installation.uninstall()
    assert "Windows only" in installation.status()[0]


def test_the_file_is_written_for_carrying_over_and_never_over_another(tmp_path: Path) -> None:
    out = tmp_path / "carried.xlam"
    out.write_text("mine")
    with pytest.raises(TausheetError, match="--force"):
        installation.install(to=out, interpreter=PYTHON)
    assert out.read_text() == "mine"
    assert "for Excel on Windows" in installation.install(to=out, interpreter=PYTHON, force=True)
    assert [path.name for path in tmp_path.iterdir()] == ["carried.xlam"]


@pytest.mark.parametrize("content", [b"", b"not a zip", b"PK\x03\x04 broken"])
def test_a_file_that_is_no_add_in_is_said_to_be_none(content: bytes, tmp_path: Path) -> None:
    path = tmp_path / "x.xlam"
    path.write_bytes(content)
    with pytest.raises(TausheetError, match="not an add-in file"):
        addin_file.read_stamp(path)


@pytest.mark.parametrize(
    ("found", "entered"),
    [
        ("=FO_STEP(A1,1,0,5)", "=FO_STEP(A1,1,0,5)"),
        (r"='C:\Users\x\XLSTART\tausheet.xlam'!FO_STEP(A1,1,0,5)", "=FO_STEP(A1,1,0,5)"),
        ("=tausheet.xlam!FO_STEP(1)+[1]!fo_step(2)", "=FO_STEP(1)+fo_step(2)"),
        ("=_xludf.FO_STEP(1)*@FO_TAU_RC(1,2)", "=FO_STEP(1)*FO_TAU_RC(1,2)"),
        ('="[1]!FO_STEP(" & [2]!Other(1)', '="[1]!FO_STEP(" & [2]!Other(1)'),
    ],
)
def test_our_functions_are_entered_by_their_plain_names(found: str, entered: str) -> None:
    assert relinked(found) == entered
