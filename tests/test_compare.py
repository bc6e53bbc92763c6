"""What `tausheet compare` says of two revisions."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from typer.testing import CliRunner

from tausheet.addin.calc import Calc
from tausheet.addin.cli import app
from tausheet.addin.make import make_sheet
from tausheet.addin.review.compare import Compared, NotCompared, compare


@pytest.fixture(scope="module")
def old(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("revisions") / "old.xlsx"
    make_sheet("bleed", path, {}, demo=True)
    return path


def by_name(compared: Compared, group: str) -> dict[str, tuple[object, object]]:
    return {c.what: (c.old, c.new) for c in compared.changes if c.group == group}


def test_one_input_and_what_follows_from_it(old: Path, tmp_path: Path) -> None:
    new = tmp_path / "new.xlsx"
    make_sheet("bleed", new, {"R_unit": "33 kohm"}, demo=True)
    compared = compare(old, new)
    assert by_name(compared, "input") == {"value_of_R_unit": (30.0, 33.0)}
    results = by_name(compared, "result")
    # R_path = R n_rs / (n_rp - n_open) = 2 R / 3; C_bank = 4.7 mF * 2 / 2
    assert results["R_path"] == pytest.approx((20000.0, 22000.0))
    assert results["tau"] == pytest.approx((94.0, 103.4))
    assert "C_bank" not in results
    assert by_name(compared, "verdict")["verdict"] == ("PASS", "FAIL")
    assert by_name(compared, "check")["Time to the safe voltage: result"] == ("PASS", "FAIL")
    before, after = by_name(compared, "margin")["Time to the safe voltage"]
    # the worst time is all-over proportional to R: 1 - 1.1 (1 - m)
    assert isinstance(before, float)
    assert after == pytest.approx(1 - 1.1 * (1 - before), rel=1e-12)
    assert not by_name(compared, "formula")
    tau = next(c for c in compared.changes if c.what == "tau")
    assert tau.difference == pytest.approx(9.4)
    assert tau.relative == pytest.approx(0.1)


def test_a_sheet_saved_in_libreoffice_is_the_same(old: Path, tmp_path: Path) -> None:
    with Calc() as calc:
        calc.store(old, tmp_path / "again.xlsx")
    assert compare(old, tmp_path / "again.xlsx").changes == []


def test_formulas_limits_and_labels(old: Path, tmp_path: Path) -> None:
    workbook = load_workbook(old)
    main = workbook.worksheets[0]
    title, address = next(iter(workbook.defined_names["tau"].destinations))
    cell = workbook[title][address.replace("$", "").split(":")[0]]
    cell.value = "=FO_TAU_RC(R_path, C_bank)*1"
    main["A7"] = "1   The verdict"
    workbook.defined_names["t_limit"].attr_text = "'Calc sheet'!$E$94"
    workbook.save(tmp_path / "changed.xlsx")
    compared = compare(old, tmp_path / "changed.xlsx")
    assert by_name(compared, "formula")["tau"] == (
        "=FO_TAU_RC(r_path,c_bank)",
        "=FO_TAU_RC(r_path,c_bank)*1",
    )
    assert by_name(compared, "other cell") == {"Calc sheet!A7": ("1   Verdict", "1   The verdict")}
    assert "t_limit" in by_name(compared, "name")


def test_table_json_and_workbook(old: Path, tmp_path: Path) -> None:
    new, out = tmp_path / "new.xlsx", tmp_path / "changes.xlsx"
    make_sheet("bleed", new, {"C_unit_source": "=1+1", "V_cap": "400 V"}, demo=True)
    run = CliRunner().invoke(app, ["compare", str(old), str(new), "-o", str(out)])
    assert run.exit_code == 0, run.output
    assert "value_of_V_cap" in run.output
    assert "-50 (-11.1 %)" in run.output
    said = json.loads(CliRunner().invoke(app, ["compare", str(old), str(new), "--json"]).output)
    rows = list(load_workbook(out)["Changes"].iter_rows(min_row=6))
    assert len(rows) == len(said["changes"]) > 5
    texts = [cell for row in rows for cell in row if cell.value == "=1+1"]
    assert [cell.data_type for cell in texts] == ["s"]
    again = CliRunner().invoke(app, ["compare", str(old), str(new), "-o", str(out)])
    assert again.exit_code != 0


def test_nothing_in_common(old: Path, tmp_path: Path) -> None:
    Workbook().save(tmp_path / "other.xlsx")
    with pytest.raises(NotCompared, match="no name in common"):
        compare(old, tmp_path / "other.xlsx")
    with pytest.raises(NotCompared, match=r"does not end in \.xlsx"):
        from tausheet.addin.review.compare import write

        write(Compared(old, old, []), tmp_path / "out.txt")
