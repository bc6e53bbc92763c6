"""Compute a workbook's formulas with an engine and store the values; touch nothing else."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from tausheet.addin import files, package
from tausheet.addin.cells import CellValue
from tausheet.functions.errors import ErrorKind, TausheetError

Values = dict[str, dict[str, CellValue]]


@dataclass(frozen=True)
class Report:
    """What recalc did."""

    path: Path
    cells: int
    errors: int
    respelled: int

    def __str__(self) -> str:
        """One line for the one who asked."""
        line = f"{self.path}: {self.cells} values stored"
        if self.errors:
            line += f", {self.errors} of them errors"
        if self.respelled:
            line += (
                f"; {self.respelled} formulas called our functions by LibreOffice's long names "
                "and call them by their plain ones again"
            )
        return line


def engine_named(name: str) -> Callable[[Path], Values]:
    """The engine that --engine chooses."""
    if name == "embedded":
        from tausheet.addin.embedded import compute as embedded

        return embedded
    if name == "calc":
        from tausheet.addin.calc import compute as calc

        return calc
    raise TausheetError(f'the engine is "{name}", but must be embedded or calc')


def recalc(
    path: Path, engine: str = "embedded", out: Path | None = None, force: bool = False
) -> Report:
    """Compute the formulas of a workbook and store their values, in the file or in `out`."""
    if out is not None:
        files.refuse_existing(out, force=force)
    data, respelled = package.formulas_spelled_plainly(package.read(path))
    target = out if out is not None else path
    with files.replacing(target, force=force or out is None) as temporary:
        temporary.write_bytes(data)
        try:
            values = engine_named(engine)(temporary)
        except TausheetError as error:  # which must not name a file that nobody knows
            error.args = (str(error).replace(str(temporary), str(path)),)
            raise
        temporary.write_bytes(package.with_values(data, values))
    stored = [value for cells in values.values() for value in cells.values()]
    errors = sum(isinstance(value, ErrorKind) for value in stored)
    return Report(target, len(stored), errors, len(respelled))
