"""Finds the LibreOffice on this machine, and the Python that can talk to it."""

from __future__ import annotations

import functools
import json
import os
import shutil
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

from tausheet.functions.errors import TausheetError

_PLACES = (
    "/opt/libreoffice*/program/soffice",
    "/usr/lib/libreoffice/program/soffice",
    "/Applications/LibreOffice.app/Contents/MacOS/soffice",
    "C:/Program Files/LibreOffice/program/soffice.exe",
)
_PROBE = (
    "import json, platform, sysconfig, uno; get = sysconfig.get_config_var; "
    "print(json.dumps([platform.python_version(), str(get('SOABI') or get('EXT_SUFFIX'))]))"
)
_ADVICE = (
    "install LibreOffice 7.4 or newer with its Python "
    "(Debian: apt-get install --no-install-recommends libreoffice-calc-nogui python3-uno)"
)


class NotInstalled(TausheetError):
    """LibreOffice, or its Python, is not here; the text says what to install."""


@dataclass(frozen=True)
class Office:
    """One LibreOffice and its Python."""

    soffice: Path
    python: Path
    python_version: str
    python_binary: str

    @property
    def unopkg(self) -> Path:
        """The program that installs extensions."""
        return self.soffice.with_name("unopkg" + self.soffice.suffix)


@functools.cache
def find() -> Office:
    """The LibreOffice to use; NotInstalled with a sentence when there is none."""
    soffice = next(_programs(), None)
    if soffice is None:
        raise NotInstalled(f"LibreOffice was not found; {_ADVICE}")
    for python in _pythons(soffice):
        probe = subprocess.run(
            [python, "-c", _PROBE], capture_output=True, text=True, env=clean_environment()
        )
        if probe.returncode == 0:
            version, binary = json.loads(probe.stdout)
            return Office(soffice, python, version, binary)
    raise NotInstalled(f"LibreOffice is here ({soffice}), but no Python that can use it; {_ADVICE}")


def clean_environment() -> dict[str, str]:
    """The environment without what belongs to this Python only.

    The system's programs come first: LibreOffice's Python takes its library from beside the first
    python3 on the path, and crashes on that of another.
    """
    own = ("PYTHONPATH", "PYTHONHOME", "VIRTUAL_ENV", "URE_BOOTSTRAP")
    kept = {name: value for name, value in os.environ.items() if name not in own}
    if os.name == "posix":
        kept["PATH"] = os.pathsep.join(["/usr/bin", "/bin", kept.get("PATH", "")])
    return kept


def _programs() -> Iterator[Path]:
    found = shutil.which("soffice") or shutil.which("libreoffice")
    if found:
        yield Path(found).resolve()
    for pattern in _PLACES:
        root = Path(pattern).anchor
        yield from sorted(Path(root).glob(pattern.removeprefix(root)), reverse=True)


def _pythons(soffice: Path) -> Iterator[Path]:
    program = soffice.parent
    for own in (program / "python", program / "python.exe", program.parent / "Resources/python"):
        if own.exists():
            yield own
    for name in ("/usr/bin/python3", "python3"):
        found = shutil.which(name)
        if found:
            yield Path(found)
    yield Path(sys.executable)
