"""The fingerprint: what keeps it, what breaks it, and what sealing touches."""

from __future__ import annotations

import datetime
import zipfile
from pathlib import Path
from typing import Any

import pypdfium2
import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula
from typer.testing import CliRunner

from tausheet import templates
from tausheet.addin import package
from tausheet.addin.calc import Calc
from tausheet.addin.cli import app
from tausheet.addin.embedded.book import Book, workbook_of
from tausheet.addin.make import make_sheet
from tausheet.addin.review import canonical, fingerprint
from tausheet.addin.review.seal import NotSealed, seal
from tausheet.addin.review.verify import verify


@pytest.fixture(scope="module")
def sealed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("sealed") / "ride.xlsx"
    make_sheet("ride-through", path, {}, demo=True)
    seal(path)
    return path


def departures(path: Path) -> list[str]:
    workbook = workbook_of(path, package.read(path))
    assert fingerprint.is_sealed(workbook)
    return [one.cell for one in fingerprint.departures(workbook, Book(workbook).values())]


def edited(path: Path, out: Path, edit: Any) -> Path:
    workbook = load_workbook(path)
    edit(workbook)
    workbook.save(out)
    return out


def cell_named(workbook: Any, name: str) -> Any:
    title, address = fingerprint.places_of(workbook, name)[0]
    return workbook[title][address]


def test_sealing_touches_nothing_else(tmp_path: Path) -> None:
    path = tmp_path / "sheet.xlsx"
    make_sheet("ride-through", path, {}, demo=True)
    before = {i.filename: i for i in zipfile.ZipFile(path).infolist()}
    bytes_before = path.read_bytes()
    sealed = seal(path)
    after = {i.filename: i for i in zipfile.ZipFile(path).infolist()}
    assert list(before) == list(after)
    changed = {name for name in before if before[name].CRC != after[name].CRC}
    titles = package.sheet_parts(zipfile.ZipFile(path))
    assert changed == {titles["Calc sheet"], titles["Sealed"]}
    workbook = load_workbook(path)
    (tmp_path / "before.xlsx").write_bytes(bytes_before)
    was = load_workbook(tmp_path / "before.xlsx")
    cells = {
        (sheet.title, cell.coordinate)
        for sheet in workbook.worksheets
        for cell in sheet._cells.values()
        if cell.value != was[sheet.title][cell.coordinate].value
    }
    allowed = {
        place
        for name in ("fingerprint", "last_verified", "sealed_results")
        for place in fingerprint.places_of(workbook, name)
    }
    assert cells == allowed
    assert cell_named(workbook, "fingerprint").value == sealed.fingerprint
    assert workbook.worksheets[0].oddFooter.center.text == f"fingerprint {sealed.fingerprint}"
    assert workbook.worksheets[0].oddFooter.right.text == "page &P of &N"
    assert verify(path).well
    assert "no signature" in str(sealed)


def resaved(names: list[str], folder: Path) -> None:
    with Calc() as calc:
        for name in names:
            path, again = folder / f"{name}.xlsx", folder / f"{name}-again.xlsx"
            make_sheet(name, path, {}, demo=True)
            mark = seal(path).fingerprint
            calc.store(path, again)
            assert departures(path) == departures(again) == [], name
            assert fingerprint.written(load_workbook(again)) == mark


def test_saving_in_libreoffice_keeps_it_and_prints_it(sealed: Path, tmp_path: Path) -> None:
    resaved(["network"], tmp_path)
    mark = fingerprint.written(load_workbook(sealed))
    with Calc() as calc:
        (printed,) = calc.pdf([sealed], tmp_path)
        calc.store(sealed, tmp_path / "again.xlsx")
    assert departures(tmp_path / "again.xlsx") == []
    document = pypdfium2.PdfDocument(printed)
    for page in document:
        assert f"fingerprint {mark}" in page.get_textpage().get_text_bounded()


def test_one_spelling_of_a_formula() -> None:
    ours = "=IF(TRUE, FO_TAU_RC('Curve'!$A$1:$A$1, 0.1), 1E-09)"
    theirs = "of=IF(TRUE(),ORG.TAUSHEET.FUNCTIONS.FO_TAU_RC(Curve!$A$1,0.1),0.000000001)"[2:]
    assert canonical.formula(ours) == canonical.formula(theirs)
    assert canonical.formula(ours) != canonical.formula(ours.replace("$A$1:$A$1", "$A$1:$A$2"))
    assert canonical.formula('="a b"') != canonical.formula('="ab"')
    cell = Workbook().worksheets[0]["B4"]
    for block in ("B4", "B4:B4"):  # as openpyxl and LibreOffice write an array formula of a cell
        cell.value = ArrayFormula(block, "=SUM(A1:A3*2)")
        assert canonical.content(cell) == "block B4 =SUM(a1:a3*2)"


@pytest.mark.campaign
def test_saving_any_sheet_in_libreoffice_keeps_it(tmp_path: Path) -> None:
    resaved([name for name in templates.SHEETS if name != "network"], tmp_path)


def harmless(workbook: Any) -> None:
    main = workbook.worksheets[0]
    main.column_dimensions["B"].width = 40
    main.sheet_view.zoomScale = 60
    for role in ("prepared", "checked", "approved"):
        cell_named(workbook, f"{role}_by").value = "A. Checker"
        cell_named(workbook, f"{role}_on").value = datetime.date(2026, 5, 4)
        cell_named(workbook, f"{role}_signature").value = "signed on paper"
    cell_named(workbook, "status").value = "approved"
    cell_named(workbook, "last_verified").value = "2027-01-01"
    cell_named(workbook, "revision_1_change").value = "first issue"


def test_what_comes_after_sealing_keeps_it(sealed: Path, tmp_path: Path) -> None:
    assert departures(edited(sealed, tmp_path / "edited.xlsx", harmless)) == []


def change(name: str, value: Any) -> Any:
    def edit(workbook: Any) -> None:
        cell_named(workbook, name).value = value

    return edit


def stretched(workbook: Any) -> None:
    """A name outside the fingerprint, stretched over an input that is then changed."""
    workbook.defined_names["status"].attr_text = "'Calc sheet'!$A$1:$H$300"
    cell_named(workbook, "value_of_V_min").value = 1.0


CHANGES = {
    "an input": change("value_of_C_nom", 99.0),
    "a unit": change("unit_of_t_need", "s"),
    "a source": change("source_of_C_nom", "somebody said so"),
    "a formula": change("t_ride", "=1"),
    "a title": change("doc_title", "something else"),
    "a result of the block": change("sealed_results", 1.0),
    "a label": lambda workbook: workbook.worksheets[0].__setitem__("A1", "other"),
    "a name": lambda workbook: workbook.defined_names.pop("t_need"),
    "an added worksheet": lambda workbook: workbook.create_sheet("More"),
    "a stretched name": stretched,
}


@pytest.mark.parametrize("what", CHANGES)
def test_a_change_breaks_it(what: str, sealed: Path, tmp_path: Path) -> None:
    workbook = load_workbook(sealed)
    before = fingerprint.fingerprint(workbook)
    assert before == fingerprint.written(workbook)
    CHANGES[what](workbook)
    workbook.save(tmp_path / "changed.xlsx")
    after = load_workbook(tmp_path / "changed.xlsx")
    assert fingerprint.fingerprint(after) != fingerprint.written(after)


def test_verify_names_the_broken_fingerprint(sealed: Path, tmp_path: Path) -> None:
    path = edited(sealed, tmp_path / "changed.xlsx", change("source_of_C_nom", "hearsay"))
    values = Book.load(path).values()
    path.write_bytes(package.with_values(path.read_bytes(), values))
    counted = [one for one in verify(path).findings if one.counts]
    assert [one.kind for one in counted] == ["broken fingerprint"]
    again = seal(path)
    assert verify(path).well
    footer = load_workbook(path).worksheets[0].oddFooter
    assert footer.center.text == f"fingerprint {again.fingerprint}"


def test_results_must_match_the_block(sealed: Path) -> None:
    workbook = workbook_of(sealed, package.read(sealed))
    values = Book(workbook).values()
    ((title, address),) = fingerprint.places_of(workbook, "t_ride")
    exact = values[title][address]
    assert isinstance(exact, float)
    for factor, found in ((1 + 3e-13, []), (1 + 3e-12, [f"{title}!{address}"])):
        values[title][address] = exact * factor
        assert [d.cell for d in fingerprint.departures(workbook, values)] == found


def test_a_long_number_is_kept_to_15_digits(tmp_path: Path) -> None:
    path = tmp_path / "long.xlsx"
    # 17 digits, and of 15 of them the last is a tie that programs round each in its own way
    make_sheet("ride-through", path, {"t_need": 0.03141592653589793}, demo=True)
    given = load_workbook(path)
    cell_named(given, "value_of_t_need").value = 0.5553415768879895
    cell_named(given, "unit_of_t_need").value = "ms"
    given.save(path)
    values = Book.load(path).values()
    path.write_bytes(package.with_values(path.read_bytes(), values))
    said = str(seal(path))
    assert "15 digits" in said
    assert cell_named(load_workbook(path), "value_of_t_need").value == 0.555341576887989
    with Calc() as calc:
        calc.store(path, tmp_path / "again.xlsx")
    assert departures(tmp_path / "again.xlsx") == []


def test_what_does_not_verify_is_not_sealed(tmp_path: Path) -> None:
    failing = tmp_path / "failing.xlsx"
    made = make_sheet("ride-through", failing, {"t_need": "100 s"}, demo=True)
    assert made.verdict == "FAIL"
    before = failing.read_bytes()
    with pytest.raises(NotSealed, match=r"does not verify: failing check at Calc sheet!"):
        seal(failing)
    assert failing.read_bytes() == before
    run = CliRunner().invoke(app, ["seal", str(failing)])
    assert run.exit_code != 0


def test_a_workbook_without_a_record_is_not_sealed(tmp_path: Path) -> None:
    Workbook().save(tmp_path / "other.xlsx")
    with pytest.raises(NotSealed, match="is no calc sheet"):
        seal(tmp_path / "other.xlsx")
    (tmp_path / "cut.xlsx").write_bytes((tmp_path / "other.xlsx").read_bytes()[:900])
    with pytest.raises(package.Unreadable):
        seal(tmp_path / "cut.xlsx")
