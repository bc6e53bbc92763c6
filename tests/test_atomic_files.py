"""No file is lost: whole or not at all, never over another, whatever kills the process."""

from __future__ import annotations

import json
import os
import random
import signal
import stat
import subprocess
import sys
import time
from pathlib import Path

import pytest
from openpyxl import Workbook

from tausheet.addin.files import NotWritten, replacing

OLD = b"old " * 50_000
NEW = b"new " * 60_000

# writes the same file again and again, so that a kill falls anywhere in it
WRITER = f"""
import sys
from pathlib import Path
from tausheet.addin.files import replacing
target = Path(sys.argv[1])
print("ready", flush=True)
while True:
    with replacing(target, force=True) as temporary:
        with temporary.open("wb") as file:
            for _ in range(60):
                file.write({NEW[:4]!r} * 1000)
    with replacing(target, force=True) as temporary:
        temporary.write_bytes({OLD[:4]!r} * 50_000)
"""


def test_a_process_killed_at_any_moment_leaves_a_whole_file(tmp_path: Path) -> None:
    target = tmp_path / "sheet.xlsx"
    target.write_bytes(OLD)
    moments = random.Random(4)
    for _ in range(25):
        writer = subprocess.Popen(
            [sys.executable, "-c", WRITER, str(target)], stdout=subprocess.PIPE
        )
        assert writer.stdout is not None
        writer.stdout.readline()
        time.sleep(moments.uniform(0, 0.03))
        writer.send_signal(signal.SIGKILL)
        writer.wait()
        writer.stdout.close()
        assert target.read_bytes() in (OLD, NEW)


def killed(command: str, folder: Path, times: int, seed: int) -> dict[str, int]:
    """How often the old and the new file were there after a kill; a broken one fails."""
    book = Workbook()
    sheet = book.worksheets[0]
    for row in range(1, 60):
        sheet.cell(row, 1, f"=FO_STEP({row},50,0,5)")
    book.save(folder / "old.xlsx")
    script = Path(__file__).with_name("run_and_be_killed.py")
    done = subprocess.run(
        [sys.executable, script, command, folder, str(times), str(seed)],
        capture_output=True,
        text=True,
        timeout=600,
    )
    assert done.returncode == 0, done.stderr[-2000:]
    seen: dict[str, int] = json.loads(done.stdout)
    assert seen["old"] + seen["new"] == times
    return seen


def test_recalc_killed_at_100_moments_leaves_the_old_file_or_the_new(tmp_path: Path) -> None:
    seen = killed("recalc", tmp_path, 100, 1)
    assert min(seen["old"], seen["new"]) >= 5, "moments before and after the change"
    assert seen["left behind"] >= 5, "moments while it is written"


@pytest.mark.campaign
@pytest.mark.parametrize("command", ["new", "index"])
def test_making_killed_at_100_moments_leaves_the_old_file_or_the_new(
    command: str, tmp_path: Path
) -> None:
    seen = killed(command, tmp_path, 100, 2)
    assert min(seen["old"], seen["new"]) >= 5


def test_an_existing_file_stays_without_force(tmp_path: Path) -> None:
    target = tmp_path / "sheet.xlsx"
    target.write_bytes(OLD)
    with (
        pytest.raises(NotWritten, match=r"exists; choose another name, or give --force"),
        replacing(target, force=False) as temporary,
    ):
        temporary.write_bytes(NEW)
    assert target.read_bytes() == OLD
    assert os.listdir(tmp_path) == ["sheet.xlsx"]


def test_a_file_that_appears_meanwhile_stays(tmp_path: Path) -> None:
    target = tmp_path / "sheet.xlsx"
    with (
        pytest.raises(NotWritten, match="exists"),
        replacing(target, force=False) as temporary,
    ):
        temporary.write_bytes(NEW)
        target.write_bytes(OLD)
    assert target.read_bytes() == OLD
    assert os.listdir(tmp_path) == ["sheet.xlsx"]


def raced(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, call: str, refused: bool
) -> tuple[Path, Path]:
    """A file appears at the last moment, just before the call that puts ours into place."""
    target = tmp_path / "sheet.xlsx"
    real = getattr(os, call)

    def late(*arguments: object, **named: object) -> object:
        if os.fspath(target) in map(str, arguments):
            target.write_bytes(OLD)
        return real(*arguments, **named)

    def no_links(*_: object) -> None:
        raise PermissionError(1, "Operation not permitted")

    monkeypatch.setattr(os, "link", no_links if refused else os.link)
    monkeypatch.setattr(os, call, late)
    return target, tmp_path


@pytest.mark.parametrize(("call", "refused"), [("link", False), ("open", True)])
def test_a_file_that_appears_at_the_last_moment_stays(
    call: str, refused: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    target, folder = raced(tmp_path, monkeypatch, call, refused)
    with (
        pytest.raises(NotWritten, match="exists; choose another name"),
        replacing(target, force=False) as temporary,
    ):
        temporary.write_bytes(NEW)
    assert target.read_bytes() == OLD
    assert os.listdir(folder) == ["sheet.xlsx"]


def test_a_file_system_without_links_will_do(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def no_links(*_: object) -> None:
        raise PermissionError(1, "Operation not permitted")

    monkeypatch.setattr(os, "link", no_links)
    with replacing(tmp_path / "sheet.xlsx", force=False) as temporary:
        temporary.write_bytes(NEW)
    assert (tmp_path / "sheet.xlsx").read_bytes() == NEW
    assert os.listdir(tmp_path) == ["sheet.xlsx"]


def test_a_read_only_file_is_not_replaced_even_with_force(tmp_path: Path) -> None:
    target = tmp_path / "sheet.xlsx"
    target.write_bytes(OLD)
    target.chmod(0o444)
    with (
        pytest.raises(NotWritten, match="is read-only; make it writable first"),
        replacing(target, force=True),
    ):
        raise AssertionError("the block must not run")
    target.chmod(0o644)
    with (
        pytest.raises(NotWritten, match="is read-only"),
        replacing(target, force=True) as temporary,
    ):
        temporary.write_bytes(NEW)
        target.chmod(0o444)
    assert target.read_bytes() == OLD
    assert os.listdir(tmp_path) == ["sheet.xlsx"]


def test_a_failure_inside_leaves_the_old_file_and_no_rubbish(tmp_path: Path) -> None:
    target = tmp_path / "sheet.xlsx"
    target.write_bytes(OLD)
    with pytest.raises(ZeroDivisionError), replacing(target, force=True) as temporary:
        temporary.write_bytes(NEW)
        raise ZeroDivisionError
    assert target.read_bytes() == OLD
    assert os.listdir(tmp_path) == ["sheet.xlsx"]


def test_permissions_are_kept_and_new_files_get_the_usual_ones(tmp_path: Path) -> None:
    old, new, plain = tmp_path / "old", tmp_path / "new", tmp_path / "plain"
    old.write_bytes(OLD)
    old.chmod(0o640)
    plain.write_bytes(OLD)
    for path in (old, new):
        with replacing(path, force=True) as temporary:
            temporary.write_bytes(NEW)
    assert stat.S_IMODE(old.stat().st_mode) == 0o640
    assert stat.S_IMODE(new.stat().st_mode) == stat.S_IMODE(plain.stat().st_mode)


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    real, link = tmp_path / "real.xlsx", tmp_path / "link.xlsx"
    real.write_bytes(OLD)
    link.symlink_to(real)
    with replacing(link, force=True) as temporary:
        temporary.write_bytes(NEW)
    assert link.is_symlink()
    assert real.read_bytes() == NEW


def test_a_place_that_cannot_be_written_is_named(tmp_path: Path) -> None:
    with (
        pytest.raises(NotWritten, match="cannot be written"),
        replacing(tmp_path / "missing" / "x.xlsx", force=False),
    ):
        raise AssertionError("the block must not run")
    with pytest.raises(NotWritten, match="is a folder"), replacing(tmp_path, force=True):
        raise AssertionError("the block must not run")
