"""Prints workbooks, many with one LibreOffice; one that cannot be printed stops no other."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from tausheet.addin import files, package
from tausheet.addin.calc import TIME_LIMIT, pdf
from tausheet.addin.calc.libreoffice import NotInstalled
from tausheet.functions.errors import TausheetError


class NotPrinted(TausheetError):
    """Workbooks that cannot be printed together; nothing was printed."""


@dataclass(frozen=True)
class Printed:
    """A workbook and its .pdf, or why there is none."""

    path: Path
    out: Path
    error: TausheetError | None = None


def print_sheets(
    paths: Sequence[Path], *, force: bool = False, limit: float = TIME_LIMIT
) -> Iterator[Printed]:
    """A .pdf beside each workbook, printed as it is asked for.

    What would be overwritten is refused at once, before the first. A LibreOffice that dies, or
    takes longer than `limit` seconds for one workbook, is started again for the next.
    """
    if not limit > 0:
        raise NotPrinted(f"the time limit is {limit:g} s; give seconds above 0 for a workbook")
    outs = [path.with_suffix(".pdf") for path in paths]
    for path, out in zip(paths, outs, strict=True):
        if outs.count(out) > 1:
            raise NotPrinted(f"{out} would be printed from two workbooks, {path} one of them")
        files.refuse_existing(out, force=force)
    return (_printed(path, out, force, limit) for path, out in zip(paths, outs, strict=True))


def _printed(path: Path, out: Path, force: bool, limit: float) -> Printed:
    try:
        package.read(path)
        with tempfile.TemporaryDirectory() as folder:
            (made,) = pdf([path], Path(folder), limit)
            with files.replacing(out, force=force) as temporary:
                temporary.write_bytes(made.read_bytes())
    except NotInstalled:
        raise
    except TausheetError as error:
        return Printed(path, out, error)
    return Printed(path, out)
