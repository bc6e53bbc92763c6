"""What a review of a workbook finds."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

CLASSES = (
    "missing input",
    "failing check",
    "stale or overwritten value",
    "no value stored",
    "formula replaced by a value",
    "formula emptied",
    "changed formula",
    "changed sign",
    "reversed comparison",
    "changed number",
    "number turned to text",
    "formula in an input cell",
    "formula in place of a label",
    "changed label",
    "changed unit",
    "emptied cell",
    "added content",
    "added formula",
    "row deleted",
    "row added",
    "changed name",
    "missing name",
    "added name",
    "missing worksheet",
    "added worksheet",
    "hidden worksheet",
    "hidden row",
    "hidden column",
    "hidden text",
    "recoloured",
    "changed number format",
    "changed conditional format",
    "changed validation",
    "protection",
    "added drawing",
    "manual calculation",
    "calculation settings",
    "link or macro",
    "second method differs",
    "not recomputed",
    "broken fingerprint",
    "unsigned",
    "version",
    "unknown sheet",
    "not sealed",
    "warning",
    "recomputed only",
)
"""Every class of finding, the plainest first."""


@dataclass(frozen=True)
class Finding:
    """One thing that was found in a workbook."""

    kind: str
    cell: str
    """Where, as `Worksheet!A1`; a name or "" where it is no single cell."""
    found: str
    expected: str
    counts: bool = True
    """False: said for information; all can be well with it."""

    def __post_init__(self) -> None:
        assert self.kind in CLASSES, self.kind

    def as_dict(self) -> dict[str, Any]:
        """For machines."""
        return asdict(self)


def in_order(findings: list[Finding]) -> list[Finding]:
    """What counts first, then the plainest first; within a class as they were found."""
    return sorted(findings, key=lambda one: (not one.counts, CLASSES.index(one.kind)))
