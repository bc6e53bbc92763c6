"""Values stored beside formulas, and nothing else in the file touched."""

from __future__ import annotations

import io
import struct
import zipfile
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin import package
from tausheet.addin.calc import Calc
from tausheet.addin.files import NotWritten
from tausheet.addin.recalc import recalc
from tausheet.functions.errors import ErrorKind, TausheetError


@pytest.fixture
def book(tmp_path: Path) -> Path:
    workbook = Workbook()
    sheet = workbook.active
    assert sheet is not None
    sheet.title = "First & <last>"
    sheet["A1"], sheet["A2"], sheet["A3"] = 47e3, 0.0047, "café"
    sheet["B1"] = "=FO_TAU_RC(A1,A2)"
    sheet["B2"] = '=A3&" <&> "&B1'
    sheet["B3"] = "=B1>200"
    sheet["B4"] = "=FO_TIME_TO(9,1,0,5)"
    sheet["B5"] = ArrayFormula("B5:B7", "=FO_STEP(A1:A2,1,0,5)")
    workbook.create_sheet("Other")["A1"] = "='First & <last>'!B1*2"
    path = tmp_path / "book.xlsx"
    workbook.save(path)
    return path


def entries(path: Path) -> dict[str, tuple[bytes, bytes]]:
    """Each part's local record as raw bytes, and its content."""
    data = path.read_bytes()
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        found = {}
        for entry in archive.infolist():
            at = entry.header_offset
            name, extra = struct.unpack_from("<HH", data, at + 26)
            end = at + 30 + name + extra + entry.compress_size
            found[entry.filename] = (data[at:end], archive.read(entry))
        return found


def test_the_values_are_there_for_everyone_who_only_reads(book: Path) -> None:
    report = recalc(book)
    assert str(report) == f"{book}: 8 values stored, 2 of them errors"
    sheet = load_workbook(book, data_only=True)["First & <last>"]
    assert [sheet[f"B{row}"].value for row in (1, 2, 3, 4)] == [
        220.9,
        "café <&> 220.9",
        True,
        "#N/A",
    ]
    assert sheet["B5"].value == 5
    assert sheet["B7"].value == "#N/A"
    assert load_workbook(book)["First & <last>"]["B1"].value == "=FO_TAU_RC(A1,A2)"
    assert load_workbook(book, data_only=True)["Other"]["A1"].value == 441.8


def test_every_other_part_stays_byte_for_byte(book: Path) -> None:
    before = entries(book)
    recalc(book)
    after = entries(book)
    sheets = {"xl/worksheets/sheet1.xml", "xl/worksheets/sheet2.xml"}
    assert list(before) == list(after)
    for name in set(before) - sheets:
        assert before[name][0] == after[name][0], name
    assert zipfile.ZipFile(book).testzip() is None


def test_computing_again_changes_nothing(book: Path) -> None:
    recalc(book)
    once = book.read_bytes()
    recalc(book)
    assert {n: c for n, (_, c) in entries(book).items()} == {
        name: zipfile.ZipFile(io.BytesIO(once)).read(name) for name in entries(book)
    }


def test_both_engines_store_the_same(book: Path, tmp_path: Path) -> None:
    one, two = tmp_path / "one.xlsx", tmp_path / "two.xlsx"
    recalc(book, engine="embedded", out=one)
    recalc(book, engine="calc", out=two)
    for title in ("First & <last>", "Other"):
        first, second = (load_workbook(path, data_only=True)[title] for path in (one, two))
        for row in first.iter_rows():
            for cell in row:
                assert cell.value == second[cell.coordinate].value, cell.coordinate


def test_an_existing_file_is_not_overwritten(book: Path, tmp_path: Path) -> None:
    out = tmp_path / "there.xlsx"
    out.write_text("mine")
    with pytest.raises(NotWritten, match="--force"):
        recalc(book, out=out)
    assert out.read_text() == "mine"
    assert recalc(book, out=out, force=True).path == out


def test_a_refusal_leaves_the_file_as_it_was(book: Path) -> None:
    workbook = load_workbook(book)
    workbook["Other"]["A2"] = "=VLOOKUP(1,A1:B2,2)"
    workbook.save(book)
    before = book.read_bytes()
    with pytest.raises(TausheetError, match=r"Other!A2: the function VLOOKUP is not known"):
        recalc(book)
    assert book.read_bytes() == before
    assert [path.name for path in book.parent.iterdir()] == ["book.xlsx"]


def test_an_unknown_engine_is_refused(book: Path) -> None:
    with pytest.raises(TausheetError, match="embedded or calc"):
        recalc(book, engine="other")


def test_names_that_libreoffice_writes_are_written_back(book: Path, tmp_path: Path) -> None:
    stored = tmp_path / "stored.xlsx"
    with Calc() as calc:
        calc.store(book, stored)
    assert b"ORG.TAUSHEET" in zipfile.ZipFile(stored).read("xl/worksheets/sheet1.xml").upper()
    report = recalc(stored)
    assert "long names" in str(report)
    sheet = load_workbook(stored)["First & <last>"]
    assert sheet["B1"].value == "=FO_TAU_RC(A1,A2)"
    assert load_workbook(stored, data_only=True)["First & <last>"]["B1"].value == 220.9


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"", "not a whole .xlsx workbook"),
        (b"hello", "not a whole .xlsx workbook"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 600, "encrypted, or of the old .xls kind"),
    ],
)
def test_a_file_that_is_no_workbook_is_said_to_be_none(
    content: bytes, sentence: str, tmp_path: Path
) -> None:
    path = tmp_path / "x.xlsx"
    path.write_bytes(content)
    with pytest.raises(TausheetError, match=sentence):
        recalc(path)
    assert path.read_bytes() == content


def test_a_missing_and_a_truncated_file_are_refused(book: Path, tmp_path: Path) -> None:
    with pytest.raises(TausheetError, match="cannot be read"):
        recalc(tmp_path / "missing.xlsx")
    book.write_bytes(book.read_bytes()[:-200])
    with pytest.raises(TausheetError, match="not a whole"):
        recalc(book)


def with_part(book: Path, name: str, content: bytes) -> Path:
    with zipfile.ZipFile(book) as given:
        parts = {entry.filename: given.read(entry) for entry in given.infolist()}
    parts[name] = content
    with zipfile.ZipFile(book, "w", zipfile.ZIP_DEFLATED) as made:
        for part, data in parts.items():
            made.writestr(part, data)
    return book


ENTITIES = b"""<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;&a;">]>
<sst xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><si><t>&b;</t></si></sst>"""


@pytest.mark.parametrize(
    ("name", "content", "sentence"),
    [
        ("xl/sharedStrings.xml", ENTITIES, "declarations that no workbook needs"),
        ("xl/sharedStrings.xml", ENTITIES.decode().encode("utf-16"), "declarations"),
        ("../outside.xml", b"<a/>", "doubtful names"),
        ("xl/bomb.bin", b"\0" * (package.MOST_BYTES + 1), "unpack to more"),
    ],
)
def test_a_workbook_that_is_not_safe_is_not_read(
    name: str, content: bytes, sentence: str, book: Path
) -> None:
    with pytest.raises(TausheetError, match=sentence):
        recalc(with_part(book, name, content))


def test_texts_that_xml_cannot_hold_are_stored_in_the_workbooks_own_spelling() -> None:
    assert package._stored("a\x01b _x0041_ <") == ("str", "a_x0001_b _x005F_x0041_ &lt;")
    assert package._stored(ErrorKind.NUM) == ("e", "#NUM!")
    assert package._stored(0.1) == ("", "0.1")
    assert package._stored(1e300) == ("", "1e+300")


@pytest.mark.parametrize(
    ("part", "old", "new"),
    [
        ("xl/workbook.xml", b'r:id="rId1"', b'r:id="rId77"'),
        ("xl/worksheets/sheet1.xml", b"</sheetData>", b""),
        ("xl/worksheets/sheet1.xml", b'ref="B5:B7"', b'ref="A1:XFD1048576"'),
        ("xl/worksheets/sheet1.xml", b'ref="B5:B7"', b'ref="5"'),
        ("xl/styles.xml", b"<fonts", b"<fronts"),
        ("xl/_rels/workbook.xml.rels", b"<Relationships", b"<Relations"),
    ],
)
def test_a_damaged_part_is_one_sentence_and_the_file_stays(
    part: str, old: bytes, new: bytes, book: Path
) -> None:
    content = zipfile.ZipFile(book).read(part)
    assert old in content
    with_part(book, part, content.replace(old, new))
    before = book.read_bytes()
    with pytest.raises(TausheetError):
        recalc(book)
    assert book.read_bytes() == before


def test_a_cell_in_the_far_corner_costs_nothing(book: Path) -> None:
    workbook = load_workbook(book)
    workbook["Other"]["XFD1048576"] = 1
    workbook.save(book)
    assert recalc(book).cells == 8


def test_a_number_that_is_shown_as_a_time_keeps_its_digits(tmp_path: Path) -> None:
    workbook = Workbook()
    sheet = workbook.active
    assert sheet is not None
    sheet["A1"], sheet["A2"] = 1e-9, "=A1*1E9"
    sheet["A1"].number_format = "h:mm:ss"
    path = tmp_path / "time.xlsx"
    workbook.save(path)
    recalc(path)
    assert load_workbook(path, data_only=True)["Sheet"]["A2"].value == pytest.approx(1, rel=1e-15)
