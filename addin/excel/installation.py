"""Put the add-in into Excel, take it out, and say how it is: Windows; the file itself anywhere."""

from __future__ import annotations

import os
import sys
from pathlib import Path

from tausheet.addin.excel import addin_file, wrappers
from tausheet.addin.excel.generator import generator
from tausheet.functions.errors import TausheetError

NOT_WINDOWS = (
    "Excel's cell functions written in Python work on Windows only; on this system "
    "`tausheet install excel --to FILE` writes the add-in file for carrying over, and "
    "`tausheet install calc` puts the functions into LibreOffice Calc."
)


class NotInstalled(TausheetError):
    """The add-in could not be put into Excel, or taken out."""


def start_up_folder() -> Path:
    """The folder from which Excel opens add-ins of this user by itself."""
    roaming = os.environ.get("APPDATA")
    if not roaming:
        raise NotInstalled("APPDATA is not set, so Excel's start-up folder is unknown; use --to")
    return Path(roaming) / "Microsoft" / "Excel" / "XLSTART"


def install(to: Path | None = None, interpreter: str | None = None, force: bool = False) -> str:
    """Make the add-in file and put it where Excel starts it; with `to`, only write it there."""
    if to is None and sys.platform != "win32":
        raise NotInstalled(NOT_WINDOWS)
    if interpreter is None:
        if sys.platform != "win32":
            raise NotInstalled(
                "the add-in file names the Python that Excel starts; give its full path on the "
                r"Windows machine: --interpreter C:\...\Scripts\pythonw.exe"
            )
        interpreter = sys.executable
    target = to if to is not None else start_up_folder() / addin_file.FILE_NAME
    if to is not None and to.exists() and not force:
        raise NotInstalled(f"{to} exists; give --force to overwrite it")
    if to is None:
        target.parent.mkdir(parents=True, exist_ok=True)
        _closed_everywhere()
    temporary = target.with_name(f".{target.name}.new")
    try:
        functions = addin_file.make(temporary, interpreter, generator())
        os.replace(temporary, target)
    except OSError as error:
        raise NotInstalled(f"{target} could not be written: {error.strerror}") from None
    finally:
        temporary.unlink(missing_ok=True)
    if to is not None:
        return f"{target}: an add-in with {len(functions)} functions; open it in Excel on Windows."
    return f"Excel: {len(functions)} functions in {target}; restart Excel to see them."


def uninstall() -> str:
    """Take the add-in out of Excel's start-up folder."""
    if sys.platform != "win32":
        raise NotInstalled(NOT_WINDOWS)
    target = start_up_folder() / addin_file.FILE_NAME
    if not target.exists():
        return "Excel: the add-in is not installed."
    _closed_everywhere()
    try:
        target.unlink()
    except OSError as error:
        raise NotInstalled(
            f"{target} could not be removed ({error.strerror}); close Excel and try again"
        ) from None
    return f"Excel: {target} removed."


def status(path: Path | None = None) -> list[str]:
    """How the add-in is: missing, in order, or in need of a repair, with the reason."""
    if path is None:
        if sys.platform != "win32":
            return [f"Excel: not here. {NOT_WINDOWS}"]
        path = start_up_folder() / addin_file.FILE_NAME
    if not path.exists():
        return ["Excel: the add-in is not installed; run `tausheet install excel`."]
    found = addin_file.read_configuration(path)
    interpreter = found.get("INTERPRETER_WIN", "")
    lines = [f"Excel: {path}, made as {found.get(addin_file.STAMP, 'unknown')}, {interpreter}."]
    wanted = addin_file.stamp(wrappers.wrapper_text(generator(), addin_file.FILE_NAME)[0])
    if found.get(addin_file.STAMP) != wanted:
        lines.append(
            f"Excel: the add-in needs a repair, since this version makes it as {wanted}; run "
            "`tausheet install excel`."
        )
    if sys.platform == "win32" and not Path(interpreter).exists():
        lines.append(
            f"Excel: the add-in needs a repair, since {interpreter} is gone; run "
            "`tausheet install excel`."
        )
    return lines


def _closed_everywhere() -> None:
    """Close the add-in in every running Excel, which would otherwise hold its file."""
    import xlwings

    for app in list(xlwings.apps):
        for book in list(app.books):
            if book.name.casefold() == addin_file.FILE_NAME:
                book.close()
