"""Every calc sheet as a file and on paper: what it holds, what is open, what a viewer shows."""

from __future__ import annotations

import math
import re
import zipfile
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pytest
import workbooks
from filled import Filled, bad_values
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula
from PIL import Image
from printed import PAPERS, assert_no_text_is_cut, pages_of, plain, shown

from tausheet import templates
from tausheet.addin import calc
from tausheet.addin.make import make_sheet
from tausheet.functions.catalogue import CATALOGUE
from tausheet.templates import drawings, formulas
from tausheet.templates.model import Choice
from tausheet.templates.values import FIELDS, shown_unit

MOST_PAGES = 12


@pytest.fixture(scope="module")
def office() -> Iterator[calc.Calc]:
    with calc.Calc() as running:
        yield running


class Made:
    """The demo page as `tausheet new` writes it: its file, its formulas, its stored values."""

    def __init__(self, name: str, folder: Path) -> None:
        self.path = folder / f"{name}.xlsx"
        make_sheet(name, self.path, {}, demo=True)
        self.formulas = load_workbook(self.path)
        self.filled = Filled(templates.SHEETS[name], self.formulas)
        stored = load_workbook(self.path, data_only=True)
        self.stored: dict[str, dict[str, Any]] = {
            sheet.title: {
                cell.coordinate: stored[sheet.title][cell.coordinate].value
                for row in sheet.iter_rows()
                for cell in row
                if cell.data_type == "f"
            }
            for sheet in self.formulas.worksheets
        }


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> Any:
    folder = tmp_path_factory.mktemp("made")
    return cache(lambda name: Made(name, folder))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_every_formula_has_a_stored_value(made: Any, name: str) -> None:
    """What a viewer without our functions shows; no error where a person looks."""
    demo: Made = made(name)
    values = demo.filled.put().values
    ours = 0
    for title, cells in demo.stored.items():
        for cell, kept in cells.items():
            value = values[title][cell]
            if isinstance(value, float):
                assert math.isclose(kept, value, rel_tol=1e-12), cell
            else:
                assert (kept or "") == getattr(value, "text", value), cell
            assert title != "Calc sheet" or not str(kept).startswith("#"), (cell, kept)
            ours += "FO_" in demo.formulas[title][cell].value
    assert ours > 10


@pytest.mark.parametrize("name", templates.SHEETS)
@pytest.mark.parametrize("paper", PAPERS)
def test_pages_of_the_demo(
    office: calc.Calc, made: Any, tmp_path: Path, name: str, paper: str
) -> None:
    """Every text is there, and the pages are those that were laid out."""
    demo: Made = made(name)
    number, size = PAPERS[paper]
    sizes, texts = pages_of(office, on_paper(demo.path, tmp_path, number), tmp_path)
    pages = len(demo.formulas["Calc sheet"].row_breaks.brk) + 1
    assert 3 <= pages <= MOST_PAGES
    assert sizes == [size] * pages
    for at, text in enumerate(texts, start=1):
        assert text.count(f"page{at}of{pages}") == 2  # at the top and at the bottom
        assert plain(templates.SHEETS[name].demo.number) in text
    for words in ("1Verdict", "3Signoff", "PASS"):
        assert words in texts[0]
    everything = "".join(texts)
    assert "###" not in everything
    for cell, text in shown(demo.formulas, demo.stored):
        assert plain(text) in everything, (cell, text)


def on_paper(path: Path, folder: Path, number: int) -> Path:
    """The file with another paper."""
    out = folder / path.name
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(out, "w") as new:
        for item in old.infolist():
            data = old.read(item)
            if item.filename == "xl/worksheets/sheet1.xml":
                data, times = re.subn(rb'paperSize="9"', b'paperSize="%d"' % number, data)
                assert times == 1
            new.writestr(item, data)
    return out


@pytest.mark.parametrize("name", templates.SHEETS)
def test_no_text_is_cut(made: Any, name: str) -> None:
    """With the demo's values, and with every input at fault, each in another way."""
    demo: Made = made(name)
    assert_no_text_is_cut(demo.formulas, shown(demo.formulas, demo.stored))
    entries = list(templates.SHEETS[name].entries())
    for turn in range(3):
        cells: dict[str, Any] = {}
        for number, entry in enumerate(entries, start=turn):
            kinds = [bad for _, bad in bad_values(entry)]
            cells |= kinds[number % len(kinds)]
        assert_no_text_is_cut(demo.formulas, shown(demo.formulas, demo.filled.put(**cells).values))


def every_cell(book: Workbook) -> Iterator[tuple[str, Any]]:
    """Each cell that holds something, with the title of its worksheet."""
    for sheet in book.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.value is not None:
                    yield sheet.title, cell


@pytest.mark.parametrize("name", templates.SHEETS)
def test_eleven_parts_in_their_order(made: Any, name: str) -> None:
    said = [str(c.value) for title, c in every_cell(made(name).formulas) if title == "Calc sheet"]
    heads = [match[1] for text in said if (match := re.fullmatch(r"\d+   (\w[\w -]+)", text))]
    assert heads == [
        "Verdict", "Purpose", "Sign-off", "Inputs", "Calculation", "Worst case", "Checks", "Curve",
        "Cautions", "Basis", "Record",
    ]  # fmt: skip
    everything = "\n".join(said)
    sheet = templates.SHEETS[name]
    for words in (
        "Local codes and licensed practice come first", "method", "assumptions", "sources",
        "not covered", "not sealed", *(caution.text for caution in sheet.cautions),
        *(entry.description for entry in sheet.entries()),
        *(entry.demo.source for entry in sheet.entries()),
        *(quantity.description for quantity in sheet.quantities()),
    ):  # fmt: skip
        assert words in everything, words
    for quantity in sheet.quantities():
        assert quantity.words in everything.replace('""', '"'), quantity.symbol


@pytest.mark.parametrize("name", templates.SHEETS)
def test_only_what_is_typed_is_unlocked(made: Any, name: str) -> None:
    book = made(name).formulas
    typed = re.compile(
        r"(values?|unit|lowest|highest|source)_of_.*|(prepared|checked|approved)_.*|revision_\d_.*"
    )
    open_cells = set()
    for defined, where in book.defined_names.items():
        if typed.fullmatch(defined) or defined in FIELDS:
            title, cells = next(iter(where.destinations))
            rows = book[title][cells.replace("$", "")]
            for row in rows if isinstance(rows, tuple) else ((rows,),):
                open_cells |= {(title, cell.coordinate) for cell in row}
    for sheet in book.worksheets:
        assert sheet.protection.sheet
        assert not sheet.protection.password
    for title, cell in every_cell(book):
        if not cell.protection.locked:
            assert (title, cell.coordinate) in open_cells, cell.coordinate
            assert cell.data_type != "f", cell.coordinate


@pytest.mark.parametrize("name", templates.SHEETS)
def test_every_name_reads_as_no_cell(made: Any, name: str) -> None:
    book, sheet = made(name).formulas, templates.SHEETS[name]
    wanted = {f"check_{check.key}" for check in sheet.checks} | {"verdict", "decided_by"}
    wanted |= {entry.symbol for entry in sheet.entries()}
    wanted |= {quantity.symbol for quantity in sheet.quantities()}
    assert wanted <= book.defined_names.keys()
    for defined, where in book.defined_names.items():
        assert formulas.fit_for_a_name(defined), defined
        area = re.fullmatch(r"('[^']+'|\w+)!(\$[A-Z]+\$\d+):(\$[A-Z]+\$\d+)", where.attr_text)
        assert area, defined
        if defined in wanted:  # of one by one, so that a blank one is blank to a function
            assert area[2] == area[3], defined
    folded = [defined.lower() for defined in book.defined_names]
    assert len(folded) == len(set(folded))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_second_ways_hold_no_function_of_ours(made: Any, name: str) -> None:
    """Walked over the cells of the file, through every name, down to the typed cells."""
    book, sheet = made(name).formulas, templates.SHEETS[name]
    seconds = [q.symbol for q in sheet.quantities() if q.second]
    assert len(seconds) >= 2
    for symbol in seconds:
        behind = workbooks.cells_behind(book, workbooks.cell_named(book, f"{symbol}_hand"))
        assert len(behind) > 1
        for cell in behind:
            assert "FO_" not in cell.value, (symbol, cell.coordinate)
    # the walk does find them where they are
    checked = [workbooks.cell_named(book, f"check_{check.key}") for check in sheet.checks]
    assert any("FO_" in c.value for start in checked for c in workbooks.cells_behind(book, start))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_formulas_are_plain(made: Any, name: str) -> None:
    book = made(name).formulas
    allowed = formulas.BUILT_INS | CATALOGUE.keys()
    for _, cell in every_cell(book):
        if cell.data_type == "f":
            text = cell.value
            if isinstance(text, ArrayFormula):  # a long table has a formula a column, none of ours
                assert cell.parent.title == "Rows"
                assert "FO_" not in text.text
                text = text.text
            assert isinstance(text, str), cell.coordinate
            assert workbooks.functions(text) <= allowed, cell.coordinate
            assert len(text) < 8000
            # Excel takes no longer text in a formula
            assert all(len(t) < 256 for t in re.findall('"((?:[^"]|"")*)"', text))
    for rules in book["Calc sheet"].conditional_formatting:
        for rule in rules.rules:
            assert "FO_" not in "".join(rule.formula)
    assert book.calculation.fullCalcOnLoad is False
    assert book.vba_archive is None


@pytest.mark.parametrize("name", templates.SHEETS)
def test_validation_refuses_with_a_sentence(made: Any, name: str) -> None:
    book = made(name).formulas
    rules = {
        str(area): rule
        for rule in book["Calc sheet"].data_validations.dataValidation
        for area in rule.sqref.ranges
    }
    for entry in templates.SHEETS[name].entries():
        rule = rules[workbooks.cell_named(book, f"value_of_{entry.symbol}").coordinate]
        assert rule.showErrorMessage
        assert entry.symbol in rule.error
        if isinstance(entry, Choice):
            assert rule.type == "list"
            continue
        assert entry.why[:40] in rule.error
        if entry.units:
            unit = workbooks.cell_named(book, f"unit_of_{entry.symbol}")
            assert rules[unit.coordinate].type == "list"
            assert unit.value in rules[unit.coordinate].formula1
    for rule in rules.values():
        assert len(rule.error) <= 255
        assert "FO_" not in f"{rule.formula1}{rule.formula2}"


@pytest.mark.parametrize("name", templates.SHEETS)
def test_curve_is_told_apart_without_colour(made: Any, name: str) -> None:
    sheet = templates.SHEETS[name]
    (chart,) = made(name).formulas["Calc sheet"]._charts
    axes = [axis.title.tx.rich.p[0].r[0].t for axis in (chart.x_axis, chart.y_axis)]
    assert re.search(r" in \S+$", axes[0])
    assert not sheet.curve.unit or axes[1].endswith(f" in {shown_unit(sheet.curve.unit)}")
    lines = len(sheet.curve.traces) + len(sheet.curve.levels) + len(sheet.curve.moments)
    looks = [
        (series.graphicalProperties.ln.prstDash, series.graphicalProperties.ln.w)
        for series in chart.series[:lines]
    ]
    assert len(set(looks)) == lines
    assert len(chart.series) == lines + len(sheet.curve.marks)
    assert len(sheet.curve.levels) + len(sheet.curve.moments) >= 1


@pytest.mark.parametrize("name", templates.SHEETS)
def test_symbols_in_the_drawing_are_those_of_the_sheet(name: str) -> None:
    sheet = templates.SHEETS[name]
    said = drawings.labels(sheet.picture.file)
    known = {entry.symbol for entry in sheet.entries()}
    known |= {quantity.symbol for quantity in sheet.quantities()}
    symbols = set(re.findall(r"\b[A-Za-z]+_\w+\b", " ".join(said)))
    assert len(symbols) > 1
    assert symbols <= known
    # the picture that ships is of this drawing: its labels are kept in it
    assert Image.open(drawings.HERE / sheet.picture.file).info["labels"] == "|".join(said)
