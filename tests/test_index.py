"""The index of all cell functions: complete, expected values from outside, results that agree."""

from __future__ import annotations

import re
from collections.abc import Iterator
from itertools import groupby
from pathlib import Path
from typing import Any

import mpmath
import pytest
import tomllib
from openpyxl import Workbook, load_workbook
from printed import PAPERS, assert_no_text_is_cut, pages_of, plain, shown
from typer.testing import CliRunner

from tausheet.addin import calc, cli, embedded
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind
from tausheet.templates import formulas, writer_index
from tausheet.templates.index import EXAMPLES, READS

ROOT = Path(__file__).parent.parent
COUNT = 65
PAGES = 8


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("index") / "index.xlsx"
    writer_index.build().save(out)
    return out


@pytest.fixture(scope="module")
def office() -> Iterator[calc.Calc]:
    with calc.Calc() as running:
        yield running


def rows_of(workbook: Workbook) -> dict[str, int]:
    """The row of each function."""
    sheet = workbook["Index"]
    return {
        cell.value: cell.row
        for (cell,) in sheet.iter_rows(max_col=1)
        if isinstance(cell.value, str) and cell.value in CATALOGUE
    }


def test_every_function_has_a_row(path: Path) -> None:
    assert len(EXAMPLES) == COUNT
    assert {example.function for example in EXAMPLES} == CATALOGUE.keys()
    assert rows_of(load_workbook(path)).keys() == CATALOGUE.keys()
    for example in EXAMPLES:
        assert f"{example.function}(" in example.formula
    groups = [CATALOGUE[example.function].group for example in EXAMPLES]
    assert len(list(groupby(groups))) == len(set(groups))


def by_mpmath(formula: str) -> Any:
    """A formula of built-in functions, worked out with 50 digits."""
    mp = mpmath.mp.clone()
    mp.dps = 50
    known = {"EXP": mp.exp, "LN": mp.log, "SQRT": mp.sqrt, "PI": lambda: +mp.pi, "n": mp.mpf}
    text = re.sub(r"(?<![A-Za-z])\d+(\.\d+)?", lambda number: f"n('{number[0]}')", formula)
    return eval(text.replace("^", "**"), {"__builtins__": {}}, known)


@pytest.mark.parametrize("engine", ["embedded", "calc"])
def test_results_agree_with_values_from_outside(path: Path, office: calc.Calc, engine: str) -> None:
    """Each result against its expected value, worked out here with 50 digits."""
    values = (embedded.compute(path) if engine == "embedded" else office.compute(path))["Index"]
    rows = rows_of(load_workbook(path))
    version = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]["version"]
    for example in EXAMPLES:
        row = rows[example.function]
        result = values[f"C{row}"]
        assert values[f"H{row}"] == "agrees", example.function
        if example.expected == "{version}":
            assert result == version
        elif example.expected.startswith('"'):
            assert result == example.expected.strip('"')
        else:
            assert formulas.functions_in(example.expected) <= {"EXP", "LN", "SQRT", "PI"}
            assert not formulas.names_in(example.expected)
            expected = by_mpmath(example.expected)
            assert abs(result - expected) <= example.within * abs(expected), example.function
        assert result not in ("", None)
    agreed = next(v for v in values.values() if isinstance(v, str) and "results agree" in v)
    assert agreed.startswith(f"{COUNT} of {COUNT} results agree")


def test_a_result_that_differs_is_named(path: Path) -> None:
    workbook = load_workbook(path)
    sheet, rows = workbook["Index"], rows_of(workbook)
    wrong = {
        "FO_TAU_RC": "=0.0047*(1+1E-11)",
        "FO_RKM": "=NA()",
        "FO_RKM_TEXT": '="r47"',
        "FO_PEAK": '="5"',
        "FO_SI": "=FO_SI(470,B1)",
    }
    for function, formula in wrong.items():
        sheet[f"C{rows[function]}"].value = formula
    values = embedded.Book(workbook).values()["Index"]
    for function in CATALOGUE:
        expected = "DIFFERS" if function in wrong else "agrees"
        assert values[f"H{rows[function]}"] == expected, function
    assert isinstance(values[f"C{rows['FO_SI']}"], ErrorKind)
    assert any(str(v).startswith(f"{COUNT - len(wrong)} of {COUNT}") for v in values.values())


def test_measured_points_are_those_of_the_reference() -> None:
    """NIST StRD Misra1a: volume and pressure of lines 61 to 74."""
    lines = (ROOT / "tests/references/nist-strd-misra1a.dat").read_text().splitlines()[60:74]
    published = [tuple(float(x) for x in reversed(line.split())) for line in lines]
    (table,) = (table for table in READS if table.columns == ("pressure", "volume"))
    assert list(table.rows) == published


@pytest.mark.parametrize("paper", PAPERS)
def test_printed_pages(office: calc.Calc, tmp_path: Path, paper: str) -> None:
    workbook = writer_index.build()
    number, size = PAPERS[paper]
    sheet = workbook["Index"]
    sheet.page_setup.paperSize = number
    out = tmp_path / "index.xlsx"
    workbook.save(out)
    sizes, texts = pages_of(office, out, tmp_path)
    assert sizes == [size] * PAGES
    assert len(sheet.row_breaks.brk) == PAGES - 1
    everything = "".join(texts)
    assert "###" not in everything
    texts_shown = shown(workbook, embedded.Book(workbook).values())
    for cell, text in texts_shown:
        assert plain(text) in everything, (cell, text)
    assert_no_text_is_cut(workbook, texts_shown)


def test_command(tmp_path: Path) -> None:
    out = tmp_path / "index.xlsx"
    done = CliRunner().invoke(cli.app, ["index", str(out)])
    assert done.exit_code == 0, done.output
    assert f"{COUNT} of {COUNT} results agree" in done.output
    stored = load_workbook(out, data_only=True)["Index"]
    for row in rows_of(load_workbook(out)).values():
        assert stored[f"C{row}"].value is not None
        assert stored[f"H{row}"].value == "agrees"
    again = CliRunner().invoke(cli.app, ["index", str(out)])
    assert again.exit_code != 0
    assert "exists" in str(again.exception)
    other = CliRunner().invoke(cli.app, ["index", str(tmp_path / "index.ods")])
    assert "does not end in .xlsx" in str(other.exception)


def test_command_says_so_where_results_differ(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """An installation whose functions give something else ends with a refusal."""
    from tausheet.templates import index

    changed = index.EXAMPLES[0].__class__(**{**vars(EXAMPLES[0]), "expected": "0.0048"})
    monkeypatch.setattr(writer_index, "EXAMPLES", (changed, *EXAMPLES[1:]))
    done = CliRunner().invoke(cli.app, ["index", str(tmp_path / "index.xlsx")])
    assert done.exit_code != 0
    assert f"{COUNT - 1} of {COUNT} results agree" in done.output
    assert "do not rely on" in str(done.exception)
