"""recalc changes the values of formula cells and not one byte else, in workbooks of other programs.

The files are made by XlsxWriter and stored by LibreOffice, with what openpyxl would drop or write
anew: pictures, charts, comments, drawings, macros, links, tables, formats.
"""

from __future__ import annotations

import io
import re
import struct
import zipfile
from pathlib import Path

import pytest
import xlsxwriter
from openpyxl import load_workbook
from PIL import Image

from tausheet.addin.calc import Calc
from tausheet.addin.excel import addin_file
from tausheet.addin.recalc import recalc

FORMULAS = ("xl/worksheets/sheet1.xml", "xl/worksheets/sheet2.xml")


def made_by_xlsxwriter(path: Path) -> Path:
    """Much of what a workbook can hold, around a few formulas."""
    with zipfile.ZipFile(addin_file.template()) as given:
        macros = io.BytesIO(given.read("xl/vbaProject.bin"))
    picture = path.with_suffix(".png")
    Image.effect_noise((60, 40), 50).save(picture)
    book = xlsxwriter.Workbook(str(path))
    if path.suffix == ".xlsm":
        book.add_vba_project(macros, True)
    sheet, notes = book.add_worksheet("Hoist <1> & 'a' drive"), book.add_worksheet("Notes")
    chart_sheet = book.add_chartsheet("Curve")
    hidden = book.add_worksheet("Hidden")
    hidden.hide()
    bold = book.add_format({"bold": True, "font_color": "#7030A0", "num_format": "0.000 E+00"})
    sheet.write("A1", 47e3, bold)
    sheet.write("A2", 0.0047)
    sheet.write_rich_string("A3", "R ", bold, "of the bank", " as built")
    sheet.write_formula("B1", "=FO_TAU_RC(A1,A2)", bold, 1)
    sheet.write_formula("B2", '=A3&" <&> "&B1', None, "old")
    sheet.write_formula("B3", "=FO_TIME_TO(9,1,0,5)")
    sheet.write_array_formula("C1:C3", "{=FO_STEP(A1:A3,1,0,5)}", bold)
    sheet.write_formula("D1", "=bank*2")
    book.define_name("bank", "='Hoist <1> & ''a'' drive'!$B$1")
    notes.write_formula("A1", "='Hoist <1> & ''a'' drive'!B1*2")
    sheet.insert_image("F2", str(picture), {"description": "the circuit"})
    chart = book.add_chart({"type": "scatter", "subtype": "smooth"})
    chart.add_series({"categories": "=Notes!$A$1:$A$3", "values": "=Notes!$B$1:$B$3"})
    chart.set_title({"name": "Fall of the voltage"})
    sheet.insert_chart("F20", chart)
    other = book.add_chart({"type": "column"})
    other.add_series({"values": "=Notes!$A$1:$A$3"})
    chart_sheet.set_chart(other)
    sheet.write_comment("A1", "as measured", {"author": "Checker"})
    sheet.insert_textbox("H1", "read me", {"fill": {"color": "#FFFFCC"}})
    sheet.insert_checkbox("J1", True)
    sheet.conditional_format("A1:A9", {"type": "data_bar", "data_bar_2010": True})
    sheet.conditional_format("B1:B9", {"type": "icon_set", "icon_style": "3_traffic_lights"})
    sheet.add_sparkline("E1", {"range": "Notes!A1:A3"})
    sheet.data_validation("A2", {"validate": "decimal", "criteria": ">", "value": 0})
    sheet.write_url("A5", "https://example.com/", string="elsewhere")
    sheet.set_header("&L&G&RQuay 4", {"image_left": str(picture)})
    sheet.set_background(str(picture))
    sheet.protect("", {"format_columns": True})
    sheet.freeze_panes(1, 1)
    sheet.outline_settings(True, False, True, False)
    notes.add_table("D1:E4", {"columns": [{"header": "part"}, {"header": "ohm"}]})
    notes.set_row(6, None, None, {"level": 1, "hidden": True})
    notes.ignore_errors({"number_stored_as_text": "A1:B9"})
    book.set_properties({"title": "Discharge", "comments": "for the tests"})
    book.set_custom_property("revision", "B")
    book.set_calc_mode("manual")
    book.close()
    return path


def records(path: Path) -> dict[str, bytes]:
    """Each part's local record, as raw bytes, in the order of the package."""
    data = path.read_bytes()
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        assert archive.testzip() is None
        found = {}
        for entry in archive.infolist():
            at = entry.header_offset
            name, extra = struct.unpack_from("<HH", data, at + 26)
            found[entry.filename] = data[at : at + 30 + name + extra + entry.compress_size]
        return found


def part(path: Path, name: str) -> bytes:
    with zipfile.ZipFile(path) as archive:
        return archive.read(name)


CELL = re.compile(rb"<c\b(?:[^>]*/>|.*?</c>)", re.DOTALL)


def without_values(xml: bytes) -> bytes:
    """A sheet without the stored values and types of its formula cells and array blocks."""

    def bare(match: re.Match[bytes]) -> bytes:
        cell = match[0]
        in_block = re.search(rb' r="C[23]"', cell)  # C1:C3 is the array formula
        if b"<f" not in cell and not in_block:
            return cell
        head, _, inside = cell.partition(b">")
        head = re.sub(rb'\s+t="[^"]*"', b"", head.removesuffix(b"/"))
        return head + re.sub(rb"<v>.*?</v>|<v */>|</c>", b"", inside, flags=re.DOTALL)

    return CELL.sub(bare, xml)


def nothing_else_changed(before: Path, after: Path, plain: bytes = b"") -> None:
    old, new = records(before), records(after)
    assert list(old) == list(new), "the same parts in the same order"
    assert len(old) > 15
    for name in old:
        if name not in FORMULAS:
            assert old[name] == new[name], name
    for name in FORMULAS:
        left, right = part(before, name), part(after, name)
        if plain:
            assert plain in left.upper() or name == FORMULAS[1]
            left = re.sub(re.escape(plain), b"", left, flags=re.IGNORECASE)
        assert left != right
        assert without_values(left) == without_values(right), name
    sheet = load_workbook(after, data_only=True).worksheets[0]
    assert sheet["B1"].value == 220.9
    assert sheet["B2"].value == "R of the bank as built <&> 220.9"
    assert sheet["B3"].value == "#N/A"
    assert [sheet[f"C{row}"].value for row in (1, 2, 3)][::2] == [5, "#VALUE!"]
    assert sheet["D1"].value == 441.8


@pytest.mark.parametrize("ending", [".xlsx", ".xlsm"])
@pytest.mark.parametrize("engine", ["embedded", "calc"])
def test_a_workbook_of_xlsxwriter(ending: str, engine: str, tmp_path: Path) -> None:
    path = made_by_xlsxwriter(tmp_path / f"rich{ending}")
    out = tmp_path / f"out{ending}"
    names = set(records(path))
    for needed in ("media/", "charts/", "chartsheets/", "comments", "drawings/", "tables/"):
        assert any(needed in name for name in names), needed
    assert ("xl/vbaProject.bin" in names) is (ending == ".xlsm")
    recalc(path, engine=engine, out=out)
    nothing_else_changed(path, out)


def test_a_workbook_that_libreoffice_stored(tmp_path: Path) -> None:
    stored, out = tmp_path / "stored.xlsx", tmp_path / "out.xlsx"
    with Calc() as calc:
        calc.store(made_by_xlsxwriter(tmp_path / "rich.xlsx"), stored)
    names = set(records(stored))
    for needed in ("media/", "charts/", "comments", "drawings/"):
        assert any(needed in name for name in names), needed
    report = recalc(stored, out=out)
    assert str(report).endswith(
        "; 3 formulas called our functions by LibreOffice's long names and call them by their "
        "plain ones again"
    )
    nothing_else_changed(stored, out, b"ORG.TAUSHEET.FUNCTIONS.")
    sheet = load_workbook(out).worksheets[0]
    assert sheet["B1"].value == "=FO_TAU_RC(A1,A2)"
    assert sheet["C1"].value.text == "=FO_STEP(A1:A3,1,0,5)"


def test_only_formulas_are_spelled_anew(tmp_path: Path) -> None:
    """Not what a text or a label says, and a defined name too."""
    path = tmp_path / "names.xlsx"
    long = "ORG.TAUSHEET.FUNCTIONS."
    book = xlsxwriter.Workbook(str(path))
    sheet = book.add_worksheet(long[:20])
    sheet.write_formula("A1", f"={long}FO_TAU_RC(2,3)+{long.lower()}fo_tau_rc( 1,2)")
    sheet.write_formula("A2", "=bank")
    sheet.write_string("A3", f"{long}FO_TAU_RC(2,3)")
    sheet.write_formula("A4", f'="{long}"&A3')
    book.define_name("bank", f"={long}FO_TAU_RC(4,5)")
    book.close()
    assert "2 formulas called" in str(recalc(path))
    values, formulas = (load_workbook(path, data_only=only).worksheets[0] for only in (True, False))
    assert [values[f"A{row}"].value for row in (1, 2)] == [8, 20]
    assert values["A3"].value == f"{long}FO_TAU_RC(2,3)"
    assert values["A4"].value == f"{long}{long}FO_TAU_RC(2,3)"
    assert formulas["A1"].value == "=FO_TAU_RC(2,3)+fo_tau_rc( 1,2)"


@pytest.mark.filterwarnings("error")
def test_nobody_is_told_that_something_was_dropped(tmp_path: Path) -> None:
    recalc(made_by_xlsxwriter(tmp_path / "rich.xlsx"))
