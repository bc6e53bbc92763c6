"""Writing files so that nobody loses one: whole or not at all, never over another by mistake."""

from __future__ import annotations

import os
import stat
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from tausheet.functions.errors import TausheetError


class NotWritten(TausheetError):
    """A file that was not written; the one that was there is as it was."""


@contextmanager
def replacing(path: Path, *, force: bool) -> Iterator[Path]:
    """A temporary file to write, which takes the place of `path` when the block ends well.

    It lies in the same folder and is renamed over `path` after its bytes are on the disk, so a
    process that is killed at any moment leaves the old file or the new one, whole.
    """
    target = path.resolve() if path.is_symlink() else path
    refuse_existing(path, force=force)
    try:
        handle, name = tempfile.mkstemp(
            suffix=target.suffix, prefix=f".{target.stem[:40]}-", dir=target.parent
        )
    except OSError as error:
        raise NotWritten(
            f"{path} cannot be written ({error.strerror}); check the folder and its permissions"
        ) from None
    os.close(handle)
    temporary = Path(name)
    try:
        yield temporary
        _like(temporary, target)
        _on_the_disk(temporary)
        if not force:
            refuse_existing(path, force=False)
        os.replace(temporary, target)
        _on_the_disk(target.parent)
    except OSError as error:
        raise NotWritten(f"{path} was not written: {error.strerror or error}") from None
    finally:
        with suppress(OSError):
            temporary.unlink(missing_ok=True)


def refuse_existing(path: Path, *, force: bool) -> None:
    """Refuse a path that is taken, unless it may be overwritten; a folder always."""
    if path.is_dir():
        raise NotWritten(f"{path} is a folder; give the name of a file")
    if not force and os.path.lexists(path):
        raise NotWritten(f"{path} exists; choose another name, or give --force to overwrite it")


def _like(temporary: Path, target: Path) -> None:
    """The permissions of the file that is replaced, or those that a new file gets here."""
    with suppress(OSError):
        if target.exists():
            os.chmod(temporary, stat.S_IMODE(target.stat().st_mode))
        else:
            mask = os.umask(0)
            os.umask(mask)
            os.chmod(temporary, 0o666 & ~mask)


def _on_the_disk(path: Path) -> None:
    if os.name != "posix" and path.is_dir():
        return
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    except OSError:
        if not path.is_dir():  # some file systems cannot do this for a folder
            raise
    finally:
        os.close(handle)
