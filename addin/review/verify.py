"""Verifies a workbook: recomputed, beside the sheet's own formulas, by a second method.

Status 0 means that nothing was found that counts. What does not count is said all the same:
named warnings, blocks that a draft need not have signed, a sheet that is not sealed.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import Any

from tausheet.addin.review import (
    second_method,
    verify_looks,
    verify_own,
    verify_second,
    verify_state,
    verify_values,
)
from tausheet.addin.review.finding import Finding, in_order
from tausheet.addin.review.workbook_file import WorkbookFile
from tausheet.functions import version


@dataclass
class Verified:
    """What was looked at in one workbook, and what was found."""

    path: Path
    sheet: str
    """The calc sheet's name, "" for any other workbook."""
    formulas: int
    findings: list[Finding] = field(default_factory=list)
    second: dict[str, verify_second.Tally] = field(default_factory=dict)
    """By cell function, how many results the second method has checked."""

    @property
    def well(self) -> bool:
        """Whether nothing was found that counts."""
        return not any(finding.counts for finding in self.findings)

    def as_dict(self) -> dict[str, Any]:
        """For machines."""
        return {
            "file": str(self.path),
            "verified_with": f"tausheet {version()}",
            "calc_sheet": self.sheet or None,
            "well": self.well,
            "formulas": self.formulas,
            "second_method": {
                name: {**asdict(tally), "how": second_method.how(name)}
                for name, tally in sorted(self.second.items())
            },
            "findings": [finding.as_dict() for finding in self.findings],
        }


def verify(path: Path) -> Verified:
    """Everything that a workbook can be held against; the file stays as it is."""
    file = WorkbookFile(path)
    sheet = verify_own.identify(file)
    result = Verified(path, sheet.name if sheet else "", verify_values.formulas(file))
    found = list(verify_values.findings(file))
    if file.refusal:
        instead = "" if file.failed else "computed with LibreOffice instead"
        found.append(Finding("not recomputed", "", file.refusal, instead, counts=file.failed))
    found += verify_second.check(file, result.second)
    found += verify_second.recomputed_only(result.second)
    found += verify_looks.of_workbook(file)
    if sheet is not None:
        found += verify_state.findings(file)
        found += _beside_own(file, verify_own.own_workbook(file, sheet))
    elif verify_own.made_by_tausheet(file):
        found.append(
            Finding("unknown sheet", "", "the names of a calc sheet", "one that tausheet writes")
        )
    result.findings = in_order(found)
    return result


def _beside_own(file: WorkbookFile, own: Any) -> Iterator[Finding]:
    comparison = verify_own.Comparison(file, own)
    yield from comparison.findings()
    yield from verify_looks.of_cells(comparison)
    yield from verify_looks.merged(file, own)
    yield from verify_looks.drawings(file, own)
