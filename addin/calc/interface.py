"""The interface that LibreOffice calls: its text, made from the catalogue, and its compiled form.

The compiled form (a type library) is kept beside this file, so that nobody needs a compiler to
install the extension; `python -m tausheet.addin.calc.build` compiles it anew.
"""

from __future__ import annotations

import hashlib
import json
import shutil
import subprocess
import tempfile
from collections.abc import Iterable
from pathlib import Path

from tausheet.addin.calc.inside import names
from tausheet.functions.catalogue import CATALOGUE, CellFunction
from tausheet.functions.errors import TausheetError

LIBRARY = Path(__file__).with_name("interface.rdb")
RECORD = Path(__file__).with_name("interface.json")
"""Digests of the text that was compiled and of what came out."""


class Stale(TausheetError):
    """The type library does not belong to the catalogue, and cannot be compiled here."""


def functions() -> list[CellFunction]:
    """The cell functions in the order in which they are written everywhere in the extension."""
    return [CATALOGUE[name] for name in sorted(CATALOGUE)]


def argument_name(index: int) -> str:
    """Name of an argument inside LibreOffice; in alphabetical order they are in argument order."""
    return f"argument{index:02}"


def text(entries: Iterable[CellFunction]) -> str:
    """The interface in UNO's interface definition language."""
    *modules, interface = names.INTERFACE.split(".")
    opening = " ".join(f"module {module} {{" for module in modules)
    lines = [opening, f"interface {interface} : com::sun::star::uno::XInterface {{"]
    for entry in entries:
        kinds = ["any"] * len(entry.parameters)
        if entry.variadic:
            kinds[-1] = "sequence<any>"
        arguments = ", ".join(
            f"[in] {kind} {argument_name(index)}" for index, kind in enumerate(kinds, start=1)
        )
        # a text inside an array compares as equal to every other in LibreOffice 7.4
        result = "any" if entry.texts else "sequence< sequence<any> >"
        lines.append(f"    {result} {entry.name}({arguments});")
    return "\n".join([*lines, "};", " ".join("};" for _ in modules)]) + "\n"


def is_stale() -> bool:
    """Whether the type library kept here is another than the catalogue's."""
    try:
        kept, recorded = LIBRARY.read_bytes(), RECORD.read_text()
    except OSError:
        return True
    return bool(json.loads(recorded) != _digests(text(functions()), kept))


def library() -> bytes:
    """The type library of the catalogue: the one kept here, or compiled when that is stale."""
    return compiled() if is_stale() else LIBRARY.read_bytes()


def compiled() -> bytes:
    """Compile the type library."""
    compiler, types = _compiler()
    with tempfile.TemporaryDirectory() as folder:
        source, target = Path(folder, "interface.idl"), Path(folder, "interface.rdb")
        source.write_text(text(functions()))
        command = [compiler, *types, str(source), str(target)]
        done = subprocess.run(command, capture_output=True, text=True)
        if done.returncode:
            raise Stale(f"the interface cannot be compiled: {done.stderr.strip()}")
        return target.read_bytes()


def refresh() -> bool:
    """Compile anew and keep the result where it is stale; whether it was."""
    if not is_stale():
        return False
    LIBRARY.write_bytes(compiled())
    record = _digests(text(functions()), LIBRARY.read_bytes())
    RECORD.write_text(json.dumps(record, indent=2) + "\n")
    return True


def _digests(source: str, result: bytes) -> dict[str, str]:
    return {
        "text": hashlib.sha256(source.encode()).hexdigest(),
        "library": hashlib.sha256(result).hexdigest(),
    }


def _compiler() -> tuple[str, list[str]]:
    soffice = shutil.which("soffice")
    if soffice:
        root = Path(soffice).resolve().parent.parent
        compiler = root / "sdk/bin/unoidl-write"
        types = [root / "program/types.rdb", root / "program/types/offapi.rdb"]
        if all(path.exists() for path in (compiler, *types)):
            return str(compiler), [str(path) for path in types]
    raise Stale(
        "the type library is not that of this catalogue, and the compiler for it is missing; "
        "install the package libreoffice-dev, then run python -m tausheet.addin.calc.build"
    )
