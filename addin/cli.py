"""The commands. Each is a few lines around a module that does the work.

A refusal (any TausheetError) is one sentence on the error stream and exit status 2.
"""

from __future__ import annotations

import csv
import gc
import json
import sys
from collections.abc import Iterable
from enum import Enum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer
from rich.console import Console
from rich.markup import escape
from rich.table import Table

from tausheet.functions.errors import TausheetError

if TYPE_CHECKING:
    from tausheet.addin.make import Made

app = typer.Typer(
    add_completion=False,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    help="First-order responses for spreadsheets: cell functions and calc sheets.",
)
console = Console(highlight=False, soft_wrap=True)


class Engine(str, Enum):
    """What computes the formulas."""

    embedded = "embedded"
    calc = "calc"


class Host(str, Enum):
    """Where the cell functions can be put."""

    calc = "calc"
    excel = "excel"


class BadValue(TausheetError):
    """A value on the command line or in a values file that cannot be read."""


EngineOption = Annotated[
    Engine, typer.Option(help="embedded: tausheet's own evaluator; calc: a headless LibreOffice.")
]
ForceOption = Annotated[bool, typer.Option("--force", help="Overwrite a file that exists.")]


@app.command("list")
def list_sheets(
    name: Annotated[str | None, typer.Argument(help="A calc sheet, to list its inputs.")] = None,
) -> None:
    """The calc sheets, a line each; with a NAME, the inputs of that sheet."""
    from tausheet import templates

    table = Table(box=None, pad_edge=False)
    if name is None:
        table.add_column("sheet")
        table.add_column("question it answers")
        for sheet in templates.SHEETS.values():
            table.add_row(sheet.name, sheet.question)
    else:
        for heading in ("symbol", "description", "units or choices", "demo value"):
            table.add_column(heading)
        for row in templates.describe_inputs(name):
            table.add_row(*map(escape, row))
    console.print(table)


@app.command()
def new(
    name: Annotated[str, typer.Argument(help="Which calc sheet: see `tausheet list`.")],
    out: Annotated[Path, typer.Argument(help="The workbook to make, an .xlsx.")],
    set_: Annotated[
        list[str] | None,
        typer.Option(
            "--set",
            help='An input: symbol=value, with its unit: C_bus="4.7 mF". A cell of a table: '
            'table.column.row=value, rows from 1: bounce.t_closed.1="2 ms". '
            "Where either comes from: C_bus_source=..., bounce.source=...",
        ),
    ] = None,
    values: Annotated[
        Path | None, typer.Option(help="A .csv with the columns symbol and value.")
    ] = None,
    demo: Annotated[bool, typer.Option("--demo", help="Fill in the demo job's values.")] = False,
    force: ForceOption = False,
    engine: EngineOption = Engine.embedded,
) -> None:
    """Make a calc sheet, computed and ready to fill in, check and sign."""
    from tausheet.addin.make import make_sheet

    given = {**(_read_values(values) if values else {}), **_assignments(set_ or [])}
    made = make_sheet(name, out, given, demo=demo, force=force, engine=engine.value)
    _print_made([made])


@app.command()
def index(
    out: Annotated[Path, typer.Argument(help="The workbook to make, an .xlsx.")],
    force: ForceOption = False,
    engine: EngineOption = Engine.embedded,
) -> None:
    """A workbook of all cell functions, each with a live example and its check value."""
    from tausheet.addin.make import NotMade, make_index

    agree, count = make_index(out, force=force, engine=engine.value)
    console.print(f"{out}: {agree} of {count} results agree with what is expected")
    if agree < count:
        raise NotMade(f"{out} shows which results differ; do not rely on this installation")


@app.command()
def fill(
    name: Annotated[str, typer.Argument(help="Which calc sheet: see `tausheet list`.")],
    table: Annotated[Path, typer.Argument(help="A .csv, its heading row the sheet's symbols.")],
    folder: Annotated[Path, typer.Argument(help="Where to put the sheets and the summary.")],
    workers: Annotated[int, typer.Option(min=1, max=256, help="Processes on this machine.")] = 1,
    cluster: Annotated[
        str | None,
        typer.Option(help="Address of a Dask scheduler that you trust: tcp://127.0.0.1:8786."),
    ] = None,
    force: ForceOption = False,
) -> None:
    """A calc sheet for each row of a table, and a summary workbook.

    The same command goes on where it was interrupted. Exit status 1 when a row gave no sheet.
    """
    from rich.progress import Progress

    from tausheet.addin.fill import SUMMARY
    from tausheet.addin.fill import fill as fill_sheets

    with Progress(console=Console(stderr=True)) as progress:
        task = progress.add_task(name, total=None)

        def told(done: int, of: int) -> None:
            progress.update(task, completed=done, total=of)

        results = fill_sheets(
            name, table, folder, workers=workers, cluster=cluster, force=force, told=told
        )
    bad = [result for result in results if result.fault]
    for result in bad:
        console.print(escape(f"line {result.line}: {result.fault}"))
    verdicts = [result.verdict for result in results]
    console.print(
        f"{len(results)} rows: {verdicts.count('PASS')} PASS, {verdicts.count('FAIL')} FAIL, "
        f"{len(bad)} not made; {folder / SUMMARY}"
    )
    if bad:
        raise typer.Exit(1)


@app.command()
def recalc(
    files: Annotated[list[Path], typer.Argument(help="Workbooks to compute.")],
    out: Annotated[
        Path | None, typer.Option("-o", "--out", help="Write here instead of into the file.")
    ] = None,
    force: ForceOption = False,
    engine: EngineOption = Engine.embedded,
) -> None:
    """Compute the formulas and store the values, touching nothing else in the file."""
    from tausheet.addin.recalc import recalc as recalc_file

    if out is not None and len(files) > 1:
        raise BadValue("-o names one file, but several are given; recalc them one at a time")
    for file in files:
        console.print(str(recalc_file(file, engine=engine.value, out=out, force=force)))


@app.command()
def pdf(
    files: Annotated[list[Path], typer.Argument(help="Workbooks to print.")],
    time_limit: Annotated[
        float, typer.Option(help="Seconds that a workbook may take; LibreOffice is then ended.")
    ] = 120.0,
    force: ForceOption = False,
) -> None:
    """The printed sheet: a .pdf beside each workbook, all made by one LibreOffice.

    Exit status 2 when a workbook was not printed; the others are.
    """
    from tausheet.addin.printing import print_sheets

    missing = 0
    for printed in print_sheets(files, force=force, limit=time_limit):
        if printed.error is None:
            console.print(f"{printed.out}")
        else:
            missing += 1
            print(f"tausheet: {printed.error}", file=sys.stderr)
    if missing:
        raise typer.Exit(2)


@app.command()
def verify(
    files: Annotated[list[Path], typer.Argument(help="Workbooks to verify.")],
    json_: Annotated[bool, typer.Option("--json", help="Everything found, for machines.")] = False,
) -> None:
    """Recompute, compare with the sheet's own formulas, check by a second method; report.

    Exit status 0 only when all is well with every file.
    """
    from tausheet.addin.verify import report, verify_files

    every = []
    for verified in verify_files(files):
        every.append(verified)
        if not json_:
            report(console, verified)
    if json_:
        print(json.dumps([one.as_dict() for one in every], indent=2, ensure_ascii=False))
    if not all(one.well for one in every):
        raise typer.Exit(1)


@app.command()
def seal(
    files: Annotated[list[Path], typer.Argument(help="Calc sheets that verify.")],
) -> None:
    """Write the fingerprint of a calc sheet that verifies into its record and its footer."""
    from tausheet.addin.review.seal import seal as seal_file

    for file in files:
        console.print(escape(str(seal_file(file))))


@app.command()
def compare(
    old: Annotated[Path, typer.Argument(help="The earlier revision of a calc sheet.")],
    new: Annotated[Path, typer.Argument(help="The later one.")],
    json_: Annotated[bool, typer.Option("--json", help="Every difference, for machines.")] = False,
    out: Annotated[
        Path | None, typer.Option("-o", "--out", help="Also write a workbook for the file.")
    ] = None,
    force: ForceOption = False,
) -> None:
    """What changed between two revisions: inputs, results, verdicts, margins, formulas."""
    from tausheet.addin.review import compare as comparing

    compared = comparing.compare(old, new)
    if out is not None:
        comparing.write(compared, out, force=force)
    if json_:
        print(json.dumps(compared.as_dict(), indent=2, ensure_ascii=False))
    else:
        comparing.report(console, compared)


@app.command()
def install(
    host: Annotated[Host, typer.Argument(help="calc: LibreOffice Calc; excel: Excel on Windows.")],
    to: Annotated[
        Path | None, typer.Option(help="excel: only write the add-in file, for carrying over.")
    ] = None,
    interpreter: Annotated[
        str | None, typer.Option(help="excel: full path of the Python that Excel starts.")
    ] = None,
    force: ForceOption = False,
) -> None:
    """Put the cell functions into a spreadsheet program."""
    if host is Host.excel:
        from tausheet.addin.excel import installation as excel

        console.print(excel.install(to, interpreter, force))
        return
    if to is not None or interpreter is not None:
        raise BadValue("--to and --interpreter go with excel only")
    from tausheet.addin.calc import installation as calc

    console.print(calc.install())


@app.command()
def uninstall(
    host: Annotated[Host, typer.Argument(help="calc: LibreOffice Calc; excel: Excel on Windows.")],
) -> None:
    """Take the cell functions out again."""
    if host is Host.excel:
        from tausheet.addin.excel import installation as excel

        console.print(excel.uninstall())
        return
    from tausheet.addin.calc import installation as calc

    console.print(calc.uninstall())


@app.command()
def refresh() -> None:
    """Excel: enter formulas again that came in as unknown names, in the open workbooks."""
    from tausheet.addin.excel.refresh import refresh as again

    console.print(again())


@app.command()
def status() -> None:
    """What works here and what is missing."""
    from tausheet.addin.status import lines

    for line in lines():
        console.print(line)


@app.command()
def demo(
    folder: Annotated[Path, typer.Argument(help="Where to put the sheets.")] = Path("demo"),
    force: ForceOption = False,
) -> None:
    """The main job on the demo scenario: sheets made, computed, results printed."""
    from tausheet.addin.make import make_demo

    sheets = make_demo(folder, force=force)
    console.print("Quay 4, harbour crane, drive retrofit: the calc sheets of the demo job\n")
    for sheet in sheets:
        console.print(f"{sheet.verdict}  {sheet.title}: {sheet.path}", style="bold")
        console.print(f"      {escape(sheet.decided_by)}")


def _print_made(made: Iterable[Made]) -> None:
    for sheet in made:
        console.print(f"{sheet.title}: {sheet.path}", style="bold")
        table = Table(box=None, pad_edge=False)
        for heading in ("check", "value used", "limit", ""):
            table.add_column(heading)
        for row in sheet.checks:
            table.add_row(*map(escape, row))
        console.print(table)
        console.print(f"verdict: {sheet.verdict}", style="bold")
        console.print(f"{escape(sheet.decided_by)}\n")


def _assignments(pairs: list[str]) -> dict[str, str]:
    given = {}
    for pair in pairs:
        symbol, equals, value = pair.partition("=")
        if not equals or not symbol.strip():
            raise BadValue(f'--set got "{pair}"; give symbol=value, for example C_bus="4.7 mF"')
        given[symbol.strip()] = value.strip()
    return given


def _read_values(path: Path) -> dict[str, str]:
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            rows = list(csv.DictReader(file))
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        raise BadValue(f"{path} cannot be read as a table of values: {error}") from None
    if not rows or not {"symbol", "value"} <= set(rows[0]):
        raise BadValue(f"{path} needs a heading row with the columns symbol and value")
    given: dict[str, str] = {}
    for number, row in enumerate(rows, start=2):
        symbol = (row["symbol"] or "").strip()
        if not symbol or symbol in given or row["value"] is None:
            raise BadValue(f"{path}, line {number}: each line needs one symbol, once, and a value")
        given[symbol] = row["value"].strip()
    return given


def main() -> None:
    """Run a command; a refusal is one sentence and exit status 2."""
    # thousands of cells live until the end, and to look through them again and again takes long
    gc.set_threshold(100_000, 50, 50)
    try:
        app()
    except TausheetError as error:
        print(f"tausheet: {error}", file=sys.stderr)
        raise SystemExit(2) from None


if __name__ == "__main__":
    main()
