"""What `tausheet verify` finds, and what it leaves alone."""

from __future__ import annotations

import datetime
import json
import random
from pathlib import Path
from typing import Any

import pytest
from changed_sheets import CHANGES, changed, values_of, write
from openpyxl import Workbook
from openpyxl.comments import Comment
from typer.testing import CliRunner

from tausheet import templates
from tausheet.addin import package
from tausheet.addin.cli import app
from tausheet.addin.embedded import Book
from tausheet.addin.make import make_sheet
from tausheet.addin.review.verify import Verified, verify
from tausheet.functions.errors import ErrorKind


def counted(verified: Verified) -> list[tuple[str, str]]:
    return [(one.kind, one.cell) for one in verified.findings if one.counts]


def assert_found(path: Path, *expected: tuple[str, str]) -> None:
    verified = verify(path)
    assert not verified.well
    assert set(expected) <= set(counted(verified)), (expected, verified.findings[:5])


SHEETS, KINDS = list(templates.SHEETS), list(CHANGES)
# every sheet and every class at least once; the campaign has each with each
SAMPLE = [(sheet, tuple(KINDS[place :: len(SHEETS)])) for place, sheet in enumerate(SHEETS)]


@pytest.mark.parametrize(("sheet", "kinds"), SAMPLE)
def test_a_change_is_found(sheet: str, kinds: tuple[str, ...], tmp_path: Path) -> None:
    path = tmp_path / "changed.xlsx"
    assert_found(path, *changed(sheet, kinds, 1, path))


@pytest.mark.campaign
@pytest.mark.parametrize("seed", [2, 3])
@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("sheet", SHEETS)
def test_every_change_is_found(sheet: str, kind: str, seed: int, tmp_path: Path) -> None:
    path = tmp_path / "changed.xlsx"
    assert_found(path, *changed(sheet, [kind], seed, path))


def harmless(workbook: Any, draw: random.Random) -> None:
    """Several of the edits that anyone makes to a sheet."""
    main = workbook.worksheets[0]
    main.column_dimensions[draw.choice("ABCDEFGH")].width *= draw.uniform(0.8, 1.6)
    main.row_dimensions[draw.randrange(10, 60)].height = draw.uniform(16, 40)
    main.sheet_view.zoomScale = draw.choice([50, 85, 100, 130, 200])
    main.sheet_view.topLeftCell = main.sheet_view.selection[0].activeCell = "A1"
    main[draw.choice(["A8", "A10", "C10", "A24"])].comment = Comment("seen", "checker")
    main.page_setup.orientation = draw.choice(["portrait", "landscape"])
    named = workbook.defined_names
    for role in draw.sample(["prepared", "checked", "approved"], 2):
        for part, value in (
            ("by", "A. Checker"),
            ("on", datetime.date(2026, draw.randrange(1, 13), 5)),
            ("signature", "signed on paper"),
        ):
            _cell(workbook, named[f"{role}_{part}"]).value = value
    number = draw.randrange(1, 5)
    _cell(workbook, named[f"revision_{number}_change"]).value = "for checking"
    _cell(workbook, named["doc_number"]).value = f"Q4-CAL-{draw.randrange(1000)}"


def _cell(workbook: Any, defined: Any) -> Any:
    title, area = next(iter(defined.destinations))
    return workbook[title][area.replace("$", "").split(":")[0]]


@pytest.mark.parametrize("seed", range(4))
def test_harmless_edits_raise_nothing(seed: int, tmp_path: Path) -> None:
    draw = random.Random(f"harmless {seed}")
    sheet = draw.choice(SHEETS)
    workbook = templates.build(sheet, demo=True)
    harmless(workbook, draw)
    path = write(workbook, values_of(sheet), tmp_path / "edited.xlsx")
    assert counted(verify(path)) == []


@pytest.mark.campaign
def test_a_hundred_harmless_edits_saved_in_libreoffice_raise_nothing(tmp_path: Path) -> None:
    from tausheet.addin.calc.driver import Calc

    with Calc() as calc:
        for seed in range(100):
            draw = random.Random(f"harmless {seed}")
            sheet = SHEETS[seed % len(SHEETS)]
            workbook = templates.build(sheet, demo=True)
            harmless(workbook, draw)
            path = write(workbook, values_of(sheet), tmp_path / f"{seed}.xlsx")
            calc.store(path, tmp_path / f"{seed}-saved.xlsx")
            assert counted(verify(tmp_path / f"{seed}-saved.xlsx")) == [], (seed, sheet)


def test_a_sheet_saved_in_libreoffice_is_well(tmp_path: Path) -> None:
    """LibreOffice renames our functions and rewrites numbers, formats, styles and rules."""
    from tausheet.addin.calc.driver import Calc

    make_sheet("bleed", tmp_path / "made.xlsx", {}, demo=True)
    with Calc() as calc:
        calc.store(tmp_path / "made.xlsx", tmp_path / "saved.xlsx")
    assert b"ORG.TAUSHEET" in _parts(tmp_path / "saved.xlsx")
    verified = verify(tmp_path / "saved.xlsx")
    assert verified.sheet == "bleed"
    assert counted(verified) == []


def _parts(path: Path) -> bytes:
    import zipfile

    with zipfile.ZipFile(path) as parts:
        return b"".join(parts.read(name) for name in parts.namelist())


def test_a_blank_sheet_names_every_missing_input_and_failing_check(tmp_path: Path) -> None:
    make_sheet("bleed", tmp_path / "blank.xlsx", {})
    verified = verify(tmp_path / "blank.xlsx")
    kinds = [one.kind for one in verified.findings if one.counts]
    assert set(kinds) == {"missing input", "failing check"}
    assert kinds == sorted(kinds, reverse=True)  # missing inputs come first
    assert any("C_unit" in one.found for one in verified.findings)


def test_a_source_typed_later_moves_no_row(tmp_path: Path) -> None:
    """The pages break where the sources of the day it was made had them."""
    long = "the data sheet of the capacitor, third edition, page 12, line 4, as confirmed by mail"
    workbook = templates.build("bleed", {"C_unit_source": long * 2}, demo=True)
    _cell(workbook, workbook.defined_names["source_of_R_unit"]).value = long
    path = write(workbook, Book(workbook).values(), tmp_path / "sources.xlsx")
    assert counted(verify(path)) == []


@pytest.mark.parametrize(
    ("status", "roles", "well"),
    [
        ("draft", (), True),
        ("checked", ("prepared",), False),
        ("checked", ("prepared", "checked"), True),
        ("approved", ("prepared", "checked"), False),
        ("approved", ("prepared", "checked", "approved"), True),
    ],
)
def test_a_status_needs_its_signatures(
    status: str, roles: tuple[str, ...], well: bool, tmp_path: Path
) -> None:
    workbook = templates.build("sampling", demo=True)
    named = workbook.defined_names
    _cell(workbook, named["status"]).value = status
    for role in roles:
        for part in ("by", "on", "signature"):
            _cell(workbook, named[f"{role}_{part}"]).value = "A. Checker"
    verified = verify(write(workbook, values_of("sampling"), tmp_path / "signed.xlsx"))
    assert verified.well is well
    assert {kind for kind, _ in counted(verified)} == (set() if well else {"unsigned"})


def test_another_version_is_said(tmp_path: Path) -> None:
    workbook = templates.build("sampling", demo=True)
    cell = _cell(workbook, workbook.defined_names["made_with"])
    cell.value = "tausheet 0.0.1"
    verified = verify(write(workbook, values_of("sampling"), tmp_path / "old.xlsx"))
    assert ("version", f"Calc sheet!{cell.coordinate}") in counted(verified)


def other_workbook(path: Path, shown: float) -> Path:
    """A workbook that is none of ours, with one of our functions."""
    workbook = Workbook()
    sheet: Any = workbook.active
    sheet["A1"], sheet["A2"] = 4700.0, 0.001
    sheet["A3"] = "=FO_TAU_RC(A1,A2)"
    workbook.save(path)
    values: Any = {"Sheet": {"A3": shown}}
    path.write_bytes(package.with_values(path.read_bytes(), values))
    return path


def test_any_workbook_with_our_functions(tmp_path: Path) -> None:
    assert counted(verify(other_workbook(tmp_path / "a.xlsx", 4.7))) == []  # 4700 ohm 1 mF
    assert_found(
        other_workbook(tmp_path / "b.xlsx", 4.8), ("stale or overwritten value", "Sheet!A3")
    )


def test_a_function_that_only_libreoffice_computes(tmp_path: Path) -> None:
    """VLOOKUP is not known to our engine: LibreOffice computes, ours the calls of FO_TAU_RC."""
    workbook = Workbook()
    sheet: Any = workbook.active
    sheet["A1"], sheet["B1"] = 1.0, 4700.0
    sheet["A2"] = "=VLOOKUP(1,A1:B1,2,FALSE)"
    sheet["A3"] = "=FO_TAU_RC(A2,0.001)"
    path = tmp_path / "lookup.xlsx"
    workbook.save(path)
    path.write_bytes(
        package.with_values(path.read_bytes(), {"Sheet": {"A2": 4700.0, "A3": ErrorKind.NA}})
    )
    verified = verify(path)
    assert counted(verified) == [("stale or overwritten value", "Sheet!A3")]
    assert "VLOOKUP" in next(o.found for o in verified.findings if o.kind == "not recomputed")


def test_the_command_says_so_in_words_json_and_status(tmp_path: Path) -> None:
    good, bad = other_workbook(tmp_path / "a.xlsx", 4.7), other_workbook(tmp_path / "b.xlsx", 5.0)
    runner = CliRunner()
    said = runner.invoke(app, ["verify", str(good)])
    assert said.exit_code == 0
    assert "all is well" in said.output
    said = runner.invoke(app, ["verify", str(good), str(bad), "--json"])
    assert said.exit_code == 1
    one, other = json.loads(said.output)
    assert (one["well"], other["well"]) == (True, False)
    assert other["findings"][0]["cell"] == "Sheet!A3"
    assert other["findings"][0]["expected"] == "4.7"
    said = runner.invoke(app, ["verify", str(bad)])
    assert said.exit_code == 1
    assert "NOT verified" in said.output
