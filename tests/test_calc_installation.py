"""tausheet install calc, status and uninstall calc, on a real LibreOffice.

Everything goes into folders of its own: what is installed on this machine stays as it is.
"""

from __future__ import annotations

import csv
import subprocess
from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin.calc import extension, installation, libreoffice
from tausheet.functions import step


@pytest.fixture
def options(tmp_path: Path) -> list[str]:
    """Options that keep an installation, also one for every user, in a folder of its own."""
    shared, user = tmp_path / "shared", tmp_path / "user"
    return [
        f"-env:UserInstallation={user.as_uri()}",
        f"-env:UNO_SHARED_PACKAGES_CACHE={shared.as_uri()}",
    ]


def converted(options: list[str], path: Path) -> list[list[str]]:
    """What a headless LibreOffice, started as anybody would, makes of a workbook."""
    command = [
        *(str(libreoffice.find().soffice), "--headless", *options),
        *("--convert-to", "csv", "--outdir", str(path.parent), str(path)),
    ]
    subprocess.run(
        command, check=True, capture_output=True, timeout=120, env=libreoffice.clean_environment()
    )
    with path.with_suffix(".csv").open(newline="") as file:
        return list(csv.reader(file))


def workbook(path: Path) -> Path:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet["A1"] = "=FO_STEP(1,1,0,5)"
    sheet["B1"] = "=FO_STEP(1,0,0,5)"
    sheet["C1"] = ArrayFormula("C1:C2", "=FO_STEP({1;2},1,0,5)")
    book.save(path)
    return path


def test_install_status_and_uninstall(options: list[str], tmp_path: Path) -> None:
    path = workbook(tmp_path / "plain.xlsx")
    assert converted(options, path) == [["#NAME?"] * 3, ["", "", "#NAME?"]]
    assert installation.installed(options) is None
    assert any("not installed; run tausheet install" in x for x in installation.status(options))

    assert "are installed in LibreOffice" in installation.install(options)
    assert installation.installed(options) == extension.summary()
    lines = installation.status(options)
    assert any(str(libreoffice.find().soffice) in line for line in lines)
    assert lines[-1].endswith(": installed.")
    at = [step(t, 1, 0, 5) for t in (1, 2)]
    assert converted(options, path) == [
        [f"{at[0]:.15g}", "#NUM!", f"{at[0]:.15g}"],
        ["", "", f"{at[1]:.15g}"],
    ]

    assert "are removed from LibreOffice" in installation.uninstall(options)
    assert installation.installed(options) is None
    assert "are not installed in LibreOffice" in installation.uninstall(options)
    assert converted(options, path) == [["#NAME?"] * 3, ["", "", "#NAME?"]]


def test_status_tells_another_tausheet(options: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    installation.install(options)
    other = {**extension.python_environment(), "executable": "/home/quay4/python"}
    monkeypatch.setattr(extension, "python_environment", lambda: other)
    [line] = [x for x in installation.status(options) if "another tausheet" in x]
    assert "Run tausheet install calc." in line
    assert "are installed" in installation.install(options)
    assert not [x for x in installation.status(options) if "another tausheet" in x]


def test_two_pythons_that_do_not_fit_are_named(
    options: list[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    other = {**extension.python_environment(), "binary": "cpython-399", "version": "3.99.4"}
    monkeypatch.setattr(extension, "python_environment", lambda: other)
    for text in (installation.install(options), installation.status(options)[-1]):
        assert f"LibreOffice runs Python {libreoffice.find().python_version} (" in text
        assert "Python 3.99.4 (cpython-399), so the cell functions are computed in a sec" in text


def test_what_the_installer_of_libreoffice_refuses(
    options: list[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    broken = {"description.xml": b"<not xml", "META-INF/manifest.xml": b""}
    monkeypatch.setattr(extension, "files", lambda: broken)
    with pytest.raises(installation.InstallationError, match="installer of extensions refuses: "):
        installation.install(options)
    assert installation.installed(options) is None


def test_status_without_libreoffice(monkeypatch: pytest.MonkeyPatch) -> None:
    def missing() -> libreoffice.Office:
        raise libreoffice.NotInstalled("LibreOffice was not found; install it")

    monkeypatch.setattr(libreoffice, "find", missing)
    assert installation.status() == ["LibreOffice: LibreOffice was not found; install it."]
    with pytest.raises(libreoffice.NotInstalled):
        installation.install()
