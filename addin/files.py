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
        refuse_existing(path, force=force)
        _like(temporary, target)
        _on_the_disk(temporary)
        if force:
            os.replace(temporary, target)
        else:
            _put_where_nothing_is(temporary, target)
        _on_the_disk(target.parent)
    except FileExistsError:
        raise _taken(path) from None
    except OSError as error:
        raise NotWritten(f"{path} was not written: {error.strerror or error}") from None
    finally:
        with suppress(OSError):
            temporary.unlink(missing_ok=True)


def refuse_existing(path: Path, *, force: bool) -> None:
    """Refuse a path that is taken, unless it may be overwritten; what is protected always."""
    if path.is_dir():
        raise NotWritten(f"{path} is a folder; give the name of a file")
    if not force and os.path.lexists(path):
        raise _taken(path)
    # the folder alone decides whether a file can be replaced, so this asks the file itself;
    # the owner's bits too, since an administrator may write whatever they say
    if path.exists() and not (os.access(path, os.W_OK) and path.stat().st_mode & stat.S_IWUSR):
        raise NotWritten(f"{path} is read-only; make it writable first, or choose another name")


def _taken(path: Path) -> NotWritten:
    return NotWritten(f"{path} exists; choose another name, or give --force to overwrite it")


def _put_where_nothing_is(temporary: Path, target: Path) -> None:
    """Rename, but never over a file that came into being meanwhile: FileExistsError."""
    if os.name == "nt":  # there renaming never replaces
        os.rename(temporary, target)
        return
    try:
        os.link(temporary, target)
    except FileExistsError:
        raise
    except OSError:  # a file system without links: the name is taken first, with an empty file
        os.close(os.open(target, os.O_CREAT | os.O_EXCL | os.O_WRONLY))
        os.replace(temporary, target)


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
