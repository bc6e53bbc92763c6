"""The workbook of `bleed` as a file: parts, names, protection, second ways, what it may hold."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.formula import Tokenizer
from openpyxl.utils import range_boundaries
from openpyxl.utils.cell import get_column_letter
from PIL import Image

from tausheet import templates
from tausheet.functions.catalogue import CATALOGUE
from tausheet.templates import drawings, formulas, style
from tausheet.templates.model import Choice, Input, Tolerance
from tausheet.templates.values import FIELDS

SHEET = templates.SHEETS["bleed"]


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Workbook:
    """The demo, written and read back."""
    path = tmp_path_factory.mktemp("workbook") / "demo.xlsx"
    templates.build("bleed", demo=True).save(path)
    return load_workbook(path)


def cell_named(book: Workbook, name: str) -> Any:
    title, cells = next(iter(book.defined_names[name].destinations))
    return book[title][cells.replace("$", "").split(":")[0]]


def texts(book: Workbook) -> list[str]:
    return [
        str(cell.value)
        for row in book["Calc sheet"].iter_rows()
        for cell in row
        if cell.value is not None
    ]


def test_eleven_parts_in_their_order(book: Workbook) -> None:
    heads = [match[1] for t in texts(book) if (match := re.fullmatch(r"\d+   (\w[\w -]+)", t))]
    assert heads == [
        "Verdict", "Purpose", "Sign-off", "Inputs", "Calculation", "Worst case", "Checks", "Curve",
        "Cautions", "Basis", "Record",
    ]  # fmt: skip


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


def test_only_what_is_typed_is_unlocked(book: Workbook) -> None:
    typed = re.compile(
        r"(value|unit|lowest|highest|source)_of_.*|(prepared|checked|approved)_.*|revision_\d_.*"
    )
    open_cells = set()
    for name, defined in book.defined_names.items():
        if typed.fullmatch(name) or name in FIELDS:
            title, cells = next(iter(defined.destinations))
            open_cells.add((title, cells.replace("$", "").split(":")[0]))
    for sheet in book.worksheets:
        assert sheet.protection.sheet
        assert not sheet.protection.password
        for row in sheet.iter_rows():
            for cell in row:
                if not cell.protection.locked and cell.value is not None:
                    assert (sheet.title, cell.coordinate) in open_cells, cell.coordinate


def test_every_name_is_one_cell_and_reads_as_no_cell(book: Workbook) -> None:
    wanted = {f"check_{check.key}" for check in SHEET.checks} | {"verdict", "decided_by"}
    wanted |= {entry.symbol for entry in SHEET.entries()}
    wanted |= {quantity.symbol for quantity in SHEET.quantities()}
    wanted |= {"t_safe_min", "t_safe_max", "R_unit_lo", "R_unit_hi"}
    assert wanted <= book.defined_names.keys()
    for name, defined in book.defined_names.items():
        assert formulas.fit_for_a_name(name), name
        assert re.fullmatch(r"('[^']+'|\w+)!\$[A-Z]+\$\d+:\$[A-Z]+\$\d+", defined.attr_text), name
        if name in wanted:
            first, last = defined.attr_text.split("!")[1].split(":")
            assert first == last, name
    folded = [name.lower() for name in book.defined_names]
    assert len(folded) == len(set(folded))


@pytest.mark.parametrize(
    "name", ["R", "c", "R1", "RC", "R1C1", "C12", "A1", "tau1", "XFD1048576", "true", "2x", "a b"]
)
def test_names_that_a_spreadsheet_takes_for_something_else(name: str) -> None:
    assert not formulas.fit_for_a_name(name)


def operands(formula: str) -> list[str]:
    return [
        token.value
        for token in Tokenizer(formula).items
        if token.type == "OPERAND" and token.subtype == "RANGE"
    ]


def functions(formula: str) -> set[str]:
    return {t.value[:-1] for t in Tokenizer(formula).items if t.type == "FUNC" and t.value != ")"}


def cells_behind(book: Workbook, start: Any) -> list[Any]:
    """Every formula cell that a cell depends on, itself included, found in the file alone."""
    todo, seen = [start], {}
    while todo:
        cell = todo.pop()
        key = (cell.parent.title, cell.coordinate)
        if key in seen or not (isinstance(cell.value, str) and cell.value.startswith("=")):
            continue
        seen[key] = cell
        for operand in operands(cell.value):
            if operand in book.defined_names:
                operand = book.defined_names[operand].attr_text
            title, _, area = operand.rpartition("!")
            sheet = book[title.strip("'")] if title else cell.parent
            left, top, right, bottom = range_boundaries(area.replace("$", ""))
            for row in range(top, bottom + 1):
                for column in range(left, right + 1):
                    todo.append(sheet[f"{get_column_letter(column)}{row}"])
    return list(seen.values())


def test_second_ways_hold_no_function_of_ours(book: Workbook) -> None:
    """Walked over the cells of the file, through every name, down to the typed cells."""
    seconds = [q.symbol for q in SHEET.quantities() if q.second]
    assert len(seconds) >= 10
    for symbol in seconds:
        behind = cells_behind(book, cell_named(book, f"{symbol}_hand"))
        assert len(behind) > 1
        for cell in behind:
            assert not {f for f in functions(cell.value) if f.startswith("FO_")}, cell.coordinate
    # the walk does find them where they are
    first = cells_behind(book, cell_named(book, "t_safe"))
    assert any("FO_TIME_UNTIL_BELOW(" in cell.value for cell in first)
    assert any("FO_TAU_RC(" in cell.value for cell in first)


def test_formulas_are_plain(book: Workbook) -> None:
    allowed = formulas.BUILT_INS | CATALOGUE.keys()
    count = 0
    for sheet in book.worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.data_type == "f":
                    count += 1
                    assert isinstance(cell.value, str), cell.coordinate  # no array formula
                    assert functions(cell.value) <= allowed, cell.coordinate
                    assert len(cell.value) < 8000
                    # Excel takes no longer text in a formula
                    assert all(len(t) < 256 for t in re.findall('"((?:[^"]|"")*)"', cell.value))
    assert count > 800
    for rules in book["Calc sheet"].conditional_formatting:
        for rule in rules.rules:
            assert "FO_" not in "".join(rule.formula)


def test_calculation_settings_keep_stored_values(book: Workbook) -> None:
    assert book.calculation.fullCalcOnLoad is False
    assert book.calculation.calcId == 191029
    assert book.vba_archive is None


def test_validation_refuses_with_a_sentence(book: Workbook) -> None:
    rules = {
        str(area): rule
        for rule in book["Calc sheet"].data_validations.dataValidation
        for area in rule.sqref.ranges
    }
    for entry in SHEET.entries():
        rule = rules[cell_named(book, f"value_of_{entry.symbol}").coordinate]
        assert rule.showErrorMessage
        assert entry.symbol in rule.error
        if isinstance(entry, Choice):
            assert rule.type == "list"
            continue
        assert entry.why[:40] in rule.error
        if entry.units:
            units = rules[cell_named(book, f"unit_of_{entry.symbol}").coordinate]
            assert units.type == "list"
            assert cell_named(book, f"unit_of_{entry.symbol}").value in units.formula1
    for rule in rules.values():
        assert len(rule.error) <= 255
        assert "FO_" not in f"{rule.formula1}{rule.formula2}"


def test_picture_says_only_symbols_of_the_sheet() -> None:
    said = drawings.labels(SHEET.picture.file)
    symbols = set(re.findall(r"\b\w+_\w+\b", " ".join(said)))
    known = {entry.symbol for entry in SHEET.entries()}
    assert symbols >= {"C_unit", "R_unit", "V_start", "n_s", "n_p", "n_rs", "n_rp"}
    assert symbols <= known
    # the picture that ships is of this drawing: its labels are kept in it
    assert Image.open(drawings.HERE / SHEET.picture.file).info["labels"] == "|".join(said)


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
