"""A calc sheet for each row of a table, and a summary workbook with a line a sheet.

The table is a .csv with a heading row of the sheet's symbols. A row that cannot be used is reported
with its line and stops nothing else. What is done is noted in the folder as it is done, so that
the same command goes on where it was interrupted.
"""

from __future__ import annotations

import csv
import hashlib
import json
import multiprocessing
from collections.abc import Callable, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from contextlib import contextmanager
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from openpyxl import Workbook
from openpyxl.cell import WriteOnlyCell

from tausheet import templates
from tausheet.addin import files, fill_sheet
from tausheet.functions import version
from tausheet.functions.errors import TausheetError
from tausheet.templates import style, values

NOTES = "progress.jsonl"
SUMMARY = "summary.xlsx"
LONGEST_FIELD = 10_000
"""Characters of one field of a table; more is no value of a calc sheet."""
MOST_COLUMNS = 2_000

Submit = Callable[..., Any]


class NotFilled(TausheetError):
    """A table or a folder that cannot be used."""


@dataclass(frozen=True)
class Row:
    """One row of the table: its line in the file, and what it gives or why it gives nothing."""

    line: int
    given: dict[str, str]
    fault: str = ""

    def digest(self, name: str) -> str:
        """What tells this row, made by this version, from any other."""
        content = json.dumps([version(), name, self.given], sort_keys=True, ensure_ascii=False)
        return hashlib.sha256(content.encode("utf-8", "surrogatepass")).hexdigest()


@dataclass(frozen=True)
class Result:
    """What became of a row."""

    line: int
    digest: str
    file: str
    verdict: str
    decided_by: str
    fault: str


def read_rows(name: str, table: Path) -> Iterator[Row]:
    """The rows of a table one by one; NotFilled where the table as a whole cannot be used."""
    csv.field_size_limit(LONGEST_FIELD)
    try:
        with table.open(encoding="utf-8-sig", newline="") as file:
            reader = csv.reader(file, strict=True)
            heading = [cell.strip() for cell in next(reader, [])]
            _check_heading(name, table, heading)
            while True:
                line = reader.line_num + 1
                try:
                    cells = next(reader)
                except StopIteration:
                    return
                except csv.Error as error:
                    yield Row(line, {}, f"it cannot be read ({error})")
                    continue
                if any(cell.strip() for cell in cells):
                    yield _row(line, heading, cells)
    except UnicodeDecodeError:
        raise NotFilled(f"{table} is not UTF-8 text; save it as CSV in UTF-8") from None
    except (OSError, csv.Error) as error:
        raise NotFilled(f"{table} cannot be read as a table: {error}") from None


def _check_heading(name: str, table: Path, heading: list[str]) -> None:
    if not any(heading):
        raise NotFilled(f"{table} has no heading row; it needs one with symbols of {name}")
    if len(heading) > MOST_COLUMNS:
        raise NotFilled(f"{table} has {len(heading)} columns; at most {MOST_COLUMNS} are read")
    twice = next((cell for cell in heading if heading.count(cell) > 1), None)
    if twice is not None:
        raise NotFilled(f'{table} has the column "{twice[:40]}" twice; keep one of them')
    try:
        # a blank value is allowed everywhere, so this tells unknown columns alone
        templates.check_keys(name, heading)
    except values.ValueRefused as error:
        raise NotFilled(f"{table}: {error}") from None


def _row(line: int, heading: list[str], cells: list[str]) -> Row:
    if len(cells) != len(heading):
        return Row(line, {}, f"it has {len(cells)} fields where the heading has {len(heading)}")
    if any("\0" in cell for cell in cells):
        return Row(line, {}, "it holds a NUL character")
    texts = (cell.strip() for cell in cells)
    return Row(line, {key: text for key, text in zip(heading, texts, strict=True) if text})


def make(name: str, line: int, digest: str, given: dict[str, str]) -> tuple[Result, bytes]:
    """Make the workbook of one row; runs on a worker."""
    file = f"{name}-{line:06d}.xlsx"
    try:
        done = fill_sheet.fill(name, given)
    except TausheetError as error:
        return Result(line, digest, "", "", "", str(error)), b""
    return Result(line, digest, file, done.said.verdict, done.said.decided_by, ""), done.data


def fill(
    name: str,
    table: Path,
    folder: Path,
    *,
    workers: int = 1,
    cluster: str | None = None,
    told: Callable[[int, int], None] = lambda done, of: None,
) -> list[Result]:
    """Make a sheet for each row; the results of all rows in their order, bad ones among them.

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
            if data:
                with files.replacing(folder / result.file, force=True) as temporary:
                    temporary.write_bytes(data)
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
                keep(Result(row.line, digest, "", "", "", row.fault), b"")
            else:
                waiting[submit(make, name, row.line, digest, row.given)] = row
                while len(waiting) >= room:
                    collect()
        while waiting:
            collect()
    results = notes.results()
    _summarize(name, folder, results)
    return results


def _outcome(future: Any, row: Row, name: str) -> tuple[Result, bytes]:
    try:
        result: tuple[Result, bytes] = future.result()
        return result
    except Exception as error:  # a worker that died, or a row that nobody foresaw
        fault = f"it was not made ({type(error).__name__}: {str(error)[:200]})"
        return Result(row.line, row.digest(name), "", "", "", fault), b""


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
    with ProcessPoolExecutor(workers, context) as executor:
        yield (
            executor.submit,
            lambda futures: wait(futures, return_when=FIRST_COMPLETED).done,
            4 * workers,
        )


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
        """Note a row as done."""
        self._now[result.line] = result
        self._file.write(json.dumps(asdict(result)) + "\n")
        self._file.flush()

    def results(self) -> list[Result]:
        """All rows of this table, in order."""
        return [self._now[line] for line in sorted(self._now)]


HEADINGS = ("line", "sheet", "verdict", "decided by", "not made, because")


def _summarize(name: str, folder: Path, results: list[Result]) -> None:
    """The summary workbook: a line a row of the table, with links to the sheets."""
    book = Workbook(write_only=True)
    page = book.create_sheet("Summary")
    for letter, width in zip("ABCDE", (8, 26, 10, 90, 90), strict=True):
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
                cell(r.fault),
            ]
        )
    with files.replacing(folder / SUMMARY, force=True) as temporary:
        book.save(temporary)
