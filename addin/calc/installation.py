"""Puts the extension into LibreOffice, takes it out, and says how things are, in sentences."""

from __future__ import annotations

import os
import re
import subprocess
import tempfile
from collections.abc import Sequence
from pathlib import Path

from tausheet.addin.calc import extension, inside, libreoffice
from tausheet.addin.calc.inside import names
from tausheet.functions.errors import TausheetError

_TIME_LIMIT = 180.0
_FOR_ALL = "for every user of this machine"


class InstallationError(TausheetError):
    """LibreOffice did not take the extension, or did not give it up; the text says why."""


def install(options: Sequence[str] = ()) -> str:
    """Install the extension; `options` go to LibreOffice's own installer as well."""
    office = libreoffice.find()
    with tempfile.TemporaryDirectory() as folder:
        package = Path(folder, "tausheet.oxt")
        extension.write_package(package)
        _unopkg("add", "--force", "--suppress-license", *options, str(package))
    if installed(options) != extension.summary():
        raise InstallationError("LibreOffice took the extension but does not list it as its own")
    done = f"The cell functions are installed in LibreOffice {_for_whom()}; restart it to use them."
    slower = _mismatch(office)
    return f"{done} {slower}." if slower else done


def uninstall(options: Sequence[str] = ()) -> str:
    """Remove the extension."""
    if installed(options) is None:
        return f"The cell functions are not installed in LibreOffice {_for_whom()}."
    _unopkg("remove", *options, names.IDENTIFIER)
    return f"The cell functions are removed from LibreOffice {_for_whom()}."


def installed(options: Sequence[str] = (), *, for_all: bool = False) -> str | None:
    """What the installed extension says of itself; None when there is none.

    for_all: look where it is installed for every user, also when this is one of them.
    """
    listed = _unopkg("list", *(["--shared"] if for_all and not _root() else []), *options)
    ours = re.search(
        rf"^Identifier: {re.escape(names.IDENTIFIER)}$.*?^  Description: ([^\n]*)$",
        listed,
        re.MULTILINE | re.DOTALL,
    )
    return ours.group(1) if ours else None


def status(options: Sequence[str] = ()) -> list[str]:
    """How things are with LibreOffice, a sentence a line."""
    try:
        office = libreoffice.find()
        there, ours = installed(options), extension.summary()
    except TausheetError as error:
        return [f"LibreOffice: {error}."]
    lines = [
        f"LibreOffice: {office.soffice}, with Python {office.python_version}; "
        "works without a window (--engine calc, pdf)."
    ]
    where = _for_whom()
    if there is None and not _root():
        there = installed(options, for_all=True)
        where = _FOR_ALL if there else where
    line = f"Cell functions in LibreOffice {where}: "
    if there is None:
        lines.append(f"{line}not installed; run tausheet install calc.")
    elif there != ours:
        lines.append(f"{line}another tausheet is installed ({there}) Run tausheet install calc.")
    else:
        lines.append(f"{line}installed.")
    slower = _mismatch(office)
    return [*lines, f"{slower}."] if slower else lines


def _mismatch(office: libreoffice.Office) -> str:
    recorded = extension.python_environment()
    return inside.mismatch(recorded, office.python_version, office.python_binary)


def _root() -> bool:
    # LibreOffice refuses an installation for root alone
    return hasattr(os, "geteuid") and os.geteuid() == 0


def _for_whom() -> str:
    return _FOR_ALL if _root() else "for this user"


def _unopkg(command: str, *arguments: str) -> str:
    program = str(libreoffice.find().unopkg)
    scope = ["--shared"] if _root() else []
    try:
        done = subprocess.run(
            [program, command, *scope, *arguments],
            capture_output=True,
            text=True,
            timeout=_TIME_LIMIT,
            stdin=subprocess.DEVNULL,
            env={**libreoffice.clean_environment(), "LC_ALL": "C.UTF-8"},
        )
    except (OSError, subprocess.TimeoutExpired) as error:
        raise InstallationError(f"LibreOffice's installer of extensions fails: {error}") from None
    if done.returncode:
        said = " ".join(f"{done.stdout} {done.stderr}".split())
        advice = "close LibreOffice and try again; " if "lock file" in said.lower() else ""
        raise InstallationError(
            f"LibreOffice's installer of extensions refuses: {advice}it says: {said[-300:]}"
        )
    return done.stdout
