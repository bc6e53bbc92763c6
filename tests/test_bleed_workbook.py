"""The workbook of `bleed` as a file: parts, names, protection, second ways, what it may hold."""

from __future__ import annotations

from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from workbooks import cell_named

from tausheet import templates
from tausheet.templates import formulas, style
from tausheet.templates.model import Input, Tolerance
from tausheet.templates.values import FIELDS

SHEET = templates.SHEETS["bleed"]


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Workbook:
    """The demo, written and read back."""
    path = tmp_path_factory.mktemp("workbook") / "demo.xlsx"
    templates.build("bleed", demo=True).save(path)
    return load_workbook(path)


def texts(book: Workbook) -> list[str]:
    return [
        str(cell.value)
        for row in book["Calc sheet"].iter_rows()
        for cell in row
        if cell.value is not None
    ]


def test_heading_on_every_page(book: Workbook) -> None:
    sheet = book["Calc sheet"]
    assert sheet.print_title_rows == "$1:$5"
    assert [cell_named(book, name).value for name in FIELDS[:5]] == [
        "Q4-CAL-001", "Hoist drive, d.c. link: discharge", "Quay 4, harbour crane, drive retrofit",
        "A", "for checking",
    ]  # fmt: skip
    assert sheet.oddHeader.right.text == sheet.oddFooter.right.text == "page &P of &N"


def test_inputs_are_complete(book: Workbook) -> None:
    said = texts(book)
    for entry in SHEET.entries():
        assert entry.symbol in said
        assert entry.description in said
        assert entry.demo.source in said
        names = [f"value_of_{entry.symbol}", f"source_of_{entry.symbol}"]
        if isinstance(entry, Input) and entry.units:
            names.append(f"unit_of_{entry.symbol}")
        if isinstance(entry, Input) and entry.tolerance is not Tolerance.NONE:
            names += [f"lowest_of_{entry.symbol}", f"highest_of_{entry.symbol}"]
        for name in names:
            cell = cell_named(book, name)
            assert cell.value is not None, name
            assert not cell.protection.locked, name
            assert cell.fill.fgColor.rgb == f"00{style.ENTRY}", name


def test_calculation_and_second_ways_are_complete(book: Workbook) -> None:
    said = "\n".join(texts(book))
    for quantity in SHEET.quantities():
        assert quantity.description in said
        assert quantity.words in said.replace('""', '"')
        assert cell_named(book, quantity.symbol).value == f"={quantity.formula}"
        if quantity.second:
            assert cell_named(book, f"{quantity.symbol}_hand").value == f"={quantity.second}"
    principal = {q.symbol for q in SHEET.quantities() if q.second}
    # the principal results of the design's table, and the voltage left at the end
    assert principal >= {
        "t_safe", "R_max", "R_pref", "E_bank", "P_bank", "V_res", "V_level", "P_res", "V_left",
    }  # fmt: skip


def test_cautions_basis_sign_off_and_record(book: Workbook) -> None:
    said = "\n".join(texts(book)).lower()
    for words in (
        "fail open", "prove dead before touching", "dielectric absorption", "hot resistors",
        "local codes and licensed practice come first", "method", "assumptions", "sources",
        "not covered", "edition in force", "prepared", "checked", "approved", "from memory",
        "not sealed", "never",
    ):  # fmt: skip
        assert words in said, words
    for role in ("prepared", "checked", "approved"):
        for what in ("by", "on", "signature"):
            assert not cell_named(book, f"{role}_{what}").protection.locked
    assert cell_named(book, "fingerprint").value == "not sealed"
    assert cell_named(book, "made_with").value.startswith("tausheet ")


@pytest.mark.parametrize(
    "name", ["R", "c", "R1", "RC", "R1C1", "C12", "A1", "tau1", "XFD1048576", "true", "2x", "a b"]
)
def test_names_that_a_spreadsheet_takes_for_something_else(name: str) -> None:
    assert not formulas.fit_for_a_name(name)


def test_picture_is_small_and_in_place(book: Workbook, tmp_path: Path) -> None:
    (image,) = book["Calc sheet"]._images
    data = image._data()
    assert data.startswith(b"\x89PNG")
    assert len(data) < 60_000


def test_curve_has_limits_crossing_and_units(book: Workbook) -> None:
    (chart,) = book["Calc sheet"]._charts
    labels = [series.tx.v for series in chart.series]
    assert labels == ["worst case", "nominal", "safe voltage", "time allowed", "safe, worst case"]
    axes = [axis.title.tx.rich.p[0].r[0].t for axis in (chart.x_axis, chart.y_axis)]
    assert axes == ["time after switching in s", "voltage of the bank in V"]
    looks = [
        (series.graphicalProperties.ln.prstDash, series.graphicalProperties.ln.w)
        for series in chart.series[:4]
    ]
    assert len(set(looks)) == 4  # told apart without colour
    assert chart.series[4].marker.symbol == "diamond"
    assert chart.x_axis.delete is False


def test_text_given_never_becomes_a_formula(tmp_path: Path) -> None:
    path = tmp_path / "texts.xlsx"
    evil = {
        "doc_title": '=HYPERLINK("x")', "project": "=1+1", "C_unit_source": "=cmd|' /C calc'!A0",
        "doc_number": "@SUM(1)", "prepared_by": "+1", "revision": "-2",
    }  # fmt: skip
    templates.build("bleed", evil, demo=True).save(path)
    back = load_workbook(path)
    for name, text in evil.items():
        place = "source_of_C_unit" if name == "C_unit_source" else name
        cell = cell_named(back, place)
        assert cell.value == text
        assert cell.data_type == "s"
        assert cell.quotePrefix
