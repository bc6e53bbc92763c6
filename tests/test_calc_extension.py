"""The extension: made from the catalogue, complete, and at work in LibreOffice's own Python."""

from __future__ import annotations

import ast
import itertools
import os
import signal
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest
from openpyxl import Workbook

from tausheet.addin import cells
from tausheet.addin.calc import Calc, driver, extension, inside, interface, registration
from tausheet.addin.calc.answer import COLUMN_ROWS, answer_of, trimmed
from tausheet.addin.calc.inside import packages
from tausheet.addin.calc.inside.second_process import SecondProcess
from tausheet.addin.cells import CellValue
from tausheet.functions import step
from tausheet.functions.catalogue import CATALOGUE
from tausheet.functions.errors import ErrorKind

FOLDER = Path(driver.__file__).parent


@pytest.fixture(scope="module")
def calc() -> Iterator[Calc]:
    with Calc() as running:
        yield running


def values(calc: Calc, folder: Path, *formulas: str) -> list[CellValue]:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    for row, formula in enumerate(formulas, start=1):
        sheet.cell(row, 2, formula)
    sheet["A1"], sheet["A2"] = 1, 2
    book.save(folder / "formulas.xlsx")
    found = calc.compute(folder / "formulas.xlsx")["Sheet"]
    return [found[f"B{row}"] for row in range(1, len(formulas) + 1)]


def test_the_type_library_belongs_to_the_catalogue() -> None:
    assert not interface.is_stale(), "run python -m tausheet.addin.calc.build"


def test_the_type_library_holds_every_cell_function() -> None:
    library = interface.library()
    missing = [name for name in CATALOGUE if name.encode() not in library]
    assert missing == []


def test_a_changed_catalogue_makes_the_type_library_stale(monkeypatch: pytest.MonkeyPatch) -> None:
    entry = CATALOGUE["FO_STEP"]
    shorter = entry.__class__(**{**vars(entry), "parameters": entry.parameters[:-1]})
    monkeypatch.setitem(CATALOGUE, "FO_STEP", shorter)
    assert interface.is_stale()


def test_without_a_compiler_a_stale_library_is_refused(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setattr(interface, "RECORD", tmp_path / "none.json")
    monkeypatch.setattr("shutil.which", lambda _: None)
    with pytest.raises(interface.Stale, match="install the package libreoffice-dev, then run"):
        extension.files()


def test_what_runs_elsewhere_is_written_for_its_oldest_python() -> None:
    for path in [*Path(inside.__file__).parent.glob("*.py"), FOLDER / "helper.py"]:
        ast.parse(path.read_text(), feature_version=inside.MINIMUM)


def test_every_file_of_the_extension_can_be_read(tmp_path: Path) -> None:
    extension.write_package(tmp_path / "tausheet.oxt")
    extension.write(extension.files(), tmp_path)
    for name in extension.files():
        if name.endswith((".xml", ".xcu", ".components")):
            ElementTree.parse(tmp_path / name)
    names = list(extension.files())
    assert names[-1] == "META-INF/manifest.xml"
    manifest = (tmp_path / "META-INF/manifest.xml").read_text()
    for name in ("interface.rdb", "CalcAddIns.xcu", "Jobs.xcu", "tausheet.components"):
        assert f'full-path="{name}"' in manifest


def test_the_same_catalogue_makes_the_same_extension(tmp_path: Path) -> None:
    for name in ("one.oxt", "two.oxt"):
        extension.write_package(tmp_path / name)
    assert (tmp_path / "one.oxt").read_bytes() == (tmp_path / "two.oxt").read_bytes()


def test_the_wizard_helps_with_every_function_and_argument(calc: Calc) -> None:
    shown = calc.wizard()
    for name, entry in CATALOGUE.items():
        assert shown[name]["description"] == entry.summary != ""
        arguments = shown[name]["arguments"]
        assert [argument for argument, _ in arguments] == [p.name for p in entry.parameters]
        for parameter, (_, text) in zip(entry.parameters, arguments, strict=True):
            assert text.startswith(parameter.help)
            assert parameter.help
            variadic = entry.variadic and parameter is entry.parameters[-1]
            needed = "as many as" if variadic else "required" if parameter.required else "optional"
            assert f"; {needed}" in text


def test_help_of_arguments_says_what_may_be_left_out() -> None:
    t, *_, delay = CATALOGUE["FO_STEP"].parameters
    assert registration.argument_help(t) == (
        "time after switching (s); any number; "
        "required (an empty cell given by its address counts as 0)"
    )
    assert registration.argument_help(delay) == (
        "time from t = 0 until the step (s); number >= 0; optional, default 0"
    )
    name, arguments = CATALOGUE["FO_REASON"].parameters
    assert registration.argument_help(name).endswith("; required")
    assert registration.argument_help(arguments, variadic=True).endswith("; as many as needed")


def test_whole_columns_are_cut_to_the_rows_in_use(calc: Calc, tmp_path: Path) -> None:
    column = (*[(float(i),) for i in range(5)], *[("",)] * (COLUMN_ROWS - 5))
    other = ((1.0,), ("",), (1.0,), *[("",)] * (COLUMN_ROWS - 3))
    short = ((1.0,), ("",))
    assert trimmed((column, other, short, 1.0, None, None)) == [column[:5], other[:5], short, 1.0]
    assert trimmed([(("",),) * COLUMN_ROWS]) == [(("",),)]
    assert values(calc, tmp_path, "=SUM(FO_STEP(A:A,1,0,5))") == [
        pytest.approx(step(1, 1, 0, 5) + step(2, 1, 0, 5), rel=1e-15)
    ]


def test_an_unknown_function_of_a_newer_extension_is_a_name_error() -> None:
    assert cells.plain_grid(answer_of("FO_LATER")(1.0)[0][0]) is ErrorKind.NAME


def same(one: Any, other: Any) -> bool:
    """Whether two results are the same, the errors in them included."""
    flat = [itertools.chain.from_iterable(rows) for rows in (one, other)]
    return all(
        cells.plain(a) == cells.plain(b) for a, b in itertools.zip_longest(*flat, fillvalue=None)
    )


CALLS: list[tuple[str, tuple[Any, ...]]] = [
    ("FO_STEP", (1.0, 1.0, 0.0, 5.0)),
    ("FO_STEP", (1.0, 0.0, 0.0, 5.0, None)),
    ("FO_STEP", (((1.0,), ("",), (2.0,)), 1.0, 0.0, 5.0)),
    ("FO_TEXT", (0.00047, "F")),
    ("FO_REASON", ("FO_STEP", (1.0, 0.0, 0.0, 5.0))),
    ("FO_VERSION", ()),
]


@pytest.mark.parametrize(("name", "arguments"), CALLS)
def test_a_second_process_answers_the_same(name: str, arguments: tuple[Any, ...]) -> None:
    process = SecondProcess(sys.executable)
    assert same(process.answer_of(name)(*arguments), answer_of(name)(*arguments))
    process.close()


def test_a_second_process_that_hangs_or_dies() -> None:
    process = SecondProcess(sys.executable, time_limit=5.0)
    answer = process.answer_of("FO_STEP")
    expected = ((step(1, 1, 0, 5),),)
    assert answer(1.0, 1.0, 0.0, 5.0) == expected
    process._process.kill()
    assert answer(1.0, 1.0, 0.0, 5.0) == expected
    os.kill(process._process.pid, signal.SIGSTOP)
    process._time_limit = 0.5
    began = time.monotonic()
    assert cells.plain(answer(1.0, 1.0, 0.0, 5.0)[0][0]) is ErrorKind.VALUE
    assert time.monotonic() - began < 3
    process._time_limit = 20.0
    assert answer(1.0, 1.0, 0.0, 5.0) == expected
    process.close()


def test_a_second_process_that_cannot_start() -> None:
    process = SecondProcess("/bin/false")
    assert cells.plain(process.answer_of("FO_STEP")(1.0)[0][0]) is ErrorKind.VALUE
    process = SecondProcess("/nowhere/python")
    assert cells.plain(process.answer_of("FO_STEP")(1.0)[0][0]) is ErrorKind.VALUE


def changed(monkeypatch: pytest.MonkeyPatch, **changes: Any) -> None:
    recorded = {**extension.python_environment(), **changes}
    monkeypatch.setattr(extension, "python_environment", lambda: recorded)


FORMULAS = (
    "=FO_STEP(A1,1,0,5)",
    "=SUM(FO_STEP(A1:A2,1,0,5))",
    "=FO_STEP(A1,-1,0,5)",
    '=FO_REASON("FO_STEP",A1,-1,0,5)',
    "=FO_VERSION()",
)


def test_a_python_of_another_binary_form_answers_in_a_second_process(
    calc: Calc, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    expected = values(calc, tmp_path, *FORMULAS)
    changed(monkeypatch, binary="cpython-399-quay", version="3.99.4", folders=[])
    with Calc() as other:
        assert values(other, tmp_path, *FORMULAS) == expected
    sentence = inside.mismatch(extension.python_environment(), "3.11.2", "cpython-311")
    assert "Python 3.11.2 (cpython-311)" in sentence
    assert "Python 3.99.4 (cpython-399-quay)" in sentence


def test_a_python_that_is_gone_is_an_error_with_a_reason(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    gone = str(tmp_path / "removed/site-packages")
    changed(monkeypatch, folders=[gone])
    sentence = f"{gone} is gone, from which tausheet was installed; run tausheet install calc again"
    assert packages.missing(extension.python_environment()) == sentence
    with Calc() as other:
        assert values(other, tmp_path, *FORMULAS) == [ErrorKind.VALUE] * 3 + [sentence] * 2


def test_packages_that_cannot_be_loaded_are_an_error_with_a_reason(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    broken = tmp_path / "site-packages/tausheet"
    broken.mkdir(parents=True)
    (broken / "__init__.py").write_text("raise ImportError('half installed')")
    changed(monkeypatch, folders=[str(broken.parent)])
    with Calc() as other:
        *errors, reason, told = values(other, tmp_path, *FORMULAS)
    assert errors == [ErrorKind.VALUE] * 3
    assert reason == told
    assert isinstance(reason, str)
    assert reason.startswith("tausheet cannot be loaded in LibreOffice (ImportError: half instal")
    assert reason.endswith("; run tausheet install calc again")


def test_package_folders_come_before_those_of_the_distribution(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    linked = tmp_path / "project"
    linked.mkdir()
    (tmp_path / "link.pth").write_text(f"{linked}\n")
    before = ["/usr/lib/python3.11", "/usr/lib/python3/dist-packages", "/macros"]
    monkeypatch.setattr(sys, "path", list(before))
    packages.add([str(tmp_path)])
    assert sys.path == [before[0], str(tmp_path), str(linked), *before[1:]]


def test_this_python_can_be_named_by_what_it_records() -> None:
    recorded = extension.python_environment()
    assert inside.mismatch(recorded, recorded["version"], recorded["binary"]) == ""
    assert any(Path(folder, "numpy").is_dir() for folder in recorded["folders"])
    assert packages.missing(recorded) == ""
    assert recorded["functions"] == sorted(CATALOGUE)
