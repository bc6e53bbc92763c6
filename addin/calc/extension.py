"""The extension as a set of files: in a folder for the headless engine, packed (.oxt) for users."""

from __future__ import annotations

import hashlib
import json
import site
import sys
import sysconfig
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from tausheet.addin.calc import inside, interface, registration
from tausheet.functions import version

INSIDE = "tausheet_inside"
"""The package inside LibreOffice that holds our code there; a copy of `inside`."""

_FOLDER = f"pythonpath/{INSIDE}"
_PACKED_ON = (2020, 1, 1, 0, 0, 0)


def python_environment() -> dict[str, Any]:
    """What LibreOffice must know of this Python: where its packages are, and its binary form."""
    folders = [*site.getsitepackages(), site.getusersitepackages()]
    return {
        "executable": executable(),
        "version": ".".join(map(str, sys.version_info[:3])),
        "binary": inside.binary_form(sysconfig.get_config_var),
        "folders": [folder for folder in folders if folder in sys.path],
        "functions": [entry.name for entry in interface.functions()],
        "texts": [entry.name for entry in interface.functions() if entry.texts],
    }


def executable() -> str:
    """This Python by one name, whichever of its names it was started by."""
    started = Path(sys.executable)
    plain = started.with_name("python" + started.suffix * (started.suffix == ".exe"))
    return str(plain if plain.exists() else started)


def summary() -> str:
    """What the extension says of itself in LibreOffice; it differs when any file of it does."""
    return _summary(_content())


def files() -> dict[str, bytes]:
    """Every file of the extension by its path inside it."""
    packed = {"summary.txt": summary().encode(), **_content()}
    packed["META-INF/manifest.xml"] = registration.manifest(packed).encode()
    return packed


def _content() -> dict[str, bytes]:
    entries = interface.functions()
    texts = {
        "description.xml": registration.description(version()),
        "CalcAddIns.xcu": registration.functions_xcu(entries),
        "Jobs.xcu": registration.jobs_xcu(),
        "tausheet.components": registration.components(),
        registration.COMPONENT: f"from {INSIDE}.component import g_ImplementationHelper\n",
        f"{_FOLDER}/environment.json": json.dumps(python_environment(), indent=2),
    }
    for path in sorted(Path(inside.__file__).parent.glob("*.py")):
        texts[f"{_FOLDER}/{path.name}"] = path.read_text(encoding="utf-8")
    return {"interface.rdb": interface.library()} | {
        name: content.encode() for name, content in texts.items()
    }


def _summary(content: Mapping[str, bytes]) -> str:
    digest = hashlib.sha256()
    for name in sorted(content):
        digest.update(name.encode() + content[name])
    return (
        f"{len(interface.functions())} cell functions for first-order responses, "
        f"computed by {executable()}; {digest.hexdigest()[:8]}."
    )


def write(contents: Mapping[str, bytes], folder: Path) -> None:
    """Write the files of an extension unpacked."""
    for name, content in contents.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)


def write_package(path: Path) -> None:
    """Write the extension as one .oxt."""
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
        for name, content in files().items():
            entry = zipfile.ZipInfo(name, _PACKED_ON)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            package.writestr(entry, content)
