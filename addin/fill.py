"""A calc sheet for each row of a table, and a summary workbook with a line a sheet.

The table is a .csv with a heading row of the sheet's symbols. A row that cannot be used is reported
with its line and stops nothing else. What is done is noted in the folder as it is done, so that
the same command goes on where it was interrupted.
"""

from __future__ import annotations

import io
import json
import multiprocessing
import os
import threading
import zipfile
from collections.abc import Callable, Iterator
from concurrent.futures import FIRST_COMPLETED, BrokenExecutor, Future, ProcessPoolExecutor, wait
from contextlib import contextmanager
from dataclasses import asdict, dataclass, replace
from pathlib import Path
from typing import Any

from openpyxl import Workbook
from openpyxl.cell import WriteOnlyCell

from tausheet import templates
from tausheet.addin import files, fill_sheet
from tausheet.addin.fill_table import NotFilled, Row, read_rows
from tausheet.functions import version
from tausheet.functions.errors import TausheetError
from tausheet.templates import style

NOTES = "progress.jsonl"
SUMMARY = "summary.xlsx"
Submit = Callable[..., Any]


@dataclass(frozen=True)
class Result:
    """What became of a row."""

    line: int
    digest: str
    file: str
    verdict: str
    decided_by: str
    corner: str
    fault: str


def _bad(row: Row, digest: str, fault: str) -> Result:
    return Result(row.line, digest, "", "", "", "", fault)


def make(
    name: str, line: int, digest: str, given: dict[str, str], wanted: str
) -> tuple[Result, bytes]:
    """Make the workbook of one row; runs on a worker, which must have the version `wanted`."""
    if version() != wanted:
        raise NotFilled(f"a worker has tausheet {version()}; install {wanted} there")
    file = f"{name}-{line:06d}.xlsx"
    try:
        done = fill_sheet.fill(name, given)
    except TausheetError as error:
        return Result(line, digest, "", "", "", "", str(error)), b""
    said = done.said
    return Result(line, digest, file, said.verdict, said.decided_by, done.corner, ""), done.data


def fill(
    name: str,
    table: Path,
    folder: Path,
    *,
    workers: int = 1,
    cluster: str | None = None,
    force: bool = False,
    told: Callable[[int, int], None] = lambda done, of: None,
) -> list[Result]:
    """Make a sheet for each row; the results of all rows in their order, bad ones among them.

    A sheet that is there and is not the one of its row, because the row has changed or because
    somebody has filled it in further, is replaced with `force` alone.
    told: is told how many rows are done, of how many.
    """
    templates.find(name)
    count = sum(1 for _ in read_rows(name, table))
    if not count:
        raise NotFilled(f"{table} has no rows below its heading")
    notes = _Notes(name, folder)
    done = 0
    waiting: dict[Any, Row] = {}
    with notes, _pool(workers, cluster) as (submit, finished, room):

        def keep(result: Result, data: bytes) -> None:
            nonlocal done
            fault = _put(folder / result.file, data, force) if data else ""
            if fault:
                result = replace(result, file="", verdict="", decided_by="", corner="", fault=fault)
            notes.add(result)
            done += 1
            told(done, count)

        def collect() -> None:
            for future in finished(list(waiting)):
                keep(*_outcome(future, waiting.pop(future), name))

        for row in read_rows(name, table):
            digest = row.digest(name)
            if notes.has(row.line, digest):
                done += 1
                told(done, count)
            elif row.fault:
                keep(_bad(row, digest, row.fault), b"")
            else:
                waiting[submit(make, name, row.line, digest, row.given, version())] = row
                while len(waiting) >= room:
                    collect()
        while waiting:
            collect()
    results = notes.results()
    _summarize(name, folder, results)
    return results


def _put(path: Path, data: bytes, force: bool) -> str:
    """Put a sheet into place; or why another one, which is there, was left alone."""
    if not force and path.exists():
        # an interrupted run may have put it there a moment before it could be noted
        same = path.is_file() and _same(path.read_bytes(), data)
        return "" if same else f"{path} is there and is another; move it away, or give --force"
    with files.replacing(path, force=force) as temporary:
        temporary.write_bytes(data)
    return ""


def _same(one: bytes, other: bytes) -> bool:
    """Whether two workbooks differ in nothing but the time they were packed."""
    found = []
    for data in (one, other):
        try:
            with zipfile.ZipFile(io.BytesIO(data)) as parts:
                entries = parts.infolist()
        except zipfile.BadZipFile:
            return False
        found.append({e.filename: e.CRC for e in entries if e.filename != "docProps/core.xml"})
    return found[0] == found[1]


def _outcome(future: Any, row: Row, name: str) -> tuple[Result, bytes]:
    try:
        result: tuple[Result, bytes] = future.result()
        return result
    except (TausheetError, BrokenExecutor):
        raise
    except Exception as error:  # a row that nobody foresaw, or a worker far away that ended
        fault = f"it was not made ({type(error).__name__}: {str(error)[:200]})"
        return _bad(row, row.digest(name), fault), b""


@contextmanager
def _pool(workers: int, cluster: str | None) -> Iterator[tuple[Submit, Callable[..., Any], int]]:
    """How to hand out a row, how to wait for some, and how many may be under way."""
    if cluster is not None:
        with _cluster(cluster) as pool:
            yield pool
        return
    if workers == 1:
        yield _at_once, lambda futures: futures, 1
        return
    context = multiprocessing.get_context("spawn")
    try:
        with ProcessPoolExecutor(workers, context, _end_with_parent) as executor:
            yield (
                executor.submit,
                lambda futures: wait(futures, return_when=FIRST_COMPLETED).done,
                4 * workers,
            )
    except BrokenExecutor:
        raise NotFilled(
            "a worker process ended in the middle (killed, or out of memory); the same command "
            "goes on where this one stopped"
        ) from None


def _end_with_parent() -> None:
    """In a worker: end when the process that started it was killed, instead of waiting for ever."""

    def watch() -> None:
        parent = multiprocessing.parent_process()
        if parent is not None:
            parent.join()
            os._exit(1)

    threading.Thread(target=watch, daemon=True).start()


def _at_once(task: Callable[..., Any], *arguments: Any) -> Future[Any]:
    future: Future[Any] = Future()
    try:
        future.set_result(task(*arguments))
    except Exception as error:
        future.set_exception(error)
    return future


@contextmanager
def _cluster(address: str) -> Iterator[tuple[Submit, Callable[..., Any], int]]:
    try:
        from distributed import Client
        from distributed import wait as wait_for
    except ImportError:
        raise NotFilled(
            "--cluster needs the package distributed: pip install tausheet[cluster]"
        ) from None
    try:
        client: Any = Client(address, timeout="20s")  # type: ignore[no-untyped-call]
    except (OSError, ValueError, TimeoutError) as error:
        raise NotFilled(f"no cluster answers at {address} ({error})") from None
    with client:
        room = 4 * max(1, sum(client.nthreads().values()))

        def submit(task: Callable[..., Any], *arguments: Any) -> Any:
            return client.submit(task, *arguments, pure=False)

        def finished(futures: list[Any]) -> Any:
            found: Any = wait_for(futures, return_when="FIRST_COMPLETED")  # type: ignore[no-untyped-call]
            return found.done

        yield submit, finished, room


class _Notes:
    """The file in the folder that says which rows are done, a line each, kept as they are done."""

    def __init__(self, name: str, folder: Path) -> None:
        self.folder, self.path = folder, folder / NOTES
        self._known: dict[int, Result] = {}
        self._now: dict[int, Result] = {}
        first = json.dumps({"sheet": name})
        try:
            folder.mkdir(parents=True, exist_ok=True)
            if not self.path.exists():
                if any(folder.iterdir()):
                    raise NotFilled(f"{folder} is not empty; name a new folder for the sheets")
                self.path.write_text(first + "\n", encoding="utf-8")
            lines = self.path.read_text(encoding="utf-8").splitlines()
        except (OSError, UnicodeDecodeError) as error:
            raise NotFilled(f"the folder {folder} cannot be used: {error}") from None
        if not lines or lines[0] != first:
            raise NotFilled(f"{folder} was filled from something else; name a new folder")
        for line in lines[1:]:
            try:
                result = Result(**json.loads(line))
            except (ValueError, TypeError):
                continue  # cut short as the run was interrupted
            self._known[result.line] = result

    def __enter__(self) -> _Notes:
        self._file = self.path.open("a", encoding="utf-8")
        self._file.write("\n")  # after a line that was cut short
        return self

    def __exit__(self, *_: object) -> None:
        self._file.close()

    def has(self, line: int, digest: str) -> bool:
        """Whether a row was done before, and its file is still there."""
        result = self._known.get(line)
        if result is None or result.digest != digest:
            return False
        if result.file and not (self.folder / result.file).is_file():
            return False
        self._now[line] = result
        return True

    def add(self, result: Result) -> None:
        """Note a row as done; one that gave no sheet is tried again by the next run."""
        self._now[result.line] = result
        if result.fault:
            return
        self._file.write(json.dumps(asdict(result)) + "\n")
        self._file.flush()

    def results(self) -> list[Result]:
        """All rows of this table, in order."""
        return [self._now[line] for line in sorted(self._now)]


HEADINGS = ("line", "sheet", "verdict", "decided by", "highest at", "not made, because")


def _summarize(name: str, folder: Path, results: list[Result]) -> None:
    """The summary workbook: a line a row of the table, with links to the sheets."""
    book = Workbook(write_only=True)
    page = book.create_sheet("Summary")
    for letter, width in zip("ABCDEF", (8, 26, 10, 90, 60, 90), strict=True):
        page.column_dimensions[letter].width = width
    page.freeze_panes = "A3"

    def cell(value: Any, bold: bool = False, link: str = "") -> Any:
        made: Any = WriteOnlyCell(page, value)
        if isinstance(value, str):
            made.data_type = "s"  # a text of the table is never a formula
        made.font = style.font(10, bold=bold)
        if link:
            made.hyperlink = link
        return made

    counts = {word: sum(r.verdict == word for r in results) for word in ("PASS", "FAIL")}
    bad = sum(bool(r.fault) for r in results)
    title = (
        f"{name}: {len(results)} rows, {counts['PASS']} PASS, {counts['FAIL']} FAIL, "
        f"{bad} not made; tausheet {version()}"
    )
    page.append([cell(title, bold=True)])
    page.append([cell(heading, bold=True) for heading in HEADINGS])
    for r in results:
        page.append(
            [
                cell(r.line),
                cell(r.file, link=r.file),
                cell(r.verdict, bold=r.verdict == "FAIL"),
                cell(r.decided_by),
                cell(r.corner),
                cell(r.fault),
            ]
        )
    with files.replacing(folder / SUMMARY, force=True) as temporary:
        book.save(temporary)
