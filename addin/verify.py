"""The command `tausheet verify`: the report of each workbook, as a table or for machines."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

from rich.console import Console
from rich.markup import escape
from rich.table import Table

from tausheet.addin.review.verify import Verified, verify

MOST_ROWS = 60
"""Findings shown of one workbook; `--json` has them all."""


def verify_files(paths: Sequence[Path]) -> Iterable[Verified]:
    """Each workbook verified as it is asked for."""
    return (verify(path) for path in paths)


def report(console: Console, verified: Verified) -> None:
    """What was looked at, and one table of what was found, the plainest first."""
    kind = f"calc sheet {verified.sheet}" if verified.sheet else "no calc sheet of tausheet"
    console.print(f"{escape(str(verified.path))}: {kind}", style="bold")
    console.print(f"{verified.formulas} formulas recomputed")
    checked = [
        f"{name} {tally.checked}" for name, tally in verified.second.items() if tally.checked
    ]
    if checked:
        console.print(f"results checked by a second method, too: {', '.join(checked)}")
    if verified.findings:
        table = Table(box=None, pad_edge=False)
        for heading in ("finding", "cell", "what is there", "what was expected"):
            table.add_column(heading, overflow="fold")
        for one in verified.findings[:MOST_ROWS]:
            row = (one.kind, one.cell, one.found, one.expected)
            table.add_row(*map(escape, row), style="" if one.counts else "dim")
        console.print(table)
        if len(verified.findings) > MOST_ROWS:
            console.print(f"... and {len(verified.findings) - MOST_ROWS} more; --json lists all")
    number = sum(one.counts for one in verified.findings)
    said = "verified: all is well" if verified.well else f"NOT verified: {number} findings count"
    console.print(f"{said}\n", style="bold")
