"""Workbooks made to hurt: a sentence within 5 s and 500 MB, nothing executed, nothing fetched.

One process reads them all, so the memory is that of the worst. The time is processor time, which
does not depend on what else runs. Limits: the issue's; kinds of attack: common practice.
"""

from __future__ import annotations

import contextlib
import http.server
import io
import json
import random
import re
import struct
import subprocess
import sys
import threading
import urllib.request
import zipfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook

from tausheet.addin import package
from tausheet.addin.printing import print_sheets
from tausheet.addin.recalc import recalc
from tausheet.addin.review.verify import verify
from tausheet.functions.errors import TausheetError

Parts = dict[str, bytes]
SHEET, BOOK = "xl/worksheets/sheet1.xml", "xl/workbook.xml"
FORMULA = b"FO_TAU_RC(A1,2)"


def parts() -> Parts:
    """A small workbook that computes."""
    book = Workbook()
    sheet = book.worksheets[0]
    sheet["A1"], sheet["B1"], sheet["A2"] = 3, f"={FORMULA.decode()}", "text"
    out = io.BytesIO()
    book.save(out)
    with zipfile.ZipFile(out) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


PLAIN = parts()


def packed(content: Parts, method: int = zipfile.ZIP_DEFLATED) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", method) as archive:
        for name, data in content.items():
            archive.writestr(name, data)
    return out.getvalue()


def with_(name: str, old: bytes, new: bytes) -> bytes:
    """The workbook with something in a part replaced."""
    assert old in PLAIN[name], old
    return packed({**PLAIN, name: PLAIN[name].replace(old, new)})


def after_cells(new: bytes) -> bytes:
    return with_(SHEET, b"</sheetData>", b"</sheetData>" + new)


def formula(new: bytes) -> bytes:
    return with_(SHEET, FORMULA, new)


def bomb(name: str) -> bytes:
    """Ten times ten times ten ... of a text, as entities."""
    levels = b"".join(b'<!ENTITY e%d "%s">' % (i + 1, b"&e%d;" % i * 10) for i in range(9))
    head = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY e0 "lol">' + levels + b"]>"
    body = PLAIN.get(name, b"<x>&e9;</x>")
    return head + body[body.index(b"?>") + 2 if body.startswith(b"<?xml") else 0 :]


def outside(name: str) -> bytes:
    """An entity that is a file of this machine."""
    head = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY f SYSTEM "file:///etc/hostname">]>'
    body = PLAIN[name]
    return head + body[body.index(b"?>") + 2 if body.startswith(b"<?xml") else 0 :]


def renamed_strings() -> bytes:
    """The texts in a part whose name does not say that it is XML."""
    content = {name: data for name, data in PLAIN.items() if name != "xl/sharedStrings.xml"}
    for name in ("[Content_Types].xml", "xl/_rels/workbook.xml.rels"):
        content[name] = content[name].replace(b"sharedStrings.xml", b"strings.bin")
    return packed({**content, "xl/strings.bin": bomb("xl/sharedStrings.xml")})


def lying_size() -> bytes:
    """A part that unpacks to far more than the directory says."""
    data = bytearray(packed({**PLAIN, "xl/media/a.bin": b"\0" * (package.MOST_BYTES + 10)}))
    with zipfile.ZipFile(io.BytesIO(bytes(data))) as archive:
        local = archive.getinfo("xl/media/a.bin").header_offset
    struct.pack_into("<I", data, local + 22, 10)
    central = data.rindex(b"PK\x01\x02", 0, data.rindex(b"xl/media/a.bin"))
    struct.pack_into("<I", data, central + 24, 10)
    return bytes(data)


def twice() -> bytes:
    out = io.BytesIO(packed(PLAIN))
    with zipfile.ZipFile(out, "a") as archive, pytest.warns(UserWarning, match="Duplicate"):
        archive.writestr(SHEET, PLAIN[SHEET])
    return out.getvalue()


def locked() -> bytes:
    """Every part marked as encrypted."""
    data = bytearray(packed(PLAIN))
    for mark, offset in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        at = data.find(mark)
        while at >= 0:
            data[at + offset] |= 1
            at = data.find(mark, at + 4)
    return bytes(data)


def names(count: int) -> bytes:
    """Names that each stand for the one before, twice."""
    defined = b"".join(
        b'<definedName name="n%da">%s</definedName>'
        % (i, b"n%da+n%da" % (i - 1, i - 1) if i else b"$A$1")
        for i in range(count)
    )
    content = {**PLAIN, SHEET: PLAIN[SHEET].replace(FORMULA, b"n%da" % (count - 1))}
    empty = b"<definedNames />"
    assert empty in PLAIN[BOOK]
    content[BOOK] = PLAIN[BOOK].replace(empty, b"<definedNames>" + defined + b"</definedNames>")
    return packed(content)


def growing_text() -> bytes:
    cells = b'<c r="A2"><f>"12345678"</f></c>' + b"".join(
        b'<c r="%c2"><f>%s</f></c>' % (66 + i, b"&amp;".join([b"%c2" % (65 + i)] * 4))
        for i in range(15)
    )
    return with_(SHEET, b"</sheetData>", b'<row r="3">' + cells + b"</row></sheetData>")


def relation(target: bytes) -> bytes:
    name = "xl/_rels/workbook.xml.rels"
    found = b"/xl/worksheets/sheet1.xml"
    assert found in PLAIN[name]
    return packed({**PLAIN, name: PLAIN[name].replace(found, target)})


@dataclass(frozen=True)
class Hostile:
    """What is made, what is said of it, and which commands are asked."""

    make: Callable[[], bytes]
    sentence: str
    commands: str = "recalc-verify-pdf"


DECLARES = "declarations that no workbook needs"
MORE = "would unpack to more than a workbook should"
DAMAGED = "is damaged"
NAMES = "doubtful names"
HOSTILE = {
    "entities in the texts": Hostile(
        lambda: packed({**PLAIN, "xl/sharedStrings.xml": bomb("xl/sharedStrings.xml")}), DECLARES
    ),
    "entities in the sheet": Hostile(lambda: packed({**PLAIN, SHEET: bomb(SHEET)}), DECLARES),
    "entities in the workbook": Hostile(lambda: packed({**PLAIN, BOOK: bomb(BOOK)}), DECLARES),
    "entities under another name": Hostile(renamed_strings, DECLARES),
    "entities in 16 bits": Hostile(
        lambda: packed({**PLAIN, SHEET: bomb(SHEET).decode().encode("utf-16")}), DECLARES
    ),
    "entities in 16 bits without a mark": Hostile(
        lambda: packed({**PLAIN, SHEET: bomb(SHEET).decode().encode("utf-16-le")}), DECLARES
    ),
    "a file as an entity": Hostile(lambda: packed({**PLAIN, BOOK: outside(BOOK)}), DECLARES),
    "a bomb of zeros": Hostile(
        lambda: packed({**PLAIN, "xl/a.bin": b"\0" * (package.MOST_BYTES + 1)}), MORE
    ),
    "a bomb that lies": Hostile(lying_size, r"not a whole .xlsx workbook|" + MORE),
    "a bomb of many parts": Hostile(
        lambda: packed({**PLAIN, **{f"xl/m{i}.xml": b"" for i in range(6000)}}), MORE
    ),
    "a part above": Hostile(lambda: packed({**PLAIN, "../../evil.xml": b"<a/>"}), NAMES),
    "a part at the root": Hostile(lambda: packed({**PLAIN, "/etc/evil.xml": b"<a/>"}), NAMES),
    "a part behind backslashes": Hostile(lambda: packed({**PLAIN, r"..\evil.xml": b"<a/>"}), NAMES),
    "a part on a drive": Hostile(lambda: packed({**PLAIN, "C:/evil.xml": b"<a/>"}), NAMES),
    "a part twice": Hostile(twice, NAMES),
    "a sheet elsewhere": Hostile(lambda: relation(b"../../../etc/passwd"), DAMAGED),
    "a sheet by address": Hostile(lambda: relation(b"file:///etc/passwd"), DAMAGED),
    "encrypted parts": Hostile(locked, "is encrypted"),
    "encrypted whole": Hostile(
        lambda: b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 5000, "is encrypted, or of the old"
    ),
    "half": Hostile(lambda: packed(PLAIN)[: len(packed(PLAIN)) // 2], "not a whole .xlsx"),
    "merged everything": Hostile(
        lambda: after_cells(b'<mergeCells><mergeCell ref="A1:XFD1048576"/></mergeCells>'), "merges"
    ),
    "linked everything": Hostile(
        lambda: after_cells(b'<hyperlinks><hyperlink ref="A1:XFD1048576"/></hyperlinks>'), "merges"
    ),
    "a block in disguise": Hostile(
        lambda: after_cells(b'<mergeCells><mergeCell ref="&#65;1:X&#70;D99999"/></mergeCells>'),
        "merges",
    ),
    "a block of nonsense": Hostile(
        lambda: after_cells(b'<mergeCells><mergeCell ref="5:X"/></mergeCells>'), "x.xlsx|whole"
    ),
    "millions of cells": Hostile(
        lambda: with_(SHEET, b"</sheetData>", b"<c/>" * 2_000_000 + b"</sheetData>"), "more cells"
    ),
    "a column beyond": Hostile(
        lambda: with_(SHEET, b'r="A2"', b'r="ZZZZZZ2"'), DAMAGED, "recalc-verify"
    ),
    "an array over everything": Hostile(
        lambda: with_(SHEET, b"<f>", b'<f t="array" ref="A1:XFD1048576">'),
        "larger than this engine fills",
        "recalc",
    ),
    "parentheses": Hostile(
        lambda: formula(b"(" * 50_000 + b"1" + b")" * 50_000), "nested too deeply", "recalc"
    ),
    "calls in calls": Hostile(
        lambda: formula(b"IF(1," * 20_000 + b"1" + b")" * 20_000), "nested too deeply", "recalc"
    ),
    "names of names": Hostile(lambda: names(60), "stand for more than", "recalc"),
    "a text that grows": Hostile(growing_text, "more than 32767 characters", "recalc"),
    "another workbook": Hostile(
        lambda: formula(b"[1]Sheet!A1+1"), "refers to another workbook", "recalc"
    ),
    "a program": Hostile(
        lambda: formula(b'DDE("soffice","/etc/passwd","A1")'), "DDE is not known", "recalc"
    ),
}


@pytest.fixture(scope="module")
def answers(tmp_path_factory: pytest.TempPathFactory) -> Iterator[tuple[dict[str, list], float]]:
    folder = tmp_path_factory.mktemp("untrusted")
    for number, (_, hostile) in enumerate(HOSTILE.items()):
        (folder / f"{number:02}.{hostile.commands}.xlsx").write_bytes(hostile.make())
    reader = [sys.executable, Path(__file__).with_name("read_untrusted.py"), folder]
    done = subprocess.run(reader, capture_output=True, text=True, timeout=300)
    assert done.returncode == 0, done.stderr[-2000:]
    *lines, memory = done.stdout.splitlines()
    found: dict[str, list] = {name: [] for name in HOSTILE}
    for line in lines:
        file, *rest = json.loads(line)
        found[list(HOSTILE)[int(file[:2])]].append(rest)
    yield found, float(memory)
    assert {path.suffix for path in folder.iterdir()} == {".xlsx"}, "nothing was printed"


@pytest.mark.parametrize("name", HOSTILE)
def test_a_hostile_workbook_is_one_sentence(
    name: str, answers: tuple[dict[str, list], float]
) -> None:
    hostile = HOSTILE[name]
    asked = answers[0][name]
    assert [one[0] for one in asked] == hostile.commands.split("-")
    for command, said, took, same in asked:
        assert said.startswith("refused: "), (command, said)
        assert re.search(hostile.sentence, said), (command, said)
        assert "\n" not in said
        assert took < 5, (command, took)
        assert same, "the file is as it was"


def test_the_worst_of_them_takes_little_memory(answers: tuple[dict[str, list], float]) -> None:
    assert answers[1] < 500


def test_cut_and_flipped_files_are_sentences_or_workbooks(tmp_path: Path) -> None:
    whole = packed(PLAIN)
    drawn = random.Random(6)
    path = tmp_path / "x.xlsx"
    refused = 0
    for number in range(60):
        data = bytearray(whole if number % 2 else packed(PLAIN, zipfile.ZIP_STORED))
        if number % 3:
            for _ in range(drawn.randint(1, 8)):
                data[drawn.randrange(len(data))] ^= 1 << drawn.randrange(8)
        else:
            del data[drawn.randrange(len(data)) :]
        path.write_bytes(data)
        try:
            recalc(path)
        except TausheetError:
            refused += 1
            assert path.read_bytes() == data
        else:
            assert load_workbook(path, data_only=True).worksheets
    assert refused > 30


class Listener(http.server.BaseHTTPRequestHandler):
    asked: list[str]

    def do_GET(self) -> None:
        self.asked.append(self.path)
        self.send_response(200)
        self.end_headers()
        self.wfile.write(b"4711")

    do_HEAD = do_OPTIONS = do_PROPFIND = do_GET

    def log_message(self, *_: object) -> None:
        pass


def linking(path: Path, target: str, calls: str) -> None:
    """A workbook with a link to another, whose value was stored as 1, and calls that fetch."""
    content = dict(PLAIN)
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    office = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
    plain = "http://schemas.openxmlformats.org/package/2006/relationships"
    content["xl/externalLinks/externalLink1.xml"] = (
        f'<externalLink xmlns="{main}"><externalBook xmlns:r="{office}" r:id="rId1"><sheetNames>'
        '<sheetName val="Sheet"/></sheetNames><sheetDataSet><sheetData sheetId="0"><row r="1">'
        '<cell r="A1"><v>1</v></cell></row></sheetData></sheetDataSet></externalBook>'
        "</externalLink>"
    ).encode()
    content["xl/externalLinks/_rels/externalLink1.xml.rels"] = (
        f'<Relationships xmlns="{plain}"><Relationship Id="rId1" TargetMode="External" '
        f'Type="{office}/externalLinkPath" Target="{target}"/></Relationships>'
    ).encode()
    content["[Content_Types].xml"] = content["[Content_Types].xml"].replace(
        b"</Types>",
        b'<Override PartName="/xl/externalLinks/externalLink1.xml" ContentType="application/vnd.'
        b'openxmlformats-officedocument.spreadsheetml.externalLink+xml"/></Types>',
    )
    relations = "xl/_rels/workbook.xml.rels"
    content[relations] = content[relations].replace(
        b"</Relationships>",
        f'<Relationship Id="rId99" Type="{office}/externalLink" '
        'Target="externalLinks/externalLink1.xml"/></Relationships>'.encode(),
    )
    content[BOOK] = content[BOOK].replace(
        b"<definedNames />",
        f'<externalReferences><externalReference xmlns:r="{office}" r:id="rId99"/>'
        "</externalReferences>".encode(),
    )
    cells = "".join(
        f'<c r="{column}5"><f>{call.format(target)}</f><v>1</v></c>'
        for column, call in zip("ABC", calls.split("; "), strict=False)
    )
    content[SHEET] = content[SHEET].replace(
        b"</sheetData>", f'<row r="5">{cells}</row></sheetData>'.encode()
    )
    path.write_bytes(packed(content))


LINK = "[1]Sheet!A1+0"
CALLS = {
    "a link": LINK,
    "a link and a jump": f'{LINK}; HYPERLINK("{{}}","x")',
    "a web service": f'{LINK}; _xlfn.WEBSERVICE("{{}}")',
    "another program": f'{LINK}; DDE("soffice","{{}}","Sheet.A1")',
}


@pytest.fixture(scope="module")
def server() -> Iterator[str]:
    Listener.asked = []
    server = http.server.ThreadingHTTPServer(("127.0.0.1", 0), Listener)
    threading.Thread(target=server.serve_forever, daemon=True).start()
    yield f"http://127.0.0.1:{server.server_port}/other.xlsx"
    server.shutdown()
    server.server_close()


@pytest.mark.parametrize("where", ["web", "disk"])
@pytest.mark.parametrize("calls", CALLS)
def test_nothing_is_fetched_and_no_other_file_is_read(
    calls: str, where: str, server: str, tmp_path: Path
) -> None:
    other = Workbook()
    other.worksheets[0]["A1"] = 4711
    other.save(tmp_path / "other.xlsx")
    path = tmp_path / "links.xlsx"
    linking(path, server if where == "web" else (tmp_path / "other.xlsx").as_uri(), CALLS[calls])
    with pytest.raises(TausheetError, match=r"Sheet!A5: .* refers to another workbook"):
        recalc(path)
    assert not verify(path).well
    with contextlib.suppress(TausheetError):  # it may also refuse, as for a web service
        recalc(path, engine="calc")
    (printed,) = print_sheets([path])
    assert printed.error is None
    shown = load_workbook(path, data_only=True).worksheets[0]
    assert all("4711" not in str(shown[f"{column}5"].value) for column in "ABC")
    assert Listener.asked == []


def test_the_server_of_the_test_would_have_noticed(server: str) -> None:
    assert urllib.request.urlopen(server).read() == b"4711"
    assert Listener.asked == ["/other.xlsx"]
