"""Put the add-in into Excel, take it out, and say how it is: Windows; the file itself anywhere."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import Any

from tausheet.addin.excel import addin_file, bridge, wrappers
from tausheet.addin.excel.generator import generator
from tausheet.addin.files import replacing
from tausheet.functions.errors import TausheetError

NOT_WINDOWS = (
    "Excel's cell functions written in Python work on Windows only; on this system "
    "`tausheet install excel --to FILE` writes the add-in file for carrying over, and "
    "`tausheet install calc` puts the functions into LibreOffice Calc."
)
_REPAIR = "run `tausheet install excel`"
_TRIAL_LIMIT = 120.0


class NotInstalled(TausheetError):
    """The add-in could not be put into Excel, or taken out."""


def start_up_folder() -> Path:
    """The folder from which Excel opens add-ins of this user by itself."""
    roaming = os.environ.get("APPDATA")
    if not roaming:
        raise NotInstalled("APPDATA is not set, so Excel's start-up folder is unknown; use --to")
    return Path(roaming) / "Microsoft" / "Excel" / "XLSTART"


CARRIED_OVER = r"C:\Program Files\tausheet\Scripts\pythonw.exe"
"""The Python that a file written elsewhere starts, in a folder that administrators alone fill."""


def install(to: Path | None = None, interpreter: str | None = None, force: bool = False) -> str:
    """Make the add-in file and put it where Excel starts it; with `to`, only write it there."""
    if to is None and sys.platform != "win32":
        raise NotInstalled(NOT_WINDOWS)
    interpreter = interpreter or (sys.executable if sys.platform == "win32" else CARRIED_OVER)
    if to is not None:
        with replacing(to, force=force) as temporary:
            functions = addin_file.make(temporary, interpreter, generator())
        return (
            f"{to}: an add-in with {len(functions)} functions, for Excel on Windows. It starts the "
            f"Python at {interpreter} and no other; --interpreter names another place."
        )
    _try_out(interpreter)
    target = start_up_folder() / addin_file.FILE_NAME
    # made outside the folder: Excel opens whatever lies in it
    made = target.parent.parent / f"{addin_file.FILE_NAME}.new"
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        functions = addin_file.make(made, interpreter, generator())
        with _closed_everywhere(target):
            os.replace(made, target)
    except OSError as error:
        raise NotInstalled(
            f"{target} could not be written ({error.strerror}); close Excel and try again"
        ) from None
    finally:
        with suppress(OSError):
            made.unlink(missing_ok=True)
    return f"Excel: {len(functions)} functions in {target}; restart Excel where it is open."


def uninstall() -> str:
    """Take the add-in out of Excel's start-up folder."""
    if sys.platform != "win32":
        raise NotInstalled(NOT_WINDOWS)
    target = start_up_folder() / addin_file.FILE_NAME
    if not target.exists():
        return "Excel: the add-in is not installed."
    try:
        with _closed_everywhere(target):
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
        try:
            path = start_up_folder() / addin_file.FILE_NAME
        except NotInstalled as error:
            return [f"Excel: {error}."]
    if not path.exists():
        return [f"Excel: the add-in is not installed; {_REPAIR}."]
    try:
        found = addin_file.read_stamp(path)
        wrong = _out_of_order(found)
    except TausheetError as error:
        return [f"Excel: {error}; {_REPAIR}."]
    lines = [
        f"Excel: {path}, made by tausheet {found.get('tausheet')} with xlwings "
        f"{found.get('xlwings')}, starts {found.get('interpreter')}."
    ]
    return [*lines, *(f"Excel: the add-in needs a repair: {each}; {_REPAIR}." for each in wrong)]


def _out_of_order(found: dict[str, str]) -> list[str]:
    """What is no longer as it was when the add-in file was made."""
    interpreter = found.get("interpreter", "")
    wanted = addin_file.contents(interpreter, generator())[2]
    wrong = [
        f"it was made with {key} {found.get(key)}, and {wanted[key]} is installed"
        for key in ("tausheet", "xlwings")
        if found.get(key) != wanted[key]
    ]
    if not wrong and found != wanted:
        wrong.append("its functions are not those of this version")
    if sys.platform == "win32":
        if not Path(interpreter).exists():
            wrong.append(f"{interpreter} is gone")
        else:
            wrong += _missing_dll(Path(interpreter), found.get("xlwings", ""))
    return wrong


def _missing_dll(interpreter: Path, xlwings_version: str) -> list[str]:
    """Nothing when a DLL is where the add-in looks for it, beside Python or one folder above."""
    names = [bridge.dll_name(bits, xlwings_version) for bits in (64, 32)]
    places = (interpreter.parent, interpreter.parent.parent)
    if any((place / name).exists() for place in places for name in names):
        return []
    return [f"{names[0]} is missing beside {interpreter}, where xlwings was upgraded or removed"]


def _try_out(interpreter: str) -> None:
    """Refuse a Python that cannot load the functions when started as Excel starts it."""
    bridge.without_console(interpreter)
    command = [interpreter, "-I", "-B", "-c", f"import xlwings, {wrappers.PYTHON_MODULE}"]
    try:
        done = subprocess.run(
            command, capture_output=True, text=True, timeout=_TRIAL_LIMIT, stdin=subprocess.DEVNULL
        )
    except (OSError, subprocess.TimeoutExpired) as error:
        raise NotInstalled(f"{interpreter} cannot be started: {error}") from None
    if done.returncode:
        said = (done.stderr.strip().splitlines() or ["it says nothing"])[-1]
        raise NotInstalled(
            f'{interpreter} cannot load the functions ({said}); install "tausheet[excel]" there'
        )


@contextmanager
def _closed_everywhere(target: Path) -> Iterator[None]:
    """Close the add-in in every running Excel, which holds its file, and open it again."""
    import xlwings

    closed = []
    for app in list(xlwings.apps):
        # an add-in is not among the workbooks that can be counted, but answers to its name
        with suppress(Exception):
            app.api.Workbooks(target.name).Close(False)
            closed.append(app)
    try:
        yield
    finally:
        for app in closed:
            _open_again(app, target)


def _open_again(app: Any, target: Path) -> None:
    if target.exists():
        # the file is in place; where Excel refuses, its next start opens it
        with suppress(Exception):
            app.api.Workbooks.Open(str(target))
