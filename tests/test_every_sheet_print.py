"""Every calc sheet on paper and as a file: pages, texts, stored values, the circuit's symbols."""

from __future__ import annotations

import math
import re
import zipfile
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import Any

import pytest
from filled import Filled, bad_values
from openpyxl import load_workbook
from PIL import Image
from printed import PAPERS, assert_no_text_is_cut, pages_of, plain, shown

from tausheet import templates
from tausheet.addin import calc
from tausheet.addin.make import make_sheet
from tausheet.templates import drawings

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
    values = Filled(templates.SHEETS[name], demo.formulas).put().values
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
    filled = Filled(templates.SHEETS[name], demo.formulas)
    entries = list(filled.sheet.entries())
    for turn in range(3):
        cells: dict[str, Any] = {}
        for number, entry in enumerate(entries, start=turn):
            kinds = [bad for _, bad in bad_values(entry)]
            cells |= kinds[number % len(kinds)]
        assert_no_text_is_cut(demo.formulas, shown(demo.formulas, filled.put(**cells).values))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_no_text_of_the_blank_form_is_cut(name: str) -> None:
    sheet = templates.SHEETS[name]
    workbook = templates.build(name)
    assert_no_text_is_cut(workbook, shown(workbook, Filled(sheet, workbook).put().values))


@pytest.mark.parametrize("name", templates.SHEETS)
def test_symbols_in_the_drawing_are_those_of_the_sheet(name: str) -> None:
    sheet = templates.SHEETS[name]
    said = drawings.labels(sheet.picture.file)
    known = {entry.symbol for entry in sheet.entries()}
    known |= {quantity.symbol for quantity in sheet.quantities()}
    symbols = set(re.findall(r"\b[A-Za-z]+_\w+\b", " ".join(said)))
    assert len(symbols) > 2
    assert symbols <= known
    # the picture that ships is of this drawing: its labels are kept in it
    assert Image.open(drawings.HERE / sheet.picture.file).info["labels"] == "|".join(said)
