"""The environment that LibreOffice is started with."""

from __future__ import annotations

import os
import sys
from pathlib import Path

import pytest
from openpyxl import Workbook

from tausheet.addin.calc import Calc, libreoffice


def test_the_systems_python_comes_before_any_other(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", "/somewhere/else")
    monkeypatch.setenv("VIRTUAL_ENV", "/somewhere")
    environment = libreoffice.clean_environment()
    assert environment["PATH"].split(os.pathsep) == ["/usr/bin", "/bin", "/somewhere/else"]
    assert "VIRTUAL_ENV" not in environment


def test_another_python_on_the_path_does_not_disturb_libreoffice(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    """With another python3 in front, LibreOffice's Python takes that one's library and crashes."""
    real = Path(sys.base_prefix, "bin")
    monkeypatch.setenv("PATH", os.pathsep.join([str(real), os.environ["PATH"]]))
    book = Workbook()
    assert book.active is not None
    book.active["A1"] = "=FO_TAU_RC(2,3)"
    path = tmp_path / "x.xlsx"
    book.save(path)
    with Calc() as calc:
        assert calc.compute(path)["Sheet"]["A1"] == 6
