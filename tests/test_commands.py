"""The commands as an engineer runs them: new processes, real files, sentences for what is wrong."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pypdfium2
import pytest
from openpyxl import load_workbook

from tausheet.templates import SHEETS


def tausheet(*arguments: object, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "tausheet.addin.cli", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, cwd=cwd, timeout=180)


def named(path: Path, name: str) -> object:
    """The stored value of a defined name of one cell, as any viewer shows it."""
    book = load_workbook(path, data_only=True)
    ((sheet, reference),) = book.defined_names[name].destinations
    return book[sheet][reference.replace("$", "").split(":")[0]].value


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("new") / "bleed.xlsx"
    done = tausheet("new", "bleed", out, "--demo")
    assert done.returncode == 0, done.stderr
    return out


def test_list_names_every_sheet_and_its_inputs() -> None:
    listed = tausheet("list")
    assert listed.returncode == 0
    for name in SHEETS:
        assert name in listed.stdout
        inputs = tausheet("list", name).stdout
        for entry in SHEETS[name].entries():
            assert entry.symbol in inputs
    wrong = tausheet("list", "nothing")
    assert wrong.returncode == 2
    assert "is no calc sheet; use one of: bleed" in wrong.stderr


def test_the_demo_sheet_passes_and_says_what_decides(demo: Path) -> None:
    assert named(demo, "verdict") == "PASS"
    assert "Time to the safe voltage" in str(named(demo, "decided_by"))


def test_an_empty_sheet_fails_and_names_the_input(tmp_path: Path) -> None:
    done = tausheet("new", "bleed", tmp_path / "empty.xlsx")
    assert done.returncode == 0
    assert "verdict: FAIL" in done.stdout
    assert named(tmp_path / "empty.xlsx", "verdict") == "FAIL"


def test_values_come_with_their_units(tmp_path: Path, demo: Path) -> None:
    out = tmp_path / "set.xlsx"
    done = tausheet(
        "new", "bleed", out, "--demo", "--set", "C_unit=2200 uF", "--set", "V_start=0.6 kV"
    )
    assert done.returncode == 0, done.stderr
    assert named(out, "C_unit") == 0.0022
    assert named(out, "V_start") == 600
    assert float(str(named(out, "t_safe"))) < float(str(named(demo, "t_safe")))


def test_a_table_of_values_is_read_and_set_wins_over_it(tmp_path: Path) -> None:
    table = tmp_path / "values.csv"
    table.write_text("symbol,value\nC_unit,2200 uF\nV_start,600 V\n", encoding="utf-8")
    out = tmp_path / "v.xlsx"
    done = tausheet("new", "bleed", out, "--demo", "--values", table, "--set", "V_start=650 V")
    assert done.returncode == 0, done.stderr
    assert (named(out, "C_unit"), named(out, "V_start")) == (0.0022, 650)


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        ("C_unit,1 uF\n", "columns symbol and value"),
        ("symbol,value\nC_unit,1 uF\nC_unit,2 uF\n", "line 3"),
        ("symbol,value\n,1\n", "line 2"),
        ("symbol,value\nC_unit\n", "line 2"),
    ],
)
def test_a_malformed_table_of_values_is_refused(
    content: str, sentence: str, tmp_path: Path
) -> None:
    table = tmp_path / "values.csv"
    table.write_text(content)
    done = tausheet("new", "bleed", tmp_path / "x.xlsx", "--values", table)
    assert done.returncode == 2
    assert sentence in done.stderr
    assert not (tmp_path / "x.xlsx").exists()


@pytest.mark.parametrize(
    ("given", "sentence"),
    [
        ("C_unit", "give symbol=value"),
        ("C_nothing=1 uF", "C_nothing"),
        ("C_unit=1 V", "C_unit"),
        ("C_unit=1 banana", "C_unit"),
        ("R_unit=5 uF", "R_unit"),
    ],
)
def test_a_value_that_cannot_be_read_makes_no_sheet(
    given: str, sentence: str, tmp_path: Path
) -> None:
    done = tausheet("new", "bleed", tmp_path / "x.xlsx", "--demo", "--set", given)
    assert done.returncode == 2
    assert sentence in done.stderr
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("value", ["0 uF", "-1 uF", "1E400 uF", "1E9 F"])
def test_a_number_out_of_its_range_never_passes(value: str, tmp_path: Path) -> None:
    out = tmp_path / "x.xlsx"
    done = tausheet("new", "bleed", out, "--demo", "--set", f"C_unit={value}")
    assert "PASS" not in done.stdout.split("verdict:")[-1]
    assert done.returncode in (0, 2)
    if done.returncode == 0:
        assert named(out, "verdict") == "FAIL"
        assert "C_unit" in done.stdout


def test_a_formula_in_a_value_stays_a_text_or_is_refused(tmp_path: Path) -> None:
    out = tmp_path / "x.xlsx"
    done = tausheet("new", "bleed", out, "--demo", "--set", 'R_unit_source==HYPERLINK("x")')
    assert done.returncode in (0, 2)
    if done.returncode == 0:
        for sheet in load_workbook(out):
            for row in sheet.iter_rows():
                assert not any(c.data_type == "f" and "HYPERLINK" in str(c.value) for c in row)


def test_an_existing_file_stays_without_force(tmp_path: Path) -> None:
    out = tmp_path / "mine.xlsx"
    out.write_text("mine")
    done = tausheet("new", "bleed", out, "--demo")
    assert done.returncode == 2
    assert "--force" in done.stderr
    assert out.read_text() == "mine"
    assert tausheet("new", "bleed", out, "--demo", "--force").returncode == 0
    assert named(out, "verdict") == "PASS"


def test_both_engines_make_the_same_sheet(demo: Path, tmp_path: Path) -> None:
    other = tmp_path / "calc.xlsx"
    assert tausheet("new", "bleed", other, "--demo", "--engine", "calc").returncode == 0
    one, two = (load_workbook(path, data_only=True) for path in (demo, other))
    for sheet in one:
        for row in sheet.iter_rows():
            for cell in row:
                value = two[sheet.title][cell.coordinate].value
                if isinstance(cell.value, float):
                    assert value == pytest.approx(cell.value, rel=1e-12, abs=1e-300)
                else:
                    assert cell.value == value, (sheet.title, cell.coordinate)


def test_recalc_says_what_it_stored_and_writes_elsewhere_on_request(
    demo: Path, tmp_path: Path
) -> None:
    before = demo.read_bytes()
    done = tausheet("recalc", demo, "-o", tmp_path / "again.xlsx")
    assert "values stored" in done.stdout
    assert demo.read_bytes() == before
    two = tausheet("recalc", demo, demo, "-o", tmp_path / "two.xlsx")
    assert two.returncode == 2
    assert "one at a time" in two.stderr


def test_the_printed_sheet_lies_beside_the_workbook(demo: Path) -> None:
    done = tausheet("pdf", demo)
    assert done.returncode == 0, done.stderr
    printed = demo.with_suffix(".pdf")
    pages = pypdfium2.PdfDocument(printed)
    assert len(pages) > 3
    assert "PASS" in pages[0].get_textpage().get_text_range()
    again = tausheet("pdf", demo)
    assert again.returncode == 2
    assert "--force" in again.stderr


def test_the_demo_makes_every_sheet_and_prints_its_verdict(tmp_path: Path) -> None:
    done = tausheet("demo", tmp_path / "quay")
    assert done.returncode == 0, done.stderr
    assert "Quay 4" in done.stdout
    assert done.stdout.count("PASS  ") == len(SHEETS)
    assert len(list((tmp_path / "quay").iterdir())) == len(SHEETS)
    assert tausheet("demo", tmp_path / "quay").returncode == 2


def test_status_says_what_works_here() -> None:
    said = tausheet("status").stdout
    assert "65 cell functions" in said
    assert "works (--engine embedded" in said
    assert "LibreOffice: " in said
    assert "Excel" in said


def test_what_is_no_workbook_is_refused_in_one_sentence(tmp_path: Path) -> None:
    path = tmp_path / "x.xlsx"
    path.write_text("no workbook")
    for command in (["recalc", path], ["pdf", path]):
        done = tausheet(*command)
        assert done.returncode == 2
        assert "not a whole .xlsx workbook" in done.stderr
        assert "Traceback" not in done.stderr
    assert tausheet("new", "bleed", tmp_path / "x.ods").returncode == 2
    assert tausheet("install", "calc", "--to", tmp_path / "y").returncode == 2


def test_without_the_extra_for_excel_status_still_answers() -> None:
    """The first command of the README installs no extra."""
    blocked = (
        "import sys; sys.modules.update(olefile=None, xlwings=None); sys.argv[1:] = ['status']"
    )
    run = "from tausheet.addin.cli import main; main()"
    command = [sys.executable, "-c", f"{blocked}; {run}"]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60)
    assert "works (--engine embedded" in done.stdout
    assert "Traceback" not in done.stderr
