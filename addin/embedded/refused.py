"""What the evaluator does not compute: it says which cell and why, and never guesses."""

from __future__ import annotations

from tausheet.functions.errors import TausheetError


class Refused(TausheetError):
    """A workbook that this engine does not compute."""

    def __init__(self, where: str, why: str) -> None:
        super().__init__(
            f"{where}: {why}. Nothing was computed and the file is untouched; "
            "`--engine calc` computes it with LibreOffice"
        )
